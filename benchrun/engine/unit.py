"""One unit's run: measure, make safe, keep; the one place that decides how a run ends."""

from __future__ import annotations

import functools
import time
import traceback
from dataclasses import dataclass, field
from pathlib import Path

from benchrun.engine.benchtop import Benchtop, Found
from benchrun.engine.drafting import Ending, draft_of
from benchrun.engine.emitter import Emitter
from benchrun.engine.events import (
    Cautioned,
    InstrumentFound,
    MadeSafe,
    Noted,
    RecordWritten,
    RunEnded,
    RunStarted,
    StepEnded,
    StepStarted,
)
from benchrun.engine.job import Job, Outcome, Turn
from benchrun.engine.journal import Journal, JournalFailed
from benchrun.engine.kept import Kept, Reading
from benchrun.engine.operators import Mistyped
from benchrun.engine.recall import Recall
from benchrun.engine.steps import EXECUTIONS, AtWork
from benchrun.engine.stopping import StopSignals
from benchrun.engine.story import PastUnit
from benchrun.errors import BenchError, InputError, InvalidMeasurement, RecordError, Stopped
from benchrun.evaluate.readings import suffix
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.record.payload import safe_name
from benchrun.record.signer import Signer
from benchrun.record.write import RecordRescued, write_or_rescue
from benchrun.scpi.transcript import Transcript
from benchrun.sequence.checks import check_serial
from benchrun.sequence.models import CAUTIONS
from benchrun.sequence.steps import Calibrate, StepModel
from benchrun.uncertainty.decision import Conclusion

__all__ = ["Shared", "UnitRun"]


@dataclass(slots=True)
class Shared:
    """What one calibration leaves for the units after the first: results, readings, their age and files."""

    state: State
    readings: dict[str, tuple[Reading, ...]] = field(default_factory=dict)
    taken_s: dict[str, float] = field(default_factory=dict)
    stored: dict[str, tuple[bytes, Path]] = field(default_factory=dict)
    signer: Signer | None = None


