"""A run whose process died is taken up again: what counts is not lost, and none of it is read again."""

from __future__ import annotations

import base64
import errno
import json
import shutil
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from benchrun.clock import FunctionClock
from benchrun.engine.journal import Appended, Journal, read_journal
from benchrun.engine.resume import StillGoing, journals, sweep, take_up
from benchrun.engine.run import run
from benchrun.engine.story import NothingDone
from benchrun.errors import InputError

TODAY = datetime(2026, 12, 1, tzinfo=UTC).date()


class Killed(BaseException):
    """Stands for the end of the process: nothing catches it but the test."""


class Mortal(Appended):
    """A journal's file in a process that ends when so many writes were made."""

    left = 10**9

    def write(self, data: bytes) -> None:
        if Mortal.left <= 0:
            raise Killed
        Mortal.left -= 1
        super().write(data)


@pytest.fixture(autouse=True)
def alive():
    Mortal.left = 10**9


def killed_after(w, writes, **changes):
    """Run until the journal has got so many lines, and let the process end there."""
    Mortal.left = writes
    with pytest.raises(Killed):
        run(replace(w.job, opener=Mortal, **changes))
    Mortal.left = 10**9
    (path,) = journals(w.job.records)
    return path


def lines(path):
    return [e.what for e in read_journal(path.read_bytes()).entries]


def writes_until(w, what, number=1):
    """How many lines a run's journal has when the wanted one is in it."""
    seen = []

    class Watched(Appended):
        def write(self, data: bytes) -> None:
            seen.append(json.loads(data.split(b"\n", 1)[0].decode()[17:])["what"])
            super().write(data)

    run(replace(w.job, opener=Watched, records=w.folder / "counting"))
    places = [i for i, one in enumerate(seen, 1) if one == what]
    return places[number - 1]


def predicate(record: Path) -> dict:
    text = json.loads((record / "envelope.json").read_text())["payload"]
    found: dict = json.loads(base64.b64decode(text))["predicate"]
    return found


def raw(record: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted((record / "raw").iterdir())}


def resumed(w, cli, *options):
    return cli("resume", str(w.job.records), "--json", *options)


@pytest.fixture
def calm(workplace):
    """What an undisturbed run gives."""
    w = workplace(units=("HF-0001", "HF-0002"))
    w.run()
    return [raw(record) for record in w.records], [predicate(record)["figures"] for record in w.records]


@pytest.mark.parametrize(
    ("what", "number"),
    [("unit", 1), ("reading", 3), ("finished", 1), ("reading", 8), ("finished", 4), ("concluded", 1),
     ("record", 1), ("unit", 2), ("served", 1), ("reading", 9), ("finished", 8), ("record", 2)],
)  # fmt: skip
def test_a_rehearsal_goes_on_as_if_nothing_had_happened(workplace, cli, calm, tmp_path, what, number):
    shutil.rmtree(tmp_path / "records")
    count = writes_until(workplace(units=("HF-0001", "HF-0002")), what, number)
    w = workplace(units=("HF-0001", "HF-0002"))
    path = killed_after(w, count)
    assert lines(path)[-1] == what
    answer = resumed(w, cli)
    assert answer.code == 0, answer.err
    assert [u["conclusion"] for u in answer.document["units"]] == ["pass", "pass"]
    assert ([raw(r) for r in w.records], [predicate(r)["figures"] for r in w.records]) == calm
    for record in w.records:
        assert w.audit(record).code == 0


def test_what_stands_and_what_is_repeated_is_told_and_recorded(workplace, cli):
    w = workplace()
    killed_after(w, writes_until(workplace(), "reading", 3) + 1)
    answer = cli("resume", str(w.job.records))
    said = ("taken up after a break: no step had finished; step 1, plane, had not finished and is repeated, "
            "with 3 readings taken again")  # fmt: skip
    assert said in " ".join(answer.out.split())
    (record,) = w.records
    assert predicate(record)["resumed"] == [said]


