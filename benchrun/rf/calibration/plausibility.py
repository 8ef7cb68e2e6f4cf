"""How believable an error box is: what a test port may look like before anyone has measured it.

A port has a directivity and a source match well below one, a tracking of about the loss of its cable, and
a tracking phase that runs back to zero at zero frequency, since a cable is all there is. None of this
is exact, so it gives a cost and never a verdict. The figures are common practice.
"""

from __future__ import annotations

from collections.abc import Mapping
from itertools import permutations

import numpy as np

from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["box_cost", "box_of", "exchanged", "intercept_rad", "noisiness", "steadiness"]

_DIRECTIVITY, _MATCH, _TRACKING_DECADES, _INTERCEPT_RAD = 0.15, 0.2, 0.5, 0.7
"""Sizes at which each property costs one."""

_SLACK = 1.5
"""Difference of cost that means nothing."""


def steadiness(plane: ComplexArray) -> float:
    """How far neighbouring points tell the same story: 1 for a smooth trace of any delay, 0 for noise.

    Magnitude of the correlation of each point with the next one; ``(f,)``.
    """
    power = float(np.sum(np.abs(plane) ** 2))
    return float(np.abs(np.sum(plane[1:] * np.conj(plane[:-1])))) / power if power > 0.0 else 0.0


def noisiness(plane: ComplexArray) -> tuple[float, float]:
    """Size of the typical and of the greatest jump against the neighbours on both sides.

    Second differences, after the mean turn of phase from point to point has been taken out; linear.
    """
    if len(plane) < 5:
        return 0.0, 0.0
    turn = np.sum(plane[1:] * np.conj(plane[:-1]))
    unit = turn / abs(turn) if abs(turn) > 0.0 else 1.0
    still = plane * unit ** -np.arange(len(plane))
    bend = np.abs(still[2:] - 2.0 * still[1:-1] + still[:-2])
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


def box_cost(box: OnePortTerms, f_hz: FloatArray) -> float:
    """How unusual a box is: about 1 for a good port, tens for one that cannot be.

    Medians over frequency, so that a few bad points do not decide.
    """
    planes = (box.directivity, box.source_match, box.tracking)
    with np.errstate(all="ignore"):
        size = float(np.median(np.abs(box.tracking)))
        if not (all(np.isfinite(np.median(np.abs(p))) for p in planes) and size > 0.0):
            return 1e3
        directivity = float(np.median(np.abs(box.directivity / box.tracking)))
        match = float(np.median(np.abs(box.source_match)))
    phase, unsure = intercept_rad(f_hz, box.tracking)
    allowed = np.hypot(_INTERCEPT_RAD, unsure)
    return float(
        (directivity / _DIRECTIVITY) ** 2
        + (match / _MATCH) ** 2
        + (np.log10(size) / _TRACKING_DECADES) ** 2
        + (phase / allowed) ** 2
    )


def exchanged(
    truths: Mapping[str, ComplexArray], readings: Mapping[str, ComplexArray], f_hz: FloatArray
) -> tuple[dict[str, str], float]:
    """Which standard each reading looks like, if the three may have been exchanged among themselves.

    Returns
    -------
    looks, gain
        What the reading under each name looks like, and by how much the cost of the error box falls
        against taking each for what it is called; zero if nothing beats that.
    """
    names = tuple(readings)
    as_given = box_cost(box_of(truths, readings), f_hz)
    costs = []
    for order in permutations(names):
        told = dict(zip(names, order, strict=True))
        moved = sum(n != other for n, other in told.items())
        costs.append((box_cost(box_of({n: truths[told[n]] for n in names}, readings), f_hz), moved, told))
    least = min(cost for cost, _, _ in costs)
    # Among what is about as good, the simplest story: fewest standards exchanged.
    cost, _, best = min((c for c in costs if c[0] <= least + _SLACK), key=lambda c: (c[1], c[0]))
    return best, as_given - cost
