"""Step ``expect``: measured against what a designed ladder should do; the difference is judged."""

from __future__ import annotations

from typing import ClassVar, Literal

from pydantic import Field

from benchrun.sequence.fields import Decibel, FrequencyRange, Name
from benchrun.sequence.steps.base import StepModel
from benchrun.sequence.steps.design import Design
from benchrun.sequence.steps.judge import RuleText
from benchrun.uncertainty.decision import Rule

__all__ = ["Expect"]


class Expect(StepModel):
    """Judge a result against its design."""

    kind: ClassVar[str] = "expect"
    leaves: ClassVar[str] = "judgement"

    name: Name = Field(default="expectation", alias="as")
    from_: Name = Field(alias="from", description="the result to judge")
    design: Design = Field(description="what was designed")
    trace: Literal["S11", "S12", "S21", "S22"] = "S21"
    over: FrequencyRange = Field(description="the band in which the design holds")
    within: Decibel = Field(
        default=0.0, ge=0, description="allowed beside the parts' tolerance: layout, stray parts"
    )
    rule: RuleText = Field(default=Rule(), description="decision rule of both limits")

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a network."""
        return {"from": ("network", self.from_)}
