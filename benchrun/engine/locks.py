"""Two runs never share an instrument: one lock a VISA resource, held by the system for the process.

The lock is the system's, on a file in the user's own folder (beside the keys); the file's text only says
who holds it, what for and since when. A holder that died, however it died, holds nothing any more: the system
let go, and the text it left tells the next one so. Locks hold among runs of one user on one machine; an
instrument on the network that other machines reach too must be kept apart by its owners.
"""

from __future__ import annotations

import contextlib
import hashlib
import json
import os
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

from benchrun.engine.oslock import hold
from benchrun.errors import BenchError
from benchrun.record.keys import home_folder
from benchrun.record.payload import safe_name

__all__ = ["Busy", "Held", "Holder", "take"]


class Busy(BenchError):
    """Somebody else holds the instrument: nothing was sent to it.

    Parameters
    ----------
    resource
        VISA resource name.
    holder
        Who, as far as known.
    """

    def __init__(self, resource: str, holder: Holder | None) -> None:
        self.resource, self.holder = resource, holder
        super().__init__(resource, holder)

    def __str__(self) -> str:
        who = f"held by {self.holder}" if self.holder else "held by another process"
        return f"{self.resource} is {who}; wait until that run has ended, or end it, then run again"


@dataclass(frozen=True, slots=True)
class Holder:
    """Who holds an instrument.

    Parameters
    ----------
    who
        The operator.
    what
        What is being run.
    since
        UTC, as text.
    pid
        Process number.
    """

    who: str
    what: str
    since: str
    pid: int

    def __str__(self) -> str:
        return f"{self.who}, {self.what}, since {self.since} (process {self.pid})"


class Held:
    """Locks taken; :meth:`release` lets go of all.

    Parameters
    ----------
    handles
        Open files, locked.
    dead
        Holders that ended without letting go, by resource: what they had switched on may still be on.
    """

    def __init__(self, handles: tuple[int, ...] = (), dead: dict[str, Holder] | None = None) -> None:
        self._handles = handles
        self.dead = dead or {}

    def release(self) -> None:
        """Let go; twice is once."""
        handles, self._handles = self._handles, ()
        for handle in handles:
            with contextlib.suppress(OSError):
                os.ftruncate(handle, 0)  # let go in good order: nobody is left to be named
            os.close(handle)


def take(resources: tuple[str, ...], who: str, what: str, folder: Path | None = None) -> Held:
    """Take the locks of some instruments, all or none.

    Parameters
    ----------
    resources
        VISA resource names; spellings that VISA holds equal are one.
    who, what
        For whoever finds it taken.
    folder
        Where the locks lie; beside the user's keys.

    Raises
    ------
    Busy
        If another process, or another run in this one, holds one of them.
    """
    folder = home_folder() / "locks" if folder is None else folder
    mine = Holder(who, what, datetime.now(UTC).isoformat(timespec="seconds"), os.getpid())
    handles: list[int] = []
    dead: dict[str, Holder] = {}
    try:
        # In one order for all, so that two runs that want the same two never each get one.
        for name in sorted({_canonical(resource) for resource in resources}):
            handle = _open(folder, name)
            handles.append(handle)
            taken = hold(handle)
            former = _read(handle)
            if not taken:
                raise Busy(name, former)
            if former is not None:
                dead[name] = former
            text = json.dumps({"resource": name, **{k: getattr(mine, k) for k in Holder.__slots__}})
            os.ftruncate(handle, 0)
            _write(handle, text.encode())
    except OSError as error:
        Held(tuple(handles)).release()
        raise BenchError(
            f"the lock of an instrument cannot be kept in {folder}: {error.strerror or error}; see that the "
            "folder can be written, or name another one in the environment variable BENCHRUN_HOME"
        ) from error
    except BaseException:
        *mine_so_far, last = handles
        os.close(last)  # not ours: its text stays
        Held(tuple(mine_so_far)).release()
        raise
    return Held(tuple(handles), dead)


def _open(folder: Path, name: str) -> int:
    folder.mkdir(parents=True, exist_ok=True, mode=0o700)
    digest = hashlib.sha256(name.encode()).hexdigest()[:12]
    path = folder / f"{safe_name(name)[:60]}-{digest}.lock"
    return os.open(path, os.O_RDWR | os.O_CREAT | getattr(os, "O_BINARY", 0), 0o600)


def _canonical(resource: str) -> str:
    # Imported here: a rehearsal takes no locks.
    from pyvisa import rname

    try:
        return str(rname.to_canonical_name(resource.strip().upper()))
    except (rname.InvalidResourceName, ValueError):
        return resource.strip().upper()


def _read(handle: int) -> Holder | None:
    try:
        os.lseek(handle, 0, os.SEEK_SET)
        found = json.loads(os.read(handle, 4096) or b"null")
        return Holder(str(found["who"]), str(found["what"]), str(found["since"]), int(found["pid"]))
    except (OSError, ValueError, TypeError, KeyError):
        return None


def _write(handle: int, data: bytes) -> None:
    os.lseek(handle, 0, os.SEEK_SET)
    os.write(handle, data)
