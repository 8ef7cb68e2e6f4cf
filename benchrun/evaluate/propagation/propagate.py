"""From declared sources to the uncertainty of every judged figure: Monte Carlo, first order, budget."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from benchrun.evaluate.propagation.influences import influences
from benchrun.evaluate.propagation.kernel import Kernel
from benchrun.evaluate.propagation.quantities import Quantity, points_of
from benchrun.evaluate.propagation.trail import POINTWISE, Trail
from benchrun.evaluate.propagation.trials import Moments, Trials
from benchrun.rf.twoport import FloatArray, TwoPort
from benchrun.uncertainty.montecarlo import (
    ADAPTIVE,
    LEAST_TRIALS,
    Comparison,
    Effort,
    Spread,
    adaptive,
    compare,
    summarise,
)
from benchrun.uncertainty.sources import Sources

__all__ = ["FigureSpread", "Propagated", "propagate"]

_NOISE_TRIALS = 300
"""Draws of noise alone in a budget: its share is then known to one part in twelve (``sqrt(2 / n)``)."""
_DOUBLING = 1.0 / (math.sqrt(2.0) - 1.0)
"""Noise lifts the extreme of a flat trace in proportion to its size: by c, and twice as much variance by
``sqrt(2) c``. The trials show the difference."""


@dataclass(frozen=True, slots=True, eq=False)
class FigureSpread:
    """What is known of one figure.

    Parameters
    ----------
    name, side, value
        Of the figure, in its SI unit.
    spread
        Of the trials; None where fewer than two of them have the figure.
    draws
        The trials themselves, ``(M,)``.
    first_order
        Standard uncertainty by first-order propagation (GUM:1995, 5.1.3, numerically).
    comparison
        Of both (JCGM 101, clause 8).
    budget
        Share of each source in the first-order variance, found by moving one influence at a time.
    noise_bias
        What the same noise once more adds to the value on average: an extreme of a noisy trace lies too far
        out. In the unit of the value.
    """

    name: str
    side: str
    value: float
    spread: Spread | None
    draws: FloatArray
    first_order: float
    comparison: Comparison | None
    budget: Mapping[str, float]
    noise_bias: float = 0.0

    def departure(self, sense: int = 0) -> float:
        """Root mean square departure of the trials from the reported value: its standard uncertainty.

        The reported value is not corrected for what the trials are off on average, so that is part of it
        (GUM:1995, F.2.4.5, from memory). What noise adds to an extreme is larger in the value than more of
        the same noise adds again: for a flat trace by ``1 / (sqrt(2) - 1)``, which is taken throughout.

        Parameters
        ----------
        sense
            0: in the unit of the value. Else relative to the magnitude of which it is ``sense 20 log10``.

        Returns
        -------
        float
            Infinite where more than one trial in forty has no such figure.
        """
        lost = 1.0 if self.spread is None else self.spread.lost
        if lost > 0.025:
            return math.inf
        off = self.draws[np.isfinite(self.draws)] - self.value
        bias = self.noise_bias
        if sense:
            off, bias = 10.0 ** (sense * off / 20.0) - 1.0, 10.0 ** (sense * bias / 20.0) - 1.0
        mean = float(off.mean()) + (_DOUBLING - 1.0) * bias
        return math.hypot(float(off.std(ddof=1)), mean)

    @property
    def noisy(self) -> bool:
        """Whether noise decides an extreme: its bias is more than half of the standard uncertainty."""
        spread = self.spread.standard if self.spread else math.inf
        return _DOUBLING * abs(self.noise_bias) > 0.5 * spread


@dataclass(frozen=True, slots=True, eq=False)
class Propagated:
    """The result of one propagation.

    Parameters
    ----------
    f_hz
        Points that were followed, ``(f,)``.
    figures
        In the order asked.
    moments
        Sums over the trials: covariances of every plane.
    trials, blocks, settled, seed
        What stands behind it.
    """

    f_hz: FloatArray
    figures: tuple[FigureSpread, ...]
    moments: Moments
    trials: int
    blocks: int
    settled: bool
    seed: int


def propagate(
    trail: Trail,
    sources: Sources,
    quantities: Sequence[Quantity],
    effort: Effort = ADAPTIVE,
    seed: int = 0,
    everywhere: bool = False,
) -> Propagated:
    """Propagate.

    Parameters
    ----------
    trail
        What was done.
    sources
        What is declared.
    quantities
        Figures, their points slices of the trail's grid.
    effort
        How many trials.
    seed
        Of all draws; the same seed gives the same numbers, on however many processors.
    everywhere
        Follow every point of the sweep, not only those that are judged.
    """
    slices = [q.points for q in quantities]
    points = points_of(slices, len(trail.f_hz))
    if everywhere or trail.basis.method.name not in POINTWISE or len(points) == 0:
        points = np.arange(len(trail.f_hz))
    fewer = trail.at(points)

    def moved(one: slice) -> slice:
        first, last = np.searchsorted(points, [one.start, one.stop])
        return slice(int(first), int(last))

    chosen = [replace(q, points=moved(q.points)) for q in quantities]
    kernel = Kernel(fewer, influences(fewer, sources))
    still = kernel.run(np.zeros((1, kernel.axes)), None)
    nominal = still.map(lambda p: p[0]) if isinstance(still, TwoPort) else still[0]
    trials = Trials(kernel, nominal, chosen, seed)

    total = Moments(0, {}, {})

    def block(number: int) -> FloatArray:
        values, moments = trials.block(number, effort.trials or LEAST_TRIALS)
        total.add(moments)
        return values

    most = 1 if effort.trials else effort.most_blocks
    done = adaptive(block, effort.digits, most)
    noise = trials.noise_alone(_NOISE_TRIALS) if kernel.noisy else np.zeros((0, len(chosen)))
    standard, budgets = _first_order(trials, noise)
    figures = tuple(
        _figure(q, done.values[:, n], noise[:, n], standard[n], budgets[n], effort.digits)
        for n, q in enumerate(chosen)
    )
    return Propagated(fewer.f_hz, figures, total, len(done.values), done.blocks, done.settled, seed)


def _figure(
    quantity: Quantity,
    draws: FloatArray,
    noise: FloatArray,
    first: float,
    budget: Mapping[str, float],
    digits: int,
) -> FigureSpread:
    spread = comparison = None
    if np.isfinite(draws).sum() >= 2:
        spread = summarise(draws)
        if math.isfinite(first) and first > 0:
            comparison = compare(quantity.value, first, spread, digits)
    bias = float(noise.mean()) - quantity.value if len(noise) else 0.0
    return FigureSpread(
        quantity.name, quantity.side, quantity.value, spread, draws, first, comparison, budget, bias
    )


def _first_order(trials: Trials, noise: FloatArray) -> tuple[list[float], list[dict[str, float]]]:
    """Standard uncertainty of each figure, and the share of each source in its variance.

    Each influence is moved by one standard uncertainty either way; half the difference, squared, is its part.
    """
    kernel = trials.kernel
    steps = np.eye(kernel.axes)
    variances: list[dict[str, float]] = [{} for _ in trials.quantities]
    parts = [np.zeros((0, len(trials.quantities)))] * 2
    for way, sign in enumerate((1.0, -1.0)):
        pieces = [
            trials.values(kernel.run(sign * steps[first : first + trials.chunk], None))
            for first in range(0, kernel.axes, trials.chunk)
        ]
        if pieces:
            parts[way] = np.concatenate(pieces)
    half = (parts[0] - parts[1]) / 2.0
    for group, row in zip(kernel.groups, half, strict=True):
        for n, change in enumerate(row):
            variances[n][group] = variances[n].get(group, 0.0) + float(change) ** 2
    if len(noise):
        for n, variance in enumerate(noise.var(axis=0, ddof=1)):
            variances[n]["noise"] = float(variance)
    sums = [sum(one.values()) for one in variances]
    shares = [
        dict(sorted(((g, v / s) for g, v in one.items()), key=lambda gv: -gv[1])) if s > 0 else {}
        for one, s in zip(variances, sums, strict=True)
    ]
    return [math.sqrt(s) for s in sums], shares
