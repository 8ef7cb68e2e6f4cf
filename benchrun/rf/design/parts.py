"""Parts of a ladder and what stands between its ports: branches, lines, stubs."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from benchrun.rf.twoport import ComplexArray, FloatArray

__all__ = ["Branch", "Chain", "Element", "Line", "Part", "Stub"]

Chain: TypeAlias = tuple[ComplexArray, ComplexArray, ComplexArray, ComplexArray]
"""A, B, C, D of a chain matrix; B in ohm, C in siemens."""
KINDS = ("coil", "capacitor", "resistor")


@dataclass(frozen=True, slots=True)
class Part:
    """One part.

    Parameters
    ----------
    kind
        ``"coil"`` (henry), ``"capacitor"`` (farad) or ``"resistor"`` (ohm).
    value
        Positive.
    tolerance
        Relative: 0.05 for 5 %.
    q
        Quality at ``q_hz``; infinite for an ideal part. A coil's resistance grows with the root of the
        frequency (skin effect), a capacitor's is the same at all frequencies (common practice).
    q_hz
        Where ``q`` is meant.

    Raises
    ------
    ValueError
        For a kind or value that no part has.
    """

    kind: str
    value: float
    tolerance: float = 0.0
    q: float = np.inf
    q_hz: float = 0.0

    def __post_init__(self) -> None:
        if self.kind not in KINDS:
            raise ValueError(f"{self.kind!r} is no part; known are {', '.join(KINDS)}")
        if not (np.isfinite(self.value) and self.value > 0):
            raise ValueError(f"a {self.kind} of {self.value:g} cannot be had; its value must be positive")
        if not 0 <= self.tolerance < 1:
            raise ValueError(f"a tolerance of {self.tolerance:g} is out of range; allowed are 0 to below 1")
        if not self.q > 0 or (np.isfinite(self.q) and not self.q_hz > 0):
            raise ValueError(f"a Q of {self.q:g} must be positive, and say at which frequency above 0 it is")

    def impedance(self, f_hz: FloatArray, factor: FloatArray) -> ComplexArray:
        """Ohm, ``(..., f)``, its value times ``factor`` ``(...,)``; 0 Hz is taken as 1 mHz."""
        value = (self.value * factor)[..., np.newaxis]
        w = 2.0 * np.pi * np.maximum(f_hz, 1e-3)
        if self.kind == "resistor":
            return np.asarray(value + 0j * w)
        if self.kind == "coil":
            loss = 0.0 if np.isinf(self.q) else 2 * np.pi * self.q_hz / self.q * np.sqrt(f_hz / self.q_hz)
            return np.asarray(value * (loss + 1j * w))
        loss = 0.0 if np.isinf(self.q) else 1.0 / (2 * np.pi * self.q_hz * self.q)
        return np.asarray((loss + 1.0 / (1j * w)) / value)


@dataclass(frozen=True, slots=True)
class Branch:
    """Parts joined in series or in parallel, standing in series or in shunt.

    Parameters
    ----------
    place
        ``"series"`` or ``"shunt"``.
    parts
        One or more.
    joined
        ``"series"`` or ``"parallel"``; of no matter for one part.
    """

    place: str
    parts: tuple[Part, ...]
    joined: str = "series"

    @property
    def varying(self) -> tuple[float, ...]:
        """Tolerances of what may vary."""
        return tuple(p.tolerance for p in self.parts)

    def chain(self, f_hz: FloatArray, factors: FloatArray) -> Chain:
        """Chain matrix ``(..., f)`` with each part times its factor ``(..., parts)``."""
        impedances = [p.impedance(f_hz, factors[..., i]) for i, p in enumerate(self.parts)]
        if self.joined == "series":
            z = sum(impedances[1:], impedances[0])
            # A perfect resonance is a very small number, never a division by nothing.
            return _placed(self.place, z, 1.0 / np.where(np.abs(z) < 1e-12, 1e-12, z))
        y = sum((1.0 / z for z in impedances[1:]), 1.0 / impedances[0])
        return _placed(self.place, 1.0 / np.where(np.abs(y) < 1e-15, 1e-15, y), y)


@dataclass(frozen=True, slots=True)
class Line:
    """A piece of line in the way.

    Parameters
    ----------
    z_ohm
        Characteristic impedance, real.
    wavelengths
        Length at ``at_hz``.
    at_hz
        Where the length is meant.
    loss_db
        Of the piece at ``at_hz``, growing with the root of the frequency.
    tolerance
        Relative, of the length.
    """

    z_ohm: float
    wavelengths: float
    at_hz: float
    loss_db: float = 0.0
    tolerance: float = 0.0

    @property
    def varying(self) -> tuple[float, ...]:
        """Tolerance of the length."""
        return (self.tolerance,)

    def turn(self, f_hz: FloatArray, factors: FloatArray) -> ComplexArray:
        """Propagation ``alpha l + j beta l``, ``(..., f)``."""
        relative = f_hz / self.at_hz
        loss = self.loss_db / (20.0 / np.log(10.0)) * np.sqrt(relative)
        whole = loss + 2j * np.pi * self.wavelengths * relative
        return np.asarray(whole * factors[..., 0][..., np.newaxis])

    def chain(self, f_hz: FloatArray, factors: FloatArray) -> Chain:
        """Chain matrix ``(..., f)``."""
        turn = self.turn(f_hz, factors)
        cosh, sinh = np.cosh(turn), np.sinh(turn)
        return (
            np.asarray(cosh),
            np.asarray(self.z_ohm * sinh),
            np.asarray(sinh / self.z_ohm),
            np.asarray(cosh),
        )


@dataclass(frozen=True, slots=True)
class Stub:
    """A line that ends, standing in shunt or in series.

    Parameters
    ----------
    place
        ``"shunt"`` or ``"series"``.
    end
        ``"open"`` or ``"short"``.
    line
        What it is made of.
    """

    place: str
    end: str
    line: Line

    @property
    def varying(self) -> tuple[float, ...]:
        """Tolerance of the length."""
        return self.line.varying

    def chain(self, f_hz: FloatArray, factors: FloatArray) -> Chain:
        """Chain matrix ``(..., f)``."""
        turn = self.line.turn(f_hz, factors)
        cosh, sinh = np.cosh(turn), np.sinh(turn)
        over, under = (sinh, cosh) if self.end == "short" else (cosh, sinh)
        # A stub of no length or at resonance is a very small or a very great number, never a division by 0.
        z = self.line.z_ohm * over / np.where(np.abs(under) < 1e-15, 1e-15, under)
        y = under / np.where(np.abs(over) < 1e-15, 1e-15, over) / self.line.z_ohm
        return _placed(self.place, z, y)


Element: TypeAlias = Branch | Line | Stub


def _placed(place: str, z: ComplexArray | FloatArray, y: ComplexArray | FloatArray) -> Chain:
    there = np.asarray(z if place == "series" else y, dtype=np.complex128)
    one, none = np.ones_like(there), np.zeros_like(there)
    return (one, there, none, one) if place == "series" else (one, none, there, one)
