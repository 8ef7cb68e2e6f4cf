"""Short, open, load on both ports and a known thru: the twelve terms (SOLT)."""

from __future__ import annotations

from typing import ClassVar, cast

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Connection, Hookup
from benchrun.rf.calibration.method import Definitions, Examiner, Readings
from benchrun.rf.calibration.one_port import REFLECTIONS, own_reflection, solve_three
from benchrun.rf.kit import Kit
from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["ShortOpenLoadThru"]

_LOADS = Hookup((Connection(("load",), (1,)), Connection(("load",), (2,))))


def _far_terms(
    near: OnePortTerms,
    reflection: ComplexArray,
    transmission: ComplexArray,
    thru: TwoPort,
    leak: ComplexArray | complex,
) -> tuple[ComplexArray, ComplexArray]:
    """Load match and transmission tracking of one direction, from the thru seen from the driven port.

    The corrected reflection of "thru ended in the load match" is solved for the load match; for a flush
    thru this is the textbook ``eL = (M11 - eD) / (eS (M11 - eD) + eR)``.
    """
    seen = near.correct(reflection)
    u = seen - thru.s11
    load = u / (thru.s12 * thru.s21 + thru.s22 * u)
    d = 1.0 - near.source_match * thru.s11 - load * thru.s22 + near.source_match * load * thru.determinant
    return load, (transmission - leak) * d / thru.s21


class ShortOpenLoadThru:
    """Full two-port calibration; isolation is read with a load on each port, only on request."""

    name: ClassVar[str] = "SOLT"
    standards: ClassVar[tuple[str, ...]] = (*REFLECTIONS, "thru")

    def required(self, ports: tuple[int, ...], isolation: bool = False) -> tuple[Hookup, ...]:
        """Seven hook-ups, eight with isolation."""
        ports = tuple(sorted(ports))
        one = tuple(Hookup.of(name, port) for port in ports for name in REFLECTIONS)
        thru = Hookup.of("thru", *ports)
        return (*one, _LOADS, thru) if isolation else (*one, thru)

    def solve(
        self, ports: tuple[int, ...], definitions: Definitions, readings: Readings, isolation: bool = False
    ) -> TwelveTerms:
        """Twelve terms, in closed form."""
        ports = tuple(sorted(ports))  # forward always drives the lower port
        truths = [np.asarray(definitions[n]) for n in REFLECTIONS]
        near = [
            solve_three(
                truths, [own_reflection(readings[Hookup.of(n, p).text], p) for n in REFLECTIONS], f"port {p}"
            )
            for p in ports
        ]
        thru, read = cast(TwoPort, definitions["thru"]), readings[Hookup.of("thru", *ports).text]
        if not all(np.isfinite(plane).all() for plane in read.planes):
            raise InvalidMeasurement(
                "The reading of the thru holds a value that is not a number.", "Read the thru again."
            )
        weakest = float(min(np.min(np.abs(read.s21)), np.min(np.abs(read.s12))))
        if not weakest > 1e-4:
            raise InvalidMeasurement(
                f"The thru lets through only {20 * np.log10(max(weakest, 1e-12)):.0f} dB somewhere in the "
                "sweep.",
                "Join the two ports with the thru, tighten both sides, and read it again.",
            )
        leaks: tuple[ComplexArray | complex, ComplexArray | complex] = (0.0, 0.0)
        if isolation:
            leaks = readings[_LOADS.text].s21, readings[_LOADS.text].s12
        forward = _far_terms(near[0], read.s11, read.s21, thru, leaks[0])
        reverse = _far_terms(near[1], read.s22, read.s12, thru.flipped(), leaks[1])
        return TwelveTerms(
            Direction(near[0].directivity, near[0].source_match, near[0].tracking, *forward, leaks[0]),
            Direction(near[1].directivity, near[1].source_match, near[1].tracking, *reverse, leaks[1]),
        )

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
    ) -> Examiner:
        """By scikit-rf's ``TwelveTerm``."""
        import skrf
        from skrf.calibration import TwelveTerm

        frequency = skrf.Frequency.from_f(f_hz, unit="hz")

        def network(two: TwoPort) -> skrf.Network:
            return skrf.Network(frequency=frequency, s=two.matrix)

        def both(one: ComplexArray, two: ComplexArray) -> skrf.Network:
            zero = np.zeros_like(one)
            return network(TwoPort(one, zero, zero, two))

        p1, p2 = sorted(ports)
        measured, ideals = [], []
        for n in REFLECTIONS:
            truth = kit.standards[n].reflection(f_hz, kit.z0_ohm)
            ideals.append(both(truth, truth))
            measured.append(both(readings[Hookup.of(n, p1).text].s11, readings[Hookup.of(n, p2).text].s22))
        ideals.append(network(kit.standards["thru"].two_port(f_hz, kit.z0_ohm)))
        measured.append(network(readings[Hookup.of("thru", p1, p2).text]))
        leak = network(readings[_LOADS.text]) if isolation else None
        calibration = TwelveTerm(measured=measured, ideals=ideals, n_thrus=1, isolation=leak)
        return lambda raw: TwoPort.of(calibration.apply_cal(network(raw)).s)
