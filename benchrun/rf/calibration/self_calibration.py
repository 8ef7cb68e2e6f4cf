r"""Error boxes from a thru, and from where two points and one reflection of port 1 are read.

Common ground of TRL, LRM and LRRM. A reflection :math:`\Gamma` on port 2 reads :math:`w_2` there; carried
through the reading of the thru it is what port 1 *would* read with :math:`T \circ 1/\Gamma` on it, where
:math:`T` is the thru's wave-cascade matrix. So every standard on either port is one on port 1, and each
method is a one-port calibration of port 1 whose unknowns drop out by pairs. The thru then gives port 2.

The formulas are our own working of Engen and Hoer (IEEE Trans. MTT-27, 1979) and of Eul and Schiek
(IEEE Trans. MTT-39, 1991); scikit-rf's TRL, LRM and LRRM, worked otherwise, are their examiners.
"""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.reading import Leaks
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["boxes", "carried", "nearest_root", "sure_of_sign"]


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


def sure_of_sign(found: ComplexArray, guess: ComplexArray, what: str) -> None:
    """Refuse a reflection whose phase is so far from its guess that the sign is not sure.

    Raises
    ------
    InvalidMeasurement
        Beyond 75 degrees; at 90 degrees the sign turns over.
    """
    off = float(np.max(np.abs(np.angle(found / guess))))
    if not off < np.radians(75.0):
        raise InvalidMeasurement(
            f"The {what} comes out {np.degrees(off):.0f} degrees away from its definition somewhere in the "
            "sweep; beyond 75 degrees the sign of the result is not sure.",
            f"See that the {what} was connected to both ports and is defined as what it is (open or short, "
            "with its offset delay).",
        )


def boxes(
    a: ComplexArray,
    b: ComplexArray,
    c: ComplexArray,
    read: TwoPort,
    thru: TwoPort,
    switch: SwitchTerms,
    leak: Leaks,
) -> EightTerms:
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
    m11, m12, m21 = -read.determinant, read.s11, -read.s22
    x11, x12 = m11 - b * m21, m12 - b  # adjugate of port 1's matrix, times the reading
    x21, x22 = a * m21 - c * m11, a - c * m12
    through = thru.s12 * thru.s21
    if _matched(thru):
        n12, n21, n22 = x12, through * x21, through * x22
    else:
        n12 = x12 - thru.s11 * x22
        n21 = thru.s22 * x11 - thru.determinant * x21
        n22 = thru.s22 * x12 - thru.determinant * x22
    inverse, size = 1.0 / n22, a - b * c
    two = OnePortTerms(
        directivity=-n21 * inverse,
        source_match=n12 * inverse,
        tracking=through * size * (read.s12 * read.s21) * (inverse * inverse),
    )
    k = n22 / (thru.s21 * read.s12)
    return EightTerms(OnePortTerms(b, -c, size), two, k, switch, *leak)


def _matched(thru: TwoPort) -> bool:
    return not (np.any(thru.s11) or np.any(thru.s22))
