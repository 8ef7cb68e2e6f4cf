"""Figures of a tone through a unit: gain, output level, harmonics, compression."""

from __future__ import annotations

import numpy as np

from benchrun.quantity import Dimension
from benchrun.rf.figures.kind import FigureKind, Found, Parameter
from benchrun.rf.tone import Tone
from benchrun.rf.twoport import FloatArray

__all__ = ["KINDS", "compression"]

_DROP = Parameter("value", Dimension.RATIO, default=1.0)


def compression(tone: Tone, drop: float) -> FloatArray:
    """Input level at which the gain has first fallen by ``drop`` dB from that at the lowest level.

    Between the two levels around the crossing the gain is taken as linear in dB over dBm.

    Returns
    -------
    numpy.ndarray
        In dBm, ``(...,)``; the highest level where the gain does not fall that far: the true value is above.
    """
    gain, level = tone.gain_db, np.broadcast_to(tone.input_dbm, tone.gain_db.shape)
    threshold = gain[..., :1] - drop
    below = gain <= threshold
    right = np.argmax(below, -1)[..., np.newaxis]
    left = np.maximum(right - 1, 0)

    def take(values: FloatArray, index: np.ndarray[tuple[int, ...], np.dtype[np.intp]]) -> FloatArray:
        return np.take_along_axis(values, index, -1)

    g0, g1 = take(gain, left), take(gain, right)
    weight = np.clip((g0 - threshold) / np.where(g0 == g1, 1.0, g0 - g1), 0.0, 1.0)
    crossing = take(level, left) + weight * (take(level, right) - take(level, left))
    return np.where(below.any(-1), crossing[..., 0], level[..., -1])


def _carrier(f_hz: FloatArray, shape: tuple[int, ...]) -> FloatArray:
    return np.full(shape, float(f_hz[0]))


def _gain(f_hz: FloatArray, tone: Tone) -> Found:
    value = tone.gain_db[..., 0]
    return Found(value, _carrier(f_hz, value.shape))


def _output(f_hz: FloatArray, tone: Tone) -> Found:
    value = tone.read_dbm[..., -1, 0]
    return Found(value, _carrier(f_hz, value.shape))


def _harmonics(f_hz: FloatArray, tone: Tone) -> Found:
    levels = tone.harmonics_db[..., -1, :]
    if levels.shape[-1] == 0:
        nothing = np.full(levels.shape[:-1], np.nan)
        return Found(nothing, nothing)
    worst = np.argmax(levels, -1)
    return Found(np.take_along_axis(levels, worst[..., np.newaxis], -1)[..., 0], f_hz[worst + 1])


def _input_compression(f_hz: FloatArray, tone: Tone, drop: float) -> Found:
    value = compression(tone, drop)
    return Found(value, _carrier(f_hz, value.shape))


def _output_compression(f_hz: FloatArray, tone: Tone, drop: float) -> Found:
    level = compression(tone, drop)[..., np.newaxis]
    # At the crossing the gain is that at the lowest level less the drop; without one it is what was read.
    reached = level >= tone.input_dbm[..., -1:]
    gain = np.where(reached, tone.gain_db[..., -1:], tone.gain_db[..., :1] - drop)
    value = (level + gain)[..., 0]
    return Found(value, _carrier(f_hz, value.shape))


def _kind(
    name: str,
    dimension: Dimension,
    meaning: str,
    scalar: object,
    sides: tuple[str, ...] = ("at least", "at most"),
    **parameters: Parameter,
) -> FigureKind:
    return FigureKind(
        name,
        dimension,
        meaning,
        parameters,
        scalar=scalar,  # type: ignore[arg-type]
        domain="tone",
        sides=sides,
    )


def _supply(f_hz: FloatArray, tone: Tone) -> Found:
    value = tone.supply_a[..., -1]
    return Found(value, _carrier(f_hz, value.shape))


KINDS = (
    _kind(
        "tone gain",
        Dimension.RATIO,
        "carrier behind the unit less carrier behind a thru, at the lowest level",
        _gain,
    ),
    _kind("output level", Dimension.POWER, "carrier behind the unit, at the highest level", _output),
    _kind(
        "harmonic level",
        Dimension.RATIO,
        "the strongest harmonic read, relative to the carrier, at the highest level",
        _harmonics,
    ),
    _kind(
        "input compression",
        Dimension.POWER,
        "input level at which the gain has first fallen by `drop` from that at the lowest level; "
        "the highest level tested where it does not fall that far",
        _input_compression,
        sides=("at least",),
        drop=_DROP,
    ),
    _kind(
        "output compression",
        Dimension.POWER,
        "output level where the gain has first fallen by `drop` from that at the lowest level; "
        "the highest level tested where it does not fall that far",
        _output_compression,
        sides=("at least",),
        drop=_DROP,
    ),
    _kind(
        "supply current", Dimension.CURRENT, "current drawn from the supply, at the highest level", _supply
    ),
)
