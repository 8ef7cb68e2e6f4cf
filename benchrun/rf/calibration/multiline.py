"""Multiline TRL: all lines at every frequency, weighted by what each can tell.

Source: D. C. DeGroot, J. A. Jargon, R. B. Marks, "Multiline TRL revealed", 60th ARFTG Conference, 2002,
after R. B. Marks, IEEE Trans. MTT-39 (7), 1991 (Gauss-Markov weights). Computed by scikit-rf's
``NISTMultilineTRL``, one draw after another; where draws are many, TRL with several lines is the method.
"""

from __future__ import annotations

import warnings
from typing import Any, ClassVar

import numpy as np

from benchrun.rf.calibration.definitions import define
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.lines import choose, guesses_of, length_m, refuse_beyond, refuse_equal
from benchrun.rf.calibration.method import PLAIN, Defined, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.reading import leaks, pair, reflections
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.calibration.self_calibration import sure_of_sign
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.calibration.trl import ThruReflectLine
from benchrun.rf.kit import Kit
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["MultilineThruReflectLine"]


class MultilineThruReflectLine(ThruReflectLine):
    """TRL with all lines weighted; readings of one sweep, without draws."""

    name: ClassVar[str] = "multiline TRL"

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> TwelveTerms:
        """Terms of the weighted lines, with the planes at the ends of the thru as it is defined.

        Raises
        ------
        TypeError
            Without the frequencies, or for readings with draws.
        """
        if not isinstance(definitions, Defined):
            raise TypeError("multiline TRL needs the frequencies: make the definitions with define()")
        if any(plane.ndim > 1 for two in readings.values() for plane in two.planes):
            raise TypeError("multiline TRL takes readings without draws; use TRL for many draws")
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        read = pair(readings, "thru", switch, leak)
        lines = {name: pair(readings, name, switch, leak) for name in options.lines}
        reflections(readings, options.reflect, (1, 2))
        refuse_equal(read, lines)
        guesses, thru, g = guesses_of(definitions, options)
        refuse_beyond(choose(read, lines, guesses), options.beyond_window)
        calibration = _calibration(definitions.f_hz, guesses, readings, isolation, options)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # its roots differ by no more than noise
            found = calibration.coefs
        one, two = (
            OnePortTerms(
                found[f"{way} directivity"],
                found[f"{way} source match"],
                found[f"{way} reflection tracking"],
            )
            for way in ("forward", "reverse")
        )
        reflect = one.correct(reflections(readings, options.reflect, (1,))[0]) * thru.s21
        declared = np.asarray(definitions[options.reflect])
        declared = (declared - g) / (1.0 - g * declared)
        turn = np.where(np.real(reflect * np.conj(declared)) < 0.0, -1.0, 1.0)
        sure_of_sign(reflect * turn, declared, options.reflect)
        out = turn / thru.s21
        terms = EightTerms(_scaled(one, out), _scaled(two, out), found["k"] * turn, switch, *leak)
        return (terms.renormalised(g) if np.any(g) else terms).twelve()

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's own correction with the same calibration: it examines the terms made of it."""
        definitions = define(kit, self.takes(options), f_hz)
        guesses, thru, g = guesses_of(definitions, options)
        make = Networks(f_hz)
        calibration = _calibration(f_hz, guesses, readings, isolation, options)
        declared = np.asarray(definitions[options.reflect])
        declared = (declared - g) / (1.0 - g * declared)

        def correct(raw: TwoPort) -> TwoPort:
            with warnings.catch_warnings():
                warnings.simplefilter("ignore")
                reflect = calibration.apply_cal(calibration.measured[1]).s[:, 0, 0] * thru.s21
                s = calibration.apply_cal(make.two(raw)).s
            turn = np.where(np.real(reflect * np.conj(declared)) < 0.0, -1.0, 1.0)
            s[:, 0, 0] *= turn
            s[:, 1, 1] *= turn
            z = kit.z0_ohm * (1.0 + g) / (1.0 - g)
            return make.renormalised(TwoPort.of(s * thru.s21[:, None, None]), z, kit.z0_ohm)

        return correct


def _scaled(port: OnePortTerms, factor: ComplexArray) -> OnePortTerms:
    """Terms for a reflection that is ``1 / factor`` times the one they were made for."""
    return OnePortTerms(port.directivity, port.source_match * factor, port.tracking * factor)


def _calibration(
    f_hz: FloatArray,
    guesses: dict[str, ComplexArray],
    readings: Readings,
    isolation: bool,
    options: Options,
) -> Any:
    from skrf.calibration import NISTMultilineTRL

    make = Networks(f_hz)
    return NISTMultilineTRL(
        [
            make.through(readings, "thru"),
            make.reflect(readings, options.reflect, isolation),
            *(make.through(readings, name) for name in options.lines),
        ],
        Grefls=[-1],
        l=[0.0, *(length_m(f_hz, guesses[name]) for name in options.lines)],
        gamma_root_choice="estimate",
        **make.given(readings, isolation),
    )
