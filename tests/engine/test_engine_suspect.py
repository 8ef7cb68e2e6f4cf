"""Suspect connections in a run: named at once, made again once, and the end if they stay suspicious."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from benchrun.clock import FunctionClock
from benchrun.engine.emitter import Emitter
from benchrun.engine.events import Event, Noted, Prompted
from benchrun.engine.kept import Kept
from benchrun.engine.steps import EXECUTIONS, AtWork
from benchrun.errors import CouldNotCheck, InvalidMeasurement
from benchrun.evaluate.chain import apply
from benchrun.evaluate.state import State
from benchrun.instruments.analyzer import NetworkAnalyzer
from benchrun.record.recompute import recompute
from benchrun.record.verify import read
from benchrun.scpi.opening import open_manager, open_session
from benchrun.scpi.transcript import Transcript
from sim_instruments.faults import inject

SWAPPED = "short on port 1", "open on port 1"
FAULTS = [
    ("open for short", 0, "short on port 1"),
    ("open for short", 1, "short on port 2"),
    ("wrong standard", 0, "short on port 1"),
    ("wrong standard", 1, "open on port 1"),
    ("wrong standard", 2, "load on port 1"),
    ("wrong standard", 4, "open on port 2"),
    ("nothing connected", 0, "short on port 1"),
    ("nothing connected", 1, "open on port 1"),
    ("nothing connected", 2, "load on port 1"),
    ("nothing connected", 3, "short on port 2"),
    ("nothing connected", 4, "open on port 2"),
    ("nothing connected", 6, "thru from port 1 to port 2"),
    ("wrong port", 1, "open on port 1"),
    ("wrong port", 3, "short on port 2"),
    ("wrong port", 4, "open on port 2"),
    ("connected late", 1, "open on port 1"),
    ("connected late", 3, "short on port 2"),
    ("connected late", 6, "thru from port 1 to port 2"),
]
"""A fault of hands, the connections that pass before it, and the one that it strikes."""


def slip(w, name: str, after: int, once: bool = True) -> None:
    """Let the rehearsal's hands slip, one time only or at every connection from then on."""
    bench = inject(w.rehearsal.bench, name, after=after)
    bench.injected[-1].once = once


def journal_of(w) -> list[dict[str, object]]:
    (record,) = w.records
    return [json.loads(line) for line in (record / "journal.jsonl").read_text().splitlines()]


def warnings_of(journal) -> list[str]:
    return [e["text"] for e in journal if e["event"] == "note" and e["weight"] == "warning"]


@pytest.mark.parametrize(("name", "after", "struck"), FAULTS)
def test_a_slip_is_named_made_again_and_the_unit_passes(workplace, name, after, struck):
    """The warning stands in the journal, both readings in the record, and an audit agrees."""
    w = workplace()
    slip(w, name, after)
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (0, "pass"), answer.document["reason"]
    journal = journal_of(w)
    told = warnings_of(journal)
    assert any(text.startswith(f"{struck}: ") for text in told), told
    assert all("Connect it once more; the reading is replaced." in text for text in told)
    assert sum(e["event"] == "reading" for e in journal) == 8 + len(told)
    assert w.audit(w.records[0]).code == 0


def test_a_good_calibration_is_not_doubted(workplace):
    w = workplace()
    assert w.run().code == 0
    assert warnings_of(journal_of(w)) == []


@pytest.mark.parametrize(
    ("name", "after", "struck"),
    [
        ("open for short", 0, "short on port 1"),
        ("nothing connected", 6, "thru from port 1 to port 2"),
        ("wrong standard", 2, "load on port 1"),
    ],
)
def test_what_stays_suspicious_ends_the_run(workplace, name, after, struck):
    """Invalid, with the connection, the reason and what to do; each connection is asked for again once."""
    w = workplace()
    slip(w, name, after, once=False)
    answer = w.run()
    found = answer.document
    assert (answer.code, found["conclusion"], found["figures"]) == (3, "invalid", [])
    assert struck in found["reason"]
    assert "connected again: " in found["reason"]
    assert found["advice"].startswith("See that the right standard hangs on the right port")
    told = warnings_of(journal_of(w))
    assert len(told) == len({text.split(":")[0] for text in told})
    assert w.analyzer.output is False
    assert w.audit(w.records[0]).code == 0


