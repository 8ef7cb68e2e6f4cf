"""Unit after unit: what a person may type, what is remembered, and records made while hands are at work."""

from __future__ import annotations

import errno
import threading
from dataclasses import replace

import pytest

from benchrun.engine.batch import BatchDesk, BatchPerson, Skipped
from benchrun.engine.job import Outcome, Turn
from benchrun.engine.operators import Mistyped
from benchrun.engine.run import run
from benchrun.engine.tally import tally
from benchrun.errors import InputError, Stopped
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.hookup import Hookup
from benchrun.record.storage import Disk
from benchrun.report.summary import summary
from benchrun.uncertainty.decision import Conclusion


def check(serial):
    if not serial.startswith("HF-"):
        raise InputError(f"serial number {serial!r} does not fit")


def desk_with(*lines, past=()):
    """A desk, what it said, and what it asked."""
    answers, said, asked = iter(lines), [], []

    def ask(request):
        asked.append(request)
        try:
            return next(answers) + "\n"
        except StopIteration:
            raise EOFError from None

    return BatchDesk(ask, said.append, check, past), said, asked


def test_serial_numbers_come_one_by_one_until_the_end():
    desk, said, _ = desk_with("HF-0001", "  HF-0002 ", "", "end", "HF-0003")
    assert [desk.next(), desk.next(), desk.next()] == [Turn("HF-0001"), Turn("HF-0002"), None]
    assert len([line for line in said if line.startswith("Type or scan")]) == 1


def test_an_input_that_ends_ends_the_batch():
    desk, _, _ = desk_with()
    assert desk.next() is None


def test_a_wrong_number_is_told_and_asked_for_again():
    desk, said, asked = desk_with("XX-1", "HF-0001")
    assert desk.next() == Turn("HF-0001")
    assert "serial number 'XX-1' does not fit" in said
    assert len(asked) == 2


@pytest.mark.parametrize(
    ("answers", "turn"),
    [(("re-soldered", ), Turn("HF-0001", "re-soldered")), (("", "HF-0002"), Turn("HF-0002")),
     (("stop", "HF-0002"), Turn("HF-0002"))],
)  # fmt: skip
def test_a_duplicate_is_asked_about(answers, turn):
    desk, _, asked = desk_with("HF-0001", "HF-0001", *answers)
    desk.next()
    desk.concluded(Outcome("HF-0001", Conclusion.FAIL))
    assert desk.next() == turn
    assert "HF-0001 was in this batch already (fail). To test it again, give the reason" in asked


def test_units_of_an_earlier_process_count_as_duplicates():
    desk, _, asked = desk_with("HF-0001", "why not", past=["HF-0001"])
    assert desk.next() == Turn("HF-0001", "why not")
    assert "tested before the break" in asked[1]


def test_the_last_unit_again_needs_a_reason():
    desk, said, _ = desk_with("again", "HF-0001", "again ", "again cable was loose")
    assert desk.next() == Turn("HF-0001")
    assert "no unit has been tested yet that could be tested again" in said
    desk.concluded(Outcome("HF-0001", Conclusion.FAIL))
    assert desk.next() == Turn("HF-0001", "cable was loose")
    assert "give the reason, as in: again REASON" in said


def test_a_unit_is_left_out_with_a_reason():
    desk, said, _ = desk_with("skip HF-0007", "skip HF-0007 bent pin", "end")
    assert desk.next() is None
    assert desk.skipped == [Skipped("HF-0007", "bent pin")]
    assert "give the reason, as in: skip SERIAL REASON" in said


@pytest.mark.parametrize("lines", [("undo HF-0002",), ("undo", "", "HF-0002"), ("UNDO   HF-0002 ",)])
def test_a_mistyped_number_is_told_at_a_connection(lines):
    answers = iter(lines)
    with pytest.raises(Mistyped) as slip:
        BatchPerson(lambda _: next(answers)).connect(Hookup.of("short", 1))
    assert slip.value.serial == "HF-0002"


def test_nobody_left_to_mend_a_number_stops():
    lines = ["undo"]

    def ask(request):
        if not lines:
            raise EOFError
        return lines.pop()

    with pytest.raises(Stopped, match="the input ended"):
        BatchPerson(ask).connect(Hookup.of("short", 1))


class Scripted:
    """A desk that gives turns, and says which thread asked for them."""

    def __init__(self, *turns):
        self.turns = list(turns)
        self.then = lambda: None

    def next(self):
        self.then()
        return self.turns.pop(0) if self.turns else None


def batch(w, desk, **changes):
    told = []
    job = replace(
        w.job, units=(), desk=desk, kept=lambda o: told.append(("kept", o.unit, o.trouble)),
        concluded=lambda o: told.append(("concluded", o.unit, o.conclusion.value)), **changes,
    )  # fmt: skip
    return run(job), told


