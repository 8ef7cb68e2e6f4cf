"""The sequence file, edition 1."""

from __future__ import annotations

import re
import warnings
from typing import TYPE_CHECKING, Annotated, Any, Literal

import numpy as np
from pydantic import BeforeValidator, Discriminator, Field, Tag, create_model, model_validator

from benchrun.rf.twoport import FloatArray
from benchrun.sequence.fields import (
    LABEL,
    Current,
    Decibel,
    Duration,
    FileModel,
    Frequency,
    Listed,
    Name,
    Power,
    Voltage,
    trouble,
)
from benchrun.sequence.steps import STEP_KINDS, Calibrate, StepModel

__all__ = ["CAUTIONS", "Fixture", "Sequence", "SweepSetup", "Unit", "Withstands"]

CAUTIONS: dict[str, str] = {
    "static-sensitive": "The part is sensitive to static: wear the wrist strap, "
    "touch ground before the part.",
    "connector care": "Inspect and clean connectors, align them, turn only the nut, "
    "finish with the torque wrench.",
    "RF power": "RF power is present: switch the source off before opening a connection, "
    "and keep clear of antennas while transmitting. Local exposure codes and licensed practice rule.",
    "DC supply": "DC is applied: check polarity and current limit before switching on; "
    "local electrical codes rule.",
    "hot parts": "Parts may be hot after use: let them cool or use tools.",
}
"""The usual cautions by name; any other text stands for itself."""


class Withstands(FileModel):
    """What may reach a part or a port without harm."""

    power: Power
    dc: Voltage = 0.0


class Feed(FileModel):
    """DC for an active unit."""

    voltage: Voltage
    current: Current = Field(description="limit at which the supply trips")


class Fixture(FileModel):
    """What the unit sits in; names are the items that hands are asked to connect."""

    left: str | None = None
    right: str | None = None


def _pattern(value: object) -> object:
    if isinstance(value, str):
        if len(value) > 200:
            raise ValueError(f"is a pattern of {len(value)} characters; at most 200 are allowed")
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("error")  # what a later Python reads otherwise is refused today
                re.compile(value)
        except (re.error, OverflowError, RecursionError, Warning) as error:
            raise ValueError(f"{value!r} is no regular expression: {error}") from None
    return value


class Unit(FileModel):
    """The part under test."""

    part: str = Field(min_length=1, max_length=80)
    serial: Annotated[str, BeforeValidator(_pattern)] = Field(
        description="regular expression of a whole serial number"
    )
    ports: Literal[1, 2] = 2
    withstands: Withstands
    gain: Decibel = Field(default=0.0, description="the unit's greatest gain")
    fixture: Fixture | None = None
    supply: Feed | None = Field(default=None, description="DC that the unit needs to work")


class SweepSetup(FileModel):
    """One way to sweep."""

    from_: Frequency | None = Field(default=None, alias="from")
    to: Frequency | None = None
    at: Annotated[tuple[Frequency, ...], Listed] | None = Field(
        default=None, min_length=2, max_length=100_001
    )
    points: int | None = Field(default=None, ge=2, le=100_001)
    spacing: Literal["linear", "log"] = "linear"
    bandwidth: Frequency = Field(gt=0, description="IF bandwidth")
    power: Power
    averages: int = Field(default=1, ge=1, le=10_000)
    settle: Duration | None = None

    @model_validator(mode="after")
    def _complete(self) -> SweepSetup:
        if self.at is not None:
            if self.from_ is not None or self.to is not None or self.points is not None:
                raise trouble("has a list (`at`) and a span (`from`, `to`, `points`); keep one of them", "at")
            if any(b <= a for a, b in zip(self.at, self.at[1:], strict=False)):
                raise trouble("`at`: frequencies do not increase", "at")
            return self
        for key, value in (("from", self.from_), ("to", self.to), ("points", self.points)):
            if value is None:
                raise trouble(f"has no `{key}`; a sweep needs `from`, `to` and `points`, or a list `at`")
        if self.from_ is not None and self.to is not None and self.from_ >= self.to:
            raise trouble("`from` is not below `to`", "to")
        if self.from_ == 0:
            raise trouble("`from` is 0 Hz; an analyzer starts above", "from")
        return self

    def grid(self) -> FloatArray:
        """Frequencies in Hz, ``(f,)``."""
        if self.at is not None:
            return np.asarray(self.at, dtype=np.float64)
        if self.from_ is None or self.to is None or self.points is None:
            raise RuntimeError("a sweep that was never validated has no grid")
        space = np.geomspace if self.spacing == "log" else np.linspace
        return np.asarray(space(self.from_, self.to, self.points), dtype=np.float64)


_ENTRIES: dict[str, Any] = {
    kind: create_model(f"{model.__name__}Entry", __base__=FileModel, step=(model, Field(alias=kind)))
    for kind, model in STEP_KINDS.items()
}


def _kind(value: Any) -> str | None:
    if isinstance(value, dict) and len(value) == 1:
        return f"{LABEL}{next(iter(value))}"
    if isinstance(value, FileModel):
        return f"{LABEL}{getattr(value, 'step').kind}"  # noqa: B009 - the field exists only on created models
    return None


def _union() -> Any:
    members = [Annotated[model, Tag(f"{LABEL}{kind}")] for kind, model in _ENTRIES.items()]
    union: Any = members[0]
    for member in members[1:]:
        union = union | member
    return Annotated[union, Discriminator(_kind)]


if TYPE_CHECKING:

    class Entry(FileModel):
        """One step under its kind."""

        step: StepModel

else:
    Entry = _union()


class Sequence(FileModel):
    """A named test."""

    sequence: Name = Field(description="name of the sequence")
    edition: Literal[1]
    title: str = Field(min_length=1, max_length=120)
    unit: Unit
    cautions: Annotated[tuple[str, ...], Listed] = ()
    sweeps: dict[Name, SweepSetup] = Field(
        default_factory=dict, max_length=100, json_schema_extra={"additionalProperties": False}
    )
    entries: Annotated[tuple[Entry, ...], Listed] = Field(alias="steps", min_length=1, max_length=1000)

    @property
    def steps(self) -> tuple[StepModel, ...]:
        """The steps themselves, in order."""
        return tuple(entry.step for entry in self.entries)

    @property
    def roles(self) -> tuple[str, ...]:
        """Instruments that the steps need, in the order of first use."""
        fed = ("supply",) if self.unit.supply is not None else ()
        return tuple(dict.fromkeys((*(role for step in self.steps for role in step.roles), *fed)))

    @property
    def caution_texts(self) -> tuple[str, ...]:
        """The cautions in full."""
        return tuple(CAUTIONS.get(text, text) for text in self.cautions)

    def sweep_of(self, step: StepModel) -> SweepSetup:
        """Find the sweep that a calibrate or sweep step uses.

        Raises
        ------
        KeyError
            If a name does not resolve.
        """
        named = getattr(step, "sweep", None)
        if named is None:
            wanted = getattr(step, "with_", None)
            named = next((s.sweep for s in self.steps if isinstance(s, Calibrate) and s.name == wanted), None)
        if named not in self.sweeps:
            raise KeyError(f"no sweep stands behind step {step.name!r}")
        return self.sweeps[named]
