"""Switch terms: what the idle port of an analyzer reflects, and how a reading is freed of it.

Source: R. B. Marks, "Formulations of the basic vector network analyzer error model including switch
terms", 50th ARFTG Conference, 1997, equations 30-33, as in scikit-rf's ``unterminate``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.method import Readings
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["NO_SWITCH", "SWITCH_READING", "SwitchTerms"]

SWITCH_READING = "switch terms"
"""Key among the readings. Of that two-port, ``s21`` holds a2/b2 while port 1 sources and ``s12`` holds a1/b1
while port 2 sources; ``s11`` and ``s22`` are not used."""


@dataclass(frozen=True, slots=True, eq=False)
class SwitchTerms:
    """The reflection of the idle port, in each direction.

    Parameters
    ----------
    forward
        ``a2/b2`` while port 1 sources, ``(..., f)`` or 0.
    reverse
        ``a1/b1`` while port 2 sources.

    Examples
    --------
    >>> import numpy as np
    >>> switch = SwitchTerms(np.array([0.1 + 0j]), np.array([0.05j]))
    >>> part = TwoPort.of(np.array([[[0.2, 0.5], [0.4, 0.1]]]))
    >>> back = switch.unterminate(switch.terminate(part))
    >>> bool(abs(back.s21[0] - 0.4) < 1e-15)
    True
    """

    forward: ComplexArray | complex = 0.0
    reverse: ComplexArray | complex = 0.0

    @classmethod
    def among(cls, readings: Readings) -> SwitchTerms:
        """Take the switch terms out of the readings of a calibration; none where nobody read them.

        Raises
        ------
        InvalidMeasurement
            If a switch term is not a number, or reflects more than it gets.
        """
        if SWITCH_READING not in readings:
            return NO_SWITCH
        read = readings[SWITCH_READING]
        greatest = float(np.max([np.max(np.abs(read.s21)), np.max(np.abs(read.s12))]))
        if not greatest < 1.0:
            raise InvalidMeasurement(
                f"A switch term has the magnitude {greatest:.3g}; an idle port reflects less than it gets.",
                "Join the ports with the thru, tighten it, and read the switch terms again.",
            )
        return cls(read.s21, read.s12)

    @classmethod
    def of(cls, terms: TwelveTerms) -> SwitchTerms:
        """Switch terms that twelve error terms imply, for example those of a stored SOLT calibration.

        ``GF = (eL - eS') / (eR' + eD' (eL - eS'))``; reverse likewise.
        """
        f, r = terms.forward, terms.reverse
        ahead, back = f.load_match - r.source_match, r.load_match - f.source_match
        return cls(ahead / (r.tracking + r.directivity * ahead), back / (f.tracking + f.directivity * back))

    @property
    def reading(self) -> TwoPort:
        """As a reading to stand under :data:`SWITCH_READING`."""
        forward, reverse = np.broadcast_arrays(
            np.atleast_1d(np.asarray(self.forward, np.complex128)),
            np.atleast_1d(np.asarray(self.reverse, np.complex128)),
        )
        zero = np.zeros_like(forward)
        return TwoPort(zero, reverse, forward, zero)

    @property
    def absent(self) -> bool:
        """Whether there are none."""
        return self is NO_SWITCH

    def unterminate(self, m: TwoPort) -> TwoPort:
        """Reading that an analyzer with matched idle ports would have made."""
        if self.absent:
            return m
        gf, gr = self.forward, self.reverse
        inverse = 1.0 / (1.0 - m.s12 * m.s21 * (gr * gf))
        return TwoPort(
            (m.s11 - m.s12 * m.s21 * gf) * inverse,
            (m.s12 - m.s11 * m.s12 * gr) * inverse,
            (m.s21 - m.s22 * m.s21 * gf) * inverse,
            (m.s22 - m.s12 * m.s21 * gr) * inverse,
        )

    def terminate(self, u: TwoPort) -> TwoPort:
        """Turn :meth:`unterminate` round."""
        if self.absent:
            return u
        ahead, back = 1.0 / (1.0 - u.s22 * self.forward), 1.0 / (1.0 - u.s11 * self.reverse)
        both = u.s12 * u.s21
        return TwoPort(
            u.s11 + both * self.forward * ahead,
            u.s12 * back,
            u.s21 * ahead,
            u.s22 + both * self.reverse * back,
        )


NO_SWITCH = SwitchTerms()
"""An analyzer whose idle ports are taken as matched."""
