"""What was done to a reading of the unit: everything that its propagation has to do again."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from benchrun.hookup import Hookup
from benchrun.rf.calibration import define
from benchrun.rf.calibration.method import PLAIN, Defined, Definitions, Method, Options, Terms
from benchrun.rf.calibration.one_port import own_reflection
from benchrun.rf.kit import Kit
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["POINTWISE", "Basis", "Halves", "Trail", "corrected", "freed"]

Halves = tuple[TwoPort | None, TwoPort | None]
"""Fixture halves left and right of the unit, as their files say."""

POINTWISE = ("response", "SOL", "SOLT")
"""Methods whose solution at one frequency asks for no other: they need only the points that are judged."""


@dataclass(frozen=True, slots=True, eq=False)
class Basis:
    """How a calibration was made.

    Parameters
    ----------
    method, ports, kit, isolation, options
        As the step says.
    hookups
        Of the standards.
    readings
        Raw readings by the text of their hook-up, planes ``(f,)``.
    noise
        Floor and trace noise of one reading, linear, see :meth:`Sources.noise`.
    """

    method: Method
    ports: tuple[int, ...]
    kit: Kit
    hookups: tuple[Hookup, ...]
    readings: Mapping[str, TwoPort]
    noise: tuple[float, float]
    isolation: bool = False
    options: Options = PLAIN

    def definitions(self, f_hz: FloatArray) -> Definitions:
        """The kit's standards on a grid."""
        return define(self.kit, self.method.takes(self.options), f_hz)


@dataclass(frozen=True, slots=True, eq=False)
class Trail:
    """A calibration, the unit's reading, and the fixtures taken out of it one after the other.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    basis
        The calibration.
    terms
        What it gave, planes ``(f,)``.
    unit
        The raw reading of the unit.
    hookup
        How it was connected.
    noise
        Floor and trace noise of the unit's reading.
    fixtures
        Taken out, in that order.
    definitions
        The standards on the same grid.
    """

    f_hz: FloatArray
    basis: Basis
    terms: Terms
    unit: TwoPort
    hookup: Hookup
    noise: tuple[float, float]
    fixtures: tuple[Halves, ...] = ()
    definitions: Definitions = field(default_factory=dict)

    def at(self, points: NDArray[np.intp]) -> Trail:
        """The same at some of its points; a method that needs all frequencies keeps all."""
        if self.basis.method.name not in POINTWISE or len(points) == len(self.f_hz):
            return self

        def some(plane: ComplexArray | complex) -> ComplexArray:
            # A definition may be one number for all frequencies.
            whole = np.broadcast_to(np.asarray(plane, np.complex128), self.f_hz.shape)
            return np.ascontiguousarray(whole[points])

        def two(data: TwoPort) -> TwoPort:
            return data.map(some)

        readings = {text: two(reading) for text, reading in self.basis.readings.items()}
        basis = replace(self.basis, readings=readings)
        fixtures = tuple(
            (None if left is None else two(left), None if right is None else two(right))
            for left, right in self.fixtures
        )
        f_hz = self.f_hz[points]
        chosen = Defined(f_hz)
        for name, one in self.definitions.items():
            chosen[name] = two(one) if isinstance(one, TwoPort) else some(one)
        terms = basis.method.solve(basis.ports, chosen, readings, basis.isolation, basis.options)
        return replace(
            self, f_hz=f_hz, basis=basis, terms=terms, unit=two(self.unit), fixtures=fixtures,
            definitions=chosen,
        )  # fmt: skip


def corrected(terms: Terms, raw: TwoPort, port: int) -> TwoPort | ComplexArray:
    """Take the error terms out of a raw reading."""
    if isinstance(terms, OnePortTerms):
        return terms.correct(own_reflection(raw, port))
    assert isinstance(terms, TwelveTerms)  # the two kinds of terms that methods solve for
    return terms.correct(raw)


def freed(data: TwoPort | ComplexArray, fixtures: tuple[Halves, ...]) -> TwoPort | ComplexArray:
    """Take fixtures out, one after the other; a one-port sits behind the left half."""
    for left, right in fixtures:
        if isinstance(data, TwoPort):
            data = data if left is None else data.without_left(left)
            data = data if right is None else data.without_right(right)
        elif left is not None:
            u = (data - left.s11) / (left.s12 * left.s21)
            data = np.asarray(u / (1.0 + left.s22 * u))
    return data
