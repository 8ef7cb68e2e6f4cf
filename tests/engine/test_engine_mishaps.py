"""An instrument that misbehaves in the middle of a run: invalid, a signed record that stands, source off."""

from __future__ import annotations

import json
import struct
from pathlib import Path

import pytest

from sim_instruments.scpi.errors import ScpiError

READ = {"workshop": "TRAC? MATRIX", "workshop-second": "CALCulate:DATA?"}
FORM = {"workshop": ">d", "workshop-second": "<f"}
SIZE = {"workshop": 61 * 8 * 8, "workshop-second": 61 * 2 * 4}
BENCHES = pytest.mark.parametrize("bench", list(READ))


def block(bench: str, values: list[float]) -> bytes:
    data = b"".join(struct.pack(FORM[bench], value) for value in values)
    count = str(len(data)).encode()
    return b"#" + str(len(count)).encode() + count + data + b"\n"


def numbers(bench: str) -> int:
    return SIZE[bench] // struct.calcsize(FORM[bench])


def ended(w, answer, *words):
    """What every such run has in common; gives the journal."""
    found = answer.document
    assert (answer.code, found["conclusion"], found["figures"]) == (3, "invalid", [])
    for word in words:
        assert word in found["reason"], found["reason"]
    assert found["reason"] in answer.err
    assert w.analyzer.output is False
    assert "left_on" not in found
    assert "STILL ON" not in answer.err
    (record,) = w.records
    assert Path(found["record"]) == record
    audit = w.audit(record)
    assert audit.code == 0, audit.err
    assert "conclusion invalid" in audit.out
    return [json.loads(line) for line in (record / "journal.jsonl").read_text().splitlines()]


BLOCKS = {
    "nothing": (lambda _: b"", ("gave no whole answer within",)),
    "garbage": (lambda _: b"\x93\x00 what?\n", ("block",)),
    "text": (lambda _: b"BUSY\n", ("block", "BUSY")),
    "an empty line": (lambda _: b"\n", ("block",)),
    "too few bytes": (lambda b: block(b, [0.1] * numbers(b))[:-100], ("ended its answer after",)),
    "a header alone": (lambda _: b"#", ("gave no whole answer within",)),
    "too few numbers": (lambda b: block(b, [0.1] * 10), ("10 numbers",)),
    "too many numbers": (lambda b: block(b, [0.1] * (numbers(b) + 2)), (" numbers",)),
    "no end": (lambda b: block(b, [0.1] * numbers(b))[:-1], ("ended its answer after",)),
    "not a number": (
        lambda b: block(b, [float("nan")] * numbers(b)),
        (
            "gave no number for S",
            "1 at 5 MHz (61 points)",
        ),
    ),
    "the standard's not a number": (lambda b: block(b, [9.91e37] * numbers(b)), ("gave no number",)),
}


@BENCHES
@pytest.mark.parametrize("what", list(BLOCKS))
def test_a_reading_that_is_none(workplace, bench, what):
    make, words = BLOCKS[what]
    w = workplace(bench=bench)
    w.mishaps.twice(READ[bench], 6, make(bench))
    request = "" if words[0].startswith("gave no number") else READ[bench]
    journal = ended(w, w.run(), *words, request, w.job.plan.bench.model.analyzer.resource)
    assert [e["event"] for e in journal][-2:] == ["safe", "run ended"]
    assert sum(e["event"] == "reading" for e in journal) == (5 if bench == "workshop" else 1)


@BENCHES
def test_readings_of_nothing_at_all_are_no_calibration(workplace, bench):
    w = workplace(bench=bench)
    for number in range(1, 40):
        # Hardly different, so that they are not called stale either.
        w.mishaps.answer(READ[bench], number, block(bench, [number * 1e-30] * numbers(bench)))
    ended(
        w, w.run(), "readings of short, open and load on port 1 differ by only", "cannot be three different"
    )


@BENCHES
@pytest.mark.parametrize("number", [1, 4, 8])
def test_an_error_in_the_queue_is_told_with_what_caused_it(workplace, bench, number):
    w = workplace(bench=bench)
    w.mishaps.at(READ[bench], number, lambda: w.analyzer.status.report(ScpiError(-240)))
    ended(w, w.run(), 'reported error -240, "Hardware error"', READ[bench][:4])


def test_an_error_while_setting_up(workplace):
    w = workplace()
    w.mishaps.at("SENS:SWE:POIN 61", 1, lambda: w.analyzer.status.report(ScpiError(-222)))
    ended(w, w.run(), "-222", "SENS:FREQ:MODE SWE")


def test_an_error_in_the_preset_ends_the_series(workplace):
    w = workplace(units=("HF-0001", "HF-0002"))
    w.mishaps.at("*RST", 1, lambda: w.analyzer.status.report(ScpiError(-310)))
    ended(w, w.run(), "-310")


