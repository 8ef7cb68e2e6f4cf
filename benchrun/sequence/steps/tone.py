"""Step ``tone``: drive the unit with one tone and read carrier and harmonics behind it."""

from __future__ import annotations

from typing import ClassVar

import numpy as np
from pydantic import Field, model_validator

from benchrun.rf.twoport import FloatArray
from benchrun.sequence.fields import Frequency, Name, Power, PowerRange, trouble
from benchrun.sequence.steps.base import StepModel

__all__ = ["Tone"]


class Tone(StepModel):
    """Drive the unit with a generator, read it with a spectrum analyzer, against a thru in its place."""

    kind: ClassVar[str] = "tone"
    leaves: ClassVar[str] = "network"
    roles: ClassVar[tuple[str, ...]] = ("generator", "spectrum analyzer")

    name: Name = Field(alias="as", description="name under which later steps refer to this result")
    at: Frequency = Field(gt=0, description="frequency of the carrier")
    level: Power | None = Field(default=None, description="source level")
    levels: PowerRange | None = Field(default=None, description="from lowest to highest source level")
    points: int | None = Field(default=None, ge=2, le=200, description="how many levels")
    harmonics: int = Field(default=1, ge=1, le=10, description="highest harmonic read; 1: the carrier alone")
    bandwidth: Frequency = Field(gt=0, description="resolution bandwidth")

    @model_validator(mode="after")
    def _one_or_many(self) -> Tone:
        if (self.level is None) == (self.levels is None):
            raise trouble("says `level` (one) and `levels` (a range) both or not at all; say one")
        if (self.levels is None) != (self.points is None):
            raise trouble("`levels` and `points` belong together", "points" if self.points else "levels")
        return self

    def grid_dbm(self) -> FloatArray:
        """Source levels in dBm, ``(k,)``, increasing."""
        if self.level is not None:
            return np.array([self.level])
        if self.levels is None or self.points is None:
            raise RuntimeError("a step that was never validated has no levels")
        return np.linspace(*self.levels, self.points)

    def frequencies(self) -> FloatArray:
        """Carrier and harmonics in Hz, ``(h,)``."""
        return self.at * np.arange(1.0, self.harmonics + 1.0)
