"""What a limit and a rule ask of a measurement, before anything is measured: for ``benchrun check``."""

from __future__ import annotations

import math
from dataclasses import dataclass

from benchrun.uncertainty.decision import COVERAGE_FACTOR, Rule
from benchrun.uncertainty.global_risk import Population, capability, global_risk

__all__ = ["Outlook", "look_ahead"]

_WARN_SHARE = 0.25
"""Guard bands that take more than this part of the tolerance are worth a word."""


@dataclass(frozen=True, slots=True)
class Outlook:
    """What can be expected.

    Parameters
    ----------
    guard_band
        w, in the unit of the limit.
    capability
        ``T / (2 U)`` between two limits; None with one limit.
    yield_cost
        Share of the conforming units that the guard band rejects beyond what simple acceptance would; None
        where no population is stated.
    warning
        A sentence, or empty.
    """

    guard_band: float
    capability: float | None
    yield_cost: float | None
    warning: str


def look_ahead(
    rule: Rule,
    expanded: float,
    at_least: float | None = None,
    at_most: float | None = None,
    unit: str = "",
    population: Population | None = None,
) -> Outlook:
    """Weigh a limit, or a pair of limits, against the uncertainty to be expected.

    Parameters
    ----------
    rule
        The decision rule.
    expanded
        Expected expanded uncertainty (k = 2), in the unit of the limits; above zero.
    at_least, at_most
        The limits; one of them may be missing.
    unit
        For the sentence.
    population
        Of the units, where it is known: true values are normal about a mean.

    Raises
    ------
    ValueError
        If there is no limit, or the uncertainty is not above zero.

    Examples
    --------
    >>> look_ahead(Rule("guard band", 1.0), 0.3, 9.75, 10.25, "dB").warning.split(";")[0]
    'the guard bands of 0.3 dB at both limits meet: no unit can ever pass 9.75 dB to 10.25 dB'
    """
    if at_least is None and at_most is None:
        raise ValueError("there is no limit to weigh")
    if not expanded > 0:
        raise ValueError(f"an expected uncertainty is above zero, not {expanded:g}")
    width = rule.factor * expanded
    low, high = -math.inf if at_least is None else at_least, math.inf if at_most is None else at_most
    both = math.isfinite(low) and math.isfinite(high)
    index = capability(low, high, expanded) if both else None
    cost = None
    if population is not None:
        standard = expanded / COVERAGE_FACTOR
        guarded, simple = (global_risk(population, standard, low, high, w) for w in (width, 0.0))
        conforming = max(1.0 - _outside(population, low, high), 1e-300)
        cost = min(max((guarded.producer - simple.producer) / conforming, 0.0), 1.0)
    return Outlook(width, index, cost, _warning(width, low, high, unit, cost))


def _outside(population: Population, low: float, high: float) -> float:
    scale = population.deviation * math.sqrt(2.0)
    below = 0.5 * math.erfc((population.mean - low) / scale)
    return below + 0.5 * math.erfc((high - population.mean) / scale)


def _warning(width: float, low: float, high: float, unit: str, cost: float | None) -> str:
    def told(value: float) -> str:
        return f"{value:.3g} {unit}".strip()

    def limit(value: float) -> str:
        return f"{value:.6g} {unit}".strip()

    tolerance = high - low
    if width <= 0:
        return ""
    advice = "lower the uncertainty, or agree on another limit or rule"
    if 2.0 * width >= tolerance:
        return (
            f"the guard bands of {told(width)} at both limits meet: no unit can ever pass "
            f"{limit(low)} to {limit(high)}; {advice}"
        )
    if cost is not None and cost > 0.05:
        return f"the guard band of {told(width)} rejects {100 * cost:.0f} % of the good units; {advice}"
    if math.isfinite(tolerance) and 2.0 * width > _WARN_SHARE * tolerance:
        share = 100.0 * 2.0 * width / tolerance
        return (
            f"the guard bands of {told(width)} take {share:.0f} % of the tolerance "
            f"{limit(low)} to {limit(high)}; {advice}"
        )
    return ""
