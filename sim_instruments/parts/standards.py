"""Calibration standards as they really are: near their definition, within their maker's tolerance."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings, known_keys, unknown_fault
from sim_instruments.values import number
from sim_instruments.waves import Matrix, Plane, Real, from_abcd, seen_through, thru

__all__ = ["standard"]


def standard(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A short, open, load or thru.

    Parameters
    ----------
    spec
        ``standard``; ``delay``, ``loss`` (ohm/s at 1 GHz) and ``impedance`` of the offset line;
        ``polynomial`` of the termination (F or H over Hz); ``resistance``, ``inductance``; ``spread``:
        standard deviations by the same names (``polynomial`` for its first coefficient).
    draws
        What makes this specimen differ from the definition.
    """
    known_keys(
        spec, "standard", "delay", "loss", "impedance", "polynomial", "resistance", "inductance", "spread"
    )
    for fault in spec.get("faults", ()):
        raise unknown_fault(fault, ())
    which, spread = spec["standard"], spec.get("spread", {})
    if which not in ("short", "open", "load", "thru"):
        raise ValueError(f"there is no standard {which!r}; known are short, open, load, thru")

    def drawn(name: str, nominal: float) -> float:
        return nominal + draws.normal(name, number(spread.get(name, 0.0)))

    delay = drawn("delay", number(spec.get("delay", 0.0)))
    loss, z_line = number(spec.get("loss", 0.0)), number(spec.get("impedance", 50.0))
    if which == "thru":
        return Part(
            2, lambda f_hz, _: _offset(f_hz, delay, loss, z_line) if delay else thru(len(f_hz)), "thru"
        )
    first, *rest = [number(x) for x in spec.get("polynomial", [0.0])]
    polynomial = np.array([drawn("polynomial", first), *rest])
    resistance, inductance = (
        drawn("resistance", number(spec.get("resistance", 50.0))),
        drawn("inductance", number(spec.get("inductance", 0.0))),
    )

    def end(f_hz: Real) -> Plane:
        w = 2 * np.pi * f_hz
        value = sum(k * f_hz**n for n, k in enumerate(polynomial))
        if which == "open":
            z = 1 / (1j * w * np.maximum(value, 1e-27))
        elif which == "short":
            z = 1j * w * value
        elif which == "load":
            z = resistance + 1j * w * inductance
        else:
            raise ValueError(f"there is no standard {which!r}")
        return np.asarray((z - 50.0) / (z + 50.0))

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        gamma = end(f_hz)
        if delay:
            gamma = seen_through(_offset(f_hz, delay, loss, z_line), gamma)
        return gamma[:, np.newaxis, np.newaxis]

    return Part(1, response, str(which))


def _offset(f_hz: Real, delay: float, loss: float, z_line: float) -> Matrix:
    """The offset line from its distributed R, L and C.

    This is the exact form; a kit's definition uses the low-loss one, which differs by parts in 100 000.
    """
    w = 2 * np.pi * f_hz
    r = loss * delay * np.sqrt(f_hz / 1e9)
    series, shunt = r + 1j * (w * delay * z_line + r), 1j * w * delay / z_line
    # The principal root would make a line shorter than nothing one longer than nothing.
    gamma, zc = np.copysign(1.0, delay) * np.sqrt(series * shunt), np.sqrt(series / shunt)
    cosh, sinh = np.cosh(gamma), np.sinh(gamma)
    return from_abcd(cosh, zc * sinh, sinh / zc, cosh)
