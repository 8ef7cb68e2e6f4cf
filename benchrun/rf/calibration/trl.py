"""Thru, reflect, line (TRL), with one line or several, of which each frequency takes the best.

Nothing need be known but that the lines are of one kind, their lengths about, and the sign of the
reflect. Their own impedance is the reference; where the kit says that it is not the system's, the result is
brought to the system's. Source: G. F. Engen and C. A. Hoer, IEEE Trans. MTT-27 (12), 1979. Lines between
20 and 160 degrees longer than the thru: common practice.
"""

from __future__ import annotations

import warnings
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from benchrun.rf.calibration.definitions import define
from benchrun.rf.calibration.lines import (
    LineReport,
    choose,
    eigen_of,
    guesses_of,
    length_m,
    refuse_beyond,
    refuse_equal,
    report_of,
)
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings
from benchrun.rf.calibration.reading import leaks, pair, reflections
from benchrun.rf.calibration.scikit_rf import Networks
from benchrun.rf.calibration.self_calibration import boxes, refuse_unsure, root_towards
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.calibration.two_port_method import TwoPortMethod
from benchrun.rf.kit import Kit
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["ThruReflectLine"]


class ThruReflectLine(TwoPortMethod):
    """The planes are at the ends of the thru as it is defined: in its middle if it has no length."""

    name: ClassVar[str] = "TRL"
    standards: ClassVar[tuple[str, ...]] = ("short", "thru", "line")

    def single(self, options: Options) -> tuple[str, ...]:
        """Name the reflect."""
        return (options.reflect,)

    def joining(self, options: Options) -> tuple[str, ...]:
        """Thru and lines."""
        return ("thru", *options.lines)

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> TwelveTerms:
        """Eigenvectors of line over thru, then the reflect, then the thru."""
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        read = pair(readings, "thru", switch, leak)
        lines = {name: pair(readings, name, switch, leak) for name in options.lines}
        w1, w2 = reflections(readings, options.reflect, (1, 2))
        guesses, thru, g = guesses_of(definitions, options)
        if len(lines) == 1:
            name = options.lines[0]
            eigen = eigen_of(read, lines[name], guesses[name])
            report = report_of(options.lines, eigen.phase_deg[np.newaxis])
        else:
            report = choose(read, lines, guesses)
            guess = _planes(report, list(guesses.values()))
            eigen = eigen_of(read, _at_each_point(report, list(lines.values())), guess)
        if len(lines) > 1 or not report.within.all():
            refuse_equal(read, lines)
        refuse_beyond(report, options.beyond_window)
        b, far = eigen.match, eigen.far
        s11, s22, det = read.s11, read.s22, read.determinant
        # The reflect on port 1, over a: p / q; and on port 2, carried through the thru, over 1 / a: x / y.
        p, q = w1 - b, 1.0 - w1 * far
        x = (far * det - s22) + (1.0 - far * s11) * w2
        y = (b * s22 - det) + (s11 - b) * w2
        declared = np.asarray(definitions[options.reflect])
        if np.any(g):
            declared = (declared - g) / (1.0 - g * declared)
        inverse = 1.0 / (q * y)
        found, least = root_towards((p * x) * inverse * (thru.s12 * thru.s21), declared)
        refuse_unsure(least, options.reflect)
        a = (p * y) * inverse / found
        result = boxes(a, b, far * a, read, thru)
        if np.any(g):
            return result.eight(switch, leak).renormalised(g).twelve()
        return result.twelve(switch, leak)

    @staticmethod
    def report(
        definitions: Definitions, readings: Readings, isolation: bool = False, options: Options = PLAIN
    ) -> LineReport:
        """Which line has what phase where, and which one is used."""
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        lines = {name: pair(readings, name, switch, leak) for name in options.lines}
        return choose(pair(readings, "thru", switch, leak), lines, guesses_of(definitions, options)[0])

    @staticmethod
    def propagation(
        definitions: Definitions, readings: Readings, isolation: bool = False, options: Options = PLAIN
    ) -> dict[str, ComplexArray]:
        r""":math:`e^{-\gamma l}` of each line's excess over the thru, as measured, ``(..., f)``."""
        switch, leak = SwitchTerms.among(readings), leaks(readings, isolation)
        thru, guesses = pair(readings, "thru", switch, leak), guesses_of(definitions, options)[0]
        return {
            name: eigen_of(thru, pair(readings, name, switch, leak), guesses[name]).propagation
            for name in options.lines
        }

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``NISTMultilineTRL`` with one line at a time, each on the points it serves.

        Its ``TRL`` makes a least-squares fit to more equations than unknowns and so differs from any
        solution by eigenvectors as soon as there is noise.
        """
        from skrf.calibration import NISTMultilineTRL

        definitions = define(kit, self.takes(options), f_hz)
        guesses, thru, g = guesses_of(definitions, options)
        report = self.report(definitions, readings, isolation, options)
        declared = np.asarray(definitions[options.reflect])
        declared = (declared - g) / (1.0 - g * declared)
        calibrations: list[tuple[Any, Networks, Any]] = []
        for index, name in enumerate(options.lines):
            here = report.chosen == index
            if not here.any():
                continue
            part = _only(readings, here)
            make = Networks(f_hz[here])
            read = make.reflect(part, options.reflect, isolation)
            calibration = NISTMultilineTRL(
                [make.through(part, "thru"), read, make.through(part, name)],
                Grefls=[-1],
                l=[0.0, length_m(f_hz[here], guesses[name][here])],
                gamma_root_choice="estimate",
                **make.given(part, isolation),
            )
            calibrations.append((here, make, calibration))

        def correct(raw: TwoPort) -> TwoPort:
            result = np.empty((len(f_hz), 2, 2), np.complex128)
            for here, make, calibration in calibrations:
                with warnings.catch_warnings():
                    warnings.simplefilter("ignore")  # its roots differ by no more than noise
                    reflect = calibration.apply_cal(calibration.measured[1]).s[:, 0, 0]
                    s = calibration.apply_cal(make.two(raw.map(lambda p, h=here: p[h]))).s  # type: ignore[misc]
                turn = np.where(np.real(reflect * np.conj(declared[here] / thru.s21[here])) < 0.0, -1.0, 1.0)
                s[:, 0, 0] *= turn
                s[:, 1, 1] *= turn
                s *= thru.s21[here, None, None]
                z = kit.z0_ohm * (1.0 + g[here]) / (1.0 - g[here])
                result[here] = make.renormalised(TwoPort.of(s), z, kit.z0_ohm).matrix
            return TwoPort.of(result)

        return correct


def _only(readings: Readings, here: NDArray[np.bool_]) -> Readings:
    return {name: two.map(lambda p: p[here]) for name, two in readings.items()}


def _planes(report: LineReport, planes: list[ComplexArray]) -> ComplexArray:
    if len(planes) == 1:
        return planes[0]
    return np.asarray(np.choose(report.chosen, np.broadcast_arrays(*planes)))


def _at_each_point(report: LineReport, lines: list[TwoPort]) -> TwoPort:
    if len(lines) == 1:
        return lines[0]
    return TwoPort(
        *(_planes(report, list(planes)) for planes in zip(*(x.planes for x in lines), strict=True))
    )
