"""Carrying out a de-embedding: arithmetic only."""

from __future__ import annotations

from benchrun.engine.steps.base import AtWork, carry_out
from benchrun.sequence.steps import DeEmbed

__all__ = ["DeEmbedExecution"]


class DeEmbedExecution:
    """Take the fixture out."""

    def words(self, step: DeEmbed, work: AtWork) -> str:
        """Which halves."""
        halves = [name for name in (step.left, step.right) if name]
        return f"{' and '.join(halves)} out of {step.from_}"

    def carry_out(self, step: DeEmbed, work: AtWork) -> None:
        """Arithmetic."""
        carry_out(step, work)
