"""The dialect file of network analyzers: how a family words each request.

Placeholders in braces are filled by the driver: ``{start_hz}``, ``{stop_hz}``, ``{points}``, ``{list_hz}``,
``{bandwidth_hz}``, ``{power_dbm}``, ``{averages}``, ``{averaging}`` (ON or OFF), ``{receiver}`` and
``{source}`` (port numbers). Adding a family is writing such a file; no Python changes.
"""

from __future__ import annotations

import string
from pathlib import Path
from typing import Annotated, Literal

from pydantic import BeforeValidator, Field

from benchrun.errors import InputError, Problem
from benchrun.sequence.fields import FileModel, Listed, Name
from benchrun.sequence.files import load_model
from benchrun.sequence.loading import read_bytes

__all__ = ["Dialect", "load_dialect"]

_KNOWN = {"start_hz", "stop_hz", "points", "list_hz", "bandwidth_hz", "power_dbm", "averages", "averaging",
          "receiver", "source"}  # fmt: skip


def _template(value: object) -> object:
    if isinstance(value, str):
        fields = {name for _, name, _, _ in string.Formatter().parse(value) if name is not None}
        unknown = fields - _KNOWN
        if unknown:
            raise ValueError(f"{value!r} holds {{{unknown.pop()}}}; known are {', '.join(sorted(_KNOWN))}")
        if any(ord(c) < 32 for c in value):
            raise ValueError(f"{value!r} holds a control character")
    return value


Words = Annotated[str, BeforeValidator(_template), Field(min_length=1, max_length=200)]
Messages = Annotated[tuple[Words, ...], Listed]
Form = Literal["ASCii", "REAL,32 NORMal", "REAL,64 NORMal", "REAL,32 SWAPped", "REAL,64 SWAPped"]


class SweepWords(FileModel):
    """Setting up a sweep."""

    span: Messages
    listed: Messages = Field(default=(), alias="list")
    linear: Messages
    log: Messages = ()
    common: Messages
    points: Words = Field(description="query that reads the number of points back")
    seconds: Words | None = Field(default=None, description="query for the time that one sweep takes")


class TriggerWords(FileModel):
    """Sweeping once and knowing when it is done."""

    start: Messages
    wait: Literal["operation complete", "condition"]
    condition: Words | None = None
    bit: int = Field(default=3, ge=0, le=14)


class ReadWords(FileModel):
    """Fetching what was read."""

    how: Literal["all at once", "one by one"]
    form: Form
    select: Words | None = None
    values: Words
    order: Annotated[tuple[Literal["S11", "S21", "S12", "S22"], ...], Listed] = Field(
        min_length=4, max_length=4
    )
    grid: Words | None = None


class HealthWords(FileModel):
    """Conditions that spoil a reading."""

    condition: Words
    overload: int = Field(ge=0, le=14)
    unlocked: int = Field(ge=0, le=14)


class Dialect(FileModel):
    """How one family of network analyzers words each request."""

    dialect: Name
    edition: Literal[1]
    title: str
    preset: Messages
    sweep: SweepWords
    trigger: TriggerWords
    read: ReadWords
    source_on: Messages = Field(alias="source on")
    source_off: Messages = Field(alias="source off")
    health: HealthWords


def load_dialect(name: str, folder: Path | None = None) -> Dialect:
    """The dialect of a name.

    Parameters
    ----------
    name
        As the bench file writes it.
    folder
        Where dialect files lie; those of the package by default.

    Raises
    ------
    InputError
        If there is none, or the file is wrong.
    """
    folder = folder or Path(__file__).parent / "dialects"
    path = folder / f"{name}.yaml"
    if not path.is_file():
        known = ", ".join(sorted(p.stem for p in folder.glob("*.yaml")))
        raise InputError(
            Problem(
                f"there is no dialect {name!r}",
                advice=f"Known are {known}; a new one is a file in that folder.",
            )
        )
    return load_model(read_bytes(path), str(path), Dialect, path).model
