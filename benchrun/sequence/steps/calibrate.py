"""Step ``calibrate``: read a kit's standards and solve the error terms."""

from __future__ import annotations

from typing import Annotated, ClassVar, Literal

from pydantic import Field

from benchrun.sequence.fields import Duration, Listed, Name
from benchrun.sequence.steps.base import StepModel

__all__ = ["Calibrate"]


class Calibrate(StepModel):
    """Calibrate the analyzer at the ends of its cables."""

    kind: ClassVar[str] = "calibrate"
    leaves: ClassVar[str] = "calibration"
    roles: ClassVar[tuple[str, ...]] = ("analyzer",)

    name: Name = Field(alias="as", description="name under which sweeps refer to this calibration")
    sweep: Name = Field(description="one of the sequence's sweeps")
    method: Literal["SOLT", "SOL"] = Field(description="SOLT: two ports; SOL: one port")
    kit: str = Field(description="name or file of the calibration kit", min_length=1)
    keep: Duration | None = Field(default=None, description="how long the calibration may serve")
    ports: Annotated[tuple[Literal[1, 2], ...], Listed] = Field(
        default=(), max_length=2, description="[1], [2] or [1, 2]"
    )
    isolation: bool = Field(default=False, description="read isolation with a load on each port (SOLT)")

    @property
    def used_ports(self) -> tuple[int, ...]:
        """The ports, with the method's default filled in."""
        return self.ports or ((1, 2) if self.method == "SOLT" else (1,))

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a sweep."""
        return {"sweep": ("sweep", self.sweep)}
