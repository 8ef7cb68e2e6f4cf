"""Whole-file checks: what can be known to go wrong before anything moves."""

# ruff: noqa: E501 - the tables read as one slip a line

from __future__ import annotations

import datetime

import pytest

from benchrun.errors import InputError
from benchrun.sequence.checks import check_bench, check_kits, check_masks, check_sequence, check_serial
from benchrun.sequence.files import KINDS, load_model, read
from benchrun.sequence.find import find
from benchrun.sequence.models import Sequence

TODAY = datetime.date(2026, 12, 1)
KIT = """\
kit: n50
edition: 1
title: Kit
frequency: 100 kHz to 6 GHz
due: 2031-06-30
standards:
  short: {kind: short}
  open: {kind: open, capacitance: {C0: 50 fF}}
  load: {kind: load}
  thru: {kind: thru}
"""
MASK = """\
mask: stop
edition: 1
title: Mask
lines:
  - {side: at most, through: [[300 MHz, -30 dB], [1 GHz, -50 dB]]}
  - {side: at least, through: [[20 MHz, -1 dB], [150 MHz, -1 dB]]}
"""
BENCH = """\
bench: b
edition: 1
title: Bench
instruments:
  analyzer:
    resource: GPIB0::16::INSTR
    dialect: whole-matrix
    ports:
      1: {withstands: {power: 20 dBm}}
      2: {withstands: {power: 10 dBm}}
    range: {frequency: 300 kHz to 6 GHz, power: -45 dBm to 10 dBm, bandwidth: 1 Hz to 300 kHz, points: 1001}
"""


def said(found):
    return [str(p) for p in found]


def test_installed_files_are_good(installed):
    sequence = read(installed / "harmonic-filter.yaml", KINDS["sequence"])
    kit = read(installed / "kits" / "n50-workshop.yaml", KINDS["kit"])
    mask = read(installed / "masks" / "harmonic-filter-stop.yaml", KINDS["mask"])
    assert said(check_sequence(sequence)) == []
    assert said(check_kits(sequence, {"n50-workshop": kit}, TODAY)) == []
    assert said(check_masks(sequence, {"harmonic-filter-stop": mask.model.build()})) == []
    for path in sorted((installed / "benches").glob("*.yaml")):
        assert said(check_bench(sequence, read(path, KINDS["bench"]).model)) == []
    assert check_serial("HF-0001", sequence.model) == "HF-0001"


@pytest.mark.parametrize("serial", ["HF-0001/../x", "../x", "HF-0001;OUTP ON", "HF-0001\n", "", " HF-0001", "-x",
                                    "HF..0001", "HF-0001\x00", "C:\\x", "ＨＦ-0001", "x" * 65])  # fmt: skip
def test_a_serial_number_is_no_path_and_no_message(good, load_text, serial):
    model = load_text(good.replace("HF-[0-9]{4}", ".*")).model
    with pytest.raises(
        InputError, match="holds characters that no serial number may hold; allowed are letters"
    ):
        check_serial(serial, model)


