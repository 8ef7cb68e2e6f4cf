"""From readings to a conclusion: every step of a sequence in order."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State
from benchrun.evaluate.steps import ARITHMETIC
from benchrun.hookup import Hookup
from benchrun.sequence.steps import StepModel

__all__ = ["apply", "evaluate", "hookups"]


def hookups(step: StepModel, procedure: Procedure) -> tuple[Hookup, ...]:
    """What a step needs connected, one reading each."""
    return ARITHMETIC[step.kind].hookups(step, procedure)


def apply(step: StepModel, state: State, readings: Mapping[str, Raw]) -> None:
    """Carry out one step's arithmetic.

    Raises
    ------
    InvalidMeasurement
        If its readings cannot be trusted.
    """
    ARITHMETIC[step.kind].apply(step, state, readings)


def evaluate(procedure: Procedure, readings: Mapping[str, Mapping[str, Raw]]) -> State:
    """All steps on kept readings, as an audit does it.

    Parameters
    ----------
    procedure
        Sequence and files.
    readings
        Raw readings by step name and hook-up text.

    Returns
    -------
    State
        With every network, judged figure and agreement.

    Raises
    ------
    InvalidMeasurement
        As the run would have raised it.
    KeyError
        If a reading is missing.
    """
    state = State(procedure)
    for step in procedure.sequence.steps:
        apply(step, state, readings.get(step.name, {}))
    return state
