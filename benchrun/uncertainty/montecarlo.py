"""The Monte Carlo method of JCGM 101:2008: intervals, numerical tolerance, adaptive trials, comparison.

Clause numbers are those of the published guide; their wording is from memory, the steps of 7.7.2 and 7.9.4 as
an open implementation restates them.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import FloatArray

__all__ = [
    "ADAPTIVE", "LEAST_TRIALS", "PROBABILITY", "Adaptive", "Comparison", "Effort", "Spread", "adaptive",
    "compare", "shortest", "summarise", "symmetric", "tolerance",
]  # fmt: skip

PROBABILITY = 0.95
LEAST_TRIALS = 10_000
"""Of one block, 7.9.4 b."""


@dataclass(frozen=True, slots=True)
class Spread:
    """What the trials of one quantity come to.

    Parameters
    ----------
    mean, standard
        Estimate and standard uncertainty (7.6), in the unit of the quantity.
    symmetric, shortest
        Coverage intervals for ``probability`` (7.7), low and high end.
    trials
        How many stand behind it.
    probability
        Of the intervals.
    lost
        Share of trials in which the quantity could not be told at all.
    """

    mean: float
    standard: float
    symmetric: tuple[float, float]
    shortest: tuple[float, float]
    trials: int
    probability: float = PROBABILITY
    lost: float = 0.0


def _length(trials: int, probability: float) -> int:
    """Of 7.7.2 the q: trials that an interval spans."""
    product = probability * trials
    return int(product) if product == int(product) else int(product + 0.5)


def symmetric(ordered: FloatArray, probability: float = PROBABILITY) -> tuple[float, float]:
    """Probabilistically symmetric coverage interval (7.7.2).

    Parameters
    ----------
    ordered
        Sorted values, ``(M,)``.
    probability
        Of coverage.

    Examples
    --------
    >>> symmetric(np.arange(1.0, 1001.0))
    (25.0, 975.0)
    """
    trials = len(ordered)
    q = _length(trials, probability)
    low = (trials - q) // 2 if (trials - q) % 2 == 0 else (trials - q + 1) // 2
    low = max(low, 1)
    return float(ordered[low - 1]), float(ordered[min(low + q, trials) - 1])


def shortest(ordered: FloatArray, probability: float = PROBABILITY) -> tuple[float, float]:
    """Shortest coverage interval (7.7.2, note 5.3.4): of all spans of q trials the least wide.

    Parameters
    ----------
    ordered
        Sorted values, ``(M,)``.
    probability
        Of coverage.
    """
    q = _length(len(ordered), probability)
    if q >= len(ordered):
        return float(ordered[0]), float(ordered[-1])
    start = int(np.argmin(ordered[q:] - ordered[:-q]))
    return float(ordered[start]), float(ordered[start + q])


def summarise(values: FloatArray, probability: float = PROBABILITY) -> Spread:
    """Estimate, standard uncertainty and intervals of one quantity.

    Parameters
    ----------
    values
        ``(M,)``; nan where a trial has none. Such trials are left out, and counted.
    probability
        Of coverage.

    Raises
    ------
    ValueError
        With fewer than two values.
    """
    kept = np.sort(values[np.isfinite(values)])
    if len(kept) < 2:
        raise ValueError(f"{len(kept)} of {len(values)} trials have a value; at least 2 are needed")
    return Spread(
        mean=float(kept.mean()),
        standard=float(kept.std(ddof=1)),
        symmetric=symmetric(kept, probability),
        shortest=shortest(kept, probability),
        trials=len(values),
        probability=probability,
        lost=1.0 - len(kept) / len(values),
    )


def tolerance(standard: float, digits: int) -> float:
    """Numerical tolerance of a standard uncertainty (7.9.2).

    ``u = c 10^l`` with ``c`` an integer of ``digits`` digits; the tolerance is half of ``10^l``.

    Examples
    --------
    >>> tolerance(0.00035, 1), round(tolerance(0.35, 2), 6)
    (5e-05, 0.005)
    """
    if not standard > 0:
        return 0.0
    mantissa = float(f"{standard:.{digits - 1}e}")  # rounding may carry into the next decade
    return 0.5 * 10.0 ** (math.floor(math.log10(mantissa) + 1e-12) - digits + 1)


@dataclass(frozen=True, slots=True)
class Effort:
    """How many trials.

    Parameters
    ----------
    trials
        A fixed number; 0 for as many blocks as the digits need (JCGM 101, 7.9).
    digits
        Significant digits of the standard uncertainty that must be stable.
    most_blocks
        Of 10 000 trials each.
    """

    trials: int = 0
    digits: int = 1
    most_blocks: int = 10


ADAPTIVE = Effort()
"""What holds where nothing is said."""


@dataclass(frozen=True, slots=True, eq=False)
class Adaptive:
    """Trials of an adaptive run.

    Parameters
    ----------
    values
        ``(M, n)``: every trial of every quantity.
    blocks
        How many blocks were needed.
    settled
        Whether the numerical tolerance was reached before the greatest number of trials.
    """

    values: FloatArray
    blocks: int
    settled: bool


def adaptive(
    block: Callable[[int], FloatArray],
    digits: int = 1,
    most_blocks: int = 10,
    probability: float = PROBABILITY,
) -> Adaptive:
    """Run blocks of trials until the results are stable (7.9.4).

    Twice the standard error, over the blocks, of each of estimate, standard uncertainty and both ends of the
    symmetric interval must be at most the numerical tolerance, for every quantity.

    Parameters
    ----------
    block
        ``block number from 0 -> (m, n)`` values of ``n`` quantities in ``m`` trials, always the same for the
        same number.
    digits
        Significant digits of the standard uncertainty that count.
    most_blocks
        After so many it ends unsettled.
    probability
        Of the interval.
    """
    blocks: list[FloatArray] = []
    found: list[FloatArray] = []
    while True:
        blocks.append(block(len(blocks)))
        found.append(_four(blocks[-1], probability))
        if len(blocks) >= 2:
            everything = np.concatenate(blocks)
            error = 2.0 * np.std(np.stack(found), axis=0, ddof=1) / math.sqrt(len(found))
            limits = [tolerance(u, digits) for u in _four(everything, probability)[:, 1]]
            near = error <= np.array(limits)[:, np.newaxis]
            settled = bool(
                np.all(near | ~np.isfinite(error))
            )  # what cannot be told does not hold up the rest
            if settled or len(blocks) >= most_blocks:
                return Adaptive(everything, len(blocks), settled)
        elif most_blocks == 1:
            return Adaptive(blocks[0], 1, False)


def _four(values: FloatArray, probability: float) -> FloatArray:
    """Estimate, standard uncertainty and interval of each quantity, ``(n, 4)``; nan where it has too few."""
    rows = np.full((values.shape[1], 4), np.nan)
    for n in range(values.shape[1]):
        if np.isfinite(values[:, n]).sum() >= 2:
            one = summarise(values[:, n], probability)
            rows[n] = one.mean, one.standard, *one.symmetric
    return rows


@dataclass(frozen=True, slots=True)
class Comparison:
    """First-order propagation beside the Monte Carlo method (clause 8).

    Parameters
    ----------
    low, high
        Absolute differences of the ends of the intervals.
    limit
        Numerical tolerance.
    """

    low: float
    high: float
    limit: float

    @property
    def agrees(self) -> bool:
        """Whether the first-order interval is validated."""
        return max(self.low, self.high) <= self.limit


def compare(
    value: float, standard: float, spread: Spread, digits: int = 1, factor: float = 1.96
) -> Comparison:
    """Compare a first-order result with the trials (8.1).

    Parameters
    ----------
    value, standard
        First-order estimate and standard uncertainty.
    spread
        Of the trials.
    digits
        Significant digits that count.
    factor
        Coverage factor of the first-order interval.
    """
    low, high = spread.symmetric
    ends = value - factor * standard, value + factor * standard
    return Comparison(abs(ends[0] - low), abs(ends[1] - high), tolerance(standard, digits))
