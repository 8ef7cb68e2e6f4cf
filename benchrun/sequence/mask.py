"""The mask file: limits that depend on frequency."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import pairwise
from typing import Annotated, Literal

import numpy as np
from pydantic import Field, model_validator

from benchrun.quantity import Dimension, render
from benchrun.rf.masks import Mask, MaskLine, band_mask, slope_line
from benchrun.rf.twoport import FloatArray
from benchrun.sequence.fields import Decibel, FileModel, Frequency, Listed, Name, trouble

__all__ = ["MaskFile"]

Corner = Annotated[tuple[Frequency, Decibel], Listed]
Gate = Annotated[tuple[Frequency, Decibel, Decibel], Listed]


class Slope(FileModel):
    """How a line goes on behind its last corner, straight over the logarithm of frequency."""

    slope: Decibel = Field(description="change of the level per decade or octave; negative falls")
    per: Literal["decade", "octave"]
    to: Frequency = Field(description="where the line ends")


class Line(FileModel):
    """One broken line, or a corridor between two."""

    side: Literal["at most", "at least"] | None = Field(default=None, description="where the trace may be")
    spacing: Literal["linear", "log"] | None = Field(
        default=None, description="over what the line is straight: frequency (linear) or its logarithm"
    )
    levels: Literal["dB", "magnitude"] = Field(
        default="dB", description="in what the line is straight between its corners"
    )
    relative_to: Literal["peak", "figure"] | None = Field(
        default=None,
        alias="relative to",
        description="what the levels count from: the trace's greatest level, or the limit's `reference`",
    )
    through: Annotated[tuple[Corner, ...], Listed] | None = Field(
        default=None, min_length=1, max_length=1000, description="corners [frequency, level]"
    )
    then: Slope | None = Field(default=None, description="a slope behind the last corner")
    between: Annotated[tuple[Gate, ...], Listed] | None = Field(
        default=None, min_length=2, max_length=1000, description="a corridor: [frequency, lowest, highest]"
    )

    @model_validator(mode="after")
    def _one_form(self) -> Line:
        if (self.through is None) == (self.between is None):
            raise trouble("has `through` (a line) and `between` (a corridor) both or not at all; keep one")
        if self.between is not None:
            for key, given in (("side", self.side), ("then", self.then)):
                if given is not None:
                    raise trouble(f"`{key}` means nothing for a corridor", key)
        elif self.side is None:
            raise trouble("has no `side`; write `side: at most` or `side: at least`")
        elif self.then is None and len(self.through or ()) < 2:
            raise trouble("`through` has one corner; a line needs two, or a slope (`then`)", "through")
        return self

    @model_validator(mode="after")
    def _forward(self) -> Line:
        key = "through" if self.through is not None else "between"
        corners = [c[0] for c in self.through or self.between or ()]
        for f0, f1 in pairwise(corners):
            if f1 < f0:
                raise trouble(f"`{key}` goes backwards from {_hz(f0)} to {_hz(f1)}", key)
        if corners[0] == corners[-1] and self.then is None:
            raise trouble(f"`{key}` has no width: all its corners are at {_hz(corners[0])}", key)
        if (self.spacing == "log" or self.then) and corners[0] <= 0:
            raise trouble(f"`{key}` starts at 0 Hz on a logarithmic axis", key)
        for f, low, high in self.between or ():
            if low > high:
                raise trouble(f"the corridor is closed at {_hz(f)}: {low:g} dB lies above {high:g} dB", key)
        return self

    @model_validator(mode="after")
    def _below_the_peak(self) -> Line:
        key = "through" if self.through is not None else "between"
        uppers = self.through or self.between if self.side != "at least" else ()
        if self.relative_to == "peak" and any(corner[-1] >= 0 for corner in uppers or ()):
            raise trouble(
                "an upper limit of 0 dB or more over the trace's own peak is never exceeded and leaves no "
                "room for uncertainty; take that line out, or count from a figure",
                key,
            )
        return self

    @model_validator(mode="after")
    def _sloped(self) -> Line:
        if self.then is None:
            return self
        last = (self.through or ())[-1][0]
        if self.then.to <= last:
            raise trouble(f"the slope goes backwards from {_hz(last)} to {_hz(self.then.to)}", "then")
        if self.spacing == "linear":
            raise trouble(
                "a slope is straight over the logarithm of frequency: write `spacing: log`", "spacing"
            )
        if self.levels == "magnitude":
            raise trouble("a slope in dB is straight in dB: write `levels: dB`", "levels")
        return self

    def build(self, name: str) -> Iterator[MaskLine]:
        """As numbers: one line, or the two of a corridor."""
        spacing, relative = self.spacing or "linear", self.relative_to or ""
        if self.between is not None:
            f, low, high = np.array(self.between, dtype=np.float64).T
            lines: tuple[MaskLine, ...] = band_mask(name, f, low, high, spacing, relative).lines
        elif self.then is not None:
            slope = self.then
            corners = [(c[0], c[1]) for c in self.through or ()]
            lines = (slope_line(str(self.side), corners, slope.to, slope.slope, slope.per),)
        else:
            f, level = np.array(self.through, dtype=np.float64).T
            lines = (MaskLine(str(self.side), f, level, spacing),)
        for line in lines:
            yield MaskLine(line.side, line.f_hz, line.level_db, line.spacing, self.levels, relative)


class MaskFile(FileModel):
    """One mask."""

    mask: Name
    edition: Literal[1]
    title: str = Field(min_length=1, max_length=120)
    lines: Annotated[tuple[Line, ...], Listed] = Field(min_length=1, max_length=40)

    @model_validator(mode="after")
    def _uncrossed(self) -> MaskFile:
        built = self.build().lines
        for upper in (x for x in built if x.side == "at most"):
            for lower in (x for x in built if x.side == "at least" and x.relative_to == upper.relative_to):
                f = _looked_at(upper, lower)
                crossed = f[lower.limit_at(f) > upper.limit_at(f) + 1e-9] if len(f) else f
                if len(crossed):
                    raise trouble(f"lines cross near {_hz(float(crossed[0]))}: no trace can pass", "lines")
        return self

    def build(self) -> Mask:
        """As numbers."""
        return Mask(self.mask, tuple(line for x in self.lines for line in x.build(self.mask)))


def _looked_at(upper: MaskLine, lower: MaskLine) -> FloatArray:
    """Frequencies that both lines cover: corners, and samples between them.

    Between corners two lines may cross only where they are straight over different axes.
    """
    corners = np.unique(np.concatenate([upper.f_hz, lower.f_hz]))
    between = np.linspace(corners[:-1], corners[1:], 32).ravel()
    f = np.unique(np.concatenate([corners, between]))
    return np.asarray(f[upper.inside(f) & lower.inside(f)])


def _hz(value: float) -> str:
    return render(float(value), Dimension.FREQUENCY)
