"""Step ``de-embed``: take the fixture halves out of a corrected result.

The halves are two-port Touchstone files. Orientation, as the signal goes from port 1 to port 2::

    analyzer port 1 --[1  left  2]--[1  unit  2]--[1  right  2]-- analyzer port 2
"""

from __future__ import annotations

from typing import ClassVar

from pydantic import Field, model_validator

from benchrun.sequence.fields import Name, trouble
from benchrun.sequence.steps.base import StepModel

__all__ = ["DeEmbed"]


class DeEmbed(StepModel):
    """Move the reference planes from the cable ends to the unit."""

    kind: ClassVar[str] = "de-embed"
    leaves: ClassVar[str] = "network"

    name: Name = Field(alias="as", description="name under which later steps refer to this result")
    from_: Name = Field(alias="from", description="the result to take the fixture out of")
    left: str | None = Field(
        default=None, description="Touchstone file of the half on port 1; its port 2 meets the unit"
    )
    right: str | None = Field(
        default=None, description="Touchstone file of the half on port 2; its port 1 meets the unit"
    )

    @model_validator(mode="after")
    def _some(self) -> DeEmbed:
        if self.left is None and self.right is None:
            raise trouble("names neither `left` nor `right`; name at least one fixture half")
        return self

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a network."""
        return {"from": ("network", self.from_)}
