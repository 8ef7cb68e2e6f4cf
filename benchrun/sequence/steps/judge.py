"""Step ``judge``: limits on figures and masks, with the decision rule that judges them."""

from __future__ import annotations

import difflib
import re
from typing import Annotated, Any, ClassVar, Literal

from pydantic import BeforeValidator, Discriminator, Field, Tag, WithJsonSchema, model_validator

from benchrun.quantity import Dimension, QuantityError, parse, parse_range, render
from benchrun.rf.figures import FIGURES, FigureKind
from benchrun.sequence.fields import (
    LABEL,
    Decibel,
    FileModel,
    Frequency,
    FrequencyRange,
    Impedance,
    Listed,
    Name,
    trouble,
)
from benchrun.sequence.steps.base import StepModel
from benchrun.uncertainty.decision import Rule

__all__ = ["FigureLimit", "FigureText", "Judge", "Limit", "MaskLimit"]


def _rule(value: object) -> Rule:
    if value == "simple":
        return Rule()
    if isinstance(value, dict) and len(value) == 1:
        (kind, width), *_ = value.items()
        match = re.fullmatch(r"([-+]?[0-9]*\.?[0-9]+) ?U", str(width))
        if kind in ("guard band", "non-binary") and match:
            factor = float(match[1])
            if abs(factor) > 10 or (kind == "non-binary" and factor < 0):
                raise ValueError(f'{width!r} is no sensible guard band; write it as in "1 U"')
            return Rule(str(kind), factor)
    raise ValueError(
        f"{value!r} is no decision rule; write `simple`, `{{guard band: 1 U}}` or `{{non-binary: 1 U}}`"
    )


def _rule_schema() -> WithJsonSchema:
    width = {"type": "string", "pattern": "^[-+]?[0-9]*\\.?[0-9]+ ?U$", "examples": ["1 U"]}

    def one(key: str) -> dict[str, Any]:
        return {
            "type": "object",
            "properties": {key: width},
            "required": [key],
            "additionalProperties": False,
        }

    return WithJsonSchema({"oneOf": [{"const": "simple"}, one("guard band"), one("non-binary")]})


RuleText = Annotated[Rule, BeforeValidator(_rule), _rule_schema()]
_KEYS = (
    "over", "at", "against", "drop", "edge", "port", "trace", "aperture", "outer", "reference", "velocity",
    "distance", "within",
)  # fmt: skip
"""What the figures take, by its name in a file."""
_FIGURE_NAMES = WithJsonSchema({"type": "string", "enum": sorted(FIGURES)})


def _figure(value: object) -> object:
    if isinstance(value, str) and value not in FIGURES:
        close = difflib.get_close_matches(value, FIGURES, 1, 0.5)
        hint = f"did you mean {close[0]!r}?" if close else f"known are {', '.join(sorted(FIGURES))}"
        raise ValueError(f"{value!r} is no figure; {hint}")
    return value


def _bound_text(value: object) -> object:
    """Keep a bare number as the text it was: right for a ratio, refused later for anything with a unit."""
    return str(value) if isinstance(value, int | float) and not isinstance(value, bool) else value


Bound = Annotated[
    str,
    BeforeValidator(_bound_text),
    WithJsonSchema({"type": ["string", "number"], "description": "with its unit; VSWR has none"}),
]


def _length_schema(example: str) -> WithJsonSchema:
    return WithJsonSchema({"type": "string", "examples": [example]})


Length = Annotated[
    float,
    Field(ge=0, le=1e6),
    BeforeValidator(lambda text: parse(text, Dimension.LENGTH)),
    _length_schema("1.2 m"),
]
LengthRange = Annotated[
    tuple[float, float],
    BeforeValidator(lambda text: parse_range(text, Dimension.LENGTH)),
    _length_schema("0.5 m to 3 m"),
]


class FigureText(FileModel):
    """A figure with what it takes."""

    figure: Annotated[str, BeforeValidator(_figure), _FIGURE_NAMES]
    over: FrequencyRange | None = Field(default=None, description="the band")
    at: Frequency | None = Field(default=None, description="one frequency instead of a band")
    against: FrequencyRange | None = Field(
        default=None, description="the band that rejection is counted from"
    )
    drop: Decibel | None = Field(default=None, description="how far below the peak")
    edge: Literal["upper", "lower"] | None = None
    port: Literal[1, 2] | None = None
    trace: Literal["S21", "S12"] | None = None
    aperture: Frequency | None = Field(default=None, description="of group delay")
    outer: Decibel | None = Field(default=None, description="the farther drop of a shape factor")
    reference: Impedance | None = Field(default=None, description="impedance that S-parameters refer to")
    velocity: float | None = Field(
        default=None, gt=0, le=1, description="on the line, as a part of the speed of light"
    )
    distance: Length | None = Field(default=None, description="along the line, from the reference plane")
    within: LengthRange | None = Field(default=None, description="the stretch of line to look at")

    @property
    def kind(self) -> FigureKind:
        """What the figure is."""
        return FIGURES[self.figure]

    @model_validator(mode="after")
    def _fits(self) -> FigureText:
        kind, given = self.kind, self._given()
        for key in given:
            if key not in kind.parameters:
                allowed = ", ".join(kind.parameters)
                raise trouble(f"`{key}` means nothing for {self.figure}; it takes {allowed}", key)
        for key, parameter in kind.parameters.items():
            if key not in given and parameter.default is None and not parameter.optional:
                raise trouble(f"{self.figure} needs `{key}`: {kind.meaning}")
        if "over" in kind.parameters and "at" in kind.parameters and (self.over is None) == (self.at is None):
            raise trouble(f"{self.figure} needs `over` (a band) or `at` (a frequency), one of them")
        return self

    def _given(self) -> dict[str, Any]:
        return {key: value for key in _KEYS if (value := getattr(self, key)) is not None}

    @property
    def parameters(self) -> dict[str, Any]:
        """Complete parameters of the figure, in SI."""
        defaults = {k: p.default for k, p in self.kind.parameters.items() if p.default is not None}
        return {**defaults, **self._given()}

    @property
    def text(self) -> str:
        """The figure in words."""
        words = [self.figure]
        for key, value in self._given().items():
            parameter = self.kind.parameters[key]
            if parameter.form == "range":
                band = " to ".join(render(x, parameter.dimension) for x in value)
                words.append(band if key == "over" else f"{key} {band}")
            elif parameter.form == "value":
                words.append(f"{key} {render(value, parameter.dimension)}")
            else:
                words.append(f"{key} {value}" if key == "port" else str(value))
        return ", ".join(words)


