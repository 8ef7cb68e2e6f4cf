"""Carrying out a judgement: arithmetic, and each figure told."""

from __future__ import annotations

from benchrun.engine.events import FigureJudged
from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.sequence.steps import Judge

__all__ = ["JudgeExecution"]


class JudgeExecution:
    """Judge every limit."""

    def words(self, step: Judge, work: AtWork) -> str:
        """How many figures and masks (each may hold several limits), by which rule."""
        count = len(step.limits)
        what = "figure or mask" if count == 1 else "figures and masks"
        return f"{count} {what} of {step.from_}, {step.rule.text}"

    def carry_out(self, step: Judge, work: AtWork) -> None:
        """Arithmetic, then one event for each figure."""
        carry_out(step, work)
        for figure in work.state.judged[step.name]:
            work.emit(FigureJudged(figure=figure))