def test_at_real_instruments_nothing_that_counts_is_read_again(workplace):
    count = writes_until(workplace(), "finished", 1) + 1
    w = workplace()
    path = killed_after(w, count)
    before = len(w.mishaps.requests)
    kept = [e.content for e in read_journal(path.read_bytes()).entries if e.what == "reading"]
    story, plan = take_up(path, TODAY)
    # The same bench lives on, as a real one does.
    story.facts = {**story.facts, "rehearsal": False}
    (outcome,) = run(replace(w.job, plan=plan, story=story))
    assert outcome.conclusion.value == "pass"
    assert sum(one.startswith("INIT") for one in w.mishaps.requests[before:]) == 1
    record = outcome.record
    assert [c for n, c in raw(record).items() if "plane" in n] == kept
    found = predicate(record)
    assert found["resumed"][0].endswith("steps 1 stand; it goes on with step 2, in-jig")
    assert found["readings"][0]["taken_s"] < found["readings"][-1]["taken_s"]
    told = [json.loads(line) for line in (record / "journal.jsonl").read_text().splitlines()]
    assert [e["number"] for e in told if e["event"] == "step ended"] in ([1, 2, 3, 4], [2, 3, 4])
    assert w.audit(record).code == 0
    assert w.analyzer.output is False
    assert journals(w.job.records) == []


def test_the_calibration_of_a_recorded_unit_serves_on_after_a_break(workplace):
    units = ("HF-0001", "HF-0002", "HF-0003")
    w = workplace(units=units)
    count = writes_until(workplace(units=units), "unit", 3)
    path = killed_after(w, count)
    before = len(w.mishaps.requests)
    story, plan = take_up(path, TODAY)
    story.facts = {**story.facts, "rehearsal": False}
    outcomes = run(replace(w.job, plan=plan, story=story))
    assert [o.conclusion.value for o in outcomes] == ["pass"] * 3
    assert sum(one.startswith("INIT") for one in w.mishaps.requests[before:]) == 1
    for outcome in outcomes:
        assert w.audit(outcome.record).code == 0


def later(w, seconds):
    """The clock some time after the break."""
    world = w.rehearsal.bench.world
    return FunctionClock(
        lambda: world.time_s + 1e6, world.advance, lambda: datetime.now(UTC) + timedelta(seconds=seconds)
    )


@pytest.mark.parametrize(("hours", "conclusion"), [(1, "pass"), (9, "invalid")])
def test_a_calibration_that_grew_too_old_in_the_break_ends_the_run(workplace, hours, conclusion):
    count = writes_until(workplace(), "finished", 1) + 1
    w = workplace()
    path = killed_after(w, count)
    story, plan = take_up(path, TODAY)
    story.facts = {**story.facts, "rehearsal": False}
    (outcome,) = run(replace(w.job, plan=plan, story=story, clock=later(w, hours * 3600)))
    assert outcome.conclusion.value == conclusion
    if hours == 9:
        assert outcome.reason.startswith("The calibration plane is 8.9 h old, and may serve for 8.0 h")
    assert len(raw(outcome.record)) == (8 if hours == 1 else 7)
    assert w.audit(outcome.record).code == 0


def test_another_instrument_on_the_bench_ends_the_run(workplace):
    count = writes_until(workplace(), "finished", 1) + 1
    w = workplace()
    path = killed_after(w, count)
    story, plan = take_up(path, TODAY)
    story.facts = {**story.facts, "rehearsal": False}
    w.mishaps.requests.clear()
    w.mishaps.answer("*IDN?", 1, b"SIMULATED,NA-2,S9999,1.0\n")
    (outcome,) = run(replace(w.job, plan=plan, story=story))
    assert outcome.reason == (
        "GPIB0::16::INSTR was 'SIMULATED,NA-2,S0016,1.0' when the run began and is "
        "'SIMULATED,NA-2,S9999,1.0' now."
    )
    assert w.mishaps.requests == ["*IDN?\n"], "nothing may be sent to an instrument that is not ours"
    assert len(raw(outcome.record)) == 7


def test_files_that_were_changed_close_the_run_as_invalid(workplace, cli, tmp_path, small_filter):
    count = writes_until(workplace(), "reading", 8)
    w = workplace()
    killed_after(w, count)
    (tmp_path / "sequence.yaml").write_text(small_filter.replace("at most: 0.6 dB", "at most: 6 dB"))
    answer = resumed(w, cli)
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert answer.document["reason"] == (
        "the run broke off, and its sequence, bench, kit or masks were changed since"
    )
    (record,) = w.records
    assert len(raw(record)) == 8, "the reading of the unfinished step is kept too"
    assert "at most: 0.6 dB" in (record / "inputs" / "sequence.yaml").read_text()
    assert w.audit(record).code == 0


def test_closing_makes_a_real_bench_safe(workplace):
    count = writes_until(workplace(), "reading", 3)
    w = workplace()
    path = killed_after(w, count)
    story, plan = take_up(path, TODAY, "it was decided so")
    story.facts = {**story.facts, "rehearsal": False}
    w.mishaps.requests.clear()
    w.analyzer.output = True
    (outcome,) = run(replace(w.job, plan=plan, story=story))
    assert (outcome.conclusion.value, outcome.reason) == ("invalid", "it was decided so")
    assert w.analyzer.output is False
    assert not any(one.startswith("INIT") for one in w.mishaps.requests)
    w.analyzer.line_closed = True


