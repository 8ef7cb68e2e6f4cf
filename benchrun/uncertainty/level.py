"""Declared uncertainty of levels: the spectrum analyzer, and the supply's meter.

Standard uncertainties, each one influence: the analyzer's absolute level is off by the same amount in every
reading; its linearity is another at every reading (common practice: two readings at unlike levels share
none of it); its frequency response is another at every harmonic, and cancels where two readings at one
frequency are compared.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields

import numpy as np

from benchrun.quantity import Dimension, QuantityError, parse
from benchrun.rf.tone import Tone

__all__ = ["LEVEL_TERMS", "LevelTerms"]

LEVEL_TERMS = ("absolute", "linearity", "response", "current")


@dataclass(frozen=True, slots=True)
class LevelTerms:
    """Standard uncertainties.

    Parameters
    ----------
    absolute
        Of the spectrum analyzer's level, in dB.
    linearity
        Of each reading of the spectrum analyzer, relative to another at the same frequency.
    response
        Of the spectrum analyzer's frequency response at each harmonic, relative to the carrier.
    current
        Of the supply's current reading, in ampere.

    Examples
    --------
    >>> LevelTerms.from_mapping({"absolute": "0.2 dB"}).absolute
    0.2
    """

    absolute: float = 0.0
    linearity: float = 0.0
    response: float = 0.0
    current: float = 0.0

    @classmethod
    def from_mapping(cls, declared: Mapping[str, str]) -> LevelTerms:
        """From text with units, as a bench file declares it.

        Raises
        ------
        QuantityError
            For an unknown term or a value in another unit.
        """
        unknown = [name for name in declared if name not in LEVEL_TERMS]
        if unknown:
            raise QuantityError(f"{unknown[0]!r} is no level term; known are {', '.join(LEVEL_TERMS)}")
        units = {"current": Dimension.CURRENT}
        return cls(
            **{name: abs(parse(text, units.get(name, Dimension.RATIO))) for name, text in declared.items()}
        )

    @property
    def declared(self) -> bool:
        """Whether anything is declared at all."""
        return any(getattr(self, f.name) > 0 for f in fields(self))

    def vary(self, tone: Tone) -> Tone:
        """Step the readings by each influence, one after the other.

        Parameters
        ----------
        tone
            As read: arrays ``(k,)`` and ``(k, h)``.

        Returns
        -------
        Tone
            Arrays ``(v, k)`` and ``(v, k, h)``: one standard uncertainty off in each row; all are systematic
            steps in the sense of :func:`benchrun.evaluate.network.combine`.
        """
        k, h = tone.read_dbm.shape
        rows = 2 + k + k * h + (h - 1)
        straight, read = np.tile(tone.input_dbm, (rows, 1)), np.tile(tone.read_dbm, (rows, 1, 1))
        supply = np.tile(tone.supply_a, (rows, 1))
        straight[0] += self.absolute
        read[0] += self.absolute
        supply[1] += self.current
        for i in range(k):
            straight[2 + i, i] += self.linearity
        for i in range(k * h):
            read[2 + k + i, i // h, i % h] += self.linearity
        for i in range(h - 1):
            read[2 + k + k * h + i, :, i + 1] += self.response
        return Tone(straight, read, supply)
