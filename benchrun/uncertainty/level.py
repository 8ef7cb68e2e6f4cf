"""Declared uncertainty of levels: generator and spectrum analyzer.

Standard uncertainties, each one influence: the generator's level is off by the same amount at every setting;
the analyzer's linearity is another at every reading (common practice: two readings at unlike levels share
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

LEVEL_TERMS = ("source", "linearity", "response")


@dataclass(frozen=True, slots=True)
class LevelTerms:
    """Standard uncertainties in dB.

    Parameters
    ----------
    source
        Of the generator's level.
    linearity
        Of each reading of the spectrum analyzer, relative to another at the same frequency.
    response
        Of the spectrum analyzer's frequency response at each harmonic, relative to the carrier.

    Examples
    --------
    >>> LevelTerms.from_mapping({"source": "0.2 dB"}).source
    0.2
    """

    source: float = 0.0
    linearity: float = 0.0
    response: float = 0.0

    @classmethod
    def from_mapping(cls, declared: Mapping[str, str]) -> LevelTerms:
        """From text with units, as a bench file declares it.

        Raises
        ------
        QuantityError
            For an unknown term or a value that is not in dB.
        """
        unknown = [name for name in declared if name not in LEVEL_TERMS]
        if unknown:
            raise QuantityError(f"{unknown[0]!r} is no level term; known are {', '.join(LEVEL_TERMS)}")
        return cls(**{name: abs(parse(text, Dimension.RATIO)) for name, text in declared.items()})

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
        rows = 1 + k + k * h + (h - 1)
        source = np.tile(tone.source_dbm, (rows, 1))
        straight = np.tile(tone.straight_dbm, (rows, 1))
        read = np.tile(tone.read_dbm, (rows, 1, 1))
        source[0] += self.source
        for i in range(k):
            straight[1 + i, i] += self.linearity
        for i in range(k * h):
            read[1 + k + i, i // h, i % h] += self.linearity
        for i in range(h - 1):
            read[1 + k + k * h + i, :, i + 1] += self.response
        return Tone(source, straight, read)