def test_a_bench_that_does_not_answer_any_more_is_told(workplace):
    count = writes_until(workplace(), "reading", 3)
    w = workplace()
    path = killed_after(w, count)
    story, plan = take_up(path, TODAY, "it was decided so")
    story.facts = {**story.facts, "rehearsal": False}
    w.analyzer.line_closed = True
    (outcome,) = run(replace(w.job, plan=plan, story=story))
    (left,) = outcome.left_on
    assert "the bench does not answer" in left
    assert "see by hand that every source and supply is off" in left
    assert predicate(outcome.record)["left_on"] == [left]


def test_a_full_disk_interrupts_and_the_run_goes_on_when_there_is_room(workplace, cli):
    class Full(Appended):
        full = False

        def write(self, data: bytes) -> None:
            if Full.full:
                raise OSError(errno.ENOSPC, "No space left on device")
            super().write(data)

    w = workplace()
    w.mishaps.at("INIT;*OPC?", 8, lambda: setattr(Full, "full", True))
    answer = w.run(opener=Full)
    assert (answer.code, answer.document["record"]) == (5, None)
    assert f"See to the disk, then: benchrun resume {w.job.records}" in answer.document["trouble"]
    assert w.analyzer.output is False
    (path,) = w.records
    assert path.suffix == ".journal"
    answer = resumed(w, cli)
    assert (answer.code, answer.document["conclusion"]) == (0, "pass")
    (record,) = w.records
    assert predicate(record)["resumed"][0].startswith("taken up after a break: steps 1 stand; step 2")


def test_a_disk_that_is_full_at_the_start_is_told_before_anything_is_sent(workplace):
    class Full(Appended):
        def write(self, data: bytes) -> None:
            raise OSError(errno.ENOSPC, "No space left on device")

    w = workplace()
    with pytest.raises(Exception, match="the disk is full: free some space"):
        w.run(opener=Full)
    assert w.mishaps.requests == []
    assert w.records == []


def test_a_run_that_had_not_begun_leaves_nothing(workplace, cli):
    w = workplace()
    killed_after(w, 2)
    answer = resumed(w, cli)
    assert (answer.code, answer.document) == (0, {"conclusion": None, "units": []})
    assert "ends before its run had begun to measure" in answer.err
    assert w.records == []


def test_a_record_that_stands_already_is_not_written_twice(workplace, cli):
    count = writes_until(workplace(), "record")
    w = workplace()
    killed_after(w, count - 1)  # the record stands, the journal does not know
    assert len([path for path in w.records if path.suffix != ".journal"]) == 1
    answer = resumed(w, cli)
    assert answer.code == 0
    assert [str(path) for path in w.records] == [answer.document["record"]]


def test_a_run_that_is_going_is_left_alone(workplace, cli):
    w = workplace()
    path = killed_after(w, writes_until(workplace(), "finished", 1))
    held = Journal(path, keep=read_journal(path.read_bytes()).good)
    (w.job.records / ".x.partial").mkdir()
    with pytest.raises(StillGoing, match="still going"):
        take_up(path, TODAY)
    answer = resumed(w, cli)
    assert answer.code == 3
    assert "still going" in answer.err
    assert (w.job.records / ".x.partial").is_dir(), "somebody may be writing it just now"
    held.close()


def test_leavings_of_half_records_are_swept(tmp_path):
    (tmp_path / ".one.0123.partial" / "raw").mkdir(parents=True)
    (tmp_path / "record").mkdir()
    assert [path.name for path in sweep(tmp_path)] == [".one.0123.partial"]
    assert [path.name for path in tmp_path.iterdir()] == ["record"]


def test_a_journal_of_a_later_version_is_left_alone(tmp_path, cli):
    journal = Journal(tmp_path / "r.journal")
    journal.line("begun", edition=2)
    journal.close()
    with pytest.raises(InputError, match="edition 2; this program reads 1"):
        take_up(tmp_path / "r.journal", TODAY)
    (tmp_path / "r.journal").write_bytes(b"nonsense")
    with pytest.raises(NothingDone):
        take_up(tmp_path / "r.journal", TODAY)


def test_no_folder_of_records_is_bad_input(cli):
    answer = cli("resume", "nowhere")
    assert (answer.code, "there is no folder of records nowhere" in answer.err) == (2, True)
