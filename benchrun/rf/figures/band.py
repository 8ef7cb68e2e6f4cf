"""Samples of a trace inside a band, its edges interpolated."""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension, render
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["at", "decibels", "in_band", "require_inside", "samples"]

_FLOOR = 1e-20


def decibels(plane: ComplexArray) -> FloatArray:
    """``20 log10 |S|``; a reading of exactly nothing becomes -400 dB rather than minus infinity."""
    return np.asarray(20.0 * np.log10(np.maximum(np.abs(plane), _FLOOR)))


def require_inside(f_hz: FloatArray, low_hz: float, high_hz: float, figure: str) -> None:
    """Refuse a band that the sweep does not reach.

    Raises
    ------
    InvalidMeasurement
        Naming the band and the sweep.
    """
    if low_hz < f_hz[0] * (1 - 1e-12) or high_hz > f_hz[-1] * (1 + 1e-12):
        low, high, first, last = (
            render(float(x), Dimension.FREQUENCY) for x in (low_hz, high_hz, f_hz[0], f_hz[-1])
        )
        raise InvalidMeasurement(
            f"{figure} is asked from {low} to {high}, but the sweep covers only {first} to {last}.",
            "Widen the sweep or narrow the band in the sequence.",
        )


def at(f_hz: FloatArray, values: FloatArray, where_hz: FloatArray | float) -> FloatArray:
    """Values at given frequencies by linear interpolation between the neighbouring samples.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    values
        ``(..., f)``, in the unit in which they are interpolated (decibels for magnitudes).
    where_hz
        Scalar or ``(k,)``, inside the sweep.

    Returns
    -------
    numpy.ndarray
        ``(..., k)``.
    """
    where = np.atleast_1d(np.asarray(where_hz, dtype=np.float64))
    right = np.clip(np.searchsorted(f_hz, where), 1, len(f_hz) - 1)
    x0, x1 = f_hz[right - 1], f_hz[right]
    weight = np.clip((where - x0) / (x1 - x0), 0.0, 1.0)
    # On a sample the neighbour has no say, not even as "nan times nothing".
    before = np.where(weight == 1.0, 0.0, values[..., right - 1])
    after = np.where(weight == 0.0, 0.0, values[..., right])
    return np.asarray(before * (1.0 - weight) + after * weight)


def samples(f_hz: FloatArray, low_hz: float, high_hz: float) -> FloatArray:
    """Both edges of a band and the frequencies of the sweep between them, ``(k,)``."""
    first, last = np.searchsorted(f_hz, low_hz, "right"), np.searchsorted(f_hz, high_hz, "left")
    return np.concatenate([[low_hz], f_hz[first:last], [high_hz]])


def in_band(
    f_hz: FloatArray, values: FloatArray, low_hz: float, high_hz: float
) -> tuple[FloatArray, FloatArray]:
    """Take the samples inside a band, and both edges by interpolation.

    So a figure does not depend on whether a grid point happens to lie on the edge.

    Returns
    -------
    f_hz, values
        ``(k,)`` and ``(..., k)``; the first and last sample are the edges.
    """
    first, last = np.searchsorted(f_hz, low_hz, "right"), np.searchsorted(f_hz, high_hz, "left")
    edges = at(f_hz, values, np.array([low_hz, high_hz]))
    inner = values[..., first:last]
    return samples(f_hz, low_hz, high_hz), np.concatenate([edges[..., :1], inner, edges[..., 1:]], axis=-1)
