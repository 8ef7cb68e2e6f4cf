"""A whip near its first resonance: series R, L, C, of which part of R radiates."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings
from sim_instruments.values import number, share
from sim_instruments.waves import Matrix, Real

__all__ = ["antenna"]


def antenna(spec: Mapping[str, Any], draws: Draws) -> Part:
    """An antenna seen at its foot.

    Parameters
    ----------
    spec
        ``resonance``, ``q`` (loaded by its own resistance), ``radiation`` and ``loss`` in ohm; ``tolerance``
        of the resonance; ``detuned``: a relative shift, as a hand nearby causes.
    """
    resonance = number(spec["resonance"]) * (
        1 + draws.normal("resonance", share(spec.get("tolerance", "0 %")) / 2)
    )
    resonance *= 1 + share(spec.get("detuned", "0 %"))
    r = number(spec["radiation"]) + number(spec.get("loss", 0.0))
    q = number(spec["q"])

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        z = r * (1 + 1j * q * (f_hz / resonance - resonance / f_hz))
        return np.asarray((z - 50.0) / (z + 50.0))[:, np.newaxis, np.newaxis]

    return Part(1, response, str(spec.get("detuned", "in the open")))
