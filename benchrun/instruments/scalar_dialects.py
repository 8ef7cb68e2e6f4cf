"""Dialect files of signal generators and spectrum analyzers."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

from pydantic import Field

from benchrun.errors import Problem
from benchrun.instruments.dialect import Form, Messages, Words, find_dialect, template
from benchrun.sequence.fields import FileModel, Listed, Name

__all__ = [
    "GeneratorDialect",
    "SpectrumDialect",
    "SupplyDialect",
    "load_generator_dialect",
    "load_spectrum_dialect",
    "load_supply_dialect",
]

_LENGTH = Field(min_length=1, max_length=200)
_FOLDER = Path(__file__).parent / "dialects"
TonePart = Annotated[str, template(("frequency_hz", "power_dbm")), _LENGTH]
ToneMessages = Annotated[tuple[TonePart, ...], Listed]
WindowPart = Annotated[str, template(("centre_hz", "span_hz", "bandwidth_hz", "reference_dbm")), _LENGTH]
WindowMessages = Annotated[tuple[WindowPart, ...], Listed]


class GeneratorDialect(FileModel):
    """How one family of signal generators words each request.

    ``{frequency_hz}`` and ``{power_dbm}`` are filled in.
    """

    dialect: Name
    edition: Annotated[int, Field(ge=1, le=1)]
    title: str
    preset: Messages
    tone: ToneMessages = Field(min_length=1)
    source_on: Messages = Field(alias="source on")
    source_off: Messages = Field(alias="source off")
    condition: Words
    unlocked: int = Field(ge=0, le=14)


class SpectrumDialect(FileModel):
    """How one family of spectrum analyzers words each request.

    ``{centre_hz}``, ``{span_hz}``, ``{bandwidth_hz}`` and ``{reference_dbm}`` are filled in.
    """

    dialect: Name
    edition: Annotated[int, Field(ge=1, le=1)]
    title: str
    preset: Messages
    window: WindowMessages = Field(min_length=1)
    sweep: Messages
    values: Words
    form: Form
    condition: Words
    overload: int = Field(ge=0, le=14)
    unlocked: int = Field(ge=0, le=14)


FeedPart = Annotated[str, template(("voltage_v", "current_a")), _LENGTH]
FeedMessages = Annotated[tuple[FeedPart, ...], Listed]


class SupplyDialect(FileModel):
    """How one family of DC supplies words each request; ``{voltage_v}`` and ``{current_a}`` are filled in."""

    dialect: Name
    edition: Annotated[int, Field(ge=1, le=1)]
    title: str
    preset: Messages
    feed: FeedMessages = Field(min_length=1)
    source_on: Messages = Field(alias="source on")
    source_off: Messages = Field(alias="source off")
    tripped: Words
    voltage: Words
    current: Words


def load_supply_dialect(name: str, place: Problem | None = None) -> SupplyDialect:
    """The dialect of a supply; raises InputError where there is none."""
    return find_dialect(name, SupplyDialect, _FOLDER / "supply", place)


def load_generator_dialect(name: str, place: Problem | None = None) -> GeneratorDialect:
    """The dialect of a generator; raises InputError where there is none."""
    return find_dialect(name, GeneratorDialect, _FOLDER / "generator", place)


def load_spectrum_dialect(name: str, place: Problem | None = None) -> SpectrumDialect:
    """The dialect of a spectrum analyzer; raises InputError where there is none."""
    return find_dialect(name, SpectrumDialect, _FOLDER / "spectrum", place)
