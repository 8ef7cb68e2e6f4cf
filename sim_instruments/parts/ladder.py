"""Ladders of coils, capacitors and resistors with Q, self-resonance, tolerance and faults."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings, known_keys
from sim_instruments.values import number, share
from sim_instruments.waves import Matrix, Plane, Real, from_abcd

__all__ = ["Element", "ladder"]

_OPEN_JOINT_F = 0.03e-12
"""What is left across a cracked solder joint, in farad."""
_BRIDGE_OHM, _BRIDGE_H = 5e-3, 0.5e-9
"""A blob of solder."""

_RESONANT_OHM = 1e-12
"""What is left of a lossless pair exactly at its resonance, so that nothing is divided by zero."""


@dataclass(frozen=True)
class Element:
    """One branch of a ladder.

    Parameters
    ----------
    name
        As on the drawing: ``C1``, ``L2``.
    place
        ``"series"`` or ``"shunt"``.
    what
        ``"coil"``, ``"capacitor"`` or ``"resistor"``.
    value
        In H, F or ohm.
    q
        Unloaded Q at ``q_at_hz``; a coil's grows with the root of frequency, a capacitor's falls with it.
    resonance_hz
        Self-resonance; 0 for none.
    drift_ppm
        Change per kelvin.
    lead_h
        Inductance of a resistor's leads.
    broken
        An open solder joint.
    joined
        In one branch with the element before it: ``"across"`` it or ``"in line"`` with it.
    """

    name: str
    place: str
    what: str
    value: float
    q: float = np.inf
    q_at_hz: float = 100e6
    resonance_hz: float = 0.0
    drift_ppm: float = 0.0
    lead_h: float = 0.0
    broken: bool = False
    joined: str = ""

    def impedance(self, f_hz: Real, around: Surroundings) -> Plane:
        """Impedance in ohm, ``(f,)``."""
        w = 2 * np.pi * f_hz
        value = self.value * (1 + self.drift_ppm * 1e-6 * (around.temperature_c - 23.0))
        if self.what == "coil":
            loss = 2 * np.pi * self.q_at_hz * value / self.q * np.sqrt(f_hz / self.q_at_hz)
            z = loss + 1j * w * value
            if self.resonance_hz:  # winding capacitance across it
                stray = 1 / ((2 * np.pi * self.resonance_hz) ** 2 * value)
                z = z / (1 + 1j * w * stray * z)
        elif self.what == "capacitor":
            loss = 1 / (2 * np.pi * self.q_at_hz * value * self.q) * np.sqrt(f_hz / self.q_at_hz)
            z = loss + 1 / (1j * w * value)
            if self.resonance_hz:  # lead inductance in line with it
                z = z + 1j * w / ((2 * np.pi * self.resonance_hz) ** 2 * value)
        else:
            z = value + 1j * w * self.lead_h
        if self.broken:
            z = z + 1 / (1j * w * _OPEN_JOINT_F)
        return np.asarray(z)


def ladder(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A ladder from its description.

    Parameters
    ----------
    spec
        ``elements``: a list of ``{name, place, coil | capacitor | resistor, q, q at, resonance, tolerance,
        spread, drift, lead, joined}``; ``joined``: across or in line, in one branch with the element before;
        ``spread``: ``normal`` (tolerance is two sigma) or ``uniform`` (its limits);
        ``faults``: a list such as ``"L2 +15 %"``, ``"open joint at C1"``, ``"C3 = 39 pF"`` or
        ``"solder bridge across L2"``;
        ``exact``: no tolerance is drawn.
    draws
        For tolerances; a normal one is cut at two sigma.

    Raises
    ------
    ValueError
        For an element or fault that makes no sense.
    """
    known_keys(spec, "elements", "exact")
    elements = [_element(e, None if spec.get("exact") else draws) for e in spec["elements"]]
    for k, element in enumerate(elements):
        if element.joined and (k == 0 or elements[k - 1].place != element.place):
            raise ValueError(f"element {element.name} is joined to none: none of its place stands before it")
    faults = [str(f) for f in spec.get("faults", ())]
    for fault in faults:
        elements = _with_fault(elements, fault)
    return Part(2, lambda f_hz, around: _response(elements, f_hz, around), "; ".join(faults) or "good")


