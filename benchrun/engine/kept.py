"""Raw readings of a run, each turned into the file of its record the moment it was taken."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

from benchrun.evaluate.readings import Raw, decode, encode, suffix
from benchrun.record.payload import ReadingEntry, safe_name
from benchrun.rf.twoport import FloatArray

__all__ = ["Kept", "Reading"]


@dataclass(frozen=True, slots=True, eq=False)
class Reading:
    """One raw reading.

    Parameters
    ----------
    step, hookup
        Which step took it, of what.
    raw
        Planes ``(f,)``, or levels.
    contents
        Its file: Touchstone, or a table; reading it back gives the same numbers to the last bit.
    taken_s
        Bench clock, seconds.
    """

    step: str
    hookup: str
    raw: Raw
    contents: bytes
    sha256: str
    taken_s: float

    @classmethod
    def of(cls, step: str, hookup: str, f_hz: FloatArray, raw: Raw, taken_s: float) -> Reading:
        """From planes ``(f,)`` on a grid ``(f,)``."""
        contents = encode(f_hz, raw, f"raw: {hookup}")
        return cls(step, hookup, raw, contents, hashlib.sha256(contents).hexdigest(), taken_s)

    @classmethod
    def restored(cls, step: str, hookup: str, contents: bytes, ending: str, taken_s: float) -> Reading:
        """From its file, for example out of a journal."""
        raw = decode(contents, f"{step} {hookup}{ending}")
        return cls(step, hookup, raw, contents, hashlib.sha256(contents).hexdigest(), taken_s)

    def entry(self, number: int, start_s: float) -> ReadingEntry:
        """As the payload lists it: the time counts from the run's start, negative for what is older."""
        file = f"raw/{number:02d}-{safe_name(f'{self.step} {self.hookup}')}{suffix(self.raw)}"
        taken_s = round(self.taken_s - start_s, 6)
        return ReadingEntry(step=self.step, hookup=self.hookup, file=file, taken_s=taken_s)


@dataclass(slots=True)
class Kept:
    """The readings of one unit's record, in the order of taking.

    Parameters
    ----------
    safe
        Called with each that is taken: the journal writes it down.
    """

    readings: list[Reading] = field(default_factory=list)
    safe: Callable[[Reading], None] | None = None

    def add(self, reading: Reading) -> Reading:
        """Keep one."""
        self.readings.append(reading)
        if self.safe is not None:
            self.safe(reading)
        return reading

    def extend(self, readings: Iterable[Reading]) -> None:
        """Keep those that an earlier unit's calibration was made of."""
        self.readings.extend(readings)

    def of(self, step: str) -> dict[str, Raw]:
        """Raw readings of a step by hook-up."""
        return {r.hookup: r.raw for r in self.readings if r.step == step}

    def files(self, start_s: float) -> tuple[list[ReadingEntry], dict[str, bytes]]:
        """Entries for the payload, and contents by path."""
        entries, contents = [], {}
        for number, reading in enumerate(self.readings, 1):
            entry = reading.entry(number, start_s)
            entries.append(entry)
            contents[entry.file] = reading.contents
        return entries, contents
