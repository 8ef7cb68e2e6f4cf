"""Kits: measured standards, connectors, dates and who overrules them, and what lines can serve."""

from __future__ import annotations

import datetime

import numpy as np
import pytest

from benchrun.errors import InputError
from benchrun.rf.kit import Measured
from benchrun.rf.touchstone import read, write
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.kits import check_connectors, check_kits, check_standards

KIT = """\
kit: n50
edition: 1
title: Kit
connector: type N, female
frequency: 1 MHz to 6 GHz
due: 2027-06-30
standards:
  short: {kind: short}
  open: {kind: open, file: open.s1p, uncertainty: {reflection: 0.005}}
  load: {kind: load}
  thru: {kind: thru}
  line: {kind: line, offset: {delay: 500 ps}}
  line-b: {kind: line, offset: {delay: 505 ps}}
  line-c: {kind: line, offset: {delay: 100 ps}}
"""
F = np.linspace(1e6, 6e9, 601)
TODAY = datetime.date(2027, 1, 1)
LATER = datetime.date(2027, 7, 1)


def opened(last_hz=6e9, z0=50.0, size=1.0):
    f = np.linspace(1e6, last_hz, 601)
    return read(write(f, size * np.exp(-2j * np.pi * f * 60e-12), "", z0), "open.s1p")


def test_a_measured_standard_is_what_was_measured(load_text):
    kit = load_text(KIT, "kit").model.build({"open.s1p": opened()})
    standard = kit.standards["open"]
    assert isinstance(standard, Measured)
    assert standard.uncertainty == {"reflection": 0.005}
    assert standard.reflection(np.array([1e9]))[0] == pytest.approx(np.exp(-2j * np.pi * 0.06), abs=1e-6)


def line_of(f, delay_s=500e-12):
    e = np.exp(-2j * np.pi * f * delay_s)
    return read(write(f, TwoPort(0 * e, e, e, 0 * e), ""), "x.s2p")


@pytest.mark.parametrize(
    ("data", "expected"),
    [
        (opened(), ""),
        (opened(last_hz=3e9), "open was measured from 1 MHz to 3 GHz, but the kit promises 1 MHz to 6 GHz"),
        (opened(z0=75.0), "open was measured in 75 ohm, but the kit is of 50 ohm"),
        (opened(size=1.2), "open shows 1.200 times the wave it gets"),
        (line_of(F), "a open has 1 port(s), but the file of open has 2"),
    ],
)
def test_a_file_that_is_no_such_standard_is_refused_where_the_kit_names_it(load_text, data, expected):
    found = check_standards(load_text(KIT, "kit"), {"open.s1p": data})
    assert [expected in str(p) and "f.yaml:9:" in str(p) for p in found] == ([True] if expected else [])


@pytest.mark.parametrize(
    ("old", "new", "expected"),
    [
        ("file: open.s1p,", "file: open.s1p, offset: {delay: 1 ps},", "is measured (`file`), so `offset`"),
        ("{reflection: 0.005}", "{C0: 1 fF}", "takes as uncertainty `reflection`, not c0_f"),
        ("short: {kind: short}", "short: {kind: short, uncertainty: {reflection: 0.1}}", "those of its own"),
        ("type N, female", "type N, girl", "connector: 'type N, girl' is not allowed here"),
    ],
)
def test_a_kit_that_contradicts_itself(load_text, old, new, expected):
    with pytest.raises(InputError) as caught:
        load_text(KIT.replace(old, new), "kit")
    assert expected in str(caught.value)


NEAR = "from: 115 MHz, to: 880 MHz, points: 103"
HIGH = "from: 1 GHz, to: 6 GHz, points: 51"
WIDE = "from: 5 MHz, to: 880 MHz, points: 176"


def problems(load_text, good, step, today=TODAY, sweep=NEAR):
    text = good.replace("method: SOLT, kit: n50", f"kit: n50, {step}")
    text = text.replace("from: 5 MHz, to: 1.2 GHz, points: 801", sweep)
    files = {"n50": {"open.s1p": opened()}}
    found = check_kits(load_text(text), {"n50": load_text(KIT, "kit")}, today, files)
    return [str(problem) for problem in found]


@pytest.mark.parametrize(
    ("step", "sweep", "expected"),
    [
        ("method: TRL", NEAR, ""),
        ("method: TRL", WIDE, "at 22 of 176 points between 5 MHz and 110 MHz"),
        ("method: TRL, beyond window: true", WIDE, ""),
        ("method: TRL, lines: [line, line-c]", "from: 115 MHz, to: 2 GHz, points: 103", ""),
        ("method: TRL, lines: [line, line-b]", NEAR, "of one length"),
        ("method: multiline TRL, lines: [line-c]", HIGH, "between 4.5 GHz and 5.5 GHz"),
        ("method: TRL, lines: [thru]", NEAR, "thru and thru are of one"),
        ("method: LRM", WIDE, ""),
    ],
)  # fmt: skip
def test_lines_are_held_against_the_sweep_before_anything_is_connected(
    load_text, good, step, sweep, expected
):
    found = problems(load_text, good, step, sweep=sweep)
    assert [expected in text for text in found] == ([True] if expected else []), found


def test_a_kit_past_its_date_is_overruled_in_writing_only(load_text, good):
    reason = 'overrule: "Standards checked against the other kit today."'
    assert problems(load_text, good, "method: SOLT") == []
    (late,) = problems(load_text, good, "method: SOLT", LATER)
    assert "kit n50 was due for calibration on 2027-06-30" in late
    assert "overrule it in writing" in late
    assert problems(load_text, good, f"method: SOLT, {reason}", LATER) == []
    (early,) = problems(load_text, good, f"method: SOLT, {reason}")
    assert "there is nothing to overrule" in early
    with pytest.raises(InputError, match="overrule"):
        problems(load_text, good, "method: SOLT, overrule: ok", LATER)


@pytest.mark.parametrize(
    ("family", "expected"), [("type N", 0), ("type n, male", 0), ("3.5 mm", 2), ('""', 0)]
)  # fmt: skip
def test_a_kit_fits_the_connectors_of_the_bench(load_text, good, installed, family, expected):
    bench = (installed / "benches" / "workshop.yaml").read_text()
    bench = bench.replace(
        "connector: type N,", f"connector: {family if family == chr(34) * 2 else repr(family)},"
    )
    found = check_connectors(load_text(good), {"n50": load_text(KIT, "kit")}, load_text(bench, "bench").model)
    assert len(found) == expected
    if found:
        assert "kit n50 is type N, but port 1 of workshop is 3.5 mm" in str(found[0])
