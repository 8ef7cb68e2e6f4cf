"""What a doubt about a connection says, and the few measures that all rules of doubt share."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.calibration.plausibility import bends, middle
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["ALIKE", "Suspicion", "apart", "jumps", "size", "surest"]

ALIKE = 0.02
"""Two standards whose readings differ by less than this share of a full reflection are one."""


@dataclass(frozen=True, slots=True)
class Suspicion:
    """One connection that looks wrong.

    Parameters
    ----------
    hookup
        Text of the hook-up whose reading is doubted.
    reason
        One sentence: what the reading looks like, and why.
    confidence
        0 to 1. Up to one half it is a hint, on which nothing should be stopped; above that hands should make
        the connection again before going on.
    looks_like
        Name of the standard that it looks like; ``"nothing"``, ``"noise"``, ``"loose"``, or empty.
    """

    hookup: str
    reason: str
    confidence: float
    looks_like: str = ""


def surest(found: list[Suspicion]) -> list[Suspicion]:
    """The surest doubt about each hook-up, the surest of all first."""
    best: dict[str, Suspicion] = {}
    for one in sorted(found, key=lambda s: -s.confidence):
        best.setdefault(one.hookup, one)
    return list(best.values())


def size(plane: ComplexArray) -> float:
    """Level of a trace: the median of its magnitude, linear."""
    return middle(np.abs(plane))


def apart(one: ComplexArray, two: ComplexArray) -> float:
    """Root of the mean squared difference over the whole sweep, linear.

    The whole sweep, since what sets a standard apart from a bare connector may show at its top only.
    """
    difference = one - two
    return float(np.sqrt(np.vdot(difference, difference).real / len(difference)))


def jumps(plane: ComplexArray, f_hz: FloatArray, full: float) -> bool:
    """Whether points leave the trace by far more than their neighbours do, and by something that matters.

    Parameters
    ----------
    plane, f_hz
        ``(f,)`` each.
    full
        Level of a full reflection, linear.

    Notes
    -----
    A cable turns the phase from point to point, on a logarithmic grid more and more so; the delay is taken
    out as the reading itself shows it. What remains still bends more where points are farther apart, so that
    each bend is held against those around it and not against the median of the sweep.
    """
    bend = bends(plane, f_hz)
    suspects = np.flatnonzero(bend > 0.05 * full)
    if suspects.size > max(len(bend) // 8, 4):
        return False  # too coarse a grid to tell a jump from a turn
    for k in suspects:
        around = bend[max(k - 12, 0) : k + 13]
        if bend[k] > 25.0 * middle(around):
            return True
    return False
