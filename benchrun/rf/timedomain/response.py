"""Impulse and step responses of a sweep."""

from __future__ import annotations

import numpy as np

from benchrun.rf.timedomain.blocks import by_rows
from benchrun.rf.timedomain.grid import Harmonics, harmonics
from benchrun.rf.timedomain.window import window
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["dc_by_causality", "envelope", "impulse", "length_for", "raw", "step"]


def length_for(points: int, fold: int) -> int:
    """Smallest power of two of at least ``fold`` times so many points."""
    return 1 << int(np.ceil(np.log2(points * fold)))


def envelope(
    step_hz: float, plane: ComplexArray, shape: str = "Kaiser", fold: int = 2
) -> tuple[FloatArray, ComplexArray]:
    """Band-pass impulse response: complex, its magnitude 1 for a full reflection.

    Parameters
    ----------
    step_hz
        Step of the even grid.
    plane
        ``(..., n)``.
    shape
        Window.
    fold
        How many times finer than the transform's own step the time axis is at least.

    Returns
    -------
    t_s, value
        ``(t,)`` from 0 up to one period ``1 / step_hz``, and ``(..., t)``. Times before 0 appear at the
        period's end.
    """
    weight = window(shape, plane.shape[-1])
    count = length_for(plane.shape[-1], fold)
    value = np.fft.ifft(plane * weight, n=count, axis=-1) * (count / weight.sum())
    return np.arange(count) / (count * step_hz), value


def dc_by_causality(samples: Harmonics) -> tuple[FloatArray, FloatArray]:
    """Find the value at 0 Hz from the fact that nothing returns before it was sent.

    A wrong value at 0 Hz lifts the impulse response evenly over all times. So the value is the one that
    makes its mean zero where there must be silence: from 3/8 to 1/8 of a period *before* the start. This
    asks that the response has died away 5/8 of a period after it; no shape of the trace near 0 Hz is
    assumed, as an extrapolated polynomial would for a line that turns several times below the first sample.

    Parameters
    ----------
    samples
        Planes ``(..., n)``.

    Returns
    -------
    dc, unrest
        ``(...,)`` each: the value, and by how much at most the step response still moves in the silence;
        well below 0.01 where the assumption holds.
    """
    n = samples.plane.shape[-1]
    return by_rows(samples.plane, length_for(n + 1, 2), _silence)


def _silence(plane: ComplexArray) -> tuple[FloatArray, FloatArray]:
    n = plane.shape[-1]
    weight = window("Kaiser", n + 1, low_pass=True)
    count = length_for(n + 1, 2)
    spectrum = np.zeros((len(plane), n + 1), np.complex128)
    spectrum[:, 1:] = plane * weight[1:]
    silent = np.fft.irfft(spectrum, n=count, axis=-1)[:, count * 5 // 8 : count * 7 // 8]
    mean = silent.mean(-1)
    drift = np.cumsum(silent - mean[:, np.newaxis], axis=-1)
    return -count * mean, drift.max(-1) - drift.min(-1)


def raw(samples: Harmonics, dc: FloatArray, shape: str, fold: int) -> FloatArray:
    """Real impulse response whose sum is the value at 0 Hz, ``(..., t)``, over one period from 0."""
    n = samples.plane.shape[-1]
    weight = window(shape, n + 1, low_pass=True)
    spectrum = np.empty((*samples.plane.shape[:-1], n + 1), np.complex128)
    spectrum[..., 0] = dc
    spectrum[..., 1:] = samples.plane * weight[1:]
    return np.asarray(np.fft.irfft(spectrum, n=length_for(n + 1, 2 * fold), axis=-1))


def impulse(
    f_hz: FloatArray,
    plane: ComplexArray,
    shape: str = "Kaiser",
    fold: int = 2,
    dc: FloatArray | float | None = None,
) -> tuple[FloatArray, FloatArray]:
    """Low-pass impulse response: real, +1 at its peak for a perfect open, -1 for a short.

    Parameters
    ----------
    f_hz, plane
        The sweep, ``(f,)`` and ``(..., f)``; see :func:`.harmonics` for what is asked of it.
    shape
        Window.
    fold
        How many times finer than half a period of the highest frequency the time axis is at least.
    dc
        Value at 0 Hz where it is known; else it is the sweep's own, or :func:`dc_by_causality`.

    Returns
    -------
    t_s, value
        ``(t,)``, from half a period before 0 to half a period after, and ``(..., t)``.

    Raises
    ------
    InvalidMeasurement
        For a sweep that cannot be put on harmonics.
    """
    samples = harmonics(f_hz, plane)
    weight = window(shape, samples.plane.shape[-1] + 1, low_pass=True)
    value = raw(samples, _dc(samples, dc), shape, fold)
    count = value.shape[-1]
    scale = count / (weight[0] + 2.0 * weight[1:].sum())
    t = (np.arange(count) - count // 2) / (count * samples.step_hz)
    return t, np.fft.fftshift(value, axes=-1) * scale


def step(
    f_hz: FloatArray,
    plane: ComplexArray,
    shape: str = "Kaiser",
    fold: int = 2,
    dc: FloatArray | float | None = None,
) -> tuple[FloatArray, FloatArray]:
    """Low-pass step response: what comes back of a step of 1, there from the start of time.

    The sum of the impulse response from half a period before 0, half of each sample counted before and
    half after it, so that a reflection at 0 has risen by half at 0. Parameters as of :func:`impulse`.

    Returns
    -------
    t_s, value
        ``(t,)`` and ``(..., t)``.

    Raises
    ------
    InvalidMeasurement
        For a sweep that cannot be put on harmonics.
    """
    samples = harmonics(f_hz, plane)
    value = np.fft.fftshift(raw(samples, _dc(samples, dc), shape, fold), axes=-1)
    count = value.shape[-1]
    t = (np.arange(count) - count // 2) / (count * samples.step_hz)
    return t, np.cumsum(value, axis=-1) - value / 2.0


def _dc(samples: Harmonics, given: FloatArray | float | None) -> FloatArray:
    if given is not None:
        return np.asarray(given, dtype=np.float64)
    return samples.dc if samples.dc is not None else dc_by_causality(samples)[0]
