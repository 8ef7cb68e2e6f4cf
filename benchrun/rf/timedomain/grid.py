"""Sweeps made even, because a transform into time wants equal steps."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension, render
from benchrun.rf.interpolation import resample, resampling_error
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["Harmonics", "even", "harmonics"]

_LEAST = 16
"""Fewer samples than this hold no picture of a line."""
_ON_GRID = 1e-3
"""How far from an even grid, in steps, a sweep may be and still be taken as it stands (rounded to 1 Hz)."""
_TOLERATED = 0.01
"""Greatest error that resampling may be estimated to make, linear."""


@dataclass(frozen=True, slots=True, eq=False)
class Harmonics:
    """Samples at the multiples of a step.

    Parameters
    ----------
    step_hz
        The step; its inverse is the period in time after which everything repeats.
    plane
        ``(..., n)`` at 1, 2, ... n times the step.
    dc
        The value at 0 Hz, real, ``(...,)``, where the sweep has it; else None.
    """

    step_hz: float
    plane: ComplexArray
    dc: FloatArray | None


def even(f_hz: FloatArray, plane: ComplexArray) -> tuple[FloatArray, ComplexArray]:
    """Take a sweep in equal steps: as it stands if it has them, else resampled to its widest step.

    Parameters
    ----------
    f_hz
        ``(f,)``, increasing.
    plane
        ``(..., f)``.

    Returns
    -------
    f_hz, plane
        ``(n,)`` and ``(..., n)``, starting at the same frequency.

    Raises
    ------
    InvalidMeasurement
        With too few samples, or where resampling would make an error above 0.01 (its estimate: the
        difference of a cubic and a parabola through the neighbouring samples).
    """
    widest = float(np.max(np.diff(f_hz))) if len(f_hz) > 1 else 0.0
    _enough(len(f_hz), "the sweep")
    mean = float(f_hz[-1] - f_hz[0]) / (len(f_hz) - 1)
    straight = f_hz[0] + mean * np.arange(len(f_hz))
    if np.max(np.abs(f_hz - straight)) <= _ON_GRID * mean:
        return straight, plane
    count = int((f_hz[-1] - f_hz[0]) / widest * (1 + 1e-9)) + 1
    _enough(count, "the sweep in equal steps")
    wanted = np.minimum(f_hz[0] + widest * np.arange(count), f_hz[-1])
    return wanted, _resampled(f_hz, plane, wanted)


def harmonics(f_hz: FloatArray, plane: ComplexArray) -> Harmonics:
    """Take a sweep at the multiples of a step, as a low-pass transform wants it.

    The step is the sweep's lowest frequency or its widest step, whichever is greater, so that nothing is
    invented below the sweep except the value at 0 Hz (:func:`.dc_by_causality`). Multiples that lie on
    samples are taken from them; others are resampled.

    Parameters
    ----------
    f_hz
        ``(f,)``, increasing, from 0 Hz or above.
    plane
        ``(..., f)``.

    Raises
    ------
    InvalidMeasurement
        If fewer than 16 multiples lie in the sweep (it starts too high), or resampling is too coarse.
    """
    widest = float(np.max(np.diff(f_hz))) if len(f_hz) > 1 else 0.0
    step = max(float(f_hz[0]), widest)
    count = int(f_hz[-1] / step * (1 + 1e-9)) if step > 0 else 0
    _enough(count, f"multiples of {render(step, Dimension.FREQUENCY)} up to the sweep's end")
    wanted = np.minimum(step * np.arange(1, count + 1), f_hz[-1])
    dc = np.asarray(plane[..., 0].real) if f_hz[0] == 0 else None
    nearest = np.clip(np.searchsorted(f_hz, wanted - widest * _ON_GRID), 0, len(f_hz) - 1)
    if np.all(np.abs(f_hz[nearest] - wanted) <= _ON_GRID * step):
        first, last = int(nearest[0]), int(nearest[-1])
        if last - first + 1 == count:  # every sample from the first multiple on: nothing to copy
            return Harmonics(step, plane[..., first : last + 1], dc)
        return Harmonics(step, np.ascontiguousarray(plane[..., nearest]), dc)
    return Harmonics(step, _resampled(f_hz, plane, wanted), dc)


def _enough(count: int, of: str) -> None:
    if count < _LEAST:
        raise InvalidMeasurement(
            f"a view over time needs at least {_LEAST} samples, and there are {count} of {of}.",
            "Sweep in equal steps, from one step upwards for a view with sign.",
        )


def _resampled(f_hz: FloatArray, plane: ComplexArray, wanted_hz: FloatArray) -> ComplexArray:
    nominal = plane if plane.ndim == 1 else plane.reshape(-1, plane.shape[-1])[0]
    error = resampling_error(f_hz, nominal, wanted_hz)
    if not error <= _TOLERATED:
        raise InvalidMeasurement(
            f"the sweep has no equal steps, and its samples are too far apart to be put on some: the error "
            f"is estimated at {error:.2g}, allowed is {_TOLERATED:g}.",
            "Sweep in equal steps, from one step upwards for a view with sign.",
        )
    return np.ascontiguousarray(resample(f_hz, plane, wanted_hz))
