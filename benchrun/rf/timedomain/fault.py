"""The greatest reflection along a line: where, and how large."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension, render
from benchrun.rf.timedomain.blocks import by_rows
from benchrun.rf.timedomain.grid import even
from benchrun.rf.timedomain.response import envelope, length_for
from benchrun.rf.timedomain.window import turns, window
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["Fault", "greatest_reflection"]

STANDS_OUT = 6.0
"""Times the median of the envelope: the greatest of 100 001 samples of noise alone reaches 4.1."""


@dataclass(frozen=True, slots=True, eq=False)
class Fault:
    """A reflection found; nan where none stands out.

    Parameters
    ----------
    time_s
        There and back, ``(...,)``.
    size
        Magnitude, 1 for a full reflection without loss on the way, ``(...,)``.
    """

    time_s: FloatArray
    size: FloatArray


def greatest_reflection(
    f_hz: FloatArray, plane: ComplexArray, within_s: tuple[float, float] | None = None
) -> Fault:
    """Find the greatest peak of the band-pass envelope (Kaiser window).

    The sample that is greatest within the stretch, if it is a peak (greater than its neighbours, also those
    outside the stretch: the flank of a peak that lies outside is no fault) and stands out by six times the
    median of the whole envelope. Between samples of time: the vertex of a parabola through the logarithm of
    three values of the transform, worked out a second time close around the first vertex.

    Parameters
    ----------
    f_hz, plane
        ``(f,)`` and ``(..., f)``; see :func:`.even` for what is asked of them.
    within_s
        There and back; None for the whole period, less two steps of the transform before its end.

    Raises
    ------
    InvalidMeasurement
        If the stretch reaches beyond the period after which the sweep repeats itself, or the sweep cannot
        be made even.
    """
    f, s = even(f_hz, plane)
    n, step_hz = len(f), float(f[1] - f[0])
    period, cell = 1.0 / step_hz, 1.0 / (n * step_hz)
    low, high = within_s if within_s is not None else (0.0, period - 2.0 * cell)
    if not 0.0 <= low < high <= period - 2.0 * cell * (1 - 1e-9):
        raise InvalidMeasurement(
            f"reflections are looked for from {render(low, Dimension.TIME)} to "
            f"{render(high, Dimension.TIME)}, there and back, but what the sweep shows repeats after "
            f"{render(period, Dimension.TIME)}.",
            "Sweep in smaller steps, or look at a shorter stretch.",
        )
    time, size = by_rows(s, length_for(n, 2), lambda block: _found(step_hz, block, low, high))
    return Fault(time, size)


def _found(step_hz: float, s: ComplexArray, low: float, high: float) -> tuple[FloatArray, FloatArray]:
    """Times and sizes of a block of rows, nan where no reflection stands out."""
    t, value = envelope(step_hz, s)
    # Compared as squares: a root for each sample would only cost time.
    power = value.real**2 + value.imag**2
    count = len(t)
    first, last = int(np.ceil(low / t[1] - 1e-9)), int(np.floor(high / t[1] + 1e-9))
    peak = first + np.argmax(power[:, first : last + 1], -1)
    rows = np.arange(len(power))
    before, here, after = (power[rows, (peak + offset) % count] for offset in (-1, 0, 1))
    # Every fifth sample tells the median well enough, a fifth of the sorting.
    told = (here >= before) & (here >= after) & (here > STANDS_OUT**2 * np.median(power[:, ::5], -1))
    coarse = (peak + _vertex(before, here, after)) * t[1]
    time, size = _refined(step_hz, s, coarse, t[1] / 4.0)
    return np.where(told, time, np.nan), np.where(told, size, np.nan)


def _vertex(before: FloatArray, here: FloatArray, after: FloatArray) -> FloatArray:
    """Where a parabola through three logarithms has its vertex, in steps from the middle one."""
    low, mid, high = (np.log(np.maximum(p, 1e-300)) for p in (before, here, after))
    bend = low - 2.0 * mid + high
    return np.asarray(np.clip(0.5 * (low - high) / np.where(bend < 0, bend, -np.inf), -1.0, 1.0))


def _refined(
    step_hz: float, plane: ComplexArray, time_s: FloatArray, apart_s: float
) -> tuple[FloatArray, FloatArray]:
    """Vertex and height from the transform itself at three times close together."""
    n = plane.shape[-1]
    weight = window("Kaiser", n)
    found, height = np.empty(len(time_s)), np.empty(len(time_s))
    middle = -(n - 1) / 2.0  # about the middle of the sweep, where the turning is least
    shift = turns(2.0 * np.pi * step_hz * apart_s, middle, n)
    for row, start in enumerate(time_s):  # row by row: a draw's three turns are as large as its sweep
        x = plane[row] * weight * turns(2.0 * np.pi * step_hz * start, middle, n)
        three = [abs(y.sum()) ** 2 for y in (x * shift.conj(), x, x * shift)]
        offset = _vertex(*(np.asarray(p) for p in three))
        found[row] = start + offset * apart_s
        low, mid, high = np.log(np.maximum(three, 1e-300))
        height[row] = np.exp((mid - 0.25 * (low - high) * offset) / 2.0) / weight.sum()
    return found, height
