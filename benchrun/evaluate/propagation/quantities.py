"""The numbers that limits judge, taken from many draws at once."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchrun.rf.figures.kind import FigureKind
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Quantity", "near", "points_of"]


@dataclass(frozen=True, slots=True, eq=False)
class Quantity:
    """One figure on one side.

    Parameters
    ----------
    name
        In words.
    kind, side, parameters
        As :meth:`FigureKind.measure` takes them.
    value
        Nominal value in the figure's SI unit.
    points
        Samples that it needs, as a slice of the grid it is given with.
    """

    name: str
    kind: FigureKind
    side: str
    parameters: Mapping[str, Any]
    value: float
    points: slice

    def take(self, f_hz: FloatArray, data: TwoPort | ComplexArray) -> FloatArray:
        """Take it from draws ``(d, f)``; ``(d,)``."""
        inside = self.points
        part = data.map(lambda p: p[..., inside]) if isinstance(data, TwoPort) else data[..., inside]
        return np.asarray(self.kind.measure(f_hz[inside], part, self.side, **self.parameters).value)


def near(f_hz: FloatArray, kind: FigureKind, parameters: Mapping[str, Any]) -> slice:
    """The samples that a figure needs: its bands, and two more at each end to interpolate the edges."""
    band = kind.band(parameters) if kind.local else None
    if band is None:
        return slice(0, len(f_hz))
    bands = (band, parameters.get("against") or band)
    first = np.searchsorted(f_hz, min(low for low, _ in bands) * (1 - 1e-12))
    last = np.searchsorted(f_hz, max(high for _, high in bands) * (1 + 1e-12))
    return slice(max(int(first) - 2, 0), min(int(last) + 2, len(f_hz)))


def points_of(slices: list[slice], total: int) -> NDArray[np.intp]:
    """All samples that any of the slices holds, rising; a slice stays one among them."""
    wanted = np.zeros(total, dtype=bool)
    for one in slices:
        wanted[one] = True
    return np.flatnonzero(wanted)
