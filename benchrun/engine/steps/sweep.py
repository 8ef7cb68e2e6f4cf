"""Carrying out a sweep of the unit."""

from __future__ import annotations

from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.quantity import Dimension, render
from benchrun.sequence.steps import Sweep

__all__ = ["SweepExecution"]


class SweepExecution:
    """Read the unit, correct."""

    def words(self, step: Sweep, work: AtWork) -> str:
        """Span and points."""
        grid = work.procedure.sequence.sweep_of(step).grid()
        low, high = (render(float(x), Dimension.FREQUENCY) for x in (grid[0], grid[-1]))
        how = f"corrected with {step.with_}" if step.with_ else "uncorrected"
        return f"{low} to {high}, {len(grid)} points, {how}"

    def carry_out(self, step: Sweep, work: AtWork) -> None:
        """As every step with readings."""
        carry_out(step, work)
