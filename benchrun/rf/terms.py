"""Error terms of an analyzer: how a true device becomes a reading, and back.

The 12-term model, forward and reverse (Rehnmark, IEEE Trans. MTT-22, 1974, as in scikit-rf's
``TwelveTerm``), and the three terms of one port. Everything is linear, complex, shape ``(..., f)``.
"""

from __future__ import annotations

from dataclasses import dataclass

from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["Direction", "OnePortTerms", "TwelveTerms"]


@dataclass(frozen=True, slots=True, eq=False)
class OnePortTerms:
    """Directivity, source match and reflection tracking of one port."""

    directivity: ComplexArray
    source_match: ComplexArray
    tracking: ComplexArray

    def embed(self, s: ComplexArray) -> ComplexArray:
        """Turn a true reflection into a raw reading: ``M = eD + eR S / (1 - eS S)``."""
        return self.directivity + self.tracking * s / (1.0 - self.source_match * s)

    def correct(self, m: ComplexArray) -> ComplexArray:
        """Turn a raw reading into a true reflection: ``S = (M - eD) / (eR + eS (M - eD))``."""
        d = m - self.directivity
        return d / (self.tracking + self.source_match * d)


@dataclass(frozen=True, slots=True, eq=False)
class Direction:
    """The six terms with one port driven; the driven port's own three are :class:`OnePortTerms`."""

    directivity: ComplexArray
    source_match: ComplexArray
    tracking: ComplexArray
    load_match: ComplexArray
    transmission: ComplexArray
    isolation: ComplexArray | complex = 0.0

    @property
    def port(self) -> OnePortTerms:
        """The reflection terms alone."""
        return OnePortTerms(self.directivity, self.source_match, self.tracking)


@dataclass(frozen=True, slots=True, eq=False)
class TwelveTerms:
    """Forward (port 1 driven) and reverse (port 2 driven) terms.

    Examples
    --------
    >>> import numpy as np
    >>> c = lambda x: np.array([complex(x)])
    >>> ideal = Direction(c(0), c(0), c(1), c(0), c(1))
    >>> pad = TwoPort(c(0.1), c(0.5), c(0.5), c(0.1))
    >>> complex(TwelveTerms(ideal, ideal).correct(pad).s21[0])
    (0.5+0j)
    """

    forward: Direction
    reverse: Direction

    def embed(self, s: TwoPort) -> TwoPort:
        """Turn true S-parameters into raw readings."""
        f, r, det = self.forward, self.reverse, s.determinant
        d1 = 1.0 - f.source_match * s.s11 - f.load_match * s.s22 + f.source_match * f.load_match * det
        d2 = 1.0 - r.load_match * s.s11 - r.source_match * s.s22 + r.load_match * r.source_match * det
        ahead, back = 1.0 / d1, 1.0 / d2
        return TwoPort(
            f.directivity + f.tracking * ((s.s11 - f.load_match * det) * ahead),
            r.isolation + r.transmission * (s.s12 * back),
            f.isolation + f.transmission * (s.s21 * ahead),
            r.directivity + r.tracking * ((s.s22 - r.load_match * det) * back),
        )

    def correct(self, m: TwoPort) -> TwoPort:
        """Turn raw readings into true S-parameters."""
        f, r = self.forward, self.reverse
        a = (m.s11 - f.directivity) / f.tracking
        b = (m.s21 - f.isolation) / f.transmission
        c = (m.s22 - r.directivity) / r.tracking
        g = (m.s12 - r.isolation) / r.transmission
        p, q, bg = 1.0 + a * f.source_match, 1.0 + c * r.source_match, b * g
        inverse = 1.0 / (p * q - bg * f.load_match * r.load_match)
        return TwoPort(
            (a * q - f.load_match * bg) * inverse,
            g * (1.0 + a * (f.source_match - r.load_match)) * inverse,
            b * (1.0 + c * (r.source_match - f.load_match)) * inverse,
            (c * p - r.load_match * bg) * inverse,
        )
