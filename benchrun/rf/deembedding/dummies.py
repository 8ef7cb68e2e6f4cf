"""On-board dummies: what pads and leads do, read on structures without the unit, and taken out.

- *open* (the pads without the unit): shunt admittances, subtracted from Y.
- *short* (the leads joined at the unit's place): series impedances, subtracted from Z.
- *thru* (the pads and leads joined through): split in two equal halves, as pi or as tee.

Source: M. C. A. M. Koolen et al., BCTM 1991 (open, then short), as in scikit-rf's ``OpenShort``,
``ShortOpen``, ``Open``, ``Short``, ``SplitPi`` and ``SplitTee``, which are the examiners.
"""

from __future__ import annotations

from typing import Literal, TypeAlias

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.deembedding.halves import without
from benchrun.rf.twoport import TwoPort

__all__ = [
    "from_admittance",
    "from_impedance",
    "halves_of_thru",
    "to_admittance",
    "to_impedance",
    "without_open",
    "without_open_then_short",
    "without_short",
    "without_short_then_open",
    "without_thru",
]

Circuit: TypeAlias = Literal["pi", "tee"]


def _invert(m: TwoPort) -> TwoPort:
    d = 1.0 / m.determinant
    return TwoPort(m.s22 * d, -m.s12 * d, -m.s21 * d, m.s11 * d)


def to_admittance(s: TwoPort) -> TwoPort:
    """Y-parameters over the reference admittance, ``(1 - S)(1 + S)^-1``; same places in the four planes."""
    d = 1.0 / ((1.0 + s.s11) * (1.0 + s.s22) - s.s12 * s.s21)
    both = s.s12 * s.s21
    return TwoPort(
        ((1.0 - s.s11) * (1.0 + s.s22) + both) * d,
        -2.0 * s.s12 * d,
        -2.0 * s.s21 * d,
        ((1.0 + s.s11) * (1.0 - s.s22) + both) * d,
    )


def from_admittance(y: TwoPort) -> TwoPort:
    """S-parameters of Y-parameters over the reference admittance: the same formula turned on itself."""
    return to_admittance(y)


def to_impedance(s: TwoPort) -> TwoPort:
    """Z-parameters over the reference impedance, ``(1 + S)(1 - S)^-1``."""
    return to_admittance(s.map(np.negative))


def from_impedance(z: TwoPort) -> TwoPort:
    """S-parameters of Z-parameters over the reference impedance."""
    return to_admittance(z).map(np.negative)


def _minus(a: TwoPort, b: TwoPort) -> TwoPort:
    return TwoPort(*(x - y for x, y in zip(a.planes, b.planes, strict=True)))


def without_open(reading: TwoPort, opened: TwoPort) -> TwoPort:
    """Take the shunt admittances of the pads out."""
    _refuse_joined(opened)
    return from_admittance(_minus(to_admittance(reading), to_admittance(opened)))


def without_short(reading: TwoPort, short: TwoPort) -> TwoPort:
    """Take the series impedances of the leads out."""
    return from_impedance(_minus(to_impedance(reading), to_impedance(short)))


def without_open_then_short(reading: TwoPort, opened: TwoPort, short: TwoPort) -> TwoPort:
    """Pads outside, leads inside: the open out of reading and short, then that short out of that reading.

    Raises
    ------
    InvalidMeasurement
        If the open dummy passes more than a pad does.
    """
    _refuse_swapped(opened, short)
    return without_short(without_open(reading, opened), without_open(short, opened))


def without_short_then_open(reading: TwoPort, opened: TwoPort, short: TwoPort) -> TwoPort:
    """Leads outside, pads inside: the short out of reading and open, then that open out of that reading."""
    _refuse_swapped(opened, short)
    return without_open(without_short(reading, short), without_short(opened, short))


def _refuse_joined(opened: TwoPort) -> None:
    most = float(np.min(np.abs(opened.s21)))
    if most > 0.5:
        raise InvalidMeasurement(
            f"The open dummy lets through at least {20 * np.log10(most):.1f} dB at every frequency; an open "
            "one lets through next to nothing.",
            "See that the open dummy was contacted and not the thru, and read it again.",
        )


def _refuse_swapped(opened: TwoPort, short: TwoPort) -> None:
    # At the lowest frequency pads are smallest: an open reflects with +1, a short with -1.
    o, s = (np.asarray(two.s11)[..., 0].real for two in (opened, short))
    if np.all(o < -0.3) and np.all(s > 0.3):
        raise InvalidMeasurement(
            f"At the lowest frequency the open dummy reflects {np.mean(o):+.2f} and the short dummy "
            f"{np.mean(s):+.2f}: they are exchanged.",
            "Exchange the two readings, or read both dummies again.",
        )


def halves_of_thru(thru: TwoPort, circuit: Circuit = "pi") -> tuple[TwoPort, TwoPort]:
    """Split a symmetric thru dummy into a left and a right half that are mirror images.

    Parameters
    ----------
    thru
        ``(..., f)``.
    circuit
        ``pi``: the shunt admittance of each pad outside, the series impedance shared by both; ``tee``: the
        series impedance outside, the shunt admittance shared.
    """
    zero = np.zeros_like(thru.s11)
    if circuit == "pi":
        y = to_admittance(thru)
        shunt, series = (y.s11 + y.s22 + y.s21 + y.s12) / 2.0, -(y.s21 + y.s12) / 2.0
        left = from_admittance(
            TwoPort(shunt + 2.0 * series, -2.0 * series, -2.0 * series, 2.0 * series + zero)
        )
    else:
        z = to_impedance(thru)
        series, shunt = (z.s11 + z.s22 - z.s21 - z.s12) / 2.0, (z.s21 + z.s12) / 2.0
        left = from_impedance(TwoPort(series + 2.0 * shunt, 2.0 * shunt, 2.0 * shunt, 2.0 * shunt + zero))
    return left, left.flipped()


def without_thru(reading: TwoPort, thru: TwoPort, circuit: Circuit = "pi") -> TwoPort:
    """Take both halves of a thru dummy out."""
    left, right = halves_of_thru(thru, circuit)
    return without(reading, left, right)
