"""Lines and cables: loss, dispersion, steps of impedance, bends, water."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings, known_keys, unknown_fault
from sim_instruments.values import number, share
from sim_instruments.waves import Matrix, Plane, Real, chain, from_abcd, two

__all__ = ["Section", "cable", "transmission_line"]

_WATER = "water in the cable"


@dataclass(frozen=True)
class Section:
    """A uniform piece of line.

    Parameters
    ----------
    delay_s
        One way, at low frequency.
    z_ohm
        Characteristic impedance.
    conductor_db, dielectric_db
        Loss at 1 GHz; the first grows with the root of frequency (skin effect), the second in proportion.
    slow, corner_hz
        Dispersion: the effective permittivity rises by the factor ``slow`` far above ``corner_hz``, in the
        form ``1 + (slow - 1) / (1 + (corner/f)^2)`` (after Getsinger's for microstrip, from memory).
    """

    delay_s: float
    z_ohm: float = 50.0
    conductor_db: float = 0.0
    dielectric_db: float = 0.0
    slow: float = 1.0
    corner_hz: float = 30e9

    def matrix(self, f_hz: Real, longer: float = 1.0) -> Matrix:
        """Its S-parameters, its delay multiplied by ``longer``."""
        delay: Real = np.asarray(self.delay_s * longer)
        if self.slow != 1.0:
            delay = delay * np.sqrt(1 + (self.slow - 1) / (1 + (self.corner_hz / f_hz) ** 2))
        ghz = f_hz / 1e9
        loss_np = (self.conductor_db * np.sqrt(ghz) + self.dielectric_db * ghz) / 8.685889638
        through: Plane = np.exp(-loss_np - 2j * np.pi * f_hz * delay)
        if self.z_ohm == 50.0:
            return two(zero := np.zeros_like(through), through, through, zero)
        cosh, sinh = (1 / through + through) / 2, (1 / through - through) / 2
        return from_abcd(cosh, np.asarray(self.z_ohm * sinh), np.asarray(sinh / self.z_ohm), cosh)


def _section(spec: Mapping[str, Any], draws: Draws) -> Section:
    known_keys(
        spec,
        "delay",
        "impedance",
        "loss",
        "dielectric loss",
        "slow",
        "corner",
        "tolerance",
        "impedance tolerance",
    )
    delay = number(spec["delay"]) * (1 + draws.normal("delay", share(spec.get("tolerance", "0 %")) / 2))
    z = number(spec.get("impedance", 50.0)) * (
        1 + draws.normal("impedance", share(spec.get("impedance tolerance", "0 %")) / 2)
    )
    if delay < 0 or z <= 0:
        raise ValueError(f"a line of {delay:g} s and {z:g} ohm cannot be")
    return Section(
        delay, z, number(spec.get("loss", 0.0)), number(spec.get("dielectric loss", 0.0)),
        number(spec.get("slow", 1.0)), number(spec.get("corner", 30e9)),
    )  # fmt: skip


def transmission_line(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A line of one or several sections with steps between them.

    Parameters
    ----------
    spec
        ``sections``: a list of ``{delay, impedance, loss, dielectric loss, slow, corner}``.
    draws
        For ``tolerance`` (of delay) and ``impedance tolerance``.
    """
    known_keys(spec, "sections")
    sections = [_section(s, draws / k) for k, s in enumerate(spec["sections"])]
    if not sections:
        raise ValueError("a line has at least one section")
    for fault in spec.get("faults", ()):
        raise unknown_fault(fault, ())

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        return chain(*(s.matrix(f_hz) for s in sections))

    return Part(2, response, "line")


def cable(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A jumper cable: a line between two connectors.

    Parameters
    ----------
    spec
        As one section of a line; ``connector``: extra capacitance at each end; ``bend``: phase change in
        degrees at 1 GHz for a usual bend; ``drift``: of the delay in ppm/K; ``faults``: ``"water in the
        cable"`` (loss up, slower, impedance down) or ``"crushed at 40 %"`` of its length.
    draws
        For its tolerances.

    Raises
    ------
    ValueError
        For another fault.
    """
    own = ("connector", "bend", "drift")
    section = _section({k: v for k, v in spec.items() if k not in own}, draws)
    crushed: float | None = None
    for fault in spec.get("faults", ()):
        if fault == _WATER:  # permittivity between the braid and the sheath rises, and so does its loss
            section = Section(
                section.delay_s * 1.06, section.z_ohm / 1.06, section.conductor_db * 1.5,
                section.dielectric_db + 1.2 * section.delay_s / 5e-9, section.slow, section.corner_hz,
            )  # fmt: skip
        elif str(fault).startswith("crushed at "):
            crushed = share(str(fault).removeprefix("crushed at "))
        else:
            raise unknown_fault(fault, (_WATER, "crushed at 40 %"))
    end_f, bend, drift = (number(spec.get(key, 0.0)) for key in own)

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        longer = 1 + drift * 1e-6 * (around.temperature_c - 23.0)
        longer += around.bend * bend / 360.0 / 1e9 / max(section.delay_s, 1e-15)
        if crushed is None:
            row = [section.matrix(f_hz, longer)]
        else:
            row = [
                section.matrix(f_hz, longer * crushed),  # the loss of a short piece is not told apart
                Section(40e-12, 28.0).matrix(f_hz),
                Section(section.delay_s, section.z_ohm).matrix(f_hz, longer * (1 - crushed)),
            ]
        if end_f:
            one, zero = np.ones(len(f_hz), np.complex128), np.zeros(len(f_hz), np.complex128)
            end = from_abcd(one, zero, np.asarray(2j * np.pi * f_hz * end_f), one)
            row = [end, *row, end]
        return chain(*row)

    return Part(2, response, "cable")
