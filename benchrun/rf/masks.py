"""Limits that depend on frequency: lines through given points, above or below a trace."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from benchrun.rf.figures.band import at
from benchrun.rf.twoport import FloatArray

__all__ = ["Mask", "MaskLine", "Worst", "band_mask", "slope_line", "worst_point"]

RELATIVE = ("", "peak", "figure")
LEVELS = ("dB", "magnitude")


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
    levels
        ``"dB"``: straight in decibels; ``"magnitude"``: straight in ``10^(dB/20)``, as a line drawn on a
        linear axis. Levels are given in dB in either case.
    relative_to
        Empty: levels are absolute. ``"peak"``: they count from the greatest level of the trace they are
        laid over. ``"figure"``: from a value in dB that whoever lays the mask has measured.

    Raises
    ------
    ValueError
        For fewer than two points, frequencies that go backwards, values that are no numbers, or an unknown
        word.

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
    levels: str = "dB"
    relative_to: str = ""

    def __post_init__(self) -> None:
        if len(self.f_hz) < 2 or np.any(np.diff(self.f_hz) < 0):
            raise ValueError("a mask line needs two or more points whose frequencies do not go backwards")
        if len(self.f_hz) != len(self.level_db) or not np.all(np.isfinite([*self.f_hz, *self.level_db])):
            raise ValueError("a mask line needs a level, a finite number, at each of its frequencies")
        if self.spacing == "log" and not self.f_hz[0] > 0:
            raise ValueError("a mask line straight over the logarithm of frequency starts above 0 Hz")
        for word, value, allowed in (
            ("side", self.side, ("at most", "at least")),
            ("spacing", self.spacing, ("linear", "log")),
            ("levels", self.levels, LEVELS),
            ("relative_to", self.relative_to, RELATIVE),
        ):
            if value not in allowed:
                raise ValueError(
                    f"{word} of a mask line is {value!r}; allowed are {', '.join(map(repr, allowed))}"
                )

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
        if self.levels == "dB":
            return np.asarray(self.level_db[right - 1] * (1.0 - weight) + self.level_db[right] * weight)
        size = 10.0 ** (self.level_db / 20.0)
        return np.asarray(20.0 * np.log10(size[right - 1] * (1.0 - weight) + size[right] * weight))

    def resolved(self, reference_db: float) -> MaskLine:
        """Make a relative line absolute: levels moved up by what they count from, in dB."""
        return replace(self, level_db=self.level_db + reference_db, relative_to="")

    def samples(self, f_hz: FloatArray) -> FloatArray:
        """Frequencies of a sweep inside the line, and its corners that lie in the sweep, ``(k,)``.

        A corner between two samples may be the tightest place, so corners count as samples.
        """
        corners = self.f_hz[(self.f_hz >= f_hz[0]) & (self.f_hz <= f_hz[-1])]
        return np.unique(np.concatenate([f_hz[self.inside(f_hz)], corners]))


@dataclass(frozen=True, slots=True)
class Mask:
    """A named set of lines for one trace."""

    name: str
    lines: tuple[MaskLine, ...]

    @property
    def band(self) -> tuple[float, float]:
        """Lowest and highest frequency of all lines, in Hz."""
        return min(float(x.f_hz[0]) for x in self.lines), max(float(x.f_hz[-1]) for x in self.lines)

    def resolved(self, reference_db: float) -> Mask:
        """Make all relative lines absolute; the others stay as they are."""
        lines = tuple(x.resolved(reference_db) if x.relative_to else x for x in self.lines)
        return Mask(self.name, lines)


def band_mask(
    name: str, f_hz: FloatArray, lower_db: FloatArray, upper_db: FloatArray, spacing: str = "linear",
    relative_to: str = "",
) -> Mask:  # fmt: skip
    """A corridor: the trace must stay between two lines through the same frequencies.

    Raises
    ------
    ValueError
        If the lower line is above the upper one anywhere: no trace can pass.
    """
    crossed = np.flatnonzero(lower_db > upper_db)
    if len(crossed):
        i = int(crossed[0])
        raise ValueError(
            f"the corridor {name!r} is closed at {f_hz[i]:g} Hz: at least {lower_db[i]:g} dB and at most "
            f"{upper_db[i]:g} dB; no trace can pass"
        )
    lower = MaskLine("at least", f_hz, lower_db, spacing, relative_to=relative_to)
    return Mask(name, (lower, replace(lower, side="at most", level_db=upper_db)))


def slope_line(
    side: str, points: Sequence[tuple[float, float]], last_hz: float, decibels: float, every: str = "decade"
) -> MaskLine:
    """Continue a line with a slope: so many dB a decade or an octave, up to a last frequency.

    Parameters
    ----------
    side
        As of :class:`MaskLine`.
    points
        Frequency and level of each corner before the slope, at least one.
    last_hz
        Where the slope ends.
    decibels
        Per decade or octave; negative falls.
    every
        ``"decade"`` or ``"octave"``.

    Raises
    ------
    ValueError
        For another word, or a slope that goes backwards or starts at 0 Hz.

    Examples
    --------
    >>> line = slope_line("at most", [(1e8, 0.0)], 1e9, -20.0)
    >>> line.level_db.tolist()
    [0.0, -20.0]
    """
    if every not in ("decade", "octave"):
        raise ValueError(f"a slope of so many dB is per 'decade' or 'octave', not per {every!r}")
    first_hz, level = points[-1]
    if not 0 < first_hz < last_hz:
        raise ValueError(f"a slope from {first_hz:g} Hz to {last_hz:g} Hz does not go up from above 0 Hz")
    base = 10.0 if every == "decade" else 2.0
    end = level + decibels * float(np.log(last_hz / first_hz) / np.log(base))
    f, levels = np.array([*points, (last_hz, end)], dtype=np.float64).T
    return MaskLine(side, f, levels, "log")


@dataclass(frozen=True, slots=True, eq=False)
class Worst:
    """Where a trace is tightest against a line.

    Parameters
    ----------
    f_hz, level_db, limit_db
        There, ``(...,)``.
    margin_db
        Positive inside the limit, ``(...,)``.
    ratio
        Margin over the uncertainty towards the limit; nan where none is given, ``(...,)``.
    """

    f_hz: FloatArray
    level_db: FloatArray
    limit_db: FloatArray
    margin_db: FloatArray
    ratio: FloatArray


def worst_point(
    line: MaskLine,
    f_hz: FloatArray,
    level_db: FloatArray,
    towards_db: FloatArray | None = None,
    by: str = "margin",
) -> Worst:
    """Find the tightest point of a trace, by margin or by margin over uncertainty.

    The two differ: deep in a stop band the margin may be great and still less than what the noise there
    leaves sure, while a small margin in the pass band is sure to a hundredth of a dB.

    Parameters
    ----------
    line
        Absolute, or relative to the ``"peak"``, which is then the greatest sample of each trace.
    f_hz
        ``(f,)``.
    level_db
        ``(..., f)``. Between samples it is taken as linear in dB.
    towards_db
        Expanded uncertainty towards the limit, ``(..., f)``, not negative; infinite where not resolvable.
    by
        ``"margin"`` or ``"uncertainty"``.

    Returns
    -------
    Worst
        A trace with a hole (nan) inside the line gives nan: it cannot be told.

    Raises
    ------
    ValueError
        If the line lies (partly) outside of the sweep, counts from a figure that has not been resolved, or
        the worst is asked by an uncertainty that is not given.
    """
    if line.relative_to == "figure":
        raise ValueError("the line counts from a figure: measure it, and lay `line.resolved(value)`")
    if by not in ("margin", "uncertainty") or (by == "uncertainty" and towards_db is None):
        raise ValueError(
            f"the worst point is by 'margin', or by 'uncertainty' where one is given; not {by!r}"
        )
    if line.f_hz[0] < f_hz[0] * (1 - 1e-12) or line.f_hz[-1] > f_hz[-1] * (1 + 1e-12):
        raise ValueError(
            f"the line runs from {line.f_hz[0]:g} Hz to {line.f_hz[-1]:g} Hz, but the sweep covers only "
            f"{f_hz[0]:g} Hz to {f_hz[-1]:g} Hz"
        )
    where = line.samples(f_hz)
    limit = line.limit_at(where)
    if line.relative_to == "peak":
        limit = limit + level_db.max(-1, keepdims=True)
    level = at(f_hz, level_db, where)
    margin = limit - level if line.side == "at most" else level - limit
    ratio = np.full_like(margin, np.nan)
    if towards_db is not None:
        towards = at(f_hz, towards_db, where)
        # Nothing uncertain and inside is infinitely sure; on the limit itself there is nothing to be sure of.
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = np.where(margin == 0, 0.0, margin / towards)
    rank = margin if by == "margin" else ratio
    index = np.argmin(rank, -1)[..., np.newaxis]

    def take(values: FloatArray) -> FloatArray:
        return np.take_along_axis(np.broadcast_to(values, margin.shape), index, -1)[..., 0]

    return Worst(take(where), take(level), take(limit), take(margin), take(ratio))