@pytest.mark.parametrize("serial", ["HF-001", "HF-00011", "hf-0001", "XHF-0001"])
def test_a_serial_number_fits_its_pattern_whole(good, load_text, serial):
    with pytest.raises(InputError, match=f"'{serial}' does not match the pattern .* of demo; read the label"):
        check_serial(serial, load_text(good).model)


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        ("sweep: wide", "sweep: wid", "f.yaml:11:35: `sweep: wid` names no sweep that stands before this step. Standing here: wide."),
        ("with: plane", "with: plain", "f.yaml:12:28: `with: plain` names no calibration that stands before this step. Standing here: plane."),
        ("with: plane", "with: judgement", "f.yaml:12:28: `with: judgement` names no calibration"),
        ("from: raw", "from: filter", "f.yaml:13:34: `from: filter` refers to itself. Put the step it needs before it."),
        ("from: raw", "from: plane", "f.yaml:13:34: `from: plane` names no network"),
        ("as: filter", "as: raw", "f.yaml:13:20: the name 'raw' is used by step 2 already"),
        ("160 MHz to 175 MHz", "1 MHz to 175 MHz", "f.yaml:17:42: insertion loss looks at 1 MHz to 175 MHz, but the sweep covers 5 MHz to 1.2 GHz. Widen"),
        ("over: 160 MHz to 175 MHz", "at: 2 GHz", "f.yaml:17:40: insertion loss looks at 2 GHz, but the sweep"),
        ("figure: insertion loss, over: 160 MHz to 175 MHz, at most: 0.45 dB", "figure: corner frequency, drop: 3 dB, at most: 2 GHz", "`at most`: 2 GHz lies outside the sweep"),
        ("insertion loss, over", "group delay, aperture: 100 kHz, at most: 1 ns, over", "f.yaml:17:43: the aperture 100 kHz is narrower than the sweep's step of 1.494 MHz. Use more points"),
        ("  part:", "  ports: 1\n  part:", "insertion loss, 160 MHz to 175 MHz needs two ports, but the unit has one"),
        ("method: SOLT", "method: SOL", "f.yaml:17:11: insertion loss, 160 MHz to 175 MHz needs two ports, but the calibration plane has one"),
        ("method: SOLT", "method: SOLT, ports: [1]", "f.yaml:11:62: SOLT calibrates 2 port(s), but `ports` names [1]"),
        ("method: SOLT", "method: SOL, isolation: true", "SOL has no isolation to read"),
    ],
)  # fmt: skip
def test_what_a_sequence_alone_can_tell(good, load_text, old, new, expected):
    text = good.replace(old, new, 1)
    if "group delay" in new:
        text = text.replace(", at most: 0.45 dB", "")
    found = said(check_sequence(load_text(text)))
    assert any(expected in line for line in found), found


def test_circular_names_end(good, load_text):
    text = good.replace("from: raw,", "from: two,").replace(
        "  - judge:", "  - de-embed: {as: two, from: filter, left: l.s2p}\n  - judge:")  # fmt: skip
    assert "`from: two` refers to step 4, which comes later" in said(check_sequence(load_text(text)))[0]


def test_a_sequence_that_judges_nothing(good, load_text):
    text = good[: good.index("  - judge")]
    assert "no step that judges" in said(check_sequence(load_text(text)))[0]


def test_a_port_that_was_not_calibrated(good, load_text):
    text = good.replace("method: SOLT", "method: SOL").replace(
        "figure: insertion loss", "figure: return loss, port: 2").replace("trace: S21", "trace: S22")  # fmt: skip
    found = said(check_sequence(load_text(text)))
    assert [line for line in found if "not of port 1" in line] == found
    assert len(found) == 2


@pytest.mark.parametrize(
    ("kit", "expected"),
    [
        (KIT.replace("6 GHz", "1 GHz"), "the sweep wide covers 5 MHz to 1.2 GHz, but kit n50 is defined only for 100 kHz to 1 GHz"),
        (KIT.replace("100 kHz", "10 MHz"), "but kit n50 is defined only for 10 MHz to 6 GHz. Use another kit"),
        (KIT.replace("2031-06-30", "2026-11-30"), "kit n50 was due for calibration on 2026-11-30. Have it calibrated"),
        (KIT.replace("  thru: {kind: thru}\n", ""), "kit n50 lacks thru for SOLT"),
    ],
)  # fmt: skip
def test_kits_that_do_not_serve(good, load_text, kit, expected):
    (problem,) = check_kits(load_text(good), {"n50": load_text(kit, "kit")}, TODAY)
    assert (problem.line, problem.column) == (11, 60)
    assert expected in str(problem)


def test_a_kit_is_good_on_the_day_it_is_due(good, load_text):
    kit = load_text(KIT.replace("2031-06-30", "2026-12-01"), "kit")
    assert check_kits(load_text(good), {"n50": kit}, TODAY) == []


@pytest.mark.parametrize(
    ("mask", "limit", "expected"),
    [
        (MASK.replace("1 GHz", "2 GHz"), "mask: stop", "mask stop covers 20 MHz to 2 GHz, but the sweep only 5 MHz to 1.2 GHz"),
        (MASK, "mask: stop, over: 100 MHz to 400 MHz", "mask stop must cover 100 MHz to 400 MHz, but has no line from 150 MHz to 300 MHz"),
        (MASK, "mask: stop, over: 10 MHz to 100 MHz", "but has no line from 10 MHz to 20 MHz"),
        (MASK.replace("[20 MHz", "[149.9 MHz"), "mask: stop", "has a line from 149.9 MHz to 150 MHz, where the sweep has no point"),
    ],
)  # fmt: skip
def test_masks_that_do_not_fit(good, load_text, mask, limit, expected):
    sequence = load_text(good.replace("mask: stop", limit))
    found = said(check_masks(sequence, {"stop": load_text(mask, "mask").model.build()}))
    assert len(found) == 1
    assert expected in found[0]


