"""Draws to corrected planes: all influences at once, then calibration, correction and de-embedding in full.

What the systematic influences do to a plane is one product of two small matrices; noise is drawn for every
plane, point and draw. That, the solution and the correction cost about as much as the random numbers do.
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from benchrun.evaluate.propagation.influence import Influence
from benchrun.evaluate.propagation.seen import UNIT, Where
from benchrun.evaluate.propagation.trail import Trail, corrected, freed
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort
from benchrun.uncertainty.distribution import Distribution

__all__ = ["Kernel"]


class Kernel:
    """Everything that does not change from draw to draw, laid out for speed.

    Parameters
    ----------
    trail
        What was done.
    found
        The influences.
    """

    def __init__(self, trail: Trail, found: Iterable[Influence]) -> None:
        self.trail, self.found = trail, tuple(found)
        self.axes = sum(2 if one.vector else 1 for one in self.found)
        self._planes = {where: self._plane(*where) for where in self._varied()}
        columns: dict[Where, list[tuple[int, ComplexArray]]] = {where: [] for where in self._planes}
        column = 0
        self.groups: list[str] = []
        normal: list[int] = []
        self._other: list[tuple[int, Influence]] = []
        for one in self.found:
            if one.distribution is Distribution.NORMAL:
                normal += range(column, column + (2 if one.vector else 1))
            else:
                self._other.append((column, one))
            for axis in range(2 if one.vector else 1):
                for where, changes in one.changes.items():
                    if where in columns:
                        columns[where].append((column, changes[axis]))
                self.groups.append(one.group)
                column += 1
        self._normal = np.array(normal, dtype=np.intp)
        points = len(trail.f_hz)
        self._index, self._change, self._noise = {}, {}, {}
        for where, entries in columns.items():
            self._index[where] = np.array([c for c, _ in entries], dtype=np.intp)
            stacked = np.array([plane for _, plane in entries], np.complex128).reshape(len(entries), points)
            self._change[where] = stacked.view(np.float64)
            floor, trace = trail.noise if where[0] == UNIT else trail.basis.noise
            plane = self._planes[where]
            sigma = np.hypot(floor, trace * np.abs(plane)) / np.sqrt(2.0)
            self._noise[where] = np.repeat(sigma, 2)

    @property
    def noisy(self) -> bool:
        """Whether noise is declared."""
        return any(bool(sigma.any()) for sigma in self._noise.values())

    def draw(self, generator: np.random.Generator, trials: int) -> FloatArray:
        """Draws of all systematic influences, ``(trials, axes)``, unit standard deviation each."""
        rows = np.empty((trials, self.axes))
        # Two axes of a normal vector are two normal draws; all of them in one call are much faster.
        rows[:, self._normal] = generator.standard_normal((trials, len(self._normal)))
        for column, one in self._other:
            axes = 2 if one.vector else 1
            rows[:, column : column + axes] = one.distribution.draw(generator, trials, one.vector)
        return rows

    def run(self, rows: FloatArray, generator: np.random.Generator | None) -> TwoPort | ComplexArray:
        """Corrected and de-embedded planes.

        Parameters
        ----------
        rows
            Values of the influences in standard deviations, ``(d, axes)``.
        generator
            Of the noise; None for none.

        Returns
        -------
        TwoPort or numpy.ndarray
            Planes ``(d, f)``.
        """
        moved: dict[str, dict[int, ComplexArray]] = {}
        for where, plane in self._planes.items():
            moved.setdefault(where[0], {})[where[1]] = self._one(where, plane, rows, generator)
        basis = self.trail.basis
        readings = {text: _with(reading, moved.get(text, {})) for text, reading in basis.readings.items()}
        terms = basis.method.solve(
            basis.ports, self.trail.definitions, readings, basis.isolation, basis.options
        )
        unit = _with(self.trail.unit, moved[UNIT])
        return freed(corrected(terms, unit, self.trail.hookup.ports[0]), self.trail.fixtures)

    def _one(
        self, where: Where, plane: ComplexArray, rows: FloatArray, generator: np.random.Generator | None
    ) -> ComplexArray:
        index, change = self._index[where], self._change[where]
        if generator is None:
            return plane + (rows[:, index] @ change).view(np.complex128)
        noise = generator.standard_normal((len(rows), 2 * len(plane)))
        noise *= self._noise[where]
        if len(index):
            noise += rows[:, index] @ change
        total: ComplexArray = noise.view(np.complex128)
        total += plane
        return total

    def _varied(self) -> list[Where]:
        """Planes that are read and used: of one port its own reflection, of two all four."""
        found: list[Where] = []
        for hookup in self.trail.basis.hookups:
            for connection in hookup.connections:
                if len(connection.ports) == 2:
                    found += [(hookup.text, p) for p in range(4)]
                else:
                    found.append((hookup.text, 0 if connection.ports[0] == 1 else 3))
            if len(hookup.connections) == 2:  # a load on each port: what leaks between them is read
                found += [(hookup.text, 1), (hookup.text, 2)]
        if isinstance(self.trail.terms, OnePortTerms):
            return [*found, (UNIT, 0 if self.trail.hookup.ports[0] == 1 else 3)]
        return found + [(UNIT, p) for p in range(4)]

    def _plane(self, text: str, plane: int) -> ComplexArray:
        reading = self.trail.unit if text == UNIT else self.trail.basis.readings[text]
        return reading.planes[plane]


def _with(reading: TwoPort, planes: dict[int, ComplexArray]) -> TwoPort:
    return TwoPort(*(planes.get(n, plane) for n, plane in enumerate(reading.planes)))
