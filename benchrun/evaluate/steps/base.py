"""What a step kind contributes to the arithmetic."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Protocol, TypeVar

from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State
from benchrun.hookup import Hookup
from benchrun.sequence.steps import StepModel

__all__ = ["Arithmetic"]

S = TypeVar("S", bound=StepModel, contravariant=True)


class Arithmetic(Protocol[S]):
    """One step kind."""

    def hookups(self, step: S, procedure: Procedure) -> tuple[Hookup, ...]:
        """What must be connected, one reading each, in order; empty for pure arithmetic."""
        ...

    def apply(self, step: S, state: State, readings: Mapping[str, Raw]) -> None:
        """Put the step's result into the state.

        Parameters
        ----------
        step
            The model.
        state
            What earlier steps left.
        readings
            Raw readings by the text of their hook-up: planes ``(f,)``, or levels.

        Raises
        ------
        InvalidMeasurement
            If the readings cannot be trusted.
        """
        ...
