"""From the names in a sequence to what they mean; a name that does not resolve never raises here."""

from __future__ import annotations

from benchrun.quantity import Dimension, render
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.files import Loaded
from benchrun.sequence.models import Sequence
from benchrun.sequence.steps import StepModel, Sweep

__all__ = ["grid_of", "ohm_of", "outside", "source_of", "span", "step_paths"]


def step_paths(loaded: Loaded[Sequence]) -> list[tuple[StepModel, tuple[object, ...]]]:
    """Give each step with its path in the file."""
    return [(step, ("steps", i, step.kind)) for i, step in enumerate(loaded.model.steps)]


def source_of(sequence: Sequence, name: str) -> StepModel | None:
    """Find the sweep step that a network comes from; only steps further up are followed: a circle ends."""
    wanted: str | None = name
    for step in reversed(sequence.steps):
        if step.name == wanted and step.leaves == "network":
            wanted = getattr(step, "from_", None)
            if wanted is None:
                return step
    return None


def grid_of(sequence: Sequence, name: str) -> FloatArray | None:
    """Find the grid of a network in Hz, ``(f,)``; None where names do not resolve."""
    step = source_of(sequence, name)
    try:
        return sequence.sweep_of(step).grid() if isinstance(step, Sweep) else None
    except KeyError:
        return None  # a name that does not resolve is reported elsewhere


def ohm_of(sequence: Sequence, name: str, z0_ohm: float) -> tuple[complex, complex]:
    """Find the reference impedance of each port of a network, ``z0_ohm`` being that of the calibration."""
    wanted: str | None = name
    for step in reversed(sequence.steps):
        if step.name == wanted and step.leaves == "network":
            changed = getattr(step, "renormalise", None)
            if changed is not None:
                return changed[0], changed[1]
            wanted = getattr(step, "from_", None)
    return complex(z0_ohm), complex(z0_ohm)


def outside(low: float, high: float, grid: FloatArray) -> bool:
    """Whether a band reaches beyond a grid, rounding aside."""
    return bool(low < grid[0] * (1 - 1e-12) or high > grid[-1] * (1 + 1e-12))


def span(low: float, high: float) -> str:
    """Write a band, or a single frequency, for people."""
    if low == high:
        return render(float(low), Dimension.FREQUENCY)
    return f"{render(float(low), Dimension.FREQUENCY)} to {render(float(high), Dimension.FREQUENCY)}"
