"""How a raw reading moves when what is connected does: numerical derivatives through the error terms."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from functools import partial
from typing import TypeAlias

import numpy as np

from benchrun.evaluate.propagation.trail import Halves, Trail, freed
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["STEP", "UNIT", "Changes", "Seen", "Where", "joint", "wrapped"]

UNIT = "unit"
"""Stands for the hook-up of the unit among those of the standards."""
Where: TypeAlias = tuple[str, int]
"""A hook-up's text (or :data:`UNIT`) and a plane: 0 for S11, 1 for S12, 2 for S21, 3 for S22."""
Changes: TypeAlias = dict[Where, tuple[ComplexArray, ...]]
"""For each plane that moves one plane ``(f,)`` an axis of what moves it."""
STEP = 1e-5
"""Of numerical derivatives; what they lack is its square, what they round is 1e-16 over it."""


def joint(size: ComplexArray) -> TwoPort:
    """A small lossless step whose transmission keeps its phase: ``S22 = -conj(S11)``."""
    one = np.ones_like(size)
    return TwoPort(size, one, one, -np.conj(size))


class Seen:
    """How a reading moves when what is connected does."""

    def __init__(self, trail: Trail, text: str, ends: tuple[int, ...], reading: TwoPort) -> None:
        self.text, self.ends, self.trail = text, ends, trail
        self.single = len(ends) == 1
        terms = trail.terms
        if self.single:
            port = ends[0]
            if isinstance(terms, TwelveTerms):
                terms = terms.forward.port if port == 1 else terms.reverse.port
            assert isinstance(terms, OnePortTerms)
            self.near = terms
            self.true: TwoPort | ComplexArray = terms.correct(reading.s11 if port == 1 else reading.s22)
        else:
            assert isinstance(terms, TwelveTerms)
            self.both = terms
            self.true = terms.correct(reading)
        self.before = self._read(self.true)

    def _read(self, true: TwoPort | ComplexArray) -> tuple[ComplexArray, ...]:
        if isinstance(true, TwoPort):
            return self.both.embed(true).planes
        return (self.near.embed(true),)

    def change(
        self, moved: Callable[[complex], TwoPort | ComplexArray], steps: tuple[complex, ...]
    ) -> Changes:
        """Derivative of each plane, for each step."""
        ways = []
        for h in steps:
            after, back = self._read(moved(h)), self._read(moved(-h))
            ways.append([(a - b) / (2.0 * abs(h)) for a, b in zip(after, back, strict=True)])
        planes = range(4) if not self.single else (0 if self.ends[0] == 1 else 3,)
        return {(self.text, p): tuple(way[n] for way in ways) for n, p in enumerate(planes)}

    def places(self, inner: bool) -> Iterator[Callable[[TwoPort], TwoPort | ComplexArray]]:
        """Where a joint can stand: at each port, and inside at each side of the unit."""
        true = self.true
        yield partial(_before, true, (), ())
        if isinstance(true, TwoPort):
            yield partial(_behind, true, (), ())
        if not inner:
            return
        for n, (left, right) in enumerate(self.trail.fixtures):
            unit = freed(true, self.trail.fixtures[: n + 1])
            halves, outer = self.trail.fixtures[n : n + 1], self.trail.fixtures[:n]
            if left is not None:
                yield partial(_before, unit, halves, outer)
            if right is not None and isinstance(unit, TwoPort):
                yield partial(_behind, unit, halves, outer)


def _before(
    data: TwoPort | ComplexArray, halves: tuple[Halves, ...], outer: tuple[Halves, ...], made: TwoPort
) -> TwoPort | ComplexArray:
    return wrapped(_led(made, data), halves, outer)


def _behind(
    data: TwoPort, halves: tuple[Halves, ...], outer: tuple[Halves, ...], made: TwoPort
) -> TwoPort | ComplexArray:
    return wrapped(data @ made.flipped(), halves, outer)


def _led(joint: TwoPort, data: TwoPort | ComplexArray) -> TwoPort | ComplexArray:
    return joint @ data if isinstance(data, TwoPort) else joint.terminated(data)


def wrapped(
    data: TwoPort | ComplexArray, inner: tuple[Halves, ...], outer: tuple[Halves, ...] = ()
) -> TwoPort | ComplexArray:
    """Put fixtures round what they were taken from, the innermost first."""
    for left, right in (*reversed(inner), *reversed(outer)):
        if left is not None:
            data = _led(left, data)
        if right is not None and isinstance(data, TwoPort):
            data = data @ right
    return data
