"""Figures of flatness: how even a transmission is inside its band."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import decibels, in_band
from benchrun.rf.figures.fit import fit
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "greatest"]

_PARAMETERS = {
    "over": Parameter("range", Dimension.FREQUENCY),
    "trace": Parameter("choice", default="S21", choices=("S21", "S12")),
}


def greatest(f_hz: FloatArray, deviation: FloatArray) -> Found:
    """Greatest absolute deviation ``(..., k)`` and where it lies."""
    size = np.abs(deviation)
    index = np.argmax(size, -1)
    return Found(np.take_along_axis(size, index[..., np.newaxis], -1)[..., 0], f_hz[index])


def _flatness(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str) -> Found:
    f, v = in_band(f_hz, decibels(transmission(network, trace)), *over)
    return greatest(f, v - fit(f, v, 1).mean[..., np.newaxis])


def _residual(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str) -> Found:
    f, v = in_band(f_hz, decibels(transmission(network, trace)), *over)
    return greatest(f, fit(f, v, 1).rest)


def _slope(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], trace: str) -> Found:
    f, v = in_band(f_hz, decibels(transmission(network, trace)), *over)
    rise = 2.0 * fit(f, v, 1).linear
    return Found(rise, np.full(rise.shape, (over[0] + over[1]) / 2.0))


KINDS = (
    FigureKind(
        "flatness",
        Dimension.RATIO,
        "greatest absolute difference of 20 log10 |S21| from its mean over the band; samples of the band "
        "and its interpolated edges, each weighing as much as the frequencies it stands for",
        _PARAMETERS,
        scalar=_flatness,
    ),
    FigureKind(
        "slope",
        Dimension.RATIO,
        "rise of the least-squares straight line through 20 log10 |S21| from the lower to the upper edge of "
        "the band, negative if it falls; its frequency is given as the middle of the band",
        _PARAMETERS,
        scalar=_slope,
    ),
    FigureKind(
        "flatness about the slope",
        Dimension.RATIO,
        "greatest absolute difference of 20 log10 |S21| from its least-squares straight line over the band",
        _PARAMETERS,
        scalar=_residual,
    ),
)