def test_a_mask_that_covers_its_band(good, load_text):
    sequence = load_text(good.replace("mask: stop", "mask: stop, over: 300 MHz to 1 GHz"))
    assert check_masks(sequence, {"stop": load_text(MASK, "mask").model.build()}) == []


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        ("[20 MHz, -1 dB], [150", "[20 MHz, -1 dB], [400", "f.yaml:5:3: lines cross near"),
        ("[1 GHz, -50 dB]", "[200 MHz, -50 dB]", "goes backwards from 300 MHz to 200 MHz"),
        ("[1 GHz, -50 dB]", "[1 GHz, -50]", "-50 has no unit"),
        ("side: at most", "side: upper", "side: 'upper' is not allowed here"),
    ],
)  # fmt: skip
def test_masks_that_contradict_themselves(problems, old, new, expected):
    (problem,) = problems(MASK.replace(old, new), "mask")
    assert expected in str(problem)


@pytest.mark.parametrize(
    ("old", "new", "bench", "place", "expected"),
    [
        ("power: -10 dBm", "power: 31 dBm", BENCH.replace("10 dBm, band", "90 dBm, band").replace("power: 20 dBm", "power: 90 dBm").replace("power: 10 dBm}", "power: 90 dBm}"), (9, 77), "31 dBm is more than the unit withstands (30 dBm)"),
        ("  part:", "  gain: 25 dB\n  part:", BENCH, (10, 77), "-10 dBm and a gain of 25 dB bring 15 dBm to a port that withstands 10 dBm"),
        ("  part:", "  gain: -30 dB\n  part:", BENCH.replace("{power: 10 dBm}", "{power: -20 dBm}"), (10, 77), "a port that withstands -20 dBm"),
        ("points: 801", "points: 1002", BENCH, (9, 43), "has 1002 points, the analyzer of b at most 1001"),
        ("to: 1.2 GHz", "to: 7 GHz", BENCH, (9, 27), "covers 5 MHz to 7 GHz, but the analyzer of b only 300 kHz to 6 GHz"),
        ("from: 5 MHz", "from: 5 kHz", BENCH, (9, 16), "covers 5 kHz to 1.2 GHz"),
        ("bandwidth: 1 kHz", "bandwidth: 1 MHz", BENCH, (9, 59), "1 MHz is outside the IF bandwidths 1 Hz to 300 kHz"),
        ("power: -10 dBm", "power: -50 dBm", BENCH, (9, 73), "-50 dBm is outside the -45 to 10 dBm"),
    ],
)  # fmt: skip
def test_benches_that_do_not_serve(good, load_text, old, new, bench, place, expected):
    text = good.replace(old, new)
    (problem,) = check_bench(load_text(text), load_text(bench, "bench").model)
    assert expected in str(problem)
    assert problem.line == place[0]
    assert text.split("\n")[problem.line - 1][problem.column - 1].strip()


@pytest.mark.parametrize("step", range(3))
@pytest.mark.parametrize("name", ["nothing", "raw", "filter", "plane", "judgement", "wide"])
def test_checks_never_raise_on_names_that_half_resolve(good, load_text, step, name):
    old = ("sweep: wide", "with: plane", "from: raw")[step]
    sequence = load_text(good.replace(old, f"{old.split()[0]} {name}"))
    kit, mask = load_text(KIT, "kit"), load_text(MASK, "mask").model.build()
    found = check_sequence(sequence)
    assert bool(found) is (f"{old.split()[0]} {name}" != old)
    check_kits(sequence, {"n50": kit}, TODAY)
    check_masks(sequence, {"stop": mask})
    check_bench(sequence, load_text(BENCH, "bench").model)


def test_limits_of_a_bandwidth_lie_nowhere_in_the_sweep() -> None:

    path = find("sequence", "preselector")
    loaded = load_model(path.read_bytes(), str(path), Sequence, path)
    assert any(step.kind == "judge" for step in loaded.model.steps)
    assert check_sequence(loaded) == []
