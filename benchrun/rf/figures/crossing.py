"""Figures of frequency: where a response leaves its pass band."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import decibels
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "edge"]

_DROP = Parameter("value", Dimension.RATIO, default=3.0)
_TRACE = Parameter("choice", default="S21", choices=("S21", "S12"))


def edge(f_hz: FloatArray, level_db: FloatArray, drop_db: float, upper: bool) -> FloatArray:
    """Frequency at which a response has first fallen by ``drop_db`` from its peak, going outwards.

    The peak is the greatest sample. Of several crossings the one nearest the peak counts. Between the two
    samples around the crossing the level is taken as linear in dB over frequency.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    level_db
        ``(..., f)``.
    drop_db
        Positive.
    upper
        Above the peak, or below it.

    Returns
    -------
    numpy.ndarray
        ``(...,)``; nan where the response does not fall that far within the sweep.
    """
    if not upper:
        return -edge(-f_hz[::-1], level_db[..., ::-1], drop_db, True)
    peak = np.argmax(level_db, -1)[..., np.newaxis]
    threshold = np.take_along_axis(level_db, peak, -1) - drop_db
    below = (level_db <= threshold) & (np.arange(len(f_hz)) > peak)
    right = np.argmax(below, -1)[..., np.newaxis]
    left = np.maximum(right - 1, 0)
    v0, v1 = np.take_along_axis(level_db, left, -1), np.take_along_axis(level_db, right, -1)
    weight = np.clip((v0 - threshold) / np.where(v0 == v1, 1.0, v0 - v1), 0.0, 1.0)
    crossing = f_hz[left] + weight * (f_hz[right] - f_hz[left])
    return np.where(below.any(-1), crossing[..., 0], np.nan)


def _corner(f_hz: FloatArray, network: TwoPort, drop: float, side: str, trace: str) -> Found:
    crossing = edge(f_hz, decibels(transmission(network, trace)), drop, side == "upper")
    return Found(crossing, crossing)


def _bandwidth(f_hz: FloatArray, network: TwoPort, drop: float, trace: str) -> Found:
    level = decibels(transmission(network, trace))
    low, high = edge(f_hz, level, drop, False), edge(f_hz, level, drop, True)
    return Found(high - low, (low + high) / 2.0)


def _centre(f_hz: FloatArray, network: TwoPort, drop: float, trace: str) -> Found:
    middle = _bandwidth(f_hz, network, drop, trace).at_hz
    return Found(middle, middle)


KINDS = (
    FigureKind(
        "corner frequency",
        Dimension.FREQUENCY,
        "where |S21| has first fallen by `drop` from its peak, on the `edge` side of the peak",
        {
            "drop": _DROP,
            "edge": Parameter("choice", default="upper", choices=("upper", "lower")),
            "trace": _TRACE,
        },
        scalar=lambda f_hz, network, drop, edge, trace: _corner(f_hz, network, drop, edge, trace),
    ),
    FigureKind(
        "bandwidth",
        Dimension.FREQUENCY,
        "upper less lower corner frequency at `drop` below the peak of |S21|",
        {"drop": _DROP, "trace": _TRACE},
        scalar=_bandwidth,
        width=True,
    ),
    FigureKind(
        "centre frequency",
        Dimension.FREQUENCY,
        "mean of lower and upper corner frequency at `drop` below the peak of |S21|",
        {"drop": _DROP, "trace": _TRACE},
        scalar=_centre,
    ),
)
