"""One source at one place."""

from __future__ import annotations

from dataclasses import dataclass

from benchrun.evaluate.propagation.seen import Changes
from benchrun.uncertainty.distribution import Distribution

__all__ = ["Influence"]


@dataclass(frozen=True, slots=True, eq=False)
class Influence:
    """What one standard deviation of it changes.

    Parameters
    ----------
    group
        The source it belongs to in a budget.
    distribution
        Of its draws.
    changes
        For each plane touched one plane ``(f,)`` an axis.
    vector
        Whether it is a complex number, of two axes drawn together.
    """

    group: str
    distribution: Distribution
    changes: Changes
    vector: bool = False
