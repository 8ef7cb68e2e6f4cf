"""What an earlier process did of a run, read from the journal that it left."""

from __future__ import annotations

import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path
from typing import Any

from benchrun.engine.drafting import Ending
from benchrun.engine.job import Orders
from benchrun.engine.journal import Contents, Entry, Journal, Opener, read_journal
from benchrun.engine.kept import Reading
from benchrun.errors import InputError
from benchrun.uncertainty.decision import Conclusion

__all__ = ["EDITION", "NothingDone", "PastReading", "PastUnit", "Story", "read_story"]

EDITION = 1
"""Of the journal's lines; raised when a reader of the former one would misunderstand."""


class NothingDone(InputError):
    """The run broke off before it had begun to measure: its journal is worth nothing."""


@dataclass(frozen=True, slots=True)
class PastReading:
    """A reading that the journal holds.

    Parameters
    ----------
    number
        Of the step that took it.
    step, hookup, suffix
        As in the record.
    taken_s
        Bench seconds since the unit's run began.
    contents, sha256
        Its file.
    """

    number: int
    step: str
    hookup: str
    suffix: str
    taken_s: float
    contents: bytes
    sha256: str

    def reading(self, start_s: float) -> Reading:
        """As the run that took it held it."""
        return Reading.restored(
            self.step, self.hookup, self.contents, self.suffix, round(self.taken_s + start_s, 6)
        )


@dataclass(slots=True)
class PastUnit:
    """One unit's run as far as it came.

    Parameters
    ----------
    serial, retest
        The unit, as corrected, and why it is tested again.
    started
        UTC.
    finished
        Numbers of the steps that count.
    readings
        All that were read, those of an unfinished step too.
    served
        Calibrations of earlier units that it was measured under, by the number of the step.
    events, transcript
        What was told and said: lines, as the record keeps them.
    ending
        How the measuring ended; None if it did not.
    record
        Name of the record's folder, if it stands.
    """

    serial: str
    retest: str
    started: datetime
    finished: set[int] = field(default_factory=set)
    readings: list[PastReading] = field(default_factory=list)
    served: dict[int, str] = field(default_factory=dict)
    events: list[str] = field(default_factory=list)
    transcript: list[bytes] = field(default_factory=list)
    ending: Ending | None = None
    record: str = ""
    begun: int = 0

    def of(self, number: int) -> list[PastReading]:
        """Readings of one step."""
        return [reading for reading in self.readings if reading.number == number]


@dataclass(slots=True)
class Story:
    """A run that did not come to its end.

    Parameters
    ----------
    path, contents
        The journal.
    facts
        How it was begun.
    inputs
        Logical name to path in a record and bytes.
    instruments
        Role, resource and identity, as the instruments said.
    units
        In order, as far as begun.
    closing
        Why it cannot go on, set by whoever takes it up; then it only becomes a record.
    """

    path: Path
    contents: Contents
    facts: Mapping[str, Any]
    inputs: dict[str, tuple[str, bytes]] = field(default_factory=dict)
    instruments: dict[str, tuple[str, str]] = field(default_factory=dict)
    units: list[PastUnit] = field(default_factory=list)
    closing: str = ""

    @property
    def rehearsal(self) -> bool:
        """Whether its bench was simulated."""
        return bool(self.facts["rehearsal"])

    @property
    def serials(self) -> tuple[str, ...]:
        """Serial numbers it was started with."""
        return tuple(self.facts["units"])

    @property
    def orders(self) -> Orders:
        """How it was started."""
        found = dict(self.facts["orders"])
        return Orders(**{**found, "faults": tuple(found["faults"])})

    def reopen(self, opener: Opener) -> Journal:
        """Go on writing after what can be believed."""
        return Journal(self.path, opener, self.contents.good, self.contents.last)


def read_story(path: Path) -> Story:
    """Read a journal.

    Raises
    ------
    NothingDone
        If the run had not begun to measure.
    InputError
        If the journal is one of a later version.
    """
    contents = read_journal(path.read_bytes())
    entries = contents.entries
    if not entries or entries[0].what != "begun":
        raise NothingDone(f"{path} ends before its run had begun to measure")
    if entries[0].facts["edition"] != EDITION:
        raise InputError(
            f"{path} is a journal of edition {entries[0].facts['edition']!r}; this program reads {EDITION}. "
            "Take the run up with the version that began it"
        )
    story = Story(path, contents, entries[0].facts)
    for entry in entries[1:]:
        if (reader := _READERS.get(entry.what)) is not None:  # a later version may say more
            reader(story, entry)
    if len(story.inputs) != story.facts["inputs"]:
        raise NothingDone(f"{path} ends before its run had begun to measure")
    return story


def _unit(story: Story, entry: Entry) -> None:
    facts = entry.facts
    started = datetime.fromisoformat(facts["started"])
    story.units.append(PastUnit(facts["serial"], facts["retest"], started))


def _input(story: Story, entry: Entry) -> None:
    story.inputs[entry.facts["name"]] = entry.facts["path"], entry.content


def _instrument(story: Story, entry: Entry) -> None:
    story.instruments.setdefault(entry.facts["role"], (entry.facts["resource"], entry.facts["identity"]))


def _event(story: Story, entry: Entry) -> None:
    unit, told = story.units[-1], json.loads(entry.facts["text"])
    unit.events.append(entry.facts["text"])
    if told["event"] == "step started":
        unit.begun = told["number"]
        if unit.begun not in unit.finished:  # a second attempt: what the first one read does not count
            unit.readings = [r for r in unit.readings if r.number != unit.begun]


def _reading(story: Story, entry: Entry) -> None:
    unit, f = story.units[-1], entry.facts
    unit.readings.append(
        PastReading(unit.begun, f["step"], f["hookup"], f["suffix"], f["taken_s"], entry.content, f["sha256"])
    )


def _served(story: Story, entry: Entry) -> None:
    story.units[-1].served[entry.facts["number"]] = entry.facts["step"]


def _finished(story: Story, entry: Entry) -> None:
    story.units[-1].finished.add(entry.facts["number"])
    story.units[-1].transcript.append(entry.content)


def _renamed(story: Story, entry: Entry) -> None:
    story.units[-1].serial = entry.facts["serial"]


def _concluded(story: Story, entry: Entry) -> None:
    facts = entry.facts
    story.units[-1].ending = Ending(Conclusion(facts["conclusion"]), facts["reason"], facts["advice"])
    story.units[-1].transcript.append(entry.content)


def _record(story: Story, entry: Entry) -> None:
    story.units[entry.facts["number"]].record = entry.facts["folder"]


_READERS: Mapping[str, Callable[[Story, Entry], None]] = {
    "input": _input,
    "instrument": _instrument,
    "unit": _unit,
    "event": _event,
    "reading": _reading,
    "served": _served,
    "finished": _finished,
    "renamed": _renamed,
    "concluded": _concluded,
    "record": _record,
}
