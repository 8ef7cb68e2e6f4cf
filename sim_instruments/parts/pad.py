"""Attenuators: tees and pis of three resistors, with lead inductance under their shunt arms."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, known_keys
from sim_instruments.parts.ladder import ladder
from sim_instruments.values import number

__all__ = ["arms", "pad"]


def arms(loss_db: float, shape: str) -> tuple[float, float]:
    """Series and shunt resistance in ohm of a 50 ohm pad, after the usual design equations.

    Tee: ``50 (K-1)/(K+1)`` and ``100 K/(K^2-1)``; pi: ``50 (K^2-1)/(2K)`` and ``50 (K+1)/(K-1)``, with
    ``K = 10^(A/20)``.

    Raises
    ------
    ValueError
        For another shape, or a loss that is none.

    Examples
    --------
    >>> [round(r, 4) for r in arms(10, "tee")]
    [25.9747, 35.1364]
    """
    if loss_db <= 0:
        raise ValueError(f"a pad loses more than 0 dB, not {loss_db:g} dB")
    k = 10 ** (loss_db / 20)
    if shape == "tee":
        return 50 * (k - 1) / (k + 1), 100 * k / (k * k - 1)
    if shape == "pi":
        return 50 * (k * k - 1) / (2 * k), 50 * (k + 1) / (k - 1)
    raise ValueError(f"a pad is a tee or a pi, not {shape!r}")


def pad(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A pad for 50 ohm.

    Parameters
    ----------
    spec
        ``loss`` in dB; ``shape``: tee or pi; ``tolerance`` and ``drift`` (ppm/K) of each resistor; ``lead``:
        inductance in each shunt arm; ``faults`` as of a ladder with arms R1, R2, R3 from port 1 on.
    """
    known_keys(spec, "loss", "shape", "tolerance", "drift", "lead")
    shape = str(spec.get("shape", "tee"))
    series, shunt = arms(number(spec["loss"]), shape)
    common = {key: spec[key] for key in ("tolerance", "drift") if key in spec}
    places = ("series", "shunt", "series") if shape == "tee" else ("shunt", "series", "shunt")
    elements = [
        {"name": f"R{n}", "place": place, "resistor": shunt if place == "shunt" else series, **common}
        | ({"lead": spec["lead"]} if place == "shunt" and "lead" in spec else {})
        for n, place in enumerate(places, 1)
    ]
    return ladder({"elements": elements, "faults": spec.get("faults", ())}, draws)
