"""Figures of phase: phase, group delay and its variation."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import at, samples
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "group_delay"]

_OVER = Parameter("range", Dimension.FREQUENCY, optional=True)
_AT = Parameter("value", Dimension.FREQUENCY, optional=True)
_TRACE = Parameter("choice", default="S21", choices=("S21", "S12"))
_APERTURE = Parameter("value", Dimension.FREQUENCY)


def group_delay(
    f_hz: FloatArray, network: TwoPort, where_hz: FloatArray, aperture: float, trace: str = "S21"
) -> FloatArray:
    r"""Group delay with a stated aperture.

    :math:`\tau(f) = -\frac{\varphi(f+a/2)-\varphi(f-a/2)}{2\pi a}` with the unwrapped phase interpolated
    linearly between samples, at any frequency, on the grid or not. Frequencies nearer than half an
    aperture to an end of the sweep have no value.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    network
        Planes ``(..., f)``.
    where_hz
        Where it is wanted, ``(k,)``.
    aperture
        In Hz; at least one grid step, or the interpolation would only repeat itself.

    Returns
    -------
    numpy.ndarray
        Seconds, ``(..., k)``; nan near the ends.
    """
    phase = np.unwrap(np.angle(transmission(network, trace)), axis=-1)
    low, high = where_hz - aperture / 2, where_hz + aperture / 2
    inside = (low >= f_hz[0] * (1 - 1e-12)) & (high <= f_hz[-1] * (1 + 1e-12))
    step = at(f_hz, phase, high) - at(f_hz, phase, low)
    return np.asarray(np.where(inside, -step / (2.0 * np.pi * aperture), np.nan))


def _phase(_f_hz: FloatArray, network: TwoPort, trace: str = "S21") -> FloatArray:
    return np.asarray(np.degrees(np.unwrap(np.angle(transmission(network, trace)), axis=-1)))


def _variation(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], aperture: float, trace: str
) -> Found:
    f = samples(f_hz, *over)
    v = group_delay(f_hz, network, f, aperture, trace)
    return Found(v.max(-1) - v.min(-1), f[np.argmax(v, -1)])


KINDS = (
    FigureKind(
        "group delay",
        Dimension.TIME,
        "phase difference over `aperture`, divided by 2 pi times the aperture, at every sample of the band",
        {"over": _OVER, "at": _AT, "aperture": _APERTURE, "trace": _TRACE},
        reach_hz="aperture",
        between=group_delay,
    ),
    FigureKind(
        "group delay variation",
        Dimension.TIME,
        "greatest less least group delay of the band",
        {"over": Parameter("range", Dimension.FREQUENCY), "aperture": _APERTURE, "trace": _TRACE},
        scalar=_variation,
        reach_hz="aperture",
    ),
    FigureKind(
        "phase",
        Dimension.ANGLE,
        "unwrapped phase of S21 from the lowest frequency of the sweep, in degrees",
        {"over": _OVER, "at": _AT, "trace": _TRACE},
        trace=_phase,
        local=False,
    ),
)
