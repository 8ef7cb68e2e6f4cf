"""Carrying out a calibration."""

from __future__ import annotations

from benchrun.engine.events import Noted
from benchrun.engine.kept import Reading
from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.engine.steps.doubting import Doubting
from benchrun.evaluate.chain import hookups
from benchrun.rf.calibration.switch_terms import SWITCH_READING
from benchrun.sequence.steps import Calibrate, StepModel

__all__ = ["CalibrateExecution"]


class CalibrateExecution:
    """Read the standards, solve."""

    def words(self, step: Calibrate, work: AtWork) -> str:
        """Method, kit and how much there is to connect."""
        count = len(hookups(step, work.procedure))
        return f"{step.method} with kit {step.kit}, {count} connections"

    def carry_out(self, step: Calibrate, work: AtWork) -> None:
        """As every step with readings, each doubted; with the thru also what the idle ports reflect."""
        if step.overrule is not None:
            work.emit(
                Noted(text=f"kit {step.kit} is past its date; overruled: {step.overrule}", weight="warning")
            )
        carry_out(
            step, work, self._idle_ports if step.how.without_switch_terms else None, Doubting(step, work)
        )

    def _idle_ports(self, step: StepModel, work: AtWork) -> None:
        assert isinstance(step, Calibrate)  # called for its own step
        assert work.analyzer is not None  # it has just swept
        terms = work.analyzer.switch_terms()
        if terms is None:
            work.emit(Noted(text=step.how.without_switch_terms, weight="warning"))
            return
        grid = work.procedure.sequence.sweep_of(step).grid()
        work.kept.add(Reading.of(step.name, SWITCH_READING, grid, terms, work.clock.seconds()))
        work.emit(Noted(text="read what the idle ports reflect"))