class FigureLimit(FigureText):
    """A limit on one figure."""

    name: str | None = Field(default=None, description="how people call this limit", max_length=60)
    at_most: Bound | None = Field(default=None, alias="at most", description="greatest value, with unit")
    at_least: Bound | None = Field(default=None, alias="at least", description="least value, with unit")
    rule: RuleText | None = None

    @model_validator(mode="after")
    def _bounded(self) -> FigureLimit:
        kind = self.kind
        for side in ("at most", "at least"):
            if getattr(self, side.replace(" ", "_")) is not None and side not in kind.sides:
                raise trouble(f"`{side}` makes no sense for {self.figure}: {kind.meaning}", side)
        if self.at_most is None and self.at_least is None:
            raise trouble(f"{self.figure} has neither `at most` nor `at least`")
        bounds = {key: self._bound(key) for key in ("at least", "at most")}
        low, high = bounds["at least"], bounds["at most"]
        if low is not None and high is not None and low >= high:
            raise trouble(f"`at least` {self.at_least} is not below `at most` {self.at_most}", "at least")
        return self

    def _bound(self, side: str) -> float | None:
        text = self.at_most if side == "at most" else self.at_least
        if text is None:
            return None
        try:
            return parse(text, self.kind.dimension)
        except QuantityError as error:
            raise trouble(f"`{side}`: {error}", side) from None

    @property
    def bounds(self) -> dict[str, float]:
        """Limits by side, in SI."""
        found = {side: self._bound(side) for side in ("at least", "at most")}
        return {side: value for side, value in found.items() if value is not None}

    @property
    def text(self) -> str:
        """The figure in words."""
        return self.name or super().text


class MaskLimit(FileModel):
    """A mask laid over a trace."""

    mask: str = Field(min_length=1, description="name or file of the mask")
    trace: Literal["S11", "S12", "S21", "S22"]
    over: FrequencyRange | None = Field(default=None, description="a band that the mask must cover whole")
    reference: FigureText | None = Field(
        default=None, description="figure that lines `relative to: figure` count from, at one frequency"
    )
    name: str | None = Field(default=None, max_length=60)
    rule: RuleText | None = None

    @model_validator(mode="after")
    def _a_level(self) -> MaskLimit:
        if self.reference is not None and (not self.reference.kind.sense or self.reference.at is None):
            levels = ", ".join(
                sorted(name for name, kind in FIGURES.items() if kind.sense and "at" in kind.parameters)
            )
            raise trouble(f"`reference` needs a level at one frequency (`at`): one of {levels}", "reference")
        return self

    @property
    def text(self) -> str:
        """The mask in words."""
        return self.name or f"mask {self.mask} on {self.trace}"

    @property
    def reference_text(self) -> str:
        """What relative lines count from, in words."""
        return self.reference.text if self.reference else "the peak"


def _which(value: Any) -> str:
    if isinstance(value, MaskLimit):
        return f"{LABEL}mask"
    return f"{LABEL}mask" if isinstance(value, dict) and "mask" in value else f"{LABEL}figure"


Limit = Annotated[
    Annotated[FigureLimit, Tag(f"{LABEL}figure")] | Annotated[MaskLimit, Tag(f"{LABEL}mask")],
    Discriminator(_which),
]


class Judge(StepModel):
    """Judge a result."""

    kind: ClassVar[str] = "judge"
    leaves: ClassVar[str] = "judgement"

    name: Name = Field(default="judgement", alias="as")
    from_: Name = Field(alias="from", description="the result to judge")
    rule: RuleText = Field(default=Rule(), description="decision rule of all limits of this step")
    limits: Annotated[tuple[Limit, ...], Listed] = Field(min_length=1, max_length=1000)

    def needs(self) -> dict[str, tuple[str, str]]:
        """Need a network."""
        return {"from": ("network", self.from_)}
