"""A gate in time: one stretch of a response alone, seen over frequency again."""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension, render
from benchrun.rf.timedomain.grid import even
from benchrun.rf.timedomain.response import length_for
from benchrun.rf.timedomain.window import window
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["gated"]


def gated(
    f_hz: FloatArray, plane: ComplexArray, low_s: float, high_s: float, keep: bool = True
) -> tuple[FloatArray, ComplexArray]:
    """Keep what arrives between two times, or take it away.

    The sweep is weighted by a Kaiser window, its band-pass response multiplied by a gate with raised-cosine
    edges (each as wide as two steps of the transform), and the result divided by what the same did to a
    single reflection in the middle of the gate. So such a reflection comes back exactly, up to the ends of
    the sweep; one elsewhere within the gate nearly so, away from the ends.

    Parameters
    ----------
    f_hz, plane
        ``(f,)`` and ``(..., f)``.
    low_s, high_s
        There and back; may be negative for what lies before the reference plane.
    keep
        True gives what is inside the gate, False what is left without it.

    Returns
    -------
    f_hz, plane
        On the even grid of the sweep, ``(n,)`` and ``(..., n)``.

    Raises
    ------
    InvalidMeasurement
        If the gate is narrower than the sweep can resolve, or wider than its period; or the sweep cannot
        be made even.
    """
    f, s = even(f_hz, plane)
    n, step_hz = len(f), float(f[1] - f[0])
    cell, period = 1.0 / (n * step_hz), 1.0 / step_hz
    width = high_s - low_s
    if not 2.0 * cell <= width < period - 2.0 * cell:
        raise InvalidMeasurement(
            f"a gate of {render(width, Dimension.TIME)} cannot be laid: the sweep resolves "
            f"{render(2 * cell, Dimension.TIME)} and repeats after {render(period, Dimension.TIME)}.",
            "Sweep a wider band for a narrower gate, in smaller steps for a wider one.",
        )
    weight, count, middle = window("Kaiser", n), length_for(n, 4), (low_s + high_s) / 2.0
    turn = np.exp(2j * np.pi * step_hz * np.arange(n) * middle)
    t = np.fft.fftfreq(count, step_hz)
    # The gate's middle is turned to t = 0, so that it never lies across the seam of the period.
    inside = np.clip((width / 2.0 + cell - np.abs(t)) / (2.0 * cell), 0.0, 1.0)
    gate = 0.5 - 0.5 * np.cos(np.pi * inside)

    def through(spectrum: ComplexArray) -> ComplexArray:
        return np.asarray(np.fft.fft(np.fft.ifft(spectrum, n=count, axis=-1) * gate, axis=-1)[..., :n])

    result = through(s * (weight * turn)) / through(weight.astype(np.complex128)) / turn
    return f, result if keep else s - result
