"""A run: one sequence on one or more units under one calibration, each leaving its record."""

from __future__ import annotations

import tempfile
import time
import traceback
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Any

from benchrun.clock import Clock
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
    Sink,
    StepEnded,
    StepStarted,
)
from benchrun.engine.kept import Kept, Reading
from benchrun.engine.operators import Operator
from benchrun.engine.plan import Plan
from benchrun.engine.steps import EXECUTIONS, AtWork
from benchrun.engine.stopping import StopSignals
from benchrun.errors import BenchError, InputError, InvalidMeasurement, RecordError, Stopped
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.evaluate.state import State
from benchrun.record.payload import safe_name
from benchrun.record.signer import Signer
from benchrun.record.storage import DISK, Storage
from benchrun.record.write import RecordRescued, refusal, write_or_rescue
from benchrun.sequence.checks import check_serial
from benchrun.sequence.models import CAUTIONS
from benchrun.sequence.steps import Calibrate
from benchrun.uncertainty.decision import Conclusion

__all__ = ["Job", "Outcome", "run"]


@dataclass(frozen=True, slots=True)
class Job:
    """What is to be run, where, and who takes part.

    Parameters
    ----------
    plan
        The plan.
    units
        Serial numbers, tested one after the other.
    operator_name
        Goes into the record.
    hands
        Who connects things.
    clock
        Bench time.
    records
        Folder of records.
    signer
        Gives the key for ``"measured"``, ``"simulated"`` or ``"recorded"`` readings; raises
        :class:`InputError` if there is none.
    sink
        Who is told what happens.
    library
        A VISA library instead of the bench file's; the rehearsal's.
    seed
        Of the simulated bench.
    storage
        Where records are written.
    """

    plan: Plan
    units: tuple[str, ...]
    operator_name: str
    hands: Operator
    clock: Clock
    records: Path
    signer: Callable[[str], Signer]
    sink: Sink
    library: Any = None
    seed: int | None = None
    storage: Storage = DISK


@dataclass(frozen=True, slots=True)
class Outcome:
    """What one unit's run came to.

    Parameters
    ----------
    unit
        Serial number.
    conclusion, reason, advice
        The worst of all figures, or why there is none.
    figures
        All judged limits.
    origin
        ``"measured"``, ``"simulated"`` or ``"recorded"``.
    record
        The record's folder; None if there is none.
    trouble
        Why there is no record where it should be.
    left_on
        Sources that could not be switched off.
    """

    unit: str
    conclusion: Conclusion
    reason: str = ""
    advice: str = ""
    figures: tuple[JudgedFigure, ...] = ()
    origin: str = "measured"
    record: Path | None = None
    trouble: str = ""
    left_on: tuple[str, ...] = ()

    @property
    def exit_code(self) -> int:
        """5 if the record is not where it should be, else that of the conclusion."""
        return 5 if self.trouble else self.conclusion.exit_code


@dataclass(slots=True)
class _Shared:
    """What one calibration leaves for the units after the first: results, readings, their age and files."""

    state: State
    readings: dict[str, tuple[Reading, ...]] = field(default_factory=dict)
    taken_s: dict[str, float] = field(default_factory=dict)
    stored: dict[str, tuple[bytes, Path]] = field(default_factory=dict)
    signer: Signer | None = None


def run(job: Job) -> tuple[Outcome, ...]:
    """Run the plan on every unit.

    Once the bench is opened every unit's run ends in a record, whatever happens; every source is off
    before this returns or raises.

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
    RecordNotWritten
        If the records folder cannot be written; nothing was measured.
    """
    for serial in job.units:
        check_serial(serial, job.plan.sequence.model)
        job.hands.offer(serial)
    job.hands.check(job.plan.hookups)
    _prepare(job.records)
    outcomes: list[Outcome] = []
    shared = _Shared(State(job.plan.procedure))
    plan = job.plan
    top = Benchtop(plan.bench.model, plan.dialect, job.library, job.clock, plan.others)
    with StopSignals() as stop, top:
        for serial in job.units:
            outcomes.append(_UnitRun(job, serial, top, shared, stop).go())
            if stop.asked or not top.ready or outcomes[-1].conclusion is Conclusion.STOPPED:
                break
    return tuple(outcomes)


def _prepare(records: Path) -> None:
    """Find out now, not after an hour of measuring, that records cannot be kept."""
    try:
        records.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryDirectory(prefix=".probe-", dir=records):
            pass
    except OSError as error:
        raise refusal(records, error) from error