def _element(spec: Mapping[str, Any], draws: Draws | None) -> Element:
    what = next((w for w in ("coil", "capacitor", "resistor") if w in spec), None)
    if what is None or spec.get("place") not in ("series", "shunt"):
        raise ValueError(f"element {spec!r} needs `place` and one of coil, capacitor, resistor")
    known_keys(
        spec, "name", "place", what, "q", "q at", "resonance", "tolerance", "spread", "drift", "lead",
        "joined",
    )  # fmt: skip
    name, spread = str(spec["name"]), spec.get("spread", "normal")
    off, limit = 0.0, share(spec.get("tolerance", "0 %"))
    joined = str(spec.get("joined", ""))
    if joined not in ("", "across", "in line"):
        raise ValueError(f"element {name}: it is joined across the one before or in line, not {joined!r}")
    if spread not in ("normal", "uniform"):
        raise ValueError(f"a spread is normal or uniform, not {spread!r}")
    if draws:
        off = draws.normal(name, limit / 2) if spread == "normal" else draws.uniform(name, -limit, limit)
    value = number(spec[what]) * (1.0 + off)
    if not value > 0:
        raise ValueError(f"element {name} of {value:g} cannot be")
    return Element(
        name, spec["place"], what, value, number(spec.get("q", np.inf)), number(spec.get("q at", 100e6)),
        number(spec.get("resonance", 0.0)), number(spec.get("drift", 0.0)), number(spec.get("lead", 0.0)),
        joined=joined,
    )  # fmt: skip


def _with_fault(elements: list[Element], fault: str) -> list[Element]:
    shift = re.fullmatch(r"(\w+) ([+-][\d.]+) ?%", fault)
    wrong = re.fullmatch(r"(\w+) = (.+)", fault)
    joint = re.fullmatch(r"open joint at (\w+)", fault)
    bridge = re.fullmatch(r"solder bridge across (\w+)", fault)
    found = shift or wrong or joint or bridge
    names = [e.name for e in elements]
    if found is None or found[1] not in names:
        raise ValueError(f"fault {fault!r} makes no sense here; parts are {', '.join(names)}")
    i = names.index(found[1])
    if shift:
        changed = replace(elements[i], value=elements[i].value * (1 + float(shift[2]) / 100))
    elif wrong:
        changed = replace(elements[i], value=number(wrong[2]))
    elif bridge:
        changed = replace(elements[i], what="resistor", value=_BRIDGE_OHM, lead_h=_BRIDGE_H)
    else:
        changed = replace(elements[i], broken=True)
    return [*elements[:i], changed, *elements[i + 1 :]]


def _response(elements: list[Element], f_hz: Real, around: Surroundings) -> Matrix:
    one, zero = np.ones(len(f_hz), np.complex128), np.zeros(len(f_hz), np.complex128)
    a, b, c, d = one, zero, zero, one
    for branch in _branches(elements):
        z = branch[0].impedance(f_hz, around)
        for element in branch[1:]:
            other = element.impedance(f_hz, around)
            around_it = z + other
            around_it = np.where(around_it == 0.0, _RESONANT_OHM, around_it)
            z = z * other / around_it if element.joined == "across" else around_it
        if branch[0].place == "series":
            b, d = a * z + b, c * z + d
        else:
            a, c = a + b / z, c + d / z
    return from_abcd(a, b, c, d)


def _branches(elements: list[Element]) -> list[list[Element]]:
    branches: list[list[Element]] = []
    for element in elements:
        if element.joined:
            branches[-1].append(element)
        else:
            branches.append([element])
    return branches
