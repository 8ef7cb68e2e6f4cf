"""Figures of phase: phase, group delay and its variation."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import at, in_band
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "group_delay"]

_OVER = Parameter("range", Dimension.FREQUENCY, optional=True)
_AT = Parameter("value", Dimension.FREQUENCY, optional=True)
_TRACE = Parameter("choice", default="S21", choices=("S21", "S12"))
_APERTURE = Parameter("value", Dimension.FREQUENCY)


def group_delay(f_hz: FloatArray, network: TwoPort, aperture: float, trace: str = "S21") -> FloatArray:
    r"""Group delay with a stated aperture.

    :math:`\tau(f) = -\frac{\varphi(f+a/2)-\varphi(f-a/2)}{2\pi a}` with the unwrapped phase interpolated
    linearly between samples. Samples nearer than half an aperture to the end of the sweep have no value.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    network
        Planes ``(..., f)``.
    aperture
        In Hz; at least one grid step, or the interpolation would only repeat itself.

    Returns
    -------
    numpy.ndarray
        Seconds, ``(..., f)``; nan near the ends.
    """
    phase = np.unwrap(np.angle(transmission(network, trace)), axis=-1)
    inside = (f_hz - aperture / 2 >= f_hz[0] * (1 - 1e-12)) & (f_hz + aperture / 2 <= f_hz[-1] * (1 + 1e-12))
    result = np.full(phase.shape, np.nan)
    centre = f_hz[inside]
    step = at(f_hz, phase, centre + aperture / 2) - at(f_hz, phase, centre - aperture / 2)
    result[..., inside] = -step / (2.0 * np.pi * aperture)
    return result


def _phase(f_hz: FloatArray, network: TwoPort, trace: str = "S21") -> FloatArray:
    return np.asarray(np.degrees(np.unwrap(np.angle(transmission(network, trace)), axis=-1)))


def _variation(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], aperture: float, trace: str
) -> Found:
    f, v = in_band(f_hz, group_delay(f_hz, network, aperture, trace), *over)
    return Found(v.max(-1) - v.min(-1), f[np.argmax(v, -1)])


KINDS = (
    FigureKind(
        "group delay",
        Dimension.TIME,
        "phase difference over `aperture`, divided by 2 pi times the aperture, at every sample of the band",
        {"over": _OVER, "at": _AT, "aperture": _APERTURE, "trace": _TRACE},
        trace=group_delay,
        reach_hz="aperture",
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
    ),
)