def test_two_that_read_alike_are_both_named_in_the_end(workplace):
    w = workplace()
    slip(w, "open for short", 0, once=False)
    assert "open on port 1 and short on port 1, connected again" in w.run().document["reason"]


class Work:
    """A calibration step by itself, on the simulated bench of a workplace."""

    def __init__(self, w, twice: bool) -> None:
        plan, rehearsal = w.job.plan, w.rehearsal
        resource = plan.bench.model.analyzer.resource
        clock = FunctionClock(lambda: rehearsal.bench.world.time_s, rehearsal.bench.world.advance)
        session = open_session(open_manager(rehearsal.library), resource, clock, Transcript())
        self.events: list[Event] = []
        self.step = plan.sequence.model.steps[0]
        self.kept = Kept()
        self.work = AtWork(
            procedure=plan.procedure,
            state=State(plan.procedure),
            analyzer=NetworkAnalyzer(session, plan.dialect),
            operator=rehearsal.hands,
            clock=clock,
            kept=self.kept,
            emit=Emitter(self.events.append, clock),
            twice=twice,
        )

    def carry_out(self) -> None:
        assert self.work.analyzer is not None
        self.work.analyzer.preset()
        EXECUTIONS["calibrate"].carry_out(self.step, self.work)

    @property
    def warnings(self) -> list[str]:
        return [e.text for e in self.events if isinstance(e, Noted) and e.weight == "warning"]


@pytest.mark.parametrize("after", [0, 2, 3, 5, 6])
def test_a_loose_contact_shows_in_a_second_sweep(workplace, after):
    """Which is the only sign that a loose load gives. Hands that leave it loose end the run."""
    w = workplace()
    slip(w, "loose connection", after, once=False)
    at = Work(w, twice=True)
    with pytest.raises(InvalidMeasurement, match="connected again: Two sweeps one after the other differ"):
        at.carry_out()
    prompts = [e.hookup for e in at.events if isinstance(e, Prompted)]
    assert prompts[-2] == prompts[-1]
    assert len(prompts) == after + 2


def test_second_sweeps_of_sound_connections_say_nothing(workplace):
    at = Work(workplace(), twice=True)
    at.carry_out()
    assert at.warnings == []
    assert len(at.kept.readings) == 7


def test_evaluation_refuses_readings_that_look_wrong(workplace):
    """So that an audit of a record made without these doubts says it as well."""
    at = Work(workplace(), twice=False)
    at.carry_out()
    readings = at.kept.of(at.step.name)
    one, two = SWAPPED
    readings[one], readings[two] = readings[two], readings[one]
    with pytest.raises(InvalidMeasurement) as caught:
        apply(at.step, State(at.work.procedure), readings)
    assert "looks like the" in caught.value.reason
    assert caught.value.reason.startswith((f"{one}: ", f"{two}: "))
    assert "right port" in caught.value.advice


def test_an_audit_says_the_same(workplace):
    """A record whose short and open were exchanged cannot be repeated, whatever it concludes."""
    w = workplace()
    w.run()
    record = read(w.records[0])
    one, two = (next(e for e in record.payload.readings if e.hookup == h) for h in SWAPPED)
    others = {one: two.file, two: one.file}
    swapped = [e.model_copy(update={"file": others.get(e, e.file)}) for e in record.payload.readings]
    payload = record.payload.model_copy(update={"readings": tuple(swapped)})
    with pytest.raises(CouldNotCheck, match=r"step .plane. cannot be repeated: .*looks like the"):
        recompute(replace(record, statement=replace(record.statement, payload=payload)))
