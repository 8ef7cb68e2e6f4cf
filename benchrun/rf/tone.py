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

    Parameters
    ----------
    source_dbm
        Levels that the generator was set to, ``(..., k)``, increasing.
    straight_dbm
        Carrier read with the unit replaced by a thru, ``(..., k)``.
    read_dbm
        Carrier and harmonics read behind the unit, ``(..., k, h)``; harmonic ``h`` in column ``h - 1``.

    Examples
    --------
    >>> import numpy as np
    >>> tone = Tone(np.array([-10.0]), np.array([-10.5]), np.array([[5.5, -30.0]]))
    >>> float(tone.gain_db[0]), float(tone.output_dbm[0])
    (16.0, 6.0)
    """

    source_dbm: FloatArray
    straight_dbm: FloatArray
    read_dbm: FloatArray

    @property
    def gain_db(self) -> FloatArray:
        """Carrier behind the unit less that behind the thru, ``(..., k)``: what is around cancels."""
        return np.asarray(self.read_dbm[..., 0] - self.straight_dbm)

    @property
    def output_dbm(self) -> FloatArray:
        """Level at the unit's output, ``(..., k)``: the source's level plus the gain."""
        return np.asarray(self.source_dbm + self.gain_db)

    @property
    def harmonics_db(self) -> FloatArray:
        """Harmonics from the second on, relative to the carrier, ``(..., k, h - 1)``."""
        return np.asarray(self.read_dbm[..., 1:] - self.read_dbm[..., :1])

    def map(self, function: Callable[[FloatArray], FloatArray]) -> Tone:
        """Apply one function to each array."""
        return Tone(function(self.source_dbm), function(self.straight_dbm), function(self.read_dbm))
