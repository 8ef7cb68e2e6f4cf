"""Halves of a test jig: a connector step, a line, a launch."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings, known_keys, unknown_fault
from sim_instruments.values import number
from sim_instruments.waves import Matrix, Real, chain, flip, from_abcd, line

__all__ = ["fixture"]


def fixture(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A half; port 1 on the side of analyzer port 1.

    Parameters
    ----------
    spec
        ``delay``, ``impedance``, ``loss`` (dB at 1 GHz) of its line; ``launch``: capacitance at the unit's
        side; ``turned``: the unit sits on port 1; ``spread``: standard deviations.
    draws
        What makes this jig differ from its file.
    """
    known_keys(spec, "delay", "impedance", "loss", "launch", "turned", "spread")
    for fault in spec.get("faults", ()):
        raise unknown_fault(fault, ())
    spread = spec.get("spread", {})

    def drawn(name: str, nominal: float) -> float:
        return nominal + draws.normal(name, number(spread.get(name, 0.0)))

    delay, z = drawn("delay", number(spec["delay"])), drawn("impedance", number(spec.get("impedance", 50.0)))
    loss, launch = (
        drawn("loss", number(spec.get("loss", 0.0))),
        drawn("launch", number(spec.get("launch", 0.0))),
    )

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        one, zero = np.ones(len(f_hz), np.complex128), np.zeros(len(f_hz), np.complex128)
        shunt = from_abcd(one, zero, np.asarray(2j * np.pi * f_hz * launch, np.complex128), one)
        whole = chain(line(f_hz, delay, z, loss), shunt)
        return flip(whole) if spec.get("turned") else whole

    return Part(2, response, "jig half")
