"""Figures of level: loss, gain, rejection, reflection, ripple."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import decibels, in_band
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["KINDS", "reflection", "transmission"]

_OVER = Parameter("range", Dimension.FREQUENCY, optional=True)
_AT = Parameter("value", Dimension.FREQUENCY, optional=True)
_PORT = Parameter("port", default=1)
_TRACE = Parameter("choice", default="S21", choices=("S21", "S12"))


def reflection(network: TwoPort | ComplexArray, port: int) -> ComplexArray:
    """S11 or S22; the reading itself where only one port was measured."""
    if not isinstance(network, TwoPort):
        return network
    return network.s11 if port == 1 else network.s22


def transmission(network: TwoPort | ComplexArray, trace: str) -> ComplexArray:
    """S21 or S12."""
    if not isinstance(network, TwoPort):
        raise TypeError("a one-port has no transmission")
    return network.parameter(trace)


def _insertion_loss(_f_hz: FloatArray, network: TwoPort, trace: str = "S21") -> FloatArray:
    return -decibels(transmission(network, trace))


def _gain(_f_hz: FloatArray, network: TwoPort, trace: str = "S21") -> FloatArray:
    return decibels(transmission(network, trace))


def _rejection(
    f_hz: FloatArray, network: TwoPort, trace: str = "S21", against: tuple[float, float] | None = None
) -> FloatArray:
    loss = -decibels(transmission(network, trace))
    if against is None:
        return loss
    return np.asarray(loss - in_band(f_hz, loss, *against)[1].min(-1, keepdims=True))


def _return_loss(_f_hz: FloatArray, network: TwoPort | ComplexArray, port: int = 1) -> FloatArray:
    return -decibels(reflection(network, port))


def _vswr(_f_hz: FloatArray, network: TwoPort | ComplexArray, port: int = 1) -> FloatArray:
    magnitude = np.minimum(np.abs(reflection(network, port)), 1.0 - 1e-9)
    return np.asarray((1.0 + magnitude) / (1.0 - magnitude))


def _mismatch_loss(_f_hz: FloatArray, network: TwoPort | ComplexArray, port: int = 1) -> FloatArray:
    power = np.minimum(np.abs(reflection(network, port)) ** 2, 1.0 - 1e-9)
    return np.asarray(-10.0 * np.log10(1.0 - power))


def _ripple(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str = "S21") -> Found:
    f, v = in_band(f_hz, decibels(transmission(network, trace)), *over)
    return Found(v.max(-1) - v.min(-1), f[np.argmin(v, -1)])


def _reciprocity(_f_hz: FloatArray, network: TwoPort) -> FloatArray:
    return np.abs(network.s21 - network.s12)


def _level(name: str, meaning: str, trace: object, sense: int = -1, **extra: Parameter) -> FigureKind:
    return FigureKind(
        name,
        Dimension.RATIO,
        meaning,
        {"over": _OVER, "at": _AT, "trace": _TRACE, **extra},
        trace=trace,  # type: ignore[arg-type]
        sense=sense,
    )


def _port(name: str, dimension: Dimension, meaning: str, trace: object, sense: int = 0) -> FigureKind:
    parameters = {"over": _OVER, "at": _AT, "port": _PORT}
    return FigureKind(name, dimension, meaning, parameters, ports=1, trace=trace, sense=sense)  # type: ignore[arg-type]


KINDS = (
    _level("insertion loss", "-20 log10 |S21| at every sample of the band", _insertion_loss),
    _level("gain", "+20 log10 |S21| at every sample of the band", _gain, sense=1),
    _level(
        "rejection",
        "-20 log10 |S21| at every sample of the band, less the least loss of the band `against` where that "
        "is given",
        _rejection,
        against=Parameter("range", Dimension.FREQUENCY, optional=True),
    ),
    _port(
        "return loss",
        Dimension.RATIO,
        "-20 log10 |S11| (port 2: |S22|) at every sample of the band",
        _return_loss,
        sense=-1,
    ),
    _port("VSWR", Dimension.NUMBER, "(1 + |S11|) / (1 - |S11|) at every sample of the band", _vswr),
    _port(
        "mismatch loss",
        Dimension.RATIO,
        "-10 log10 (1 - |S11|^2) at every sample of the band",
        _mismatch_loss,
    ),
    FigureKind(
        "ripple",
        Dimension.RATIO,
        "greatest less least 20 log10 |S21| of the band",
        {"over": Parameter("range", Dimension.FREQUENCY), "trace": _TRACE},
        scalar=_ripple,
    ),
    FigureKind(
        "reciprocity",
        Dimension.NUMBER,
        "|S21 - S12| at every sample of the band, linear",
        {"over": _OVER, "at": _AT},
        trace=_reciprocity,
    ),
)
