"""Figures of a response's shape: how steeply and how far out it stops."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.band import decibels, in_band
from benchrun.rf.figures.crossing import edge
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.figures.level import transmission
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["KINDS", "outermost"]

_DROP = Parameter("value", Dimension.RATIO, default=3.0)
_TRACE = Parameter("choice", default="S21", choices=("S21", "S12"))


def _first_down(f_hz: FloatArray, level_db: FloatArray, threshold_db: FloatArray) -> FloatArray:
    """Where a trace first reaches a threshold ``(...,)``, going up; nan if it never does.

    Linear in dB over frequency between the two samples around the crossing. If the first sample is there
    already, its own frequency.
    """
    below = level_db <= threshold_db[..., np.newaxis]
    right = np.argmax(below, -1)[..., np.newaxis]
    left = np.maximum(right - 1, 0)
    v0, v1 = np.take_along_axis(level_db, left, -1), np.take_along_axis(level_db, right, -1)
    weight = np.clip((v0 - threshold_db[..., np.newaxis]) / np.where(v0 == v1, 1.0, v0 - v1), 0.0, 1.0)
    crossing = f_hz[left] + weight * (f_hz[right] - f_hz[left])
    return np.where(below.any(-1), crossing[..., 0], np.nan)


def outermost(f_hz: FloatArray, level_db: FloatArray, drop_db: float, upper: bool) -> FloatArray:
    """Frequency beyond which a response stays at least ``drop_db`` below its peak, to the sweep's end.

    The *last* crossing going outwards from the greatest sample, where :func:`.crossing.edge` gives the
    first; the two differ where the response comes back up in its stop band. Between the two samples
    around the crossing the level is taken as linear in dB over frequency.

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
        ``(...,)``; nan where the sweep's end itself is not that far down, so that nothing is known of
        what follows.
    """
    if not upper:
        return -outermost(-f_hz[::-1], level_db[..., ::-1], drop_db, True)
    threshold = level_db.max(-1) - drop_db
    # From the far end inwards: the first sample that is above.
    above = level_db[..., ::-1] > threshold[..., np.newaxis]
    back = np.argmax(above, -1)[..., np.newaxis]
    left = level_db.shape[-1] - 1 - back
    right = np.minimum(left + 1, level_db.shape[-1] - 1)
    v0, v1 = np.take_along_axis(level_db, left, -1), np.take_along_axis(level_db, right, -1)
    weight = np.clip((v0 - threshold[..., np.newaxis]) / np.where(v0 == v1, 1.0, v0 - v1), 0.0, 1.0)
    crossing = f_hz[left] + weight * (f_hz[right] - f_hz[left])
    return np.where(back[..., 0] > 0, crossing[..., 0], np.nan)


def _shape(f_hz: FloatArray, network: TwoPort, drop: float, outer: float, trace: str) -> Found:
    level = decibels(transmission(network, trace))
    low, high = edge(f_hz, level, drop, False), edge(f_hz, level, drop, True)
    wide = edge(f_hz, level, outer, True) - edge(f_hz, level, outer, False)
    return Found(wide / (high - low), (low + high) / 2.0)


def _loaded_q(f_hz: FloatArray, network: TwoPort, drop: float, trace: str) -> Found:
    level = decibels(transmission(network, trace))
    low, high = edge(f_hz, level, drop, False), edge(f_hz, level, drop, True)
    centre = np.sqrt(low * high)
    return Found(centre / (high - low), centre)


def _stop_edge(f_hz: FloatArray, network: TwoPort, drop: float, side: str, trace: str) -> Found:
    found = outermost(f_hz, decibels(transmission(network, trace)), drop, side == "upper")
    return Found(found, found)


def _nearest(f_hz: FloatArray, network: TwoPort, over: tuple[float, float], drop: float, trace: str) -> Found:
    level = decibels(transmission(network, trace))
    band_f, band = in_band(f_hz, level, *over)
    threshold = band.max(-1) - drop
    # Outwards from each edge of the band, the edge itself included as a sample.
    first, last = np.searchsorted(f_hz, over[0], "left"), np.searchsorted(f_hz, over[1], "right")
    up_f = np.concatenate([band_f[-1:], f_hz[last:]])
    up = _first_down(up_f, np.concatenate([band[..., -1:], level[..., last:]], -1), threshold)
    down_f = np.concatenate([-band_f[:1], -f_hz[:first][::-1]])
    outward = np.concatenate([band[..., :1], level[..., :first][..., ::-1]], -1)
    down = -_first_down(down_f, outward, threshold)
    away_up, away_down = up - over[1], over[0] - down
    nearer_up = np.isnan(away_down) | (away_up <= away_down)
    return Found(np.where(nearer_up, away_up, away_down), np.where(nearer_up, up, down))


KINDS = (
    FigureKind(
        "shape factor",
        Dimension.NUMBER,
        "bandwidth at `outer` below the peak of |S21|, divided by the bandwidth at `drop` below it; first "
        "crossings going outwards, both of both levels within the sweep",
        {"drop": _DROP, "outer": Parameter("value", Dimension.RATIO), "trace": _TRACE},
        scalar=_shape,
    ),
    FigureKind(
        "loaded Q",
        Dimension.NUMBER,
        "geometric mean of lower and upper corner frequency at `drop` below the peak of |S21|, divided by "
        "their difference",
        {"drop": _DROP, "trace": _TRACE},
        scalar=_loaded_q,
    ),
    FigureKind(
        "stop-band edge",
        Dimension.FREQUENCY,
        "frequency beyond which |S21| stays at least `drop` below its peak up to the sweep's end, on the "
        "`edge` side of the peak; the last crossing if there are several",
        {
            "drop": Parameter("value", Dimension.RATIO),
            "edge": Parameter("choice", default="upper", choices=("upper", "lower")),
            "trace": _TRACE,
        },
        scalar=lambda f_hz, network, drop, edge, trace: _stop_edge(f_hz, network, drop, edge, trace),
    ),
    FigureKind(
        "nearest stop-band crossing",
        Dimension.FREQUENCY,
        "distance from the nearer edge of the pass band `over` outwards to where |S21| has first fallen by "
        "`drop` below its greatest value of that band, below or above it, whichever is nearer; an edge that "
        "is down already gives 0",
        {
            "over": Parameter("range", Dimension.FREQUENCY),
            "drop": Parameter("value", Dimension.RATIO),
            "trace": _TRACE,
        },
        scalar=_nearest,
        local=False,
        width=True,
    ),
)
