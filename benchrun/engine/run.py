"""A run: one sequence on one or more units under one calibration, each leaving its record."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import asdict
from datetime import UTC, datetime
from pathlib import Path

from benchrun.engine.benchtop import Benchtop
from benchrun.engine.job import Job, Outcome, Turn
from benchrun.engine.journal import SUFFIX, Journal
from benchrun.engine.stopping import StopSignals
from benchrun.engine.story import EDITION, PastUnit
from benchrun.engine.unit import Shared, UnitRun
from benchrun.errors import InputError, RecordError, RecordNotWritten, Stopped
from benchrun.evaluate.state import State
from benchrun.record.payload import safe_name
from benchrun.record.verify import read
from benchrun.record.write import refusal
from benchrun.sequence.checks import check_serial
from benchrun.uncertainty.decision import Conclusion

__all__ = ["Job", "Outcome", "run"]


def run(job: Job) -> tuple[Outcome, ...]:
    """Run the plan on every unit.

    Once the bench is opened every unit's run ends in a record, whatever happens; every source is off
    before this returns or raises. If the process does not live to its end, a journal in the folder of records
    holds what counts, and a later job with its :class:`~benchrun.engine.story.Story` goes on.

    Parameters
    ----------
    job
        The job.

    Returns
    -------
    tuple of Outcome
        One for each unit begun; a stop ends the series.

    Raises
    ------
    InputError
        For a serial number, hands or a key that do not fit; nothing was measured.
    Busy
        If another run holds an instrument; nothing was sent to it.
    RecordNotWritten
        If the records folder cannot be written; nothing was measured.
    """
    story, plan = job.story, job.plan
    if story is None or not story.closing:
        for serial in job.units:
            check_serial(serial, plan.sequence.model)
            job.hands.offer(serial)
        job.hands.check(plan.hookups)
    what = f"{plan.sequence.model.sequence} on {plan.bench.model.bench}"
    top = Benchtop(
        plan.bench.model, plan.dialect, job.library, job.clock, plan.others, job.operator_name, what
    )
    with StopSignals() as stop, top, _journal(job) as journal:
        return _Series(job, top, stop, journal).go()


class _Series:
    """Unit after unit."""

    def __init__(self, job: Job, top: Benchtop, stop: StopSignals, journal: Journal) -> None:
        self.job, self.top, self.stop, self.journal = job, top, stop, journal
        self.shared = Shared(State(job.plan.procedure))
        self.outcomes: list[Outcome] = []
        self.late: list[tuple[int, UnitRun, Future[Outcome]]] = []

    def go(self) -> tuple[Outcome, ...]:
        """All of them."""
        with contextlib.ExitStack() as stack:
            clerk = stack.enter_context(ThreadPoolExecutor(1)) if self.job.desk is not None else None
            try:
                for number, (turn, past) in enumerate(self._turns()):
                    self._one(number, turn, past, clerk)
                    last = self.outcomes[-1]
                    if self.stop.asked or not self._goes_on(past) or last.conclusion is Conclusion.STOPPED:
                        break
                    if self.journal.failure is not None:
                        break
            finally:
                self._collect(wait=True)
        return tuple(self.outcomes)

    def _goes_on(self, past: PastUnit | None) -> bool:
        """Whether the bench is there for the next unit; one that was only recalled did not need it."""
        return self.top.ready or past is not None

    def _turns(self) -> Iterator[tuple[Turn, PastUnit | None]]:
        story, job = self.job.story, self.job
        past = story.units if story is not None else []
        for unit in past:
            yield Turn(unit.serial, unit.retest), unit
        if story is not None and story.closing:
            return
        for serial in job.units[len(past) :]:
            yield Turn(serial), None
        while job.desk is not None:
            self._collect()
            try:
                with self.stop.armed():
                    turn = job.desk.next()
            except Stopped:
                return
            if turn is None:
                return
            yield turn, None

    def _one(self, number: int, turn: Turn, past: PastUnit | None, clerk: ThreadPoolExecutor | None) -> None:
        unit = UnitRun(self.job, turn, number, self.top, self.stop, self.journal, self.shared, past)
        if past is not None and past.record:
            self.outcomes.append(self._recalled(unit, past))
            return
        self.outcomes.append(unit.measure())
        self.job.concluded(self.outcomes[-1])
        if clerk is None:
            self._settled(number, unit, unit.keep())
        else:
            self.late.append((number, unit, clerk.submit(unit.keep)))

    def _recalled(self, unit: UnitRun, past: PastUnit) -> Outcome:
        """A unit whose record stands: what it came to, and what it leaves for the next one."""
        assert self.job.story is not None  # a past comes from a story
        assert unit.past is not None
        if self.job.story.rehearsal and not self.job.story.closing:
            unit.measure()
        elif not self.job.story.closing:
            unit.past.bring_calibrations_back()
        folder = Path(past.record)
        try:
            payload = read(folder).payload
        except RecordError as error:
            return Outcome(past.serial, Conclusion.INVALID, str(error), trouble=str(error))
        return Outcome(
            past.serial, Conclusion(payload.conclusion), payload.reason, payload.advice, payload.figures,
            payload.origin, folder, "", payload.left_on, payload.bench_seconds,
        )  # fmt: skip

    def _collect(self, wait: bool = False) -> None:
        """Hear what became of records that were made while the next unit was connected."""
        while self.late and (wait or self.late[0][2].done()):
            number, unit, future = self.late.pop(0)
            self._settled(number, unit, future.result())

    def _settled(self, number: int, unit: UnitRun, outcome: Outcome) -> None:
        unit.settle()
        self.outcomes[number] = outcome
        self.job.kept(outcome)


@contextlib.contextmanager
def _journal(job: Job) -> Iterator[Journal]:
    """The journal of a run: kept if the run could not finish, removed if its records stand."""
    journal = _open(job)
    try:
        _begin(job, journal)
        yield journal
    except (InputError, RecordNotWritten):  # no key, a full disk: nothing was measured
        journal.remove()
        raise
    except BaseException:
        journal.close()
        raise
    if journal.needed:
        journal.close()
    else:
        journal.remove()


def _open(job: Job) -> Journal:
    """Make the file: it shows now, and not after an hour of measuring, whether records can be kept."""
    try:
        if job.story is not None:
            return job.story.reopen(job.opener)
        job.records.mkdir(parents=True, exist_ok=True)
        sequence = safe_name(job.plan.sequence.model.sequence)[:36]
        name = f".{datetime.now(UTC):%Y%m%dT%H%M%SZ}-{sequence}-{os.urandom(4).hex()}{SUFFIX}"
        journal = Journal(job.records / name, job.opener)
        job.storage.sync(job.records)
    except OSError as error:
        raise refusal(job.records, error) from error
    return journal


def _begin(job: Job, journal: Journal) -> None:
    """Write down all that another process needs to take the run up."""
    plan, utc = job.plan, datetime.now(UTC).isoformat()
    if job.story is not None:
        journal.line("taken up", utc=utc, pid=os.getpid())
        return
    journal.line(
        "begun", edition=EDITION, utc=utc, pid=os.getpid(),
        sequence=str(plan.sequence.path.resolve()), bench=str(plan.bench.path.resolve()),
        name=plan.sequence.model.sequence, plan=plan.digest, inputs=len(plan.inputs),
        units=list(job.units), operator=job.operator_name, rehearsal=job.library is not None,
        seed=job.seed, orders=asdict(job.orders),
    )  # fmt: skip
    for logical, (path, raw) in plan.inputs.items():
        journal.line("input", raw, name=logical, path=path)
    if journal.failure is not None:
        cause = journal.failure.__cause__
        assert isinstance(cause, OSError)
        raise refusal(job.records, cause) from journal.failure
