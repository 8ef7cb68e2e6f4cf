"""What a batch came to in numbers: how many, which share passed, the worst margins, what drifts."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

from benchrun.engine.job import Outcome

__all__ = ["Drift", "Tally", "Worst", "tally"]

_SURE = 3.0
"""A slope counts from three of its standard deviations on (common practice), and from five units on."""
_FEWEST = 5


@dataclass(frozen=True, slots=True)
class Worst:
    """Least margin of one limit.

    Parameters
    ----------
    name, unit
        The limit, and the unit of its margin.
    margin, serial
        The least, and which unit's.
    """

    name: str
    unit: str
    margin: float
    serial: str


@dataclass(frozen=True, slots=True)
class Drift:
    """A figure that moves from unit to unit.

    Parameters
    ----------
    name, unit
        The figure.
    change
        From the first to the last unit by a straight line through all.
    sigmas
        The slope over its standard deviation.
    """

    name: str
    unit: str
    change: float
    sigmas: float


@dataclass(frozen=True, slots=True)
class Tally:
    """A batch.

    Parameters
    ----------
    units
        How many units, each counted by its last test.
    tests
        How many tests, those that were repeated too.
    conclusions
        How many units came to what.
    worst, drifts
        Least margin of every limit, in the order of the sequence; figures that move.
    """

    units: int
    tests: int
    conclusions: dict[str, int]
    worst: tuple[Worst, ...]
    drifts: tuple[Drift, ...]

    @property
    def share(self) -> float:
        """Share of units that conform, of those about which something was concluded; nan without any."""
        judged = sum(n for what, n in self.conclusions.items() if what not in ("invalid", "stopped"))
        good = sum(self.conclusions.get(what, 0) for what in ("pass", "conditional pass"))
        return good / judged if judged else math.nan


def tally(outcomes: Sequence[Outcome]) -> Tally:
    """Count a batch.

    Parameters
    ----------
    outcomes
        In the order of testing; the last test of a unit is the one that counts.
    """
    last = {outcome.unit: outcome for outcome in outcomes}
    counted = Counter(outcome.conclusion.value for outcome in last.values())
    values: dict[tuple[str, str], list[float]] = {}
    least: dict[str, Worst] = {}
    for outcome in last.values():
        if outcome.conclusion.value in ("invalid", "stopped"):
            continue
        for figure in outcome.figures:
            if figure.value is None or figure.margin is None:  # there is none, for example no corner
                continue
            values.setdefault((figure.name, figure.unit), []).append(figure.value)
            if figure.name not in least or figure.margin < least[figure.name].margin:
                least[figure.name] = Worst(figure.name, figure.unit, figure.margin, outcome.unit)
    drifts = (_drift(name, unit, found) for (name, unit), found in values.items())
    return Tally(
        len(last), len(outcomes), dict(counted), tuple(least.values()), tuple(d for d in drifts if d)
    )


def _drift(name: str, unit: str, values: Sequence[float]) -> Drift | None:
    """A straight line by least squares over the number of the unit, and how sure its slope is."""
    n = len(values)
    if n < _FEWEST or not all(math.isfinite(value) for value in values):
        return None
    mean_x, mean = (n - 1) / 2, math.fsum(values) / n
    spread = n * (n * n - 1) / 12
    slope = math.fsum((x - mean_x) * (value - mean) for x, value in enumerate(values)) / spread
    rest = math.fsum((value - mean - slope * (x - mean_x)) ** 2 for x, value in enumerate(values))
    deviation = math.sqrt(rest / (n - 2) / spread)
    sigmas = abs(slope) / deviation if deviation else math.inf if slope else 0.0
    return Drift(name, unit, slope * (n - 1), sigmas) if sigmas >= _SURE else None
