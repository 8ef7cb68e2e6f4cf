r"""Figures of linear phase: departure from a pure delay, electrical length, parts of the group delay.

All are of the unwrapped phase: two neighbouring samples must turn by less than half a turn, or whole turns
are lost; the sweep's step bounds the delay that can be told to half its inverse.
"""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import in_band, samples
from benchrun.rf.figures.fit import Fit, fit
from benchrun.rf.figures.flat import greatest
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.figures.phase import group_delay
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "LIGHT"]

LIGHT = 299_792_458.0
"""Speed of light in vacuum, m/s (exact: the SI definition of the metre)."""

_OVER = Parameter("range", Dimension.FREQUENCY)
_TRACE = Parameter("choice", default="S21", choices=("S21", "S12"))
_PHASE = {"over": _OVER, "trace": _TRACE}
_DELAY = {"over": _OVER, "aperture": Parameter("value", Dimension.FREQUENCY), "trace": _TRACE}


def _phase(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str
) -> tuple[FloatArray, FloatArray]:
    """Unwrapped phase in radians over a band."""
    return in_band(f_hz, np.unwrap(np.angle(transmission(network, trace)), axis=-1), *over)


def _linearity(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str) -> Found:
    f, v = _phase(f_hz, network, over, trace)
    return greatest(f, np.degrees(fit(f, v, 1).rest))


def _length(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str) -> Found:
    f, v = _phase(f_hz, network, over, trace)
    turn = 2.0 * fit(f, v, 1).linear
    length = -turn / (2.0 * np.pi * (over[1] - over[0])) * LIGHT
    return Found(length, np.full(length.shape, (over[0] + over[1]) / 2.0))


def _parts(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], aperture: float, trace: str
) -> tuple[FloatArray, Fit]:
    f = samples(f_hz, *over)
    return f, fit(f, group_delay(f_hz, network, f, aperture, trace), 2)


def _middle(value: FloatArray, over: tuple[float, float]) -> Found:
    return Found(value, np.full(value.shape, (over[0] + over[1]) / 2.0))


def _linear(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], aperture: float, trace: str
) -> Found:
    return _middle(2.0 * _parts(f_hz, network, over, aperture, trace)[1].linear, over)


def _parabolic(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], aperture: float, trace: str
) -> Found:
    return _middle(_parts(f_hz, network, over, aperture, trace)[1].parabolic, over)


def _rest(
    f_hz: FloatArray, network: TwoPort, over: tuple[float, float], aperture: float, trace: str
) -> Found:
    f, parts = _parts(f_hz, network, over, aperture, trace)
    high, low = parts.rest.max(-1), parts.rest.min(-1)
    lone = np.isnan(parts.parabolic)
    return Found(np.where(lone, np.nan, high - low), f[np.argmax(parts.rest, -1)])


_SPLIT = "of the group delay over the band, split by least squares into a constant, a line and a parabola"

KINDS = (
    FigureKind(
        "phase linearity",
        Dimension.ANGLE,
        "greatest absolute difference of the unwrapped phase of S21 from its least-squares straight line "
        "over the band",
        _PHASE,
        scalar=_linearity,
    ),
    FigureKind(
        "electrical length",
        Dimension.LENGTH,
        "length of empty space with the same delay: c times the delay that is the slope of the least-squares "
        "straight line through the unwrapped phase of S21 over the band; its frequency is given as the "
        "middle of the band",
        _PHASE,
        scalar=_length,
    ),
    FigureKind(
        "group delay slope",
        Dimension.TIME,
        f"linear part {_SPLIT}: its change from the lower to the upper edge",
        _DELAY,
        scalar=_linear,
        reach_hz="aperture",
    ),
    FigureKind(
        "group delay parabola",
        Dimension.TIME,
        f"parabolic part {_SPLIT}: its rise from the middle to either edge, negative if it falls",
        _DELAY,
        scalar=_parabolic,
        reach_hz="aperture",
    ),
    FigureKind(
        "group delay ripple",
        Dimension.TIME,
        f"greatest less least of what is left {_SPLIT}",
        _DELAY,
        scalar=_rest,
        reach_hz="aperture",
    ),
)
