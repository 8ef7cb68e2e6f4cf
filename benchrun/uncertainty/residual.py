r"""Declared residual terms: what is left of the analyzer's errors after correction.

The corrected reading is the true one seen through a small error box. To first order (the EA-10/12 form,
rewritten for complex quantities; residual symbols as in EURAMET cg-12's earlier editions, from memory):

.. math:: dS_{11} = \delta + \tau S_{11} + \mu S_{11}^2 + \lambda S_{21} S_{12},
   \qquad dS_{21} / S_{21} = \tau_T + \mu S_{11} + \lambda S_{22}.

Each residual is one complex number for the whole sweep (a systematic error does not average out along
it) of declared magnitude and unknown phase: per axis its standard uncertainty is the magnitude over the
square root of two (U-shaped, JCGM 101:2008 table 1, from memory). Noise is drawn anew at each point.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields, replace

import numpy as np

from benchrun.quantity import Dimension, QuantityError, parse
from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["DECIBEL_LOSS", "DECIBEL_RIPPLE", "ResidualTerms"]

DECIBEL_LOSS = ("directivity", "source match", "load match", "isolation", "repeatability", "noise floor")
"""Given as so many dB below one: "44 dB" is a magnitude of 0.0063."""
DECIBEL_RIPPLE = ("reflection tracking", "transmission tracking", "trace noise")
"""Given as a deviation in dB: "0.03 dB" is a relative 0.0035."""


@dataclass(frozen=True, slots=True)
class ResidualTerms:
    """Magnitudes of the residual terms, linear, the same for both ports.

    Parameters
    ----------
    directivity, source_match, load_match
        Magnitudes of delta, mu, lambda.
    reflection_tracking, transmission_tracking
        Relative magnitudes of tau and tau_T.
    isolation
        Magnitude added to transmission.
    repeatability
        Magnitude added to each reflection by making the connection.
    noise_floor
        Standard deviation per reading, real and imaginary part together, added.
    trace_noise
        Relative standard deviation per reading.

    Examples
    --------
    >>> terms = ResidualTerms.from_mapping({"directivity": "40 dB", "trace noise": "0.01 dB"})
    >>> round(terms.directivity, 6)
    0.01
    """

    directivity: float = 0.0
    source_match: float = 0.0
    load_match: float = 0.0
    reflection_tracking: float = 0.0
    transmission_tracking: float = 0.0
    isolation: float = 0.0
    repeatability: float = 0.0
    noise_floor: float = 0.0
    trace_noise: float = 0.0

    @classmethod
    def from_mapping(cls, declared: Mapping[str, str]) -> ResidualTerms:
        """From text with units, as a bench file declares it.

        Raises
        ------
        QuantityError
            For an unknown term or a value that is not in dB.
        """
        values: dict[str, float] = {}
        for name, text in declared.items():
            level = parse(text, Dimension.RATIO)
            if name in DECIBEL_LOSS:
                values[name.replace(" ", "_")] = 10.0 ** (-abs(level) / 20.0)
            elif name in DECIBEL_RIPPLE:
                values[name.replace(" ", "_")] = 10.0 ** (abs(level) / 20.0) - 1.0
            else:
                raise QuantityError(
                    f"{name!r} is no residual term; known are {', '.join(DECIBEL_LOSS + DECIBEL_RIPPLE)}"
                )
        return cls(**values)

    def scaled(self, floor: float, trace: float) -> ResidualTerms:
        """The same terms with other noise: floor and trace noise multiplied, linear."""
        return replace(self, noise_floor=self.noise_floor * floor, trace_noise=self.trace_noise * trace)

    @property
    def declared(self) -> bool:
        """Whether anything is declared at all."""
        return any(getattr(self, f.name) > 0 for f in fields(self))

    def vary(self, nominal: TwoPort | ComplexArray, noise: TwoPort | ComplexArray) -> TwoPort | ComplexArray:
        """Step the corrected reading by each influence, one after the other.

        Parameters
        ----------
        nominal
            Corrected planes ``(f,)``.
        noise
            Complex normal draws of unit variance, planes ``(n, f)``.

        Returns
        -------
        TwoPort or numpy.ndarray
            Planes ``(v, f)``: :attr:`steps` rows (two ports) or :attr:`one_port_steps` rows (one port),
            each one influence one standard uncertainty off, then ``n`` rows of noise.
        """
        if not isinstance(nominal, TwoPort):
            return self._vary_one_port(nominal, np.asarray(noise))
        stepped = self._boxes().embed(nominal)
        assert isinstance(noise, TwoPort)  # the caller draws noise for what it varies
        noisy = [
            s + n * (self.noise_floor + self.trace_noise * np.abs(s))
            for s, n in zip(nominal.planes, noise.planes, strict=True)
        ]
        return TwoPort(*(np.concatenate([a, b]) for a, b in zip(stepped.planes, noisy, strict=True)))

    def first_order(self, s: TwoPort) -> tuple[FloatArray, FloatArray]:
        """Estimate the standard uncertainty of one component of S11 and S21, by the formulas above.

        Parameters
        ----------
        s
            Planes ``(f,)``.

        Returns
        -------
        u_s11, u_s21
            ``(f,)``, linear. Root sum of squares; each magnitude over the square root of two. The
            reflection of a connection stands on both its sides, so the near one adds to directivity and
            source match at once, and the far one to load match.
        """
        a11, a21, a22, loop = np.abs(s.s11), np.abs(s.s21), np.abs(s.s22), np.abs(s.s21 * s.s12)
        r11 = (
            self.directivity**2
            + (self.repeatability * np.abs(1.0 + s.s11**2)) ** 2
            + (self.repeatability * loop) ** 2
            + (self.reflection_tracking * a11) ** 2
            + (self.source_match * a11**2) ** 2
            + (self.load_match * loop) ** 2
            + (self.noise_floor + self.trace_noise * a11) ** 2
        )
        r21 = (
            (self.transmission_tracking * a21) ** 2
            + (self.source_match * a11 * a21) ** 2
            + (self.load_match * a22 * a21) ** 2
            + self.isolation**2
            + (self.noise_floor + self.trace_noise * a21) ** 2
            + (self.repeatability * a11 * a21) ** 2
            + (self.repeatability * a22 * a21) ** 2
        )
        return np.sqrt(r11 / 2.0), np.sqrt(r21 / 2.0)

    @property
    def names(self) -> tuple[str, ...]:
        """What each row of :meth:`vary` steps, for two ports, before the noise rows."""
        return tuple(
            f"{term}, {way}, {axis}"
            for way in ("forward", "reverse")
            for term in _TERMS
            for axis in ("re", "im")
        )

    @property
    def steps(self) -> int:
        """Rows of systematic influences for two ports."""
        return len(self.names)

    one_port_steps = 8
    """Rows for one port: directivity, repeatability, source match and tracking, two axes each."""

    def _boxes(self) -> TwelveTerms:
        """Residual error boxes ``(steps, 1)``, one influence off in each row."""
        count, unit = self.steps, 1.0 / np.sqrt(2.0)
        size = {
            "directivity": self.directivity,
            "source match": self.source_match,
            "tracking": self.reflection_tracking,
            "load match": self.load_match,
            "transmission": self.transmission_tracking,
            "isolation": self.isolation,
            "repeatability": self.repeatability,
        }
        columns = {(way, term): np.zeros((count, 1), np.complex128) for way in (0, 1) for term in _TERMS}
        row = 0
        for way in (0, 1):
            for term in _TERMS:
                for axis in (1.0, 1.0j):
                    columns[way, term][row] = size[term] * unit * axis
                    row += 1

        def direction(way: int) -> Direction:
            c = {term: columns[way, term] for term in _TERMS}
            return Direction(
                c["directivity"] + c["repeatability"],
                # A connection's own reflection is seen from both sides (common practice).
                c["source match"] + c["repeatability"],
                1.0 + c["tracking"],
                c["load match"] + columns[1 - way, "repeatability"],
                1.0 + c["transmission"],
                c["isolation"],
            )

        return TwelveTerms(direction(0), direction(1))

    def _vary_one_port(self, nominal: ComplexArray, noise: ComplexArray) -> ComplexArray:
        unit, rows = 1.0 / np.sqrt(2.0), []
        sizes = (self.directivity, self.repeatability, self.source_match, self.reflection_tracking)
        for index, size in enumerate(sizes):
            for axis in (1.0, 1.0j):
                step = complex(size * unit * axis)
                terms = OnePortTerms(
                    np.asarray(step if index < 2 else 0.0),
                    np.asarray(step if index in (1, 2) else 0.0),  # a connection is seen from both sides
                    np.asarray(1.0 + (step if index == 3 else 0.0)),
                )
                rows.append(terms.embed(nominal))
        noisy = nominal + noise * (self.noise_floor + self.trace_noise * np.abs(nominal))
        return np.concatenate([np.stack(rows), noisy])


_TERMS = (
    "directivity",
    "source match",
    "tracking",
    "load match",
    "transmission",
    "isolation",
    "repeatability",
)
