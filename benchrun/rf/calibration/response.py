"""Response: one known reflection on a port, one known thru between ports, and nothing else known.

The simplest correction there is: level and phase are set right, mismatch and directivity stay. With
isolation, a load on each port gives the leakage of the transmissions and the directivity of the
reflections as well. Common practice.
"""

from __future__ import annotations

from typing import ClassVar, cast

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings, Terms
from benchrun.rf.calibration.one_port import own_reflection
from benchrun.rf.calibration.reading import LOADS, believed, joined, leaks
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.kit import Kit
from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Response"]


class Response:
    """One port: the reflection standard. Two ports: it on each port, and the thru."""

    name: ClassVar[str] = "response"
    standards: ClassVar[tuple[str, ...]] = ("short", "thru")
    two_port: ClassVar[bool] = True
    without_switch_terms: ClassVar[str] = ""

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Take the reflection standard and the thru."""
        return options.reflect, "thru"

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """One hook-up for one port, three for two; one more with isolation."""
        ports = tuple(sorted(ports))
        one = tuple(Hookup.of(options.reflect, port) for port in ports)
        if len(ports) == 1:
            return (*one, Hookup.of("load", *ports)) if isolation else one
        thru = Hookup.of("thru", *ports)
        return (*one, LOADS, thru) if isolation else (*one, thru)

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Terms:
        """Trackings, and with isolation the leakages; every match is taken as perfect."""
        ports = tuple(sorted(ports))
        near = [self._port(port, ports, definitions, readings, isolation, options) for port in ports]
        if len(ports) == 1:
            return near[0]
        thru, leak = cast(TwoPort, definitions["thru"]), leaks(readings, isolation)
        read = joined(readings[Hookup.of("thru", *ports).text], "thru")
        none = np.zeros_like(near[0].tracking)
        ahead, back = (read.s21 - leak[0]) / thru.s21, (read.s12 - leak[1]) / thru.s12
        return TwelveTerms(
            Direction(near[0].directivity, none, near[0].tracking, none, ahead, leak[0]),
            Direction(near[1].directivity, none, near[1].tracking, none, back, leak[1]),
        )

    def _port(
        self,
        port: int,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool,
        options: Options,
    ) -> OnePortTerms:
        read = own_reflection(readings[Hookup.of(options.reflect, port).text], port)
        believed((read,), f"{options.reflect} on port {port}")
        directivity = np.zeros_like(read)
        if isolation:
            loads = LOADS if len(ports) == 2 else Hookup.of("load", port)
            directivity = own_reflection(readings[loads.text], port)
            believed((directivity,), f"load on port {port}")
        tracking = (read - directivity) / np.asarray(definitions[options.reflect])
        weakest = float(np.min(np.abs(tracking)))
        if not weakest > 1e-3:
            raise InvalidMeasurement(
                f"The {options.reflect} on port {port} gives back only {weakest:.1e} of what it should "
                "somewhere in the sweep.",
                f"Connect the {options.reflect} to port {port}, tighten it, and read it again.",
            )
        return OnePortTerms(directivity, np.zeros_like(read), tracking)

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's network arithmetic, and its one-port calibration with two made-up standards."""
        from skrf.calibration import OnePort

        make, ports = Networks(f_hz), tuple(sorted(ports))
        truth = kit.standards[options.reflect].reflection(f_hz, kit.z0_ohm)
        loads = LOADS if len(ports) == 2 else Hookup.of("load", *ports)

        def port_calibration(port: int) -> OnePort:
            read = own_reflection(readings[Hookup.of(options.reflect, port).text], port)
            zero = np.zeros_like(read)
            floor = own_reflection(readings[loads.text], port) if isolation else zero
            # A port without source match reads the negative standard as far from the floor, turned round.
            measured = [make.one(p) for p in (read, 2.0 * floor - read, floor)]
            return OnePort(measured=measured, ideals=[make.one(p) for p in (truth, -truth, zero)])

        calibrations = {port: port_calibration(port) for port in ports}

        def reflection(raw: TwoPort, port: int) -> ComplexArray:
            corrected = calibrations[port].apply_cal(make.one(own_reflection(raw, port)))
            return np.asarray(corrected.s[:, 0, 0], np.complex128)

        if len(ports) == 1:
            return lambda raw: reflection(raw, ports[0])
        thru = make.two(kit.standards["thru"].two_port(f_hz, kit.z0_ohm))
        read = make.through(readings, "thru")
        nothing = TwoPort(*(np.zeros(len(f_hz), np.complex128) for _ in range(4)))
        floor = make.two(readings[LOADS.text] if isolation else nothing)

        def correct(raw: TwoPort) -> TwoPort:
            s = ((make.two(raw) - floor) / (read - floor)).s * thru.s
            return TwoPort(reflection(raw, 1), s[:, 0, 1], s[:, 1, 0], reflection(raw, 2))

        return correct
