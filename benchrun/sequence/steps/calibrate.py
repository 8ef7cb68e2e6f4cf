"""Step ``calibrate``: read a kit's standards and solve the error terms."""

from __future__ import annotations

from typing import Annotated, ClassVar, Literal

from pydantic import Field

from benchrun.rf.calibration import METHODS
from benchrun.rf.calibration.method import Method, Options
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
    method: Literal["response", "SOL", "one-path", "SOLT", "SOLR", "TRL", "multiline TRL", "LRM", "LRRM"] = (
        Field(
            description="SOLT: two ports, known thru; SOLR: unknown thru; SOL: one port; "
            "one-path: one source, the unit turned round"
        )
    )
    kit: str = Field(description="name or file of the calibration kit", min_length=1)
    keep: Duration | None = Field(default=None, description="how long the calibration may serve")
    ports: Annotated[tuple[Literal[1, 2], ...], Listed] = Field(
        default=(), max_length=2, description="[1], [2] or [1, 2]"
    )
    isolation: bool = Field(default=False, description="read isolation with a load on each port")
    lines: Annotated[tuple[Name, ...], Listed] = Field(
        default=("line",), min_length=1, max_length=8, description="line standards of the kit (TRL)"
    )
    reflect: Name = Field(default="short", description="reflecting standard of the kit (TRL, LRM)")
    overrule: str | None = Field(
        default=None,
        min_length=10,
        max_length=300,
        description="why a kit past its date may be used after all; stands in the record",
    )
    beyond_window: bool = Field(
        default=False,
        alias="beyond window",
        description="accept frequencies where no line is 20 to 160 degrees longer than the thru (TRL)",
    )

    @property
    def how(self) -> Method:
        """The method itself."""
        return METHODS[self.method]

    @property
    def options(self) -> Options:
        """The method's options."""
        return Options(self.lines, self.reflect, self.beyond_window)

    @property
    def used_ports(self) -> tuple[int, ...]:
        """The ports, with the method's default filled in."""
        return self.ports or ((1, 2) if self.how.two_port else (1,))

    @property
    def turns(self) -> bool:
        """Whether the unit is read twice, the second time turned round."""
        return self.method == "one-path"

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a sweep."""
        return {"sweep": ("sweep", self.sweep)}
