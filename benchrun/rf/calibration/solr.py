"""Short, open, load on both ports and any reciprocal thru, of whose length only the sign is needed (SOLR).

Source: A. Ferrero and U. Pisani, "Two-port network analyzer calibration using an unknown thru", IEEE
Microwave and Guided Wave Letters 2 (12), 1992, as in scikit-rf's ``UnknownThru``.
"""

from __future__ import annotations

from typing import ClassVar, cast

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.one_port import REFLECTIONS, solve_three
from benchrun.rf.calibration.reading import leaks, pair, reflections
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.calibration.two_port_method import TwoPortMethod
from benchrun.rf.kit import Kit
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["ShortOpenLoadReciprocal"]

_SURE_RAD = np.radians(60.0)
"""Greatest departure of the thru's phase from its guess; at 90 degrees the sign turns over."""

_ONE_WAY_DB = 20.0
"""Greatest difference between the two directions of a raw thru: no test set is that lopsided."""


class ShortOpenLoadReciprocal(TwoPortMethod):
    """Unknown thru: its definition in the kit is a guess, right to better than a sixth of a wave."""

    name: ClassVar[str] = "SOLR"
    standards: ClassVar[tuple[str, ...]] = (*REFLECTIONS, "thru")

    def single(self, options: Options) -> tuple[str, ...]:
        """Short, open and load."""
        return REFLECTIONS

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> TwelveTerms:
        r"""Two one-port calibrations, and :math:`e_{10}e_{32} = \pm\sqrt{e_R e_R' M_{21}/M_{12}}`."""
        truths = [np.asarray(definitions[n]) for n in REFLECTIONS]
        read = [reflections(readings, n, (1, 2)) for n in REFLECTIONS]
        one, two = (solve_three(truths, [r[p] for r in read], f"port {p + 1}") for p in (0, 1))
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        thru = pair(readings, "thru", switch, leak)
        ratio = thru.s21 / thru.s12
        lopsided = float(np.max(np.abs(20.0 * np.log10(np.abs(ratio)))))
        if not lopsided < _ONE_WAY_DB:
            raise InvalidMeasurement(
                f"The thru passes {lopsided:.0f} dB more one way than the other somewhere in the sweep; it "
                f"must be reciprocal, and an analyzer alone makes less than {_ONE_WAY_DB:.0f} dB.",
                "Use a passive thru without isolator or amplifier, or a calibration with a known thru.",
            )
        k = np.sqrt(one.tracking * two.tracking * ratio) / two.tracking
        guess = cast(TwoPort, definitions["thru"]).s21
        first = EightTerms(one, two, k)
        off = np.angle(first.correct(thru).s21 / guess)
        wrong = np.abs(off) > np.pi / 2
        unsure = float(np.max(np.minimum(np.abs(off), np.pi - np.abs(off))))
        if not unsure < _SURE_RAD:
            raise InvalidMeasurement(
                f"The thru's phase is {np.degrees(unsure):.0f} degrees away from its definition somewhere in "
                f"the sweep; beyond {np.degrees(_SURE_RAD):.0f} degrees the sign of the result is not sure.",
                "Give the delay of the thru in the kit file to within a tenth of a period of the highest "
                "frequency, or use a shorter thru.",
            )
        return EightTerms(one, two, np.where(wrong, -k, k), switch, *leak).twelve()

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``UnknownThru``."""
        from skrf.calibration import UnknownThru

        make = Networks(f_hz)
        truths = [kit.standards[n].reflection(f_hz, kit.z0_ohm) for n in REFLECTIONS]
        ideals = [make.both(t, t) for t in truths]
        ideals.append(make.two(kit.standards["thru"].two_port(f_hz, kit.z0_ohm)))
        measured = [make.reflect(readings, n, isolation) for n in REFLECTIONS]
        measured.append(make.through(readings, "thru"))
        calibration = UnknownThru(measured=measured, ideals=ideals, **make.given(readings, isolation))
        return lambda raw: TwoPort.of(calibration.apply_cal(make.two(raw)).s)
