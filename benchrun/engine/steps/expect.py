"""Carrying out an expectation: arithmetic, and both limits told."""

from __future__ import annotations

from benchrun.engine.events import FigureJudged
from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.quantity import Dimension, render
from benchrun.sequence.steps import Expect

__all__ = ["ExpectExecution"]


class ExpectExecution:
    """Judge a result against its design."""

    def words(self, step: Expect, work: AtWork) -> str:
        """Which trace, where, how closely."""
        low, high = (render(f, Dimension.FREQUENCY) for f in step.over)
        closely = f"parts of {100 * step.design.tolerance:g} %, {step.within:g} dB more"
        return f"{step.trace} of {step.from_} against its design, {low} to {high}, {closely}"

    def carry_out(self, step: Expect, work: AtWork) -> None:
        """Arithmetic, then one event for each limit."""
        carry_out(step, work)
        for figure in work.state.judged[step.name]:
            work.emit(FigureJudged(figure=figure))