def test_a_batch_shares_a_calibration_and_keeps_each_unit(workplace):
    w = workplace()
    outcomes, told = batch(w, Scripted(Turn("HF-0001"), Turn("HF-9001"), Turn("HF-0001", "again")))
    assert [o.conclusion.value for o in outcomes] == ["pass", "fail", "pass"]
    assert sum(one.startswith("INIT") for one in w.mishaps.requests) == 7 + 3
    assert [one for one in told if one[0] == "concluded"] == [
        ("concluded", "HF-0001", "pass"), ("concluded", "HF-9001", "fail"), ("concluded", "HF-0001", "pass")
    ]  # fmt: skip
    assert [one[1:] for one in told if one[0] == "kept"] == [
        ("HF-0001", ""),
        ("HF-9001", ""),
        ("HF-0001", ""),
    ]
    assert len(w.records) == 3
    for outcome in outcomes:
        assert w.audit(outcome.record).code == 0
    assert '"retest":"again"' in _statement(outcomes[2].record).replace('": "', '":"')


def _statement(record):
    import base64
    import json

    return base64.b64decode(json.loads((record / "envelope.json").read_text())["payload"]).decode()


def test_a_record_is_made_while_the_next_unit_is_measured(workplace):
    """The first record cannot be finished before the second unit has been connected."""
    w, connected = workplace(), threading.Event()

    class Slow(Disk):
        def write_file(self, path, content):
            assert connected.wait(30), "the run waited for the record"
            super().write_file(path, content)

    desk = Scripted(Turn("HF-0001"), Turn("HF-0002"))
    w.mishaps.at("INIT;*OPC?", 9, connected.set)
    outcomes, told = batch(w, desk, storage=Slow())
    assert [o.trouble for o in outcomes] == ["", ""]
    assert told[:2] == [("concluded", "HF-0001", "pass"), ("concluded", "HF-0002", "pass")]


def test_a_record_that_fails_behind_the_scenes_still_reaches_the_operator(workplace, tmp_path, monkeypatch):
    import tempfile

    (tmp_path / "temporary").mkdir()
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path / "temporary"))

    class Full(Disk):
        def write_file(self, path, content):
            raise OSError(errno.ENOSPC, "No space left on device")

    w = workplace()
    outcomes, told = batch(w, Scripted(Turn("HF-0001"), Turn("HF-0002")), storage=Full())
    assert [o.exit_code for o in outcomes] == [5, 5]
    assert all("the disk is full" in one[2] for one in told if one[0] == "kept")
    assert [path.suffix for path in w.records] == [".journal"]


def test_a_mistyped_serial_number_is_mended_and_nothing_is_read_again(workplace):
    w = workplace()
    connect, slips = w.job.hands.connect, ["XX", "HF-9001"]

    def slip(hookup):
        if "unit" in hookup.text and slips:
            raise Mistyped(slips.pop(0))
        connect(hookup)

    w.job.hands.connect = slip
    outcomes, told = batch(w, Scripted(Turn("HF-0001")))
    (outcome,) = outcomes
    assert (outcome.unit, outcome.conclusion.value) == ("HF-9001", "fail")
    assert told[0] == ("concluded", "HF-9001", "fail")
    assert sum(one.startswith("INIT") for one in w.mishaps.requests) == 8
    assert outcome.record.name.endswith("-HF-9001")
    assert (
        "serial number HF-0001 was mistyped; it is HF-9001" in (outcome.record / "journal.jsonl").read_text()
    )


def figure(value, margin=1.0, name="insertion loss"):
    return JudgedFigure(name, value, "dB", 0.6, "at most", margin, 0.05, 1e8, "pass")


def test_a_batch_in_numbers():
    outcomes = [
        Outcome("A", Conclusion.FAIL, figures=(figure(0.7, -0.1),)),
        Outcome("B", Conclusion.PASS, figures=(figure(0.4, 0.2),)),
        Outcome("A", Conclusion.PASS, figures=(figure(0.5, 0.1),)),
        Outcome("C", Conclusion.INVALID),
    ]
    found = tally(outcomes)
    assert (found.units, found.tests, found.conclusions) == (3, 4, {"pass": 2, "invalid": 1})
    assert found.share == 1.0
    assert summary(found, [Skipped("D", "bent pin")]) == [
        "3 units, 1 of them tested again: 1 invalid, 2 pass",
        "conforming: 100.0 % of those about which something was concluded",
        "least margin of insertion loss: 0.10 dB, A",
        "left out: D, bent pin",
    ]


def test_a_drift_is_told_from_three_of_its_deviations_on():
    noise = (0.01, -0.01, 0.02, -0.02, 0.0, 0.01, -0.015, 0.005)
    still = [Outcome(f"U{i}", Conclusion.PASS, figures=(figure(x),)) for i, x in enumerate(noise)]
    assert tally(still).drifts == ()
    moving = [Outcome(f"U{i}", Conclusion.PASS, figures=(figure(x + 0.03 * i),)) for i, x in enumerate(noise)]
    (drift,) = tally(moving).drifts
    # numpy.polyfit(range(8), values, 1) gives 0.0291667 a unit
    assert drift.change == pytest.approx(7 * 0.0291667, rel=1e-4)
    assert drift.sigmas > 3
    assert "insertion loss drifts: +0.204 dB" in summary(tally(moving))[-1]


def test_an_empty_batch():
    assert summary(tally([])) == ["0 units: nothing tested"]
