"""Short, open and load on one port: three known reflections, three error terms (SOL)."""

from __future__ import annotations

from collections.abc import Sequence
from typing import ClassVar

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration.method import PLAIN, Definitions, Examiner, Options, Readings
from benchrun.rf.kit import Kit
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["REFLECTIONS", "ShortOpenLoad", "finite", "own_reflection", "solve_three"]

REFLECTIONS = ("short", "open", "load")


def own_reflection(reading: TwoPort, port: int) -> ComplexArray:
    """S11 for port 1, S22 for port 2."""
    return reading.s11 if port == 1 else reading.s22


def finite(plane: ComplexArray) -> bool:
    """Whether every value is a number: a sum that is one says so at a sixth of the cost of asking each."""
    with np.errstate(all="ignore"):
        return bool(np.isfinite(plane.sum()))


def solve_three(truths: Sequence[ComplexArray], readings: Sequence[ComplexArray], where: str) -> OnePortTerms:
    r"""Solve the bilinear one-port model for three known standards.

    :math:`M_i = a + b S_i + c S_i M_i` is linear in :math:`a=e_D`, :math:`b=e_R-e_D e_S`, :math:`c=e_S`;
    written out by differences so that no matrix is formed.

    Parameters
    ----------
    truths, readings
        Three planes each, ``(..., f)``.
    where
        For the error: which port.

    Raises
    ------
    InvalidMeasurement
        If two readings are so alike that they cannot be different standards, or one is not a number.
    """
    (s1, s2, s3), (m1, m2, m3) = truths, readings
    if not all(finite(m) for m in readings):
        raise InvalidMeasurement(
            f"A reading of short, open or load on {where} holds a value that is not a number.",
            "Read the three standards again.",
        )
    m12, m13 = m1 - m2, m1 - m3
    gap = min(float(np.min(np.abs(x))) for x in (m12, m13, m2 - m3))
    if not gap > 1e-3:
        raise InvalidMeasurement(
            f"Two of the readings of short, open and load on {where} differ by only {gap:.1e} somewhere in "
            "the sweep, so they cannot be three different standards.",
            "Connect each standard once more and read the three again.",
        )
    # Eliminating a and b: c from the ratio of differences, then b, then a. What only the truths make is made
    # first, since they are one plane where the readings are many.
    inverse, ratio = 1.0 / (s1 - s2), (s1 - s2) / (s1 - s3)
    first = s1 * m1
    p12 = first - s2 * m2
    c = (m12 - m13 * ratio) / (p12 - (first - s3 * m3) * ratio)
    b = (m12 - c * p12) * inverse
    a = m1 - b * s1 - c * first
    return OnePortTerms(directivity=a, source_match=c, tracking=b + a * c)


class ShortOpenLoad:
    """One port; what is measured afterwards is its reflection."""

    name: ClassVar[str] = "SOL"
    standards: ClassVar[tuple[str, ...]] = REFLECTIONS
    two_port: ClassVar[bool] = False
    without_switch_terms: ClassVar[str] = ""

    def takes(self, options: Options = PLAIN) -> tuple[str, ...]:
        """Short, open and load."""
        return self.standards

    def required(
        self, ports: tuple[int, ...], isolation: bool = False, options: Options = PLAIN
    ) -> tuple[Hookup, ...]:
        """Three hook-ups."""
        return tuple(Hookup.of(name, ports[0]) for name in REFLECTIONS)

    def solve(
        self,
        ports: tuple[int, ...],
        definitions: Definitions,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> OnePortTerms:
        """Three terms of the one port."""
        port = ports[0]
        measured = [own_reflection(readings[Hookup.of(n, port).text], port) for n in REFLECTIONS]
        return solve_three([np.asarray(definitions[n]) for n in REFLECTIONS], measured, f"port {port}")

    def examiner(
        self,
        f_hz: FloatArray,
        ports: tuple[int, ...],
        kit: Kit,
        readings: Readings,
        isolation: bool = False,
        options: Options = PLAIN,
    ) -> Examiner:
        """By scikit-rf's ``OnePort``."""
        import skrf
        from skrf.calibration import OnePort

        port, frequency = ports[0], skrf.Frequency.from_f(f_hz, unit="hz")

        def network(plane: ComplexArray) -> skrf.Network:
            return skrf.Network(frequency=frequency, s=plane[:, None, None])

        ideals = [network(kit.standards[n].reflection(f_hz, kit.z0_ohm)) for n in REFLECTIONS]
        measured = [network(own_reflection(readings[Hookup.of(n, port).text], port)) for n in REFLECTIONS]
        calibration = OnePort(measured=measured, ideals=ideals)

        def correct(raw: TwoPort) -> ComplexArray:
            corrected = calibration.apply_cal(network(own_reflection(raw, port)))
            return np.asarray(corrected.s[:, 0, 0], dtype=np.complex128)

        return correct
