"""What the methods ask of readings before they believe them."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Connection, Hookup
from benchrun.rf.calibration.method import Readings
from benchrun.rf.calibration.one_port import finite, own_reflection
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["LOADS", "Leaks", "believed", "joined", "leaks", "pair", "reflections"]

LOADS = Hookup((Connection(("load",), (1,)), Connection(("load",), (2,))))
"""A load on each port: what passes then is leakage."""

Leaks = tuple[ComplexArray | complex, ComplexArray | complex]
"""Leakage forward and reverse."""

_WEAKEST = 1e-4


def believed(planes: Iterable[ComplexArray], what: str) -> None:
    """Refuse readings that hold no number somewhere.

    Raises
    ------
    InvalidMeasurement
        Naming ``what``.
    """
    if not all(finite(plane) for plane in planes):
        raise InvalidMeasurement(
            f"The reading of the {what} holds a value that is not a number.", f"Read the {what} again."
        )


def joined(read: TwoPort, what: str) -> TwoPort:
    """Refuse a reading of something that should join the ports but lets nothing through.

    Raises
    ------
    InvalidMeasurement
        Below -80 dB in either direction, or not a number.
    """
    believed(read.planes, what)
    weakest = float(min(np.min(np.abs(read.s21)), np.min(np.abs(read.s12))))
    if not weakest > _WEAKEST:
        raise InvalidMeasurement(
            f"The {what} lets through only {20 * np.log10(max(weakest, 1e-12)):.0f} dB somewhere in the "
            "sweep.",
            f"Join the two ports with the {what}, tighten both sides, and read it again.",
        )
    return read


def leaks(readings: Readings, isolation: bool) -> Leaks:
    """Leakage forward and reverse from a load on each port; zero unless asked for."""
    if not isolation:
        return 0.0, 0.0
    read = readings[LOADS.text]
    believed((read.s21, read.s12), "loads for isolation")
    return read.s21, read.s12


def reflections(readings: Readings, name: str, ports: tuple[int, ...]) -> list[ComplexArray]:
    """The own reflection of a standard on each port."""
    found = [own_reflection(readings[Hookup.of(name, port).text], port) for port in ports]
    for plane, port in zip(found, ports, strict=True):
        believed((plane,), f"{name} on port {port}")
    return found


def pair(readings: Readings, name: str, switch: SwitchTerms, leak: Leaks) -> TwoPort:
    """What joins the ports, freed of leakage and switch terms."""
    read = joined(readings[Hookup.of(name, 1, 2).text], name)
    if isinstance(leak[0], np.ndarray):
        read = TwoPort(read.s11, read.s12 - leak[1], read.s21 - leak[0], read.s22)
    return switch.unterminate(read)
