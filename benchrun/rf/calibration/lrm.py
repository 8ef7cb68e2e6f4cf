"""Line, reflect, match (LRM).

A known line between the ports, a reflect of which only the sign is known, and a known match; reflect and
match are the same on both ports.

Source: H.-J. Eul and B. Schiek, IEEE Trans. MTT-39 (4), 1991; examined by scikit-rf's ``LRM`` (after Zhao
et al., Appl. Sci. 7, 2017).
"""

from __future__ import annotations

from typing import ClassVar, cast

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.reading import leaks, pair, reflections
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.calibration.self_calibration import boxes, carried, nearest_root, sure_of_sign
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.calibration.two_port_method import TwoPortMethod
from benchrun.rf.kit import Kit
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["LineReflectMatch"]


class LineReflectMatch(TwoPortMethod):
    """The known line is the kit's thru, the match its load."""

    name: ClassVar[str] = "LRM"
    standards: ClassVar[tuple[str, ...]] = ("short", "load", "thru")

    def single(self, options: Options) -> tuple[str, ...]:
        """Reflect and match."""
        return options.reflect, "load"

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> TwelveTerms:
        """Cross-ratios of four readings give the reflect, and that the rest."""
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        read, thru = pair(readings, "thru", switch, leak), cast(TwoPort, definitions["thru"])
        w1, w2 = reflections(readings, options.reflect, (1, 2))
        b, match_2 = reflections(readings, "load", (1, 2))
        for port, gap in ((1, np.abs(w1 - b)), (2, np.abs(w2 - match_2))):
            if not float(np.min(gap)) > 1e-3:
                raise InvalidMeasurement(
                    f"The readings of {options.reflect} and load on port {port} differ by only "
                    f"{np.min(gap):.1e} somewhere in the sweep, so they cannot be two standards.",
                    "Connect each of them once more and read both again.",
                )
        g = np.asarray(definitions["load"])
        # Truth with the matches of port 1 and port 2 at zero and infinity: (S - g) / (1 - y S).
        y = (thru.s22 - g) / (thru.determinant - thru.s11 * g)
        u0, u1 = y * thru.determinant - thru.s22, 1.0 - y * thru.s11
        v0, v1 = g * thru.s22 - thru.determinant, thru.s11 - g
        # The same with the readings: (w - b) / (1 - w far).
        far = carried(read, match_2)
        m11, m12, m21 = -read.determinant, read.s11, -read.s22
        here = (w1 - b) / (1.0 - w1 * far)
        there = ((m11 - b * m21) + (m12 - b) * w2) / ((m21 - far * m11) + (1.0 - far * m12) * w2)
        q = here / there
        guess = np.asarray(definitions[options.reflect])
        s = nearest_root(u1 + q * y * v1, u0 - g * u1 - q * (v1 - y * v0), -g * u0 - q * v0, guess)
        sure_of_sign(s, guess, options.reflect)
        kappa = (s - g) / ((1.0 - y * s) * here)
        n = 1.0 / (kappa - far * g)
        a, b, c = (1.0 - kappa * b * y) * n, (kappa * b - g) * n, (far - kappa * y) * n
        return boxes(a, b, c, read, thru).twelve(switch, leak)

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``LRM``."""
        from skrf.calibration import LRM

        make = Networks(f_hz)
        truths = [kit.standards[n].reflection(f_hz, kit.z0_ohm) for n in (options.reflect, "load")]
        calibration = LRM(
            measured=[
                make.through(readings, "thru"),
                *(make.reflect(readings, n, isolation) for n in (options.reflect, "load")),
            ],
            ideals=[
                make.two(kit.standards["thru"].two_port(f_hz, kit.z0_ohm)),
                *(make.both(t, t) for t in truths),
            ],
            **make.given(readings, isolation),
        )
        return lambda raw: TwoPort.of(calibration.apply_cal(make.two(raw)).s)
