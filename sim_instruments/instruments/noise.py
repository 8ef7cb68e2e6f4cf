"""What receivers add to a reading: floor, trace noise, compression, spurious responses."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.values import number
from sim_instruments.waves import Matrix, Real

__all__ = ["Noise"]


class Noise:
    """Imperfections of the receivers themselves.

    Parameters
    ----------
    spec
        ``noise`` (dBm in 1 Hz); ``trace noise`` (dB rms in 1 kHz); ``compression``: dBm at a receiver at
        which it reads 0.1 dB low (none: never); ``spurious``: ``{every, level}``, a response of ``level`` dBm
        wherever a multiple of ``every`` falls into the bandwidth.
    generator
        Chance.
    """

    def __init__(self, spec: Mapping[str, Any], generator: np.random.Generator) -> None:
        self.floor_dbm_hz, self.trace_db = number(spec["noise"]), number(spec["trace noise"])
        self.compression_dbm = number(spec.get("compression", np.inf))
        spurious = spec.get("spurious")
        self.spurious = (number(spurious["every"]), number(spurious["level"])) if spurious else None
        self.generator = generator

    def on(self, m: Matrix, bandwidth_hz: float, power_dbm: float | Real, averages: int) -> Matrix:
        """A floor that source power lifts readings above, and trace noise in proportion to the reading.

        Parameters
        ----------
        m
            Readings, ``(f, 2, 2)``.
        bandwidth_hz
            Noise power goes with it.
        power_dbm
            Of the source, one or ``(f,)``.
        averages
            Noise power goes down with it.
        """
        root = np.sqrt(1.0 / averages)
        if np.ndim(power_dbm):
            power_dbm = np.asarray(power_dbm)[:, None, None]
        floor = 10 ** ((self.floor_dbm_hz + 10 * np.log10(bandwidth_hz) - power_dbm) / 20) * root
        trace = (10 ** (self.trace_db / 20) - 1) * np.sqrt(bandwidth_hz / 1e3) * root
        draws = self._complex(2, m.shape)
        seen = m
        if np.isfinite(self.compression_dbm):
            seen = m * self.compressed(power_dbm + 20 * np.log10(np.abs(m) + 1e-30))
        noise: Matrix = draws[0]  # in place: fresh draws belong to nobody else
        noise *= trace
        noise += 1.0
        noise *= seen
        draws[1] *= floor
        noise += draws[1]
        return noise

    def compressed(self, level_dbm: Real) -> Real:
        """Factor that a receiver reads too low, any shape: -0.1 dB at the stated level, cubic far below."""
        tenth = 10 ** (0.1 / 10) - 1
        return np.asarray((1 + tenth * 10 ** ((level_dbm - self.compression_dbm) / 10)) ** -0.5)

    def spurs(self, f_hz: Real, bandwidth_hz: float, power_dbm: float | Real) -> Real:
        """Spurious responses against the source, ``(f,)``, linear; 0 where there is none."""
        if self.spurious is None:
            return np.zeros(len(f_hz))
        every, level = self.spurious
        off = np.abs(f_hz - np.round(f_hz / every) * every)
        return np.where(off <= bandwidth_hz / 2, 10 ** ((level - power_dbm) / 20), 0.0)

    def alone(self, points: int) -> Matrix:
        """Readings with the source off: noise over noise, ``(f, 2, 2)``."""
        draws = self._complex(2, (points, 2, 2))
        return np.asarray(draws[0] / draws[1])

    def _complex(self, count: int, shape: tuple[int, ...]) -> Matrix:
        """Complex normal draws of unit variance."""
        points, *ports = shape
        draws = self.generator.standard_normal((count, *ports, points, 2))
        draws *= np.sqrt(0.5)
        return np.moveaxis(draws.view(np.complex128)[..., 0], -1, 1)