class _UnitRun:
    """One unit's run."""

    def __init__(self, job: Job, serial: str, top: Benchtop, shared: _Shared, stop: StopSignals) -> None:
        self.job, self.serial, self.top, self.shared, self.stop = job, serial, top, shared, stop
        self.emit = Emitter(job.sink, job.clock)
        self.state = shared.state.next_unit()
        self.state.thorough = not shared.state.calibrations
        self.kept = Kept()
        self.signer: Signer | None = None
        self.fault = ""
        self.said = len(top.transcript.exchanges)

    def go(self) -> Outcome:
        """Measure, make safe, keep."""
        started, began = self.job.clock.utc(), time.perf_counter()
        ending = self._measure()
        left_on = self.top.make_safe()
        if self.top.ours:
            self.emit(MadeSafe(left_on=left_on))
        figures = self.state.figures
        self.emit(
            RunEnded(
                conclusion=ending.conclusion.value,
                reason=ending.reason,
                advice=ending.advice,
                figures=figures,
            )
        )
        wall_s = time.perf_counter() - began
        record, trouble = self._keep(ending, started, wall_s)
        return Outcome(
            unit=self.serial,
            conclusion=ending.conclusion,
            reason=ending.reason,
            advice=ending.advice,
            figures=figures,
            origin=self._origin,
            record=record,
            trouble=trouble,
            left_on=left_on,
        )

    @property
    def _origin(self) -> str:
        """From the instruments' own mouths; before any has spoken, what the run was started as."""
        if self.top.found:
            return self.top.origin
        return "simulated" if self.job.library is not None else "measured"

    def _measure(self) -> Ending:
        """Everything that may go wrong; comes back with how it ended, and raises only for want of a key."""
        try:
            with self.stop.armed():
                self._begin()
                self._steps()
                self.top.confirm()
            return Ending(self.state.conclusion)
        except Stopped as stopped:
            return Ending(Conclusion.STOPPED, stopped.reason)
        except InvalidMeasurement as error:
            return Ending(Conclusion.INVALID, error.reason, error.advice)
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
        if not self.top.ready:
            self.top.open(self._tell, self._take_key)
        else:
            for found in self.top.found:
                self._tell(found)
            self._take_key()
        self.job.hands.offer(self.serial)

    def _tell(self, found: Found) -> None:
        self.emit(InstrumentFound(role=found.role, resource=found.resource, identity=found.identity.text))

    def _take_key(self) -> None:
        self.signer = self.shared.signer = self.shared.signer or self.job.signer(self._origin)

    def _steps(self) -> None:
        plan = self.job.plan
        work = AtWork(
            procedure=plan.procedure,
            state=self.state,
            analyzer=self.top.analyzer,
            operator=self.job.hands,
            clock=self.job.clock,
            kept=self.kept,
            emit=self.emit,
            generator=self.top.generator,
            spectrum=self.top.spectrum,
        )
        for number, step in enumerate(plan.sequence.model.steps, 1):
            execution = EXECUTIONS[step.kind]
            self.emit(
                StepStarted(number=number, kind=step.kind, step=step.name, what=execution.words(step, work))
            )
            if isinstance(step, Calibrate) and self._still_good(step):
                self.kept.extend(self.shared.readings[step.name])
            else:
                if isinstance(step, Calibrate):
                    self.state.thorough = True
                execution.carry_out(step, work)
                if isinstance(step, Calibrate):
                    self._share(step)
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

    def _share(self, step: Calibrate) -> None:
        self.shared.readings[step.name] = tuple(r for r in self.kept.readings if r.step == step.name)
        self.shared.taken_s[step.name] = self.job.clock.seconds()
        self.shared.state.calibrations[step.name] = self.state.calibrations[step.name]
        self.shared.state.agreements[step.name] = self.state.agreements[step.name]

    def _keep(self, ending: Ending, started: datetime, wall_s: float) -> tuple[Path | None, str]:
        """Write the record; what went wrong with it is said, never raised."""
        sequence = safe_name(self.job.plan.sequence.model.sequence)[:36]  # a name has at most 120 characters
        name = f"{started:%Y%m%dT%H%M%SZ}-{sequence}-{self.serial}"
        try:
            signer = self.signer or self.job.signer(self._origin)
            draft = draft_of(self, ending, started, wall_s)
            folder = write_or_rescue(draft, self.job.records, name, signer, self.job.storage)
        except RecordRescued as error:
            return error.folder, f"{error.message} The record stands in {error.folder}: move it to its place."
        except (RecordError, InputError) as error:
            return None, str(error)
        except Exception as error:  # a fault of the program here must not take the other units' results along
            return (
                None,
                f"the record was not written, by a fault of the program: {type(error).__name__}: {error}",
            )
        if not self.shared.stored:
            self.shared.stored.update({path: (raw, folder / path) for path, raw in draft.files.items()})
        self.emit(RecordWritten(folder=str(folder), key=signer.key_id))
        return folder, ""
