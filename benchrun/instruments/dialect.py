"""The dialect file of network analyzers: how a family words each request.

Placeholders in braces are filled by the driver: ``{start_hz}``, ``{stop_hz}``, ``{points}``, ``{list_hz}``,
``{bandwidth_hz}``, ``{power_dbm}``, ``{averages}``, ``{averaging}`` (ON or OFF), ``{receiver}`` and
``{source}`` (port numbers; only in ``select`` and ``values``). Adding a family is writing such a file; no
Python changes.
"""

from __future__ import annotations

import difflib
import string
from pathlib import Path
from typing import Annotated, Literal, TypeVar

from pydantic import BeforeValidator, Field, model_validator

from benchrun.errors import InputError, Problem
from benchrun.sequence.fields import FileModel, Listed, Name, trouble
from benchrun.sequence.files import load_model
from benchrun.sequence.loading import read_bytes

__all__ = ["Dialect", "find_dialect", "load_dialect", "template"]

M = TypeVar("M", bound=FileModel)

_SWEEP = ("averages", "averaging", "bandwidth_hz", "list_hz", "points", "power_dbm", "start_hz", "stop_hz")
_READING = ("receiver", "source")


def template(known: tuple[str, ...]) -> BeforeValidator:
    """A check that text holds no other placeholders than these."""
    allowed = f"allowed here are {', '.join(known)}" if known else "none is allowed here"

    def check(value: object) -> object:
        if isinstance(value, str):
            if not value.isascii() or any(ord(c) < 32 for c in value):
                raise ValueError(f"{value!r} holds characters that cannot be sent in one message")
            for _, name, spec, conversion in string.Formatter().parse(value):
                if name is not None and (name not in known or spec or conversion):
                    raise ValueError(f"{value!r} holds the placeholder {{{name}}}; {allowed}")
        return value

    return BeforeValidator(check)


_LENGTH = Field(min_length=1, max_length=200)
Words = Annotated[str, template(()), _LENGTH]
SweepMessages = Annotated[tuple[Annotated[str, template(_SWEEP), _LENGTH], ...], Listed]
ReadingWords = Annotated[str, template(_READING), _LENGTH]
Messages = Annotated[tuple[Words, ...], Listed]
Form = Literal["ASCii", "REAL,32 NORMal", "REAL,64 NORMal", "REAL,32 SWAPped", "REAL,64 SWAPped"]


class SweepWords(FileModel):
    """Setting up a sweep."""

    span: SweepMessages = Field(min_length=1)
    listed: SweepMessages = Field(default=(), alias="list")
    linear: SweepMessages
    log: SweepMessages = ()
    common: SweepMessages
    points: Words = Field(description="query that reads the number of points back")
    seconds: Words | None = Field(default=None, description="query for the time that one sweep takes")


class TriggerWords(FileModel):
    """Sweeping once and knowing when it is done."""

    start: Messages = Field(min_length=1)
    wait: Literal["operation complete", "condition"]
    condition: Words | None = None
    bit: int = Field(default=3, ge=0, le=14)

    @model_validator(mode="after")
    def _asked(self) -> TriggerWords:
        if self.wait == "condition" and self.condition is None:
            raise trouble("`wait: condition` needs `condition`, the query that reads it", "wait")
        return self


class ReadWords(FileModel):
    """Fetching what was read."""

    how: Literal["all at once", "one by one"]
    form: Form
    select: ReadingWords | None = None
    values: ReadingWords
    order: Annotated[tuple[Literal["S11", "S21", "S12", "S22"], ...], Listed] = Field(
        min_length=4, max_length=4
    )
    grid: Words | None = None
    switch: Words | None = Field(
        default=None,
        description="query for what the idle port reflected in the last sweep: a2/b2, then a1/b1",
    )

    @model_validator(mode="after")
    def _each_once(self) -> ReadWords:
        if len(set(self.order)) != 4:
            raise trouble("`order` must name each of S11, S21, S12, S22 once", "order")
        told = "{receiver}" in (self.select or "") + self.values
        if self.how == "one by one" and not told:
            raise trouble(
                "neither `select` nor `values` says which reading is meant ({receiver}, {source})", "how"
            )
        if self.how == "all at once" and told:
            raise trouble("`how: all at once` leaves nothing for {receiver} and {source} to say", "how")
        return self


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


def load_dialect(name: str, folder: Path | None = None, place: Problem | None = None) -> Dialect:
    """Load the dialect of a name.

    Parameters
    ----------
    name
        As the bench file writes it.
    folder
        Where dialect files lie; those of the package by default.
    place
        Where the name was used, for the complaint.

    Raises
    ------
    InputError
        If there is none, or the file is wrong.
    """
    return find_dialect(name, Dialect, folder or Path(__file__).parent / "dialects", place)


def find_dialect(name: str, model: type[M], folder: Path, place: Problem | None) -> M:
    """Load the dialect file of a name from a folder.

    Raises
    ------
    InputError
        If there is none, or the file is wrong.
    """
    known = sorted(p.stem for p in folder.glob("*.yaml"))
    if name not in known:
        close = difflib.get_close_matches(name, known, 1, 0.5)
        advice = f"Did you mean {close[0]!r}?" if close else f"Known are {', '.join(known) or 'none'}."
        at = place or Problem("")
        raise InputError(Problem(f"there is no dialect {name!r}", at.file, at.line, at.column, advice))
    path = folder / f"{name}.yaml"
    return load_model(read_bytes(path), str(path), model, path).model
