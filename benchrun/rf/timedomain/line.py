"""Impedance along a line, as a step sent into it sees it."""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension, render
from benchrun.rf.timedomain.blocks import by_rows
from benchrun.rf.timedomain.grid import Harmonics
from benchrun.rf.timedomain.response import dc_by_causality, step
from benchrun.rf.timedomain.window import turns, window
from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["impedance_along", "impedance_at"]

RESTLESS = 0.02
"""How far the step response may move where it must be silent, before no impedance is told from it."""
_FOLD = 4


def impedance_along(
    f_hz: FloatArray,
    plane: ComplexArray,
    z0_ohm: float = 50.0,
    shape: str = "Kaiser",
    dc: FloatArray | float | None = None,
) -> tuple[FloatArray, FloatArray]:
    r"""Impedance over time: :math:`Z_0 (1 + \rho)/(1 - \rho)` of the step response :math:`\rho`.

    The plain reading of a reflectometer (common practice): exact for the first section; behind a mismatch
    each further one is off by what that mismatch kept back and by later echoes, which grow with its square.

    Parameters
    ----------
    f_hz, plane
        ``(f,)`` and ``(..., f)``.
    z0_ohm
        Reference impedance, real.
    shape, dc
        As of :func:`.impulse`.

    Returns
    -------
    t_s, z_ohm
        There and back, ``(t,)``, and ``(..., t)``.

    Raises
    ------
    InvalidMeasurement
        For a sweep that cannot be put on harmonics.
    """
    t, rho = step(f_hz, plane, shape, _FOLD, dc)
    return t, _impedance(rho, z0_ohm)


def impedance_at(samples: Harmonics, time_s: float, z0_ohm: float = 50.0) -> FloatArray:
    """Impedance at one time there and back, Kaiser window, the value at 0 Hz by causality or measured.

    The impulse response is integrated harmonic by harmonic, so there are no samples of time to interpolate.

    Parameters
    ----------
    samples
        Of :func:`.harmonics`, planes ``(..., n)``.
    time_s
        From 0 up.
    z0_ohm
        Reference impedance, real.

    Returns
    -------
    numpy.ndarray
        Ohm, ``(...,)``; nan where the response has not died away within 5/8 of the period, or the step
        response is 1 or more (an open).

    Raises
    ------
    InvalidMeasurement
        If the time lies beyond what the sweep can show.
    """
    reach = 0.625 / samples.step_hz
    if not 0.0 <= time_s <= reach:
        raise InvalidMeasurement(
            f"the impedance is asked for {render(time_s, Dimension.TIME)} after the start, there and back, "
            f"but the sweep shows only {render(reach, Dimension.TIME)}.",
            "Sweep in smaller steps from one step upwards, or look at a nearer place.",
        )
    n = samples.plane.shape[-1]
    order, weight = np.arange(1, n + 1), window("Kaiser", n + 1, low_pass=True)[1:]
    # The integral of each harmonic from 3/8 of a period before 0, where nothing has come yet.
    since = turns(2.0 * np.pi * samples.step_hz * time_s, 1.0, n) - turns(-0.75 * np.pi, 1.0, n)
    kernel = weight * since / (1j * np.pi * order)

    def integral(plane: ComplexArray) -> tuple[FloatArray, FloatArray]:
        found = (plane * kernel).real.sum(-1)
        return found, found

    dc, unrest = dc_by_causality(samples)
    rho = by_rows(samples.plane, n, integral)[0]
    rho = rho + (dc if samples.dc is None else samples.dc) * (time_s * samples.step_hz + 0.375)
    return np.where(unrest <= RESTLESS, _impedance(rho, z0_ohm), np.nan)


def _impedance(rho: FloatArray, z0_ohm: float) -> FloatArray:
    passive = np.where(np.abs(rho) < 1.0, rho, np.nan)
    return np.asarray(z0_ohm * (1.0 + passive) / (1.0 - passive))
