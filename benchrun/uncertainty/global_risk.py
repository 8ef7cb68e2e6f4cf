"""Risks over a whole population, before any unit of it is measured, and how well a measurement can tell.

Sources: JCGM 106:2012, 9.4 and 9.5 (global consumer's and producer's risk for a normal population and a
normal measurement), 7.6 (measurement capability index); clause numbers from memory.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import FloatArray

__all__ = ["GlobalRisk", "Population", "capability", "global_risk", "posterior"]

_REACH = 12.0
"""Standard deviations that are integrated over: beyond, a normal density is below 1e-31."""
_NODES = 64


@dataclass(frozen=True, slots=True)
class Population:
    """What is known of the units before they are measured.

    Parameters
    ----------
    mean, deviation
        Of the true values, normally distributed; the deviation above zero.
    """

    mean: float
    deviation: float


@dataclass(frozen=True, slots=True)
class GlobalRisk:
    """Shares of all units.

    Parameters
    ----------
    consumer
        Do not conform and are accepted.
    producer
        Conform and are rejected.
    rejected
        Are rejected, rightly or not.
    """

    consumer: float
    producer: float
    rejected: float


def capability(low: float, high: float, expanded: float) -> float:
    """Measurement capability index ``C_m = T / (2 U)``, with U for k = 2 (JCGM 106, 7.6).

    Examples
    --------
    >>> capability(9.8, 10.2, 0.05)
    4.0
    """
    width = (high - low) / (2.0 * expanded) if expanded else math.inf
    return round(width, 12) if math.isfinite(width) else width


def posterior(prior: Population, measured: float, standard: float) -> Population:
    """What is known after a measurement with a standard uncertainty (JCGM 106, 7.2, from memory).

    Examples
    --------
    >>> posterior(Population(0.0, 1.0), 2.0, 1.0)
    Population(mean=1.0, deviation=0.7071067811865476)
    """
    a, b = prior.deviation**-2, standard**-2
    return Population((prior.mean * a + measured * b) / (a + b), math.sqrt(1.0 / (a + b)))


def global_risk(
    population: Population,
    standard: float,
    low: float = -math.inf,
    high: float = math.inf,
    guard_band: float = 0.0,
) -> GlobalRisk:
    """Global risks of a rule with a guard band at each limit there is.

    Parameters
    ----------
    population
        Of the true values.
    standard
        Standard uncertainty of one measurement, k = 1, above zero.
    low, high
        Tolerance limits; infinite where there is none.
    guard_band
        w: accepted is what was measured from ``low + w`` to ``high - w``; negative for guarded rejection.

    Raises
    ------
    ValueError
        If a spread is not above zero, or the limits do not increase.

    Examples
    --------
    >>> risk = global_risk(Population(1500.0, 0.12), 0.04, 1499.8, 1500.2)
    >>> round(100 * risk.consumer, 4), round(100 * risk.producer, 4)
    (1.8942, 3.7208)
    """
    if not (standard > 0 and population.deviation > 0 and low < high):
        raise ValueError(
            f"spreads must be above zero and limits increase; got a population of {population.deviation:g}, "
            f"u = {standard:g}, limits {low:g} and {high:g}"
        )
    zl, zu = ((limit - population.mean) / population.deviation for limit in (low, high))
    accept_low = low + guard_band if math.isfinite(low) else low
    accept_high = high - guard_band if math.isfinite(high) else high

    def accepted(z: FloatArray) -> FloatArray:
        true = population.mean + population.deviation * z
        share = _normal((accept_high - true) / standard) - _normal((accept_low - true) / standard)
        return np.maximum(share, 0.0)  # no measurement at all is accepted where the guard bands meet

    breaks = [(edge - population.mean) / population.deviation for edge in (accept_low, accept_high)]
    width = standard / population.deviation
    consumer = sum(_integral(accepted, a, b, breaks, width) for a, b in ((-_REACH, zl), (zu, _REACH)))
    inside = _integral(accepted, zl, zu, breaks, width)
    conforming = _phi(zu) - _phi(zl)
    return GlobalRisk(consumer, max(conforming - inside, 0.0), max(1.0 - consumer - inside, 0.0))


def _phi(z: float) -> float:
    return 0.5 * math.erfc(-z / math.sqrt(2.0))


_ERFC = np.vectorize(math.erfc, otypes=[np.float64])


def _normal(z: FloatArray) -> FloatArray:
    """Normal distribution function; numpy has none."""
    return np.asarray(0.5 * _ERFC(-z / math.sqrt(2.0)))


def _integral(
    function: Callable[[FloatArray], FloatArray], low: float, high: float, breaks: list[float], width: float
) -> float:
    """Integrate ``function(z) phi(z)`` by Gauss and Legendre, in pieces about every place where it turns."""
    low, high = max(low, -_REACH), min(high, _REACH)
    if low >= high:
        return 0.0
    around = [b + k * width for b in breaks if math.isfinite(b) for k in (-8.0, -3.0, 0.0, 3.0, 8.0)]
    edges = sorted({low, high, *(e for e in (*around, -6.0, -3.0, 0.0, 3.0, 6.0) if low < e < high)})
    nodes, weights = np.polynomial.legendre.leggauss(_NODES)
    total = 0.0
    for a, b in itertools.pairwise(edges):
        z = 0.5 * (b - a) * nodes + 0.5 * (a + b)
        density = np.exp(-0.5 * z * z) / math.sqrt(2.0 * math.pi)
        total += 0.5 * (b - a) * float(np.sum(weights * function(z) * density))
    return total
