"""How believable an error box is: what a test port may look like before anyone has measured it.

A port has a directivity and a source match well below one, and a tracking of about the loss of its cable.
The phase of its tracking runs back to zero at zero frequency only where receivers add none of their own,
which some do: it is a hint. None of this is exact, so it gives a cost and never a verdict. The figures are
common practice.
"""

from __future__ import annotations

from collections.abc import Mapping
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = [
    "bends", "box_cost", "box_of", "delay_s", "exchanged", "intercept_rad", "middle",
    "noisiness", "steadiness",
]  # fmt: skip

_DIRECTIVITY, _MATCH, _TRACKING_DECADES = 0.15, 0.2, 0.5
"""Sizes at which each property costs one."""

_SLACK = 1.5
"""Difference of cost that means nothing."""


_STEPS = 200
"""Steps of a sweep that are looked at for a delay."""


_BELIEVED = 4.0
"""Cost of a box that needs no other story."""


def middle(values: FloatArray) -> float:
    """Upper median of ``(f,)``: for a few hundred values several times as fast as numpy's own."""
    half = len(values) // 2
    return float(np.partition(values, half)[half])


def steadiness(plane: ComplexArray) -> float:
    """How far neighbouring points tell the same story: 1 for a smooth trace of any delay, 0 for noise.

    Magnitude of the correlation of each point with the next one; ``(f,)``.
    """
    power = float(np.sum(np.abs(plane) ** 2))
    return float(np.abs(np.sum(plane[1:] * np.conj(plane[:-1])))) / power if power > 0.0 else 0.0


def delay_s(plane: ComplexArray, f_hz: FloatArray) -> float:
    """Group delay of a trace as it shows itself between neighbouring points, in seconds.

    The half of the steps that are shortest decide, so that a logarithmic grid whose top turns by more than
    half a turn a step does not mislead; on an even grid it is the delay up to a whole number of turns a step.
    """
    step = np.diff(f_hz)
    # A few hundred of the shorter steps tell the delay as well as all of them.
    near = np.flatnonzero(step <= middle(step))
    near = near[:: -(-len(near) // _STEPS)]
    coarse = middle(_turns(plane, near) / step[near])
    far = np.arange(0, len(step), -(-len(step) // _STEPS))
    # Once more around the first guess, each point by its weight and by the length of its step.
    rest = _turns(plane, far, coarse * step[far])
    weight = np.abs(plane[far]) * step[far]
    whole = float(np.sum(weight * step[far]))
    return coarse + float(np.sum(rest * weight)) / whole if whole > 0.0 else coarse


def _turns(plane: ComplexArray, at: NDArray[np.intp], off: FloatArray | float = 0.0) -> FloatArray:
    """By how many turns the phase falls from some points to the next, beyond ``off``."""
    turn = plane[at + 1] * np.conj(plane[at]) * np.exp(2j * np.pi * np.asarray(off))
    return np.asarray(-np.angle(turn) / (2.0 * np.pi))


def bends(plane: ComplexArray, f_hz: FloatArray) -> FloatArray:
    """Twice the distance of inner points from the line between their neighbours, delay out, ``(f - 2,)``."""
    if len(plane) < 5 or not np.any(plane):
        return np.zeros(max(len(plane) - 2, 0))
    still = plane * np.exp(2j * np.pi * delay_s(plane, f_hz) * f_hz)
    share = (f_hz[1:-1] - f_hz[:-2]) / (f_hz[2:] - f_hz[:-2])
    return np.asarray(2.0 * np.abs(still[1:-1] - (1.0 - share) * still[:-2] - share * still[2:]))


def noisiness(plane: ComplexArray, f_hz: FloatArray | None = None) -> tuple[float, float]:
    """Size of the typical and of the greatest jump against the neighbours on both sides.

    Second differences, after the delay has been taken out; linear. Without frequencies an even grid is meant.
    """
    if len(plane) < 5:
        return 0.0, 0.0
    bend = bends(plane, np.arange(1.0, len(plane) + 1.0) if f_hz is None else f_hz)
    return float(np.median(bend)), float(np.max(bend))


def intercept_rad(f_hz: FloatArray, plane: ComplexArray) -> tuple[float, float]:
    """Phase of a trace carried back to zero frequency along a straight line, and how unsure that is.

    Returns
    -------
    phase, unsure
        In radians, the phase within plus and minus pi; ``unsure`` infinite where the phase turns too
        fast from point to point to be followed.
    """
    if len(f_hz) < 5:
        return 0.0, np.inf
    if float(np.median(np.abs(np.angle(plane[1:] * np.conj(plane[:-1]))))) > 2.5:
        return 0.0, np.inf
    phase = np.unwrap(np.angle(plane))
    slope, start = np.polyfit(f_hz, phase, 1)
    rest = float(np.std(phase - slope * f_hz - start))
    far = float(f_hz[0] / max(f_hz[-1] - f_hz[0], 1.0))
    return float(np.angle(np.exp(1j * start))), rest + 0.1 * far


def box_of(truths: Mapping[str, ComplexArray], readings: Mapping[str, ComplexArray]) -> OnePortTerms:
    """Error box of three standards, without asking whether it makes sense; may hold no numbers."""
    (s1, s2, s3), (m1, m2, m3) = (tuple(x[n] for n in readings) for x in (truths, readings))
    with np.errstate(all="ignore"):
        p12, p13 = s1 * m1 - s2 * m2, s1 * m1 - s3 * m3
        c = ((m1 - m2) * (s1 - s3) - (m1 - m3) * (s1 - s2)) / (p12 * (s1 - s3) - p13 * (s1 - s2))
        b = (m1 - m2 - c * p12) / (s1 - s2)
        a = m1 - b * s1 - c * s1 * m1
        return OnePortTerms(a, c, b + a * c)


def box_cost(box: OnePortTerms) -> float:
    """How unusual a box is: about 1 for a good port, tens for one that cannot be.

    Medians over frequency, so that a few bad points do not decide.
    """
    planes = (box.directivity, box.source_match, box.tracking)
    with np.errstate(all="ignore"):
        size = middle(np.abs(box.tracking))
        if not (all(np.isfinite(p.sum()) for p in planes) and size > 0.0):
            return 1e3
        directivity = middle(np.abs(box.directivity / box.tracking))
        match = middle(np.abs(box.source_match))
    return float(
        (directivity / _DIRECTIVITY) ** 2 + (match / _MATCH) ** 2 + (np.log10(size) / _TRACKING_DECADES) ** 2
    )


def exchanged(
    truths: Mapping[str, ComplexArray], readings: Mapping[str, ComplexArray]
) -> tuple[dict[str, str], float]:
    """Which standard each reading looks like, if the three may have been exchanged among themselves.

    Short and open exchanged only turn the sign of source match and tracking, which costs nothing: what else
    is read must tell.

    Returns
    -------
    looks, gain
        What the reading under each name looks like, and by how much the cost of the error box falls
        against taking each for what it is called; zero if nothing beats that.
    """
    names = tuple(readings)
    as_given = box_cost(box_of(truths, readings))
    if as_given < _BELIEVED:
        return {name: name for name in names}, 0.0
    costs = []
    for order in permutations(names):
        told = dict(zip(names, order, strict=True))
        moved = sum(n != other for n, other in told.items())
        costs.append((box_cost(box_of({n: truths[told[n]] for n in names}, readings)), moved, told))
    least = min(cost for cost, _, _ in costs)
    # Among what is about as good, the simplest story: fewest standards exchanged.
    cost, _, best = min((c for c in costs if c[0] <= least + _SLACK), key=lambda c: (c[1], c[0]))
    return best, as_given - cost
