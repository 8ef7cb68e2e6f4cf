"""Short, open, load on both ports and a known thru: the twelve terms (SOLT)."""

from __future__ import annotations

from typing import ClassVar, cast

import numpy as np

from benchrun.hookup import Hookup
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.one_port import REFLECTIONS, own_reflection, solve_three
from benchrun.rf.calibration.reading import LOADS, joined, leaks
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.kit import Kit
from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["ShortOpenLoadThru", "far_terms"]


def far_terms(
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
    # seen = d / q; both fractions are made one, so that only one division is made.
    d = reflection - near.directivity
    q = near.tracking + near.source_match * d
    if _flush(thru):
        load = d / q
        factor = 1.0 - near.source_match * load
    else:
        u = d - thru.s11 * q
        load = u / (thru.s12 * thru.s21 * q + thru.s22 * u)
        factor = 1.0 - near.source_match * thru.s11 - load * (thru.s22 - near.source_match * thru.determinant)
        factor *= 1.0 / thru.s21
    through = transmission - leak if isinstance(leak, np.ndarray) else transmission
    return load, through * factor


def _flush(thru: TwoPort) -> bool:
    return bool(
        not (np.any(thru.s11) or np.any(thru.s22)) and np.all(thru.s21 == 1.0) and np.all(thru.s12 == 1.0)
    )


class ShortOpenLoadThru:
    """Full two-port calibration; isolation is read with a load on each port, only on request."""

    name: ClassVar[str] = "SOLT"
    standards: ClassVar[tuple[str, ...]] = (*REFLECTIONS, "thru")

    two_port: ClassVar[bool] = True
    without_switch_terms: ClassVar[str] = ""

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Short, open, load and thru."""
        return self.standards

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """Seven hook-ups, eight with isolation."""
        ports = tuple(sorted(ports))
        one = tuple(Hookup.of(name, port) for port in ports for name in REFLECTIONS)
        thru = Hookup.of("thru", *ports)
        return (*one, LOADS, thru) if isolation else (*one, thru)

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
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
        thru, read = (
            cast(TwoPort, definitions["thru"]),
            joined(readings[Hookup.of("thru", *ports).text], "thru"),
        )
        leak = leaks(readings, isolation)
        forward = far_terms(near[0], read.s11, read.s21, thru, leak[0])
        reverse = far_terms(near[1], read.s22, read.s12, thru.flipped(), leak[1])
        return TwelveTerms(
            Direction(near[0].directivity, near[0].source_match, near[0].tracking, *forward, leak[0]),
            Direction(near[1].directivity, near[1].source_match, near[1].tracking, *reverse, leak[1]),
        )

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``TwelveTerm``."""
        from skrf.calibration import TwelveTerm

        make = Networks(f_hz)
        truths = [kit.standards[n].reflection(f_hz, kit.z0_ohm) for n in REFLECTIONS]
        ideals = [make.both(truth, truth) for truth in truths]
        ideals.append(make.two(kit.standards["thru"].two_port(f_hz, kit.z0_ohm)))
        measured = [make.reflect(readings, n) for n in REFLECTIONS]
        measured.append(make.through(readings, "thru"))
        leak = make.two(readings[LOADS.text]) if isolation else None
        calibration = TwelveTerm(measured=measured, ideals=ideals, n_thrus=1, isolation=leak)
        return lambda raw: TwoPort.of(calibration.apply_cal(make.two(raw)).s)