ANSWERS = {
    "identity of two words": ("*IDN?", b"WHO,ME\n", "four fields"),
    "identity that is no text": ("*IDN?", b"\xff\xfe\xfd\n", "plain text"),
    "no identity": ("*IDN?", b"", "gave no whole answer"),
    "points": ("SENS:SWE:POIN?", b"60\n", "61 points as set"),
    "points in words": ("SENS:SWE:POIN?", b"many\n", "a number was expected"),
    "settings done": ("SENS:SWE:POIN 61", b"0\n", '"1" for *OPC?'),
    "sweep done": ("INIT;*OPC?", b"what\n", '"1" for *OPC?'),
    "no sweep": ("INIT;*OPC?", b"", "gave no whole answer"),
    "grid": (
        "TRAC? GRID",
        block("workshop", [1e6 * n for n in range(1, 62)]),
        "another grid: point 61 lies at 61000000 Hz",
    ),
    "error queue": ("SYST:ERR?", b"fine, thank you\n", "an error number and text"),
    "health": ("STAT:QUES:COND?", b"none\n", "a number was expected"),
    "overload": ("STAT:QUES:COND?", b"8\n", "reports an overload"),
    "reference": ("STAT:QUES:COND?", b"32\n", "reports an unlocked reference"),
}


@pytest.mark.parametrize("what", list(ANSWERS))
def test_any_other_answer_may_be_wrong(workplace, what):
    request, data, words = ANSWERS[what]
    w = workplace(units=("HF-0001",))
    w.mishaps.twice(request, 1, data) if what == "no sweep" else w.mishaps.answer(request, 1, data)
    answer = w.run()
    if what.endswith("identity") or what.startswith("identity"):
        assert not any("OUTP" in one or "*RST" in one for one in w.mishaps.requests)
    ended(w, answer, words)


def test_another_instrument_is_left_alone(workplace, tmp_path):
    text = (Path(__file__).parents[2] / "sequences/benches/workshop.yaml").read_text()
    place = "    dialect: whole-matrix\n"
    assert place in text
    (tmp_path / "bench.yaml").write_text(text.replace(place, place + "    identity: {model: NA-7}\n"))
    w = workplace(bench=str(tmp_path / "bench.yaml"), units=("HF-0001", "HF-0002"))
    journal = ended(
        w, w.run(), "is 'SIMULATED,NA-2,S0016,1.0'", "'model NA-7'", "connect the right", "GPIB0::16::INSTR"
    )
    assert w.mishaps.requests == ["*IDN?\n"], "nothing may be sent to an instrument that is not ours"
    assert "safe" not in [e["event"] for e in journal]


@BENCHES
@pytest.mark.parametrize("number", [1, 6])
def test_a_line_that_closes_says_what_stays_on(workplace, bench, number):
    w = workplace(bench=bench)
    w.mishaps.at(READ[bench], number, lambda: setattr(w.analyzer, "line_closed", True))
    answer = w.run()
    found = answer.document
    assert (answer.code, found["conclusion"]) == (3, "invalid")
    assert w.analyzer.output is True  # nobody can reach it any more
    (left,) = found["left_on"]
    assert f"the source of {w.job.plan.bench.model.analyzer.resource} may still be on" in left
    assert "switch it off by hand" in left
    assert f"STILL ON: {left}" in answer.err
    (record,) = w.records
    assert w.audit(record).code == 0
    assert "may still be on" in (record / "journal.jsonl").read_text()


def test_readings_taken_before_are_kept(workplace):
    w = workplace()
    w.mishaps.twice(READ["workshop"], 8, b"")
    journal = ended(w, w.run())
    (record,) = w.records
    assert len(list((record / "raw").iterdir())) == 7
    assert sum(e["event"] == "reading" for e in journal) == 7
    last = [json.loads(line) for line in (record / "transcript.jsonl").read_text().splitlines()]
    assert any(one["way"] == "failed" and "TRAC? MATRIX" in one["text"] for one in last)


def test_the_next_unit_is_measured_after_one_that_went_wrong(workplace):
    w = workplace(units=("HF-0001", "HF-0002", "HF-9001"))
    w.mishaps.twice(READ["workshop"], 9, b"")  # the second unit's reading
    answer = w.run()
    units = answer.document["units"]
    assert [u["conclusion"] for u in units] == ["pass", "invalid", "fail"]
    assert answer.document["conclusion"] == "invalid"
    assert answer.code == 3
    assert [len(u["figures"]) for u in units] == [3, 0, 3]
    assert len(w.records) == 3
    for record in w.records:
        assert w.audit(record).code == 0
    assert w.analyzer.output is False


def test_waiting_for_nothing_takes_bench_time_and_no_other(workplace):
    w = workplace()
    w.mishaps.answer("INIT;*OPC?", 1, b"")
    w.run()
    (over,) = [event for event in w.events if event.name == "run ended"]
    assert over.at_s > 5.0
