"""Faults that any part can have, whatever it is made of."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np

from sim_instruments.parts.base import Part, Surroundings
from sim_instruments.waves import Matrix, Real, chain, from_abcd

__all__ = ["GENERAL", "is_general", "spoiled"]

GENERAL = ("connector loose", "connector 2 loose")
"""In words, as files give them."""
_CONTACT_OHM, _GAP_H = 4.0, 1.2e-9
"""A centre pin that hardly touches: resistance, and the current's way round the gap."""


def is_general(fault: str) -> bool:
    """Whether any part can have it."""
    return re.fullmatch(r"connector( [12])? loose", fault) is not None


def spoiled(part: Part, fault: str) -> Part:
    """The part with a general fault."""
    at_two = "2" in fault

    def loose(f_hz: Real) -> Matrix:
        one, zero = np.ones(len(f_hz), np.complex128), np.zeros(len(f_hz), np.complex128)
        return from_abcd(one, np.asarray(_CONTACT_OHM + 2j * np.pi * f_hz * _GAP_H), zero, one)

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        inner = part.response(f_hz, around)
        if part.ports == 1:
            gamma = inner[:, 0, 0]
            z = 50.0 * (1 + gamma) + (_CONTACT_OHM + 2j * np.pi * f_hz * _GAP_H) * (1 - gamma)
            return np.asarray((z - 50.0 * (1 - gamma)) / (z + 50.0 * (1 - gamma)))[:, None, None]
        return chain(inner, loose(f_hz)) if at_two else chain(loose(f_hz), inner)

    return replace(part, response=response)
