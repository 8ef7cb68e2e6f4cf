"""Two-port calibration of an analyzer that sources on one port only; the unit is turned round by hand.

The forward six terms are those of SOLT. The unit is read twice, the second time turned round, and the
two readings together are corrected as one full two-port reading, whose reverse terms are the forward
ones once more. Source: scikit-rf's ``TwoPortOnePath``.
"""

from __future__ import annotations

from typing import ClassVar, cast

import numpy as np

from benchrun.hookup import Hookup
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.one_port import REFLECTIONS, own_reflection, solve_three
from benchrun.rf.calibration.reading import LOADS, believed, joined
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.calibration.solt import far_terms
from benchrun.rf.kit import Kit
from benchrun.rf.terms import Direction, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["OnePath", "turned_round"]


def turned_round(forward: TwoPort, turned: TwoPort) -> TwoPort:
    """Join two readings of one unit, the second made with the unit turned round, to one raw reading.

    Parameters
    ----------
    forward
        ``s11`` and ``s21`` as read with the unit's port 1 on the source.
    turned
        ``s11`` and ``s21`` as read with the unit's port 2 on the source. Other planes are not looked at.
    """
    return TwoPort(forward.s11, turned.s21, forward.s21, turned.s11)


class OnePath:
    """Short, open and load on port 1, then the thru; what is corrected is a joined reading.

    See Also
    --------
    turned_round : makes the joined reading.
    """

    name: ClassVar[str] = "one-path"
    standards: ClassVar[tuple[str, ...]] = (*REFLECTIONS, "thru")
    two_port: ClassVar[bool] = True
    without_switch_terms: ClassVar[str] = ""

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Short, open, load and thru."""
        return self.standards

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """Four hook-ups, five with isolation."""
        one, thru = tuple(Hookup.of(name, 1) for name in REFLECTIONS), Hookup.of("thru", 1, 2)
        return (*one, LOADS, thru) if isolation else (*one, thru)

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> TwelveTerms:
        """Six terms, used both ways."""
        near = solve_three(
            [np.asarray(definitions[n]) for n in REFLECTIONS],
            [own_reflection(readings[Hookup.of(n, 1).text], 1) for n in REFLECTIONS],
            "port 1",
        )
        read, leak = readings[Hookup.of("thru", 1, 2).text], cast(ComplexArray | complex, 0.0)
        # The reverse planes of such an analyzer hold nothing.
        joined(TwoPort(read.s11, read.s21, read.s21, read.s11), "thru")
        if isolation:
            leak = readings[LOADS.text].s21
            believed((np.asarray(leak),), "loads for isolation")
        far = far_terms(near, read.s11, read.s21, cast(TwoPort, definitions["thru"]), leak)
        way = Direction(near.directivity, near.source_match, near.tracking, *far, leak)
        return TwelveTerms(way, way)

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``TwoPortOnePath``."""
        from skrf.calibration import TwoPortOnePath

        make = Networks(f_hz)
        truths = [kit.standards[n].reflection(f_hz, kit.z0_ohm) for n in REFLECTIONS]
        ideals = [make.both(truth, truth) for truth in truths]
        ideals.append(make.two(kit.standards["thru"].two_port(f_hz, kit.z0_ohm)))
        measured = [make.two(readings[Hookup.of(n, 1).text]) for n in REFLECTIONS]
        measured.append(make.through(readings, "thru"))
        leak = make.two(readings[LOADS.text]) if isolation else None
        calibration = TwoPortOnePath(
            measured=measured, ideals=ideals, n_thrus=1, source_port=1, isolation=leak
        )

        def correct(raw: TwoPort) -> TwoPort:
            zero = np.zeros_like(raw.s11)
            forward = make.two(TwoPort(raw.s11, zero, raw.s21, zero))
            turned = make.two(TwoPort(raw.s22, zero, raw.s12, zero))
            return TwoPort.of(calibration.apply_cal((forward, turned)).s)

        return correct
