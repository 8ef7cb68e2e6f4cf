"""Carrying out a de-embedding: arithmetic only."""

from __future__ import annotations

from benchrun.engine.events import Noted
from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.evaluate.steps.removing import quality_text
from benchrun.sequence.steps import DeEmbed

__all__ = ["DeEmbedExecution"]


class DeEmbedExecution:
    """Take the fixture out."""

    def words(self, step: DeEmbed, work: AtWork) -> str:
        """What is taken out."""
        return step.text

    def carry_out(self, step: DeEmbed, work: AtWork) -> None:
        """Arithmetic; how good a 2x-thru is, is told."""
        if step.two_thru is not None:
            data = work.procedure.fixtures[step.two_thru.file]
            work.emit(Noted(text=quality_text(data.two_port)))
        carry_out(step, work)
