"""Carrying out a calibration."""

from __future__ import annotations

from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.evaluate.chain import hookups
from benchrun.sequence.steps import Calibrate

__all__ = ["CalibrateExecution"]


class CalibrateExecution:
    """Read the standards, solve."""

    def words(self, step: Calibrate, work: AtWork) -> str:
        """Method, kit and how much there is to connect."""
        count = len(hookups(step, work.procedure))
        return f"{step.method} with kit {step.kit}, {count} connections"

    def carry_out(self, step: Calibrate, work: AtWork) -> None:
        """As every step with readings."""
        carry_out(step, work)
