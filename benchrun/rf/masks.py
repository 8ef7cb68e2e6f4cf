"""Limits that depend on frequency: lines through given points, above or below a trace."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.rf.twoport import FloatArray

__all__ = ["Mask", "MaskLine"]


@dataclass(frozen=True, slots=True, eq=False)
class MaskLine:
    """One broken line.

    Parameters
    ----------
    side
        ``"at most"``: the trace must stay below; ``"at least"``: above.
    f_hz
        Corner points, ``(k,)``, increasing; two equal frequencies make a step.
    level_db
        Levels there, ``(k,)``.
    spacing
        ``"linear"``: straight over frequency; ``"log"``: straight over the logarithm of frequency.

    Examples
    --------
    >>> import numpy as np
    >>> line = MaskLine("at most", np.array([1e8, 2e8]), np.array([0.0, -20.0]))
    >>> float(line.limit_at(np.array([1.5e8]))[0])
    -10.0
    """

    side: str
    f_hz: FloatArray
    level_db: FloatArray
    spacing: str = "linear"

    def __post_init__(self) -> None:
        if len(self.f_hz) < 2 or np.any(np.diff(self.f_hz) < 0):
            raise ValueError("a mask line needs two or more points whose frequencies do not go backwards")
        if self.spacing == "log" and not self.f_hz[0] > 0:
            raise ValueError("a mask line straight over the logarithm of frequency starts above 0 Hz")

    def inside(self, f_hz: FloatArray) -> np.ndarray[tuple[int, ...], np.dtype[np.bool_]]:
        """Which frequencies the line covers, ``(f,)``."""
        return np.asarray((f_hz >= self.f_hz[0]) & (f_hz <= self.f_hz[-1]))

    def limit_at(self, f_hz: FloatArray) -> FloatArray:
        """Interpolate the limit in dB at ``(f,)`` frequencies inside; at a step the stricter level counts."""
        x, xs = (np.log(self.f_hz), np.log(f_hz)) if self.spacing == "log" else (self.f_hz, f_hz)
        before, after = self._side(x, xs, "left"), self._side(x, xs, "right")
        return np.minimum(before, after) if self.side == "at most" else np.maximum(before, after)

    def _side(self, x: FloatArray, xs: FloatArray, side: str) -> FloatArray:
        right = np.clip(np.searchsorted(x, xs, "left" if side == "left" else "right"), 1, len(x) - 1)
        width = x[right] - x[right - 1]
        weight = np.clip((xs - x[right - 1]) / np.where(width == 0, 1.0, width), 0.0, 1.0)
        if side == "right":  # a line that ends in a step ends at the step's far level
            weight = np.where(width == 0, 1.0, weight)
        return np.asarray(self.level_db[right - 1] * (1.0 - weight) + self.level_db[right] * weight)


@dataclass(frozen=True, slots=True)
class Mask:
    """A named set of lines for one trace."""

    name: str
    lines: tuple[MaskLine, ...]

    @property
    def band(self) -> tuple[float, float]:
        """Lowest and highest frequency of all lines, in Hz."""
        return min(float(x.f_hz[0]) for x in self.lines), max(float(x.f_hz[-1]) for x in self.lines)
