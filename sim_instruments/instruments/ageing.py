"""How an instrument changes: warming up after it is switched on, drifting, following the room."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.values import number

__all__ = ["COLD_DB", "Ageing"]

COLD_DB = 0.01
"""Off by more than this an instrument says that it is warming up: bit 4 (temperature) of QUEStionable."""

_PERIODS_S = (2100.0, 5300.0, 14000.0)


class Ageing:
    """A slow complex factor on the receivers of each port.

    Parameters
    ----------
    spec
        ``warm-up``: ``{size: dB, time: s}``, what the reading is off when cold and the time constant in which
        that goes; ``on for``: how long it had been on when the world began (a day if not said); ``drift``:
        ``{size: dB, temperature: dB/K}``, rms wander over hours and what the room does. Phase moves by as
        many hundredths of a radian as the level by tenths of a dB, as one complex number would.
    draws
        Directions and phases of the wander.
    """

    def __init__(self, spec: Mapping[str, Any], draws: Draws) -> None:
        warm, drift = spec.get("warm-up", {}), spec.get("drift", {})
        self._cold, self._tau_s = number(warm.get("size", 0.0)) / 8.686, number(warm.get("time", 1200.0))
        self._on_s = number(spec.get("on for", 86400.0))
        self._wander, self._per_k = (
            number(drift.get("size", 0.0)) / 8.686,
            number(drift.get("temperature", 0.0)) / 8.686,
        )
        self._start = {p: [draws.uniform(f"start {p} {t}", 0.0, 6.283) for t in _PERIODS_S] for p in (1, 2)}
        self._way = {p: draws.phase(f"way {p}") for p in (1, 2)}

    def cold_db(self, time_s: float) -> float:
        """How far readings are off because it is not warm yet."""
        return self._cold * math.exp(-(time_s + self._on_s) / self._tau_s) * 8.686

    def factor(self, port: int, time_s: float, temperature_c: float) -> complex:
        """Factor on what the receivers of a port read."""
        cold = self.cold_db(time_s) / 8.686
        waves = sum(
            np.sin(2 * np.pi * time_s / t + s) for t, s in zip(_PERIODS_S, self._start[port], strict=True)
        )
        wander = self._wander * waves * np.sqrt(2 / len(_PERIODS_S))
        return complex(np.exp(self._way[port] * (cold + wander + self._per_k * (temperature_c - 23.0))))
