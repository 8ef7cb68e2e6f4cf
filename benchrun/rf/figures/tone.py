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
    """Source level at which the gain has first fallen by ``drop`` dB from that at the lowest level.

    Between the two levels around the crossing the gain is taken as linear in dB over dBm.

    Returns
    -------
    numpy.ndarray
        In dBm, ``(...,)``; nan where the gain does not fall that far.
    """
    gain, source = tone.gain_db, np.broadcast_to(tone.source_dbm, tone.gain_db.shape)
    threshold = gain[..., :1] - drop
    below = gain <= threshold
    right = np.argmax(below, -1)[..., np.newaxis]
    left = np.maximum(right - 1, 0)

    def take(values: FloatArray, index: np.ndarray[tuple[int, ...], np.dtype[np.intp]]) -> FloatArray:
        return np.take_along_axis(values, index, -1)

    g0, g1 = take(gain, left), take(gain, right)
    weight = np.clip((g0 - threshold) / np.where(g0 == g1, 1.0, g0 - g1), 0.0, 1.0)
    crossing = take(source, left) + weight * (take(source, right) - take(source, left))
    return np.where(below.any(-1), crossing[..., 0], np.nan)


def _carrier(f_hz: FloatArray, shape: tuple[int, ...]) -> FloatArray:
    return np.full(shape, float(f_hz[0]))


def _gain(f_hz: FloatArray, tone: Tone) -> Found:
    value = tone.gain_db[..., 0]
    return Found(value, _carrier(f_hz, value.shape))


def _output(f_hz: FloatArray, tone: Tone) -> Found:
    value = tone.output_dbm[..., -1]
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
    value = compression(tone, drop) + tone.gain_db[..., 0] - drop
    return Found(value, _carrier(f_hz, value.shape))


def _kind(
    name: str, dimension: Dimension, meaning: str, scalar: object, **parameters: Parameter
) -> FigureKind:
    return FigureKind(name, dimension, meaning, parameters, ports=2, scalar=scalar, domain="tone")  # type: ignore[arg-type]


KINDS = (
    _kind(
        "tone gain",
        Dimension.RATIO,
        "carrier behind the unit less carrier behind a thru, at the lowest level",
        _gain,
    ),
    _kind("output level", Dimension.POWER, "source level plus gain, at the highest level", _output),
    _kind(
        "harmonic level",
        Dimension.RATIO,
        "the strongest harmonic read, relative to the carrier, at the highest level",
        _harmonics,
    ),
    _kind(
        "input compression",
        Dimension.POWER,
        "source level at which the gain has first fallen by `drop` from that at the lowest level",
        _input_compression,
        drop=_DROP,
    ),
    _kind(
        "output compression",
        Dimension.POWER,
        "output level where the gain has first fallen by `drop` from that at the lowest level",
        _output_compression,
        drop=_DROP,
    ),
)
