"""Taking a unit's run up again: what its journal holds becomes results again, or is replayed.

At real instruments nothing is repeated that counts: finished steps come back from their readings. In a
rehearsal the world was lost with its process; it is made again from its seed, and the finished steps are
carried out once more in it, without being told or written down, only to bring it to where it stood. Their
readings must then be those of the journal, byte for byte.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from benchrun.engine.benchtop import Found
from benchrun.engine.drafting import Ending
from benchrun.engine.events import Noted
from benchrun.engine.story import PastUnit
from benchrun.errors import BenchError, InvalidMeasurement, RecordError
from benchrun.evaluate.chain import apply, hookups
from benchrun.record.payload import utc_text
from benchrun.record.verify import read
from benchrun.scpi.identity import Identity
from benchrun.sequence.steps import Calibrate, StepModel
from benchrun.uncertainty.decision import Conclusion

if TYPE_CHECKING:
    from benchrun.engine.unit import UnitRun

__all__ = ["Recall"]


class Recall:
    """The past of a unit's run.

    Parameters
    ----------
    unit
        The run that goes on.
    past
        What the journal holds of it.
    """

    def __init__(self, unit: UnitRun, past: PastUnit) -> None:
        self._unit, self._past = unit, past
        assert unit.job.story is not None  # a past comes from a story
        self._story = unit.job.story
        self._replayed = self._story.rehearsal and not self._story.closing
        self._steps = list(enumerate(unit.job.plan.sequence.model.steps, 1))
        self._told = False
        self.notes: list[str] = [] if self.recorded else [self._words()]
        unit.emit.recall(past.events)
        if not self._replayed:
            gone_s = (unit.job.clock.utc() - past.started).total_seconds()
            unit.emit.start_s = unit.job.clock.seconds() - max(gone_s, 0.0)

    @property
    def recorded(self) -> bool:
        """Whether its record stands already."""
        return bool(self._past.record)

    @property
    def transcript(self) -> tuple[bytes, ...]:
        """What was said on the lines in the earlier process, as far as it counts."""
        return () if self._replayed else tuple(self._past.transcript)

    def _words(self) -> str:
        stands = [number for number, _ in self._steps if number in self._past.finished]
        rest = [(number, step) for number, step in self._steps if number not in self._past.finished]
        said = f"steps {', '.join(map(str, stands))} stand" if stands else "no step had finished"
        if self._story.closing or self._past.ending is not None:
            return f"taken up after a break: {said}"
        if not rest:
            return f"taken up after a break: {said}, only the record was missing"
        number, step = rest[0]
        lost = len(self._past.of(number))
        if self._past.begun < number:
            return f"taken up after a break: {said}; it goes on with step {number}, {step.name}"
        again = f", with {lost} readings taken again" if lost else ""
        why = f"step {number}, {step.name}, had not finished and is repeated{again}"
        return f"taken up after a break: {said}; {why}"

    def restore(self) -> Ending | None:
        """Make results of the journal; gives the ending of a run that has nothing left to do.

        Raises
        ------
        InvalidMeasurement
            If a calibration is too old for what is still to be measured.
        """
        stopped = self._past.ending is not None and self._past.ending.conclusion is Conclusion.STOPPED
        if self._replayed and not stopped:
            return None
        for number, step in self._steps:
            if number in self._past.finished:
                self._bring_back(number, step)
        if self._story.closing or self._past.ending is not None:
            for number, _ in self._steps:
                if number not in self._past.finished:
                    self._unit.kept.extend(r.reading(self._unit.emit.start_s) for r in self._past.of(number))
            self.goes_on()
        if self._story.closing:
            self._close_bench()
            return Ending(Conclusion.INVALID, self._story.closing, "Run again from the start.")
        if self._past.ending is not None:
            self._recall_instruments()
            return self._past.ending
        self._check_age()
        return None

    def _bring_back(self, number: int, step: StepModel) -> None:
        unit = self._unit
        if number in self._past.served:
            unit.kept.extend(unit.shared.readings[step.name])
            unit.state.agreements[step.name] = unit.shared.state.agreements[step.name]
            return
        found = [r.reading(unit.emit.start_s) for r in self._past.of(number)]
        unit.kept.extend(found)
        if isinstance(step, Calibrate):
            unit.state.thorough = True
        apply(step, unit.state, unit.kept.of(step.name))
        if isinstance(step, Calibrate):
            unit.share(step, found[-1].taken_s if found else unit.emit.start_s)

    def bring_calibrations_back(self) -> None:
        """For the units that follow one whose record stands: what it was calibrated with."""
        for number, step in self._steps:
            made = number in self._past.finished and number not in self._past.served
            if made and isinstance(step, Calibrate):
                self._bring_back(number, step)

    def _check_age(self) -> None:
        """A calibration must not have grown too old while nobody measured."""
        unit = self._unit
        if not any(
            hookups(step, unit.job.plan.procedure)
            for number, step in self._steps
            if number not in self._past.finished
        ):
            return  # only arithmetic is left
        for number, step in self._steps:
            if number in self._past.finished and isinstance(step, Calibrate) and step.keep is not None:
                age = unit.job.clock.seconds() - unit.shared.taken_s[step.name]
                if age > step.keep:
                    raise InvalidMeasurement(
                        f"The calibration {step.name} is {age / 3600:.1f} h old, and may serve for "
                        f"{step.keep / 3600:.1f} h: what is still to be measured needs a new one.",
                        "Run again from the start.",
                    )

    def _close_bench(self) -> None:
        """Nobody made the bench safe when the run broke off: do it now, as far as it answers."""
        top = self._unit.top
        if self._story.rehearsal:
            self._recall_instruments()
            return
        try:
            top.open()
        except BenchError as error:
            self._recall_instruments()
            text = f"the bench does not answer ({error}): see by hand that every source and supply is off"
            self._unit.unreachable = (text,)

    def _recall_instruments(self) -> None:
        top = self._unit.top
        if not top.found:
            top.found = tuple(
                Found(role, resource, Identity.parse(identity, resource))
                for role, (resource, identity) in self._story.instruments.items()
            )

    def check_identity(self, found: Found) -> None:
        """The bench must be the one on which the run began.

        Raises
        ------
        InvalidMeasurement
            If another instrument stands there.
        """
        _, before = self._story.instruments.get(found.role, ("", found.identity.text))
        if before != found.identity.text:
            raise InvalidMeasurement(
                f"{found.resource} was {before!r} when the run began and is {found.identity.text!r} now.",
                "Run again from the start.",
            )

    def stands(self, number: int) -> bool:
        """Whether a step counts already."""
        return number in self._past.finished

    def again(self, number: int, step: StepModel, carry_out: Callable[[], None]) -> None:
        """Bring a simulated world to where it stood after a finished step; real readings are there already.

        Raises
        ------
        InvalidMeasurement
            If the world does not come out where it was.
        """
        unit, wanted = self._unit, [r.sha256 for r in self._past.of(number)]
        if self._replayed:
            count = len(unit.kept.readings)
            with unit.emit.muted():
                carry_out()
            found = [r.sha256 for r in unit.kept.readings[count:]]
            if number not in self._past.served and found != wanted:
                raise InvalidMeasurement(
                    f"Step {number}, {step.name}, gave other readings when it was replayed than the journal "
                    "holds: the simulation has changed since.",
                    "Rehearse again from the start.",
                )
        if wanted:
            how = "replayed byte for byte" if self._replayed else "from the journal"
            unit.emit(Noted(text=f"step {number}, {step.name}, stands: {len(wanted)} readings, {how}"))

    def goes_on(self) -> None:
        """Say once from where."""
        if not self._told and self.notes:
            self._told = True
            self._unit.emit(Noted(text=self.notes[0], weight="warning"))

    def record_of(self, name: str) -> Path | None:
        """The record, if the break came between its last word and the journal's."""
        unit = self._unit
        for folder in sorted(unit.job.records.glob(f"{name}*")):
            try:
                payload = read(folder).payload
            except RecordError:
                continue
            same = payload.plan == unit.job.plan.digest and payload.unit.serial == unit.serial
            if same and payload.started_utc == utc_text(self._past.started):
                return folder
        return None
