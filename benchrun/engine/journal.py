"""The journal on disk: what a run has done so far, so that another process can take it up again.

One hidden file in the folder of records, append-only, held by a lock of the system as long as its run lives.
A line is a checksum and a JSON object; the checksum covers the line before it too, so that neither a torn end
nor a lost middle is ever believed. Bytes (a reading, an input file) follow the line that gives their size and
digest. It is brought to the medium where a step has finished that read something, and removed when the
records stand; whoever looks for records sees a hidden file, never half a record.
"""

from __future__ import annotations

import contextlib
import hashlib
import json
import os
import threading
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from benchrun.engine.oslock import hold
from benchrun.errors import RecordError

__all__ = ["SUFFIX", "Appended", "Entry", "Journal", "JournalFailed", "Opener", "read_journal"]

SUFFIX = ".journal"
_DIGITS = 16
_FIRST = "benchrun journal 1"


class JournalFailed(RecordError):
    """The journal could not be written: what happens from here on could not be taken up again."""


class Appended:
    """A file that only grows; the seam at which a test lets the disk fail.

    Parameters
    ----------
    path
        The file.
    keep
        How many bytes of an existing file to go on after; None makes a new one.

    Raises
    ------
    OSError
        As every operation.
    """

    def __init__(self, path: Path, keep: int | None) -> None:
        make = os.O_CREAT | os.O_EXCL if keep is None else 0
        self.handle = os.open(path, os.O_RDWR | make | getattr(os, "O_BINARY", 0), 0o600)
        if keep is not None:
            os.ftruncate(self.handle, keep)
            os.lseek(self.handle, 0, os.SEEK_END)

    def write(self, data: bytes) -> None:
        """Append all of it."""
        view = memoryview(data)
        while view:
            view = view[os.write(self.handle, view) :]

    def sync(self) -> None:
        """Bring it to the medium."""
        getattr(os, "fdatasync", os.fsync)(self.handle)

    def close(self) -> None:
        """Close, and let go of the lock."""
        os.close(self.handle)


Opener = Callable[[Path, int | None], Appended]


class Journal:
    """A journal that is being written; lines may come from several threads.

    Parameters
    ----------
    path
        The file.
    opener
        The disk.
    keep, last
        Where to go on in an existing one: bytes that are believed, and the checksum of the last line.

    Raises
    ------
    OSError
        If the file cannot be made.
    """

    def __init__(
        self, path: Path, opener: Opener = Appended, keep: int | None = None, last: str = _FIRST
    ) -> None:
        self.path = path
        self._file = opener(path, keep)
        self._last = last
        self._lock = threading.Lock()
        self.failure: JournalFailed | None = None
        self.needed = False
        """Whether it must stay: something that counts stands nowhere else."""
        with contextlib.suppress(OSError):  # a file system without locks: then nobody else is kept away
            hold(self._file.handle)

    def line(self, what: str, content: bytes | None = None, **facts: object) -> None:
        """Append one line, and bytes that belong to it.

        A disk that refuses is told by :meth:`sync`, where a step is about to count as finished; nothing else
        that is going on (switching off, writing the record) need mind.
        """
        found: dict[str, object] = {"what": what, **facts}
        if content is not None:
            found["bytes"] = len(content)
            if "sha256" not in found:  # whoever made it may know
                found["sha256"] = hashlib.sha256(content).hexdigest()
        text = json.dumps(found, ensure_ascii=False)
        with self._lock, contextlib.suppress(JournalFailed):
            self._last = _checksum(self._last, text)
            head = f"{self._last} {text}\n".encode()
            self._do(lambda: self._file.write(head if content is None else head + content + b"\n"))

    def sync(self) -> None:
        """Bring everything to the medium.

        Raises
        ------
        JournalFailed
            If the disk refuses, or has refused a line since.
        """
        with self._lock:
            self._do(self._file.sync)

    def _do(self, operation: Callable[[], None]) -> None:
        if self.failure is not None:
            raise self.failure
        try:
            operation()
        except OSError as error:
            said = error.strerror or str(error)
            self.failure = JournalFailed(f"the journal {self.path} could not be written: {said}")
            raise self.failure from error

    def close(self) -> None:
        """Leave it for whoever takes the run up again."""
        with contextlib.suppress(OSError):
            self._file.close()

    def remove(self) -> None:
        """The records stand: it is needed no more."""
        if os.name == "nt":  # an open file cannot be removed there
            self.close()
        with contextlib.suppress(OSError):
            self.path.unlink(missing_ok=True)
        self.close()


@dataclass(frozen=True, slots=True)
class Entry:
    """One line that is believed."""

    what: str
    facts: Mapping[str, Any]
    content: bytes = b""


@dataclass(slots=True)
class Contents:
    """A journal as read.

    Parameters
    ----------
    entries
        In order, up to the first that cannot be believed.
    good
        How many bytes those are.
    last
        Checksum of the last of them.
    torn
        Why reading ended early; empty if it did not.
    """

    entries: list[Entry] = field(default_factory=list)
    good: int = 0
    last: str = _FIRST
    torn: str = ""


def read_journal(data: bytes) -> Contents:
    """Read a journal as far as it can be believed.

    Parameters
    ----------
    data
        All of its file.

    Examples
    --------
    >>> read_journal(b"no journal at all").torn
    'line 1 is torn'
    """
    found = Contents()
    for number, (entry, end, last) in enumerate(_lines(data), 1):
        if entry is None:
            found.torn = f"line {number} is torn"
            break
        found.entries.append(entry)
        found.good, found.last = end, last
    return found


def _lines(data: bytes) -> Iterator[tuple[Entry | None, int, str]]:
    at, last = 0, _FIRST
    while at < len(data):
        end = data.find(b"\n", at)
        head = data[at:end] if end >= 0 else b""
        try:
            text = head[_DIGITS + 1 :].decode()
            last = _checksum(last, text)
            if head[: _DIGITS + 1] != f"{last} ".encode():
                raise ValueError("another checksum")
            facts = json.loads(text)
            at, content = end + 1, b""
            if "bytes" in facts:
                content = data[at : at + facts["bytes"]]
                if hashlib.sha256(content).hexdigest() != facts["sha256"]:
                    raise ValueError("another content")
                at += len(content)
                if data[at : at + 1] != b"\n":
                    raise ValueError("no end")
                at += 1
            yield Entry(facts.pop("what"), facts, content), at, last
        except (ValueError, KeyError, TypeError, AttributeError):
            yield None, at, last
            return


def _checksum(before: str, text: str) -> str:
    return hashlib.sha256(f"{before}\n{text}".encode()).hexdigest()[:_DIGITS]
