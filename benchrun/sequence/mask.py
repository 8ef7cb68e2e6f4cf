"""The mask file: limits that depend on frequency."""

from __future__ import annotations

from typing import Annotated, Literal

import numpy as np
from pydantic import Field, model_validator

from benchrun.rf.masks import Mask, MaskLine
from benchrun.sequence.fields import Decibel, FileModel, Frequency, Listed, Name, trouble

__all__ = ["MaskFile"]

Corner = Annotated[tuple[Frequency, Decibel], Listed]


class Line(FileModel):
    """One broken line."""

    side: Literal["at most", "at least"]
    spacing: Literal["linear", "log"] = "linear"
    through: Annotated[tuple[Corner, ...], Listed] = Field(min_length=2, max_length=1000)

    @model_validator(mode="after")
    def _forward(self) -> Line:
        for (f0, _), (f1, _) in zip(self.through, self.through[1:], strict=False):
            if f1 < f0:
                raise trouble(f"`through` goes backwards from {f0:g} Hz to {f1:g} Hz", "through")
        if self.spacing == "log" and self.through[0][0] <= 0:
            raise trouble("`through` starts at 0 Hz on a logarithmic axis", "through")
        return self


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
            for lower in (x for x in built if x.side == "at least"):
                corners = np.unique(np.concatenate([upper.f_hz, lower.f_hz]))
                # Between corners two lines may cross only where one is straight over log f; sample it.
                between = np.linspace(corners[:-1], corners[1:], 32).ravel()
                f = np.unique(np.concatenate([corners, between]))
                f = f[upper.inside(f) & lower.inside(f)]
                if len(f) and np.any(lower.limit_at(f) > upper.limit_at(f)):
                    raise trouble(
                        f"lines cross near {f[np.argmax(lower.limit_at(f) > upper.limit_at(f))]:g} Hz: "
                        "no trace can pass",
                        "lines",
                    )
        return self

    def build(self) -> Mask:
        """As numbers."""
        lines = [
            MaskLine(
                x.side, np.array([c[0] for c in x.through]), np.array([c[1] for c in x.through]), x.spacing
            )
            for x in self.lines
        ]
        return Mask(self.mask, tuple(lines))
