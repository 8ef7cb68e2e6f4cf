"""A whip near its first resonance: series R, L, C, of which part of R radiates; and its matching network."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings, known_keys, unknown_fault
from sim_instruments.parts.ladder import ladder
from sim_instruments.values import number, share
from sim_instruments.waves import Matrix, Real, seen_through

__all__ = ["antenna"]

_HAND_SHIFT, _HAND_OHM = -0.04, 9.0
"""A hand at the tip: capacitance lowers the resonance by some percent, and flesh takes power."""


def antenna(spec: Mapping[str, Any], draws: Draws) -> Part:
    """An antenna seen at its foot, through its matching network if it has one.

    Parameters
    ----------
    spec
        ``resonance``, ``q`` (by its own resistance), ``radiation`` and ``loss`` in ohm; ``tolerance`` of the
        resonance; ``match``: elements of a ladder between its connector and its foot; ``faults``: ``"hand
        nearby"``, ``"cut -3 %"`` (its resonance), or any fault of its ladder.
    draws
        For its tolerances.
    """
    known_keys(spec, "resonance", "q", "radiation", "loss", "tolerance", "match")
    resonance = number(spec["resonance"]) * (
        1 + draws.normal("resonance", share(spec.get("tolerance", "0 %")) / 2)
    )
    r, q = number(spec["radiation"]) + number(spec.get("loss", 0.0)), number(spec["q"])
    reactance, elements, rest = q * r, spec.get("match", ()), list[str]()
    for fault in (str(f) for f in spec.get("faults", ())):
        if fault == "hand nearby":
            resonance, r = resonance * (1 + _HAND_SHIFT), r + _HAND_OHM
        elif fault.startswith("cut "):
            resonance *= 1 + share(fault.removeprefix("cut "))
        elif elements:
            rest.append(fault)
        else:
            raise unknown_fault(fault, ("hand nearby", "cut -3 %"))
    network = ladder({"elements": elements, "faults": rest}, draws / "match") if elements else None

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        z = r + 1j * reactance * (f_hz / resonance - resonance / f_hz)
        gamma = np.asarray((z - 50.0) / (z + 50.0))
        if network is not None:
            gamma = seen_through(network.response(f_hz, around), gamma)
        return gamma[:, np.newaxis, np.newaxis]

    return Part(1, response, "antenna")
