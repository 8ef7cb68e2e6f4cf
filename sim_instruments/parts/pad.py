"""Attenuators: a tee of three resistors behind a little lead inductance."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part
from sim_instruments.parts.ladder import ladder
from sim_instruments.values import number, share

__all__ = ["pad"]


def pad(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A tee pad for 50 ohm.

    Resistances after the usual design equations (K = 10^(A/20), series 50 (K-1)/(K+1), shunt 100 K/(K^2-1)).

    Parameters
    ----------
    spec
        ``loss`` in dB; ``tolerance`` of each resistor; ``lead``: inductance of the shunt arm; ``faults`` as
        of a ladder with arms R1, R2 (shunt), R3.
    """
    k = 10 ** (number(spec["loss"]) / 20)
    series, shunt = 50 * (k - 1) / (k + 1), 100 * k / (k * k - 1)
    tolerance = {"tolerance": f"{100 * share(spec.get('tolerance', '0 %'))} %"}
    elements = [
        {"name": "R1", "place": "series", "resistor": series, **tolerance},
        {"name": "R2", "place": "shunt", "resistor": shunt, **tolerance},
        {"name": "R3", "place": "series", "resistor": series, **tolerance},
    ]
    return ladder({"elements": elements, "faults": spec.get("faults", ())}, draws)
