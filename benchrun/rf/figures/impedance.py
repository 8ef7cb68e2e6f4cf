r"""Figures of impedance: what a reflection means as a circuit in series or in parallel.

:math:`Z = Z_0 (1 + \Gamma)/(1 - \Gamma)` with the real reference impedance `reference` (definition; any
transmission-line text). Values are taken from the interpolated reflection, not interpolated themselves:
between two samples the reflection moves on a straight line of the complex plane, while its impedance may
pass a pole. At a pole (a perfect open for series values, a short for parallel ones) there is no value.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import at
from benchrun.rf.figures.kind import FigureKind, Parameter
from benchrun.rf.figures.level import reflection
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["KINDS"]

_PARAMETERS = {
    "over": Parameter("range", Dimension.FREQUENCY, optional=True),
    "at": Parameter("value", Dimension.FREQUENCY, optional=True),
    "port": Parameter("port", default=1),
}
_REFERENCE = Parameter("value", Dimension.IMPEDANCE, default=50.0)


def _between(f_hz: FloatArray, plane: ComplexArray, where_hz: FloatArray) -> ComplexArray:
    return np.asarray(at(f_hz, plane.real, where_hz) + 1j * at(f_hz, plane.imag, where_hz))


def _ratio(above: FloatArray, below: FloatArray) -> FloatArray:
    with np.errstate(divide="ignore", invalid="ignore"):
        value = above / below
    return np.asarray(np.where(np.isfinite(value), value, np.nan))


def _figure(
    name: str, dimension: Dimension, meaning: str, value: Callable[[ComplexArray, float], FloatArray]
) -> FigureKind:
    def between(
        f_hz: FloatArray,
        network: TwoPort | ComplexArray,
        where_hz: FloatArray,
        port: int = 1,
        reference: float = 50.0,
    ) -> FloatArray:
        return value(_between(f_hz, reflection(network, port), where_hz), reference)

    parameters = {**_PARAMETERS, "reference": _REFERENCE} if dimension is Dimension.IMPEDANCE else _PARAMETERS
    where = "at every sample of the band, of the reflection interpolated between samples"
    return FigureKind(name, dimension, f"{meaning}, {where}", parameters, ports=1, between=between)


def _power(gamma: ComplexArray) -> FloatArray:
    return np.asarray(1.0 - gamma.real**2 - gamma.imag**2)


def _square(value: ComplexArray) -> FloatArray:
    return np.asarray(value.real**2 + value.imag**2)


KINDS = (
    _figure(
        "resistance",
        Dimension.IMPEDANCE,
        "real part of Z = `reference` (1 + S11) / (1 - S11)",
        lambda g, z0: z0 * _ratio(_power(g), _square(1.0 - g)),
    ),
    _figure(
        "reactance",
        Dimension.IMPEDANCE,
        "imaginary part of Z = `reference` (1 + S11) / (1 - S11)",
        lambda g, z0: z0 * _ratio(2.0 * g.imag, _square(1.0 - g)),
    ),
    _figure(
        "impedance",
        Dimension.IMPEDANCE,
        "magnitude of Z = `reference` (1 + S11) / (1 - S11)",
        lambda g, z0: z0 * _ratio(np.abs(1.0 + g), np.abs(1.0 - g)),
    ),
    _figure(
        "parallel resistance",
        Dimension.IMPEDANCE,
        "1 / Re Y of the admittance Y = (1 - S11) / (1 + S11) / `reference`",
        lambda g, z0: z0 * _ratio(_square(1.0 + g), _power(g)),
    ),
    _figure(
        "parallel reactance",
        Dimension.IMPEDANCE,
        "-1 / Im Y of the admittance Y = (1 - S11) / (1 + S11) / `reference`",
        lambda g, z0: z0 * _ratio(_square(1.0 + g), 2.0 * g.imag),
    ),
    _figure(
        "Q",
        Dimension.NUMBER,
        "|Im Z| / Re Z of the impedance Z behind S11 (the same as |Im Y| / Re Y); negative where |S11| > 1",
        lambda g, _z0: _ratio(np.abs(2.0 * g.imag), _power(g)),
    ),
)
