"""Step ``sweep``: read the unit, and correct the reading where a calibration is named."""

from __future__ import annotations

from typing import ClassVar

from pydantic import Field, model_validator

from benchrun.sequence.fields import Name, trouble
from benchrun.sequence.steps.base import StepModel

__all__ = ["Sweep"]


class Sweep(StepModel):
    """Read the unit once."""

    kind: ClassVar[str] = "sweep"
    leaves: ClassVar[str] = "network"
    roles: ClassVar[tuple[str, ...]] = ("analyzer",)

    name: Name = Field(alias="as", description="name under which later steps refer to this result")
    with_: Name | None = Field(default=None, alias="with", description="a calibration; its sweep is used")
    sweep: Name | None = Field(
        default=None, description="one of the sequence's sweeps, to read without correction"
    )

    @model_validator(mode="after")
    def _one_of(self) -> Sweep:
        if (self.with_ is None) == (self.sweep is None):
            raise trouble(
                "says `with` (a calibration) and `sweep` (an uncorrected sweep) both or not at all; say one"
            )
        return self

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a calibration or a sweep."""
        if self.with_ is not None:
            return {"with": ("calibration", self.with_)}
        return {"sweep": ("sweep", str(self.sweep))}
