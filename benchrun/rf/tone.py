"""A single tone through a unit: levels of its carrier and harmonics, at one or several source levels."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import FloatArray

__all__ = ["Tone"]


@dataclass(frozen=True, slots=True, eq=False)
class Tone:
    """What a spectrum analyzer read behind a unit that a generator drives.

    The spectrum analyzer is the reference of level: what it reads through a thru in the unit's place is the
    unit's input level, whatever the generator was set to and the cables lose before it.

    Parameters
    ----------
    input_dbm
        Carrier read with the unit replaced by a thru, ``(..., k)``, increasing.
    read_dbm
        Carrier and harmonics read behind the unit, ``(..., k, h)``; harmonic ``h`` in column ``h - 1``.
    supply_a
        Supply current at each level, ``(..., k)``; nan where there is no supply.

    Examples
    --------
    >>> import numpy as np
    >>> tone = Tone(np.array([-10.5]), np.array([[5.5, -30.0]]), np.array([0.082]))
    >>> float(tone.gain_db[0]), float(tone.harmonics_db[0, 0])
    (16.0, -35.5)
    """

    input_dbm: FloatArray
    read_dbm: FloatArray
    supply_a: FloatArray

    @property
    def gain_db(self) -> FloatArray:
        """Carrier behind the unit less that behind the thru, ``(..., k)``: what is around cancels."""
        return np.asarray(self.read_dbm[..., 0] - self.input_dbm)

    @property
    def harmonics_db(self) -> FloatArray:
        """Harmonics from the second on, relative to the carrier, ``(..., k, h - 1)``."""
        return np.asarray(self.read_dbm[..., 1:] - self.read_dbm[..., :1])

    def map(self, function: Callable[[FloatArray], FloatArray]) -> Tone:
        """Apply one function to each array."""
        return Tone(function(self.input_dbm), function(self.read_dbm), function(self.supply_a))