class UnitRun:
    """One unit's run.

    Parameters
    ----------
    job, turn, number
        What, on which unit, which in the series from 0 on.
    top, stop, journal
        The bench, the stop signals and the journal of the series.
    shared
        What units under one calibration share.
    past
        What an earlier process did of it.
    """

    def __init__(
        self,
        job: Job,
        turn: Turn,
        number: int,
        top: Benchtop,
        stop: StopSignals,
        journal: Journal,
        shared: Shared,
        past: PastUnit | None = None,
    ) -> None:
        self.job, self.top, self.shared, self.stop, self.journal = job, top, shared, stop, journal
        self.serial, self.retest, self.number = turn.serial, turn.retest, number
        self.emit = Emitter(job.sink, job.clock, journal)
        self.state = shared.state.next_unit()
        self.state.thorough = not shared.state.calibrations
        self.kept = Kept(safe=self._write_down)
        self.signer: Signer | None = None
        self.fault = self.outage = ""
        self._told = len(top.transcript.exchanges)
        self._pieces: list[bytes] = []
        self.repeated = len(top.repeats)
        self.past = Recall(self, past) if past is not None else None
        self.started = past.started if past is not None else job.clock.utc()
        self.ending = Ending(Conclusion.STOPPED)
        self.left_on: tuple[str, ...] = ()
        self.unreachable: tuple[str, ...] = ()
        self.repeats: tuple[str, ...] = ()
        self.wall_s = self.bench_s = 0.0
        self._written: RecordWritten | None = None

    # -- measuring, in the thread that started the run ---

    def measure(self) -> Outcome:
        """Measure and make safe; raises only for want of a key, before anything was measured."""
        began = time.perf_counter()
        if self.past is None:
            started = self.started.isoformat()
            self.journal.line("unit", serial=self.serial, retest=self.retest, started=started)
        with self.emit.muted(self.past is not None and self.past.recorded):
            self.ending = self._measure()
            self.left_on = (*self.top.make_safe(), *self.unreachable)
            if self.top.ours:
                self.emit(MadeSafe(left_on=self.left_on))
            self._say_end()
        self.wall_s = time.perf_counter() - began
        self.bench_s = self.emit.seconds()
        self.top.transcript.exchanges.clear()  # said and kept: a batch of thousands must not pile it up
        self.repeats = tuple(self.top.repeats[self.repeated :])
        return self.outcome()

    def _say_end(self) -> None:
        ending = self.ending
        conclusion, reason, advice = ending.conclusion.value, ending.reason, ending.advice
        self.emit(RunEnded(conclusion=conclusion, reason=reason, advice=advice, figures=self.state.figures))
        said = self._said_since()
        if not self.emit.silent:
            self.journal.line("concluded", said, conclusion=conclusion, reason=reason, advice=advice)

    def outcome(self, record: Path | None = None, trouble: str = "") -> Outcome:
        """As far as it is known."""
        return Outcome(
            unit=self.serial,
            conclusion=self.ending.conclusion,
            reason=self.ending.reason,
            advice=self.ending.advice,
            figures=self.state.figures,
            origin=self.origin,
            record=record,
            trouble=trouble or self.outage,
            left_on=self.left_on,
            bench_s=self.bench_s,
        )

    @property
    def origin(self) -> str:
        """From the instruments' own mouths; before any has spoken, what the run was started as."""
        if self.top.found:
            return self.top.origin
        return "simulated" if self.job.library is not None else "measured"

    def _measure(self) -> Ending:
        """Everything that may go wrong; comes back with how it ended."""
        try:
            with self.stop.armed():
                if self.past is not None and (ending := self.past.restore()) is not None:
                    return ending
                self._begin()
                self._steps()
                self.top.confirm()
            return Ending(self.state.conclusion)
        except Stopped as stopped:
            return Ending(Conclusion.STOPPED, stopped.reason)
        except InvalidMeasurement as error:
            return Ending(Conclusion.INVALID, error.reason, error.advice)
        except JournalFailed as error:
            advice = f"See to the disk, then: benchrun resume {self.job.records}"
            self.outage = f"{error}. Nothing that counts is lost: the journal keeps it. {advice}"
            return Ending(Conclusion.INVALID, "the run was interrupted by the disk", advice)
        except InputError as error:
            if self.signer is None and self.top.found:
                raise  # nothing was measured yet
            return Ending(Conclusion.INVALID, str(error), "Correct it, then run again.")
        except BenchError as error:
            return Ending(Conclusion.INVALID, str(error), "See to it, then run again.")
        except Exception as error:  # a fault of the program: the readings taken so far are kept all the same
            self.fault = traceback.format_exc()
            reason = f"a fault of the program: {type(error).__name__}: {error}"
            return Ending(
                Conclusion.INVALID, reason, "Report it with the record; fault.txt in it says where."
            )

    def _begin(self) -> None:
        plan = self.job.plan
        sequence, unit = plan.sequence.model, plan.sequence.model.unit
        self.emit(
            RunStarted(
                sequence=sequence.sequence,
                title=sequence.title,
                unit=self.serial,
                part=unit.part,
                bench=plan.bench.model.title,
                operator=self.job.operator_name,
                simulated=self.job.library is not None,
                seed=self.job.seed,
                steps=len(sequence.steps),
                plan=plan.digest,
            )
        )
        for text in (*sequence.caution_texts, *(CAUTIONS.get(c, c) for c in plan.bench.model.cautions)):
            self.emit(Cautioned(text=text))
        if self.retest:
            self.emit(Noted(text=f"tested again: {self.retest}", weight="warning"))
        if not self.top.ready:
            for resource, holder in self.top.held.dead.items():
                text = f"{resource}: {holder} ended without letting go; see: benchrun resume"
                self.emit(Noted(text=text, weight="warning"))
            self.top.open(self._tell, self.take_key)
        else:
            for found in self.top.found:
                self._tell(found)
            self.take_key()
        self.job.hands.offer(self.serial)

    def _tell(self, found: Found) -> None:
        if self.past is not None:
            self.past.check_identity(found)
        self.journal.line(
            "instrument", role=found.role, resource=found.resource, identity=found.identity.text
        )
        self.emit(InstrumentFound(role=found.role, resource=found.resource, identity=found.identity.text))

    def take_key(self) -> None:
        """Have a key for the record before anything is set."""
        self.signer = self.shared.signer = self.shared.signer or self.job.signer(self.origin)

    def _steps(self) -> None:
        plan, past = self.job.plan, self.past
        work = AtWork(
            procedure=plan.procedure,
            state=self.state,
            analyzer=self.top.analyzer,
            operator=_Hands(self),
            clock=self.job.clock,
            kept=self.kept,
            emit=self.emit,
            generator=self.top.generator,
            spectrum=self.top.spectrum,
            supply=self.top.supply,
        )
        for number, step in enumerate(plan.sequence.model.steps, 1):
            if past is not None and past.stands(number):
                past.again(number, step, functools.partial(self._step, number, step, work))
                continue
            if past is not None:
                past.goes_on()
            self._step(number, step, work)
        if past is not None:  # only the record was missing
            past.goes_on()

    def _step(self, number: int, step: StepModel, work: AtWork) -> None:
        execution, count = EXECUTIONS[step.kind], len(self.kept.readings)
        self.emit(
            StepStarted(number=number, kind=step.kind, step=step.name, what=execution.words(step, work))
        )
        if isinstance(step, Calibrate) and self._still_good(step):
            self.kept.extend(self.shared.readings[step.name])
            if not self.emit.silent:
                self.journal.line("served", number=number, step=step.name)
        else:
            if isinstance(step, Calibrate):
                self.state.thorough = True
            repeats = len(self.top.repeats)
            execution.carry_out(step, work)
            for text in self.top.repeats[repeats:]:
                self.emit(Noted(text=text, weight="warning"))
            if isinstance(step, Calibrate):
                self.share(step, self.job.clock.seconds())
        said = self._said_since()
        if not self.emit.silent:
            self.journal.line("finished", said, number=number)
            if len(self.kept.readings) > count:
                self.journal.sync()  # only now does it count
        self.emit(StepEnded(number=number, step=step.name))

    def _still_good(self, step: Calibrate) -> bool:
        """Whether a calibration of an earlier unit serves; an old one is made again."""
        if step.name not in self.shared.readings or step.name not in self.state.calibrations:
            return False
        age = self.job.clock.seconds() - self.shared.taken_s[step.name]
        if step.keep is not None and age > step.keep:
            return False
        self.state.agreements[step.name] = self.shared.state.agreements[step.name]
        self.emit(Noted(text=f"{step.name} serves on, {age / 60:.0f} min old"))
        return True

    def share(self, step: Calibrate, taken_s: float) -> None:
        """Leave a calibration for the units that follow."""
        self.shared.readings[step.name] = tuple(r for r in self.kept.readings if r.step == step.name)
        self.shared.taken_s[step.name] = taken_s
        self.shared.state.calibrations[step.name] = self.state.calibrations[step.name]
        self.shared.state.agreements[step.name] = self.state.agreements[step.name]

    def rename(self, serial: str) -> None:
        """The serial number was mistyped; nothing is judged yet, so it is corrected."""
        check_serial(serial, self.job.plan.sequence.model)
        self.job.hands.offer(serial)
        text = f"serial number {self.serial} was mistyped; it is {serial}"
        self.serial = serial
        self.journal.line("renamed", serial=serial)
        self.emit(Noted(text=text, weight="warning"))

    def _write_down(self, reading: Reading) -> None:
        if not self.emit.silent:
            self.journal.line(
                "reading",
                reading.contents,
                sha256=reading.sha256,
                step=reading.step,
                hookup=reading.hookup,
                suffix=suffix(reading.raw),
                taken_s=round(reading.taken_s - self.emit.start_s, 6),
            )

    def _said_since(self) -> bytes:
        """What was said on the lines since the last call."""
        exchanges = self.top.transcript.exchanges
        said = Transcript(exchanges[self._told :]).as_json_lines()
        self._told = len(exchanges)
        self._pieces.append(said)
        return said

    @property
    def transcript(self) -> bytes:
        """All that was said in this unit's run, in every process that had a part in it."""
        return b"".join((*(self.past.transcript if self.past else ()), *self._pieces))

    # -- keeping, in any thread ---

    def keep(self) -> Outcome:
        """Write the record; what went wrong with it is said, never raised."""
        if self.outage:  # the journal is all there is, and it is enough
            self.journal.needed = True
            return self.outcome()
        sequence = safe_name(self.job.plan.sequence.model.sequence)[:36]  # a name has at most 120 characters
        name = f"{self.started:%Y%m%dT%H%M%SZ}-{sequence}-{self.serial}"
        if self.past is not None and (folder := self.past.record_of(name)) is not None:
            return self.outcome(folder)
        try:
            signer = self.signer or self.job.signer(self.origin)
            draft = draft_of(self, self.ending, self.started, self.wall_s)
            folder = write_or_rescue(draft, self.job.records, name, signer, self.job.storage)
        except RecordRescued as error:
            text = f"{error.message} The record stands in {error.folder}: move it to its place."
            return self.outcome(error.folder, text)
        except (RecordError, InputError) as error:
            return self._only_journal(str(error))
        except Exception as error:  # a fault of the program here must not take the other units' results along
            said = f"{type(error).__name__}: {error}"
            return self._only_journal(f"the record was not written, by a fault of the program: {said}.")
        if not self.shared.stored:
            self.shared.stored.update({path: (raw, folder / path) for path, raw in draft.files.items()})
        self.journal.line("record", number=self.number, folder=str(folder))
        self._written = RecordWritten(folder=str(folder), key=signer.key_id)
        return self.outcome(folder)

    def _only_journal(self, trouble: str) -> Outcome:
        self.journal.needed = True
        what = "All readings are" if self.journal.failure is None else "What had been written down is"
        text = f"{trouble} {what} in the journal; when that is mended: benchrun resume"
        return self.outcome(None, f"{text} {self.job.records}")

    def settle(self) -> None:
        """Tell of the record, in the thread that started the run."""
        if self._written is not None:
            self.emit(self._written)
        # Only rings of references hold the readings now; without them they go at once, not some time.
        self.kept = Kept()
        self.past = None


class _Hands:
    """The operator, who may have mistyped the serial number."""

    def __init__(self, unit: UnitRun) -> None:
        self._unit = unit

    def check(self, hookups: tuple[Hookup, ...]) -> None:
        """As the operator."""
        self._unit.job.hands.check(hookups)

    def offer(self, serial: str) -> None:
        """As the operator."""
        self._unit.job.hands.offer(serial)

    def connect(self, hookup: Hookup) -> None:
        """As the operator; a slip is mended, and the request made again."""
        while True:
            try:
                self._unit.job.hands.connect(hookup)
            except Mistyped as slip:
                try:
                    self._unit.rename(slip.serial)
                except InputError as error:
                    self._unit.emit(Noted(text=str(error), weight="warning"))
            else:
                return
