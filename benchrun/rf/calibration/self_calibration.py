r"""Error boxes from a thru, and from where two points and one reflection of port 1 are read.

Common ground of TRL, LRM and LRRM. A reflection :math:`\Gamma` on port 2 reads :math:`w_2` there; carried
through the reading of the thru it is what port 1 *would* read with :math:`T \circ 1/\Gamma` on it, where
:math:`T` is the thru's wave-cascade matrix. So every standard on either port is one on port 1, and each
method is a one-port calibration of port 1 whose unknowns drop out by pairs. The thru then gives port 2.

The formulas are our own working of Engen and Hoer (IEEE Trans. MTT-27, 1979) and of Eul and Schiek
(IEEE Trans. MTT-39, 1991); scikit-rf's TRL, LRM and LRRM, worked otherwise, are their examiners.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.eight_terms import EightTerms, twelve_of
from benchrun.rf.calibration.reading import Leaks
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["Boxes", "boxes", "carried", "nearest_root", "refuse_unsure", "root_towards", "sure_of_sign"]

_TINY = np.finfo(np.float64).tiny
_SURE = float(np.cos(np.radians(75.0)))


def carried(thru: TwoPort, w2: ComplexArray) -> ComplexArray:
    """Reciprocal of the reading of port 1 that equals reading ``w2`` of port 2, through a read thru.

    The reciprocal, because the match of port 2 is carried to the neighbourhood of infinity.
    """
    return (w2 - thru.s22) / (thru.s11 * w2 - thru.determinant)


def nearest_root(
    a: ComplexArray, b: ComplexArray | complex, c: ComplexArray, guess: ComplexArray
) -> ComplexArray:
    """Root of ``a x^2 + b x + c`` that lies nearer to a guess, without cancellation."""
    disc = np.sqrt(b * b - 4.0 * a * c)
    q = -0.5 * (b + np.where(np.real(np.conj(b) * disc) < 0.0, -disc, disc))
    one, two = q / a, c / q
    return np.where(np.abs(one - guess) <= np.abs(two - guess), one, two)


def root_towards(square: ComplexArray, guess: ComplexArray) -> tuple[ComplexArray, float]:
    """Square root that lies within 90 degrees of a guess, and the least cosine of the angle between them.

    In the frame of the guess it is the root with positive real part: half the cost of a complex root whose
    sign is chosen afterwards. ``guess`` is ``(f,)`` or of the shape of ``square``.
    """
    unit = guess / np.abs(guess)
    w = square * np.conj(unit) ** 2
    size = np.abs(w)
    half = 0.5 * (size + w.real)
    np.maximum(half, _TINY, out=half)
    root = np.empty_like(w)
    root.real = np.sqrt(half)
    root.imag = 0.5 * w.imag / root.real
    least = float(np.sqrt(max(np.min(half / np.maximum(size, _TINY)), 0.0)))
    return np.multiply(root, unit, out=root), least


def refuse_unsure(least: float, what: str) -> None:
    """Refuse a reflection whose phase is so far from its guess that the sign is not sure.

    Parameters
    ----------
    least
        Cosine of the greatest angle between them.

    Raises
    ------
    InvalidMeasurement
        Beyond 75 degrees; at 90 degrees the sign turns over.
    """
    if not least > _SURE:
        off = np.degrees(np.arccos(min(max(least, -1.0), 1.0)))
        raise InvalidMeasurement(
            f"The {what} comes out {off:.0f} degrees away from its definition somewhere in the sweep; beyond "
            "75 degrees the sign of the result is not sure.",
            f"See that the {what} was connected to both ports and is defined as what it is (open or short, "
            "with its offset delay).",
        )


def sure_of_sign(found: ComplexArray, guess: ComplexArray, what: str) -> None:
    """As :func:`refuse_unsure`, for a reflection and its guess."""
    refuse_unsure(float(np.min(np.cos(np.angle(found / guess)))), what)


class Boxes(NamedTuple):
    """Both error boxes.

    Parameters
    ----------
    one, two
        Reflection terms of port 1 and of port 2.
    ahead, back
        Transmission from source 1 to receiver 2, ``e10 e32``, and from source 2 to receiver 1, ``e23 e01``.
    """

    one: OnePortTerms
    two: OnePortTerms
    ahead: ComplexArray
    back: ComplexArray

    def eight(self, switch: SwitchTerms, leak: Leaks) -> EightTerms:
        """As eight terms."""
        return EightTerms(self.one, self.two, self.ahead / self.two.tracking, switch, *leak)

    def twelve(self, switch: SwitchTerms, leak: Leaks) -> TwelveTerms:
        """As twelve terms."""
        return twelve_of(self.one, self.two, self.ahead, self.back, switch, leak)


def boxes(a: ComplexArray, b: ComplexArray, c: ComplexArray, read: TwoPort, thru: TwoPort) -> Boxes:
    """Both error boxes from port 1's reading ``(a S + b) / (c S + 1)`` and a known thru.

    Parameters
    ----------
    a, b, c
        Port 1, ``(..., f)``.
    read
        The thru as read, freed of leakage and switch terms.
    thru
        What it is.
    """
    # Wave-cascade matrices, each divided by its lower right element so far as that is 1 / S21.
    det = read.determinant
    x12 = read.s11 - b  # adjugate of port 1's matrix, times the reading
    x21, x22 = c * det - a * read.s22, a - c * read.s11
    through = thru.s12 * thru.s21
    if not (np.any(thru.s11) or np.any(thru.s22)):
        n12, n21, n22 = x12, through * x21, through * x22
    else:
        x11 = b * read.s22 - det
        n12 = x12 - thru.s11 * x22
        n21 = thru.s22 * x11 - thru.determinant * x21
        n22 = thru.s22 * x12 - thru.determinant * x22
    inverse, size = 1.0 / n22, a - b * c
    grown = size * inverse
    ahead, back = (thru.s12 * grown) * read.s21, thru.s21 * read.s12
    two = OnePortTerms(-n21 * inverse, n12 * inverse, ahead * back * inverse)
    return Boxes(OnePortTerms(b, -c, size), two, ahead, back * grown)
