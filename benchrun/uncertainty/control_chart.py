"""Control chart of a check part over days: warn beyond two deviations, refuse beyond three, see trends.

Sources: Shewhart's limits; the run rules after ISO 7870-2:2013 and common practice (from memory): nine in a
row on one side, six in a row rising or falling, two of three beyond two standard deviations on one side.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum

__all__ = ["Chart", "Finding", "State", "baseline", "judge"]

_SIDE, _TREND = 9, 6


class State(StrEnum):
    """What the last value means for the bench."""

    IN_CONTROL = "in control"
    WARNING = "warning"
    REFUSED = "refused"


@dataclass(frozen=True, slots=True)
class Chart:
    """Centre and spread of a check part's value.

    Parameters
    ----------
    centre, deviation
        In the unit of the value; the deviation above zero.
    """

    centre: float
    deviation: float


@dataclass(frozen=True, slots=True)
class Finding:
    """The judgement of the last value.

    Parameters
    ----------
    state
        What follows.
    distance
        Of the last value from the centre, in standard deviations.
    reasons
        A sentence for each rule that was met; empty if none.
    """

    state: State
    distance: float
    reasons: tuple[str, ...]


def baseline(values: Sequence[float], least: int = 8) -> Chart:
    """Centre and standard deviation of values taken while all was well.

    Parameters
    ----------
    values
        One a day, at least ``least`` of them.

    Raises
    ------
    ValueError
        With fewer values, or if they do not scatter at all.

    Examples
    --------
    >>> baseline([1.0, 3.0] * 4).centre
    2.0
    """
    if len(values) < least:
        raise ValueError(f"{len(values)} values are too few for a control chart; take at least {least}")
    centre = math.fsum(values) / len(values)
    deviation = math.sqrt(math.fsum((v - centre) ** 2 for v in values) / (len(values) - 1))
    if not deviation > 0:
        raise ValueError("the values do not scatter at all, so no limits follow from them")
    return Chart(centre, deviation)


def judge(chart: Chart, values: Sequence[float]) -> Finding:
    """Judge the last of some values, in the order of their days.

    Parameters
    ----------
    chart
        Centre and spread.
    values
        Oldest first; at least one.

    Raises
    ------
    ValueError
        If there is no value, or one is not a number.

    Examples
    --------
    >>> judge(Chart(10.0, 0.1), [10.0, 10.25]).state.value
    'warning'
    """
    if not values or not all(math.isfinite(v) for v in values):
        raise ValueError("a control chart needs at least one value, all of them numbers")
    z = [(value - chart.centre) / chart.deviation for value in values]
    last, reasons, state = z[-1], list[str](), State.IN_CONTROL
    if abs(last) > 3:
        reasons.append(f"{abs(last):.1f} standard deviations from the centre; more than 3 are refused")
        state = State.REFUSED
    elif abs(last) > 2:
        reasons.append(f"{abs(last):.1f} standard deviations from the centre; more than 2 are a warning")
    for side in (1.0, -1.0):
        if side * last > 2 and sum(side * one > 2 for one in z[-3:]) >= 2:
            reasons.append("two of the last three lie more than 2 standard deviations on one side")
            state = State.REFUSED
        if len(z) >= _SIDE and all(side * one > 0 for one in z[-_SIDE:]):
            reasons.append(f"the last {_SIDE} lie on one side of the centre")
        recent = z[-_TREND:]
        if len(recent) == _TREND and all(side * (b - a) > 0 for a, b in itertools.pairwise(recent)):
            reasons.append(f"the last {_TREND} {'rise' if side > 0 else 'fall'} all the way")
    if reasons and state is State.IN_CONTROL:
        state = State.WARNING
    return Finding(state, last, tuple(reasons))
