"""Small files that appear whole: keys and trust entries."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

from benchrun.errors import RecordError

__all__ = ["exists", "place_new", "place_over", "read_bytes"]


def exists(path: Path) -> bool:
    """Whether there is such a file.

    Raises
    ------
    RecordError
        If the system does not say.
    """
    try:
        return path.exists()
    except OSError as error:
        raise RecordError(f"{path} cannot be reached: {error.strerror or error}") from error


def read_bytes(path: Path) -> bytes:
    """All of a file.

    Raises
    ------
    RecordError
        If the system refuses.
    """
    try:
        return path.read_bytes()
    except OSError as error:
        raise RecordError(f"{path} cannot be read: {error.strerror or error}") from error


def place_new(
    path: Path, content: bytes, *, private: bool = False, link: Callable[[Path, Path], None] = os.link
) -> bool:
    """Put a file where none is.

    Parameters
    ----------
    path
        The file; its folder is made if missing, for the user alone.
    content
        All of it.
    private
        Whether only the user may read it.
    link
        Gives the file of the first path the name of the second; OSError where there are no links.

    Returns
    -------
    bool
        False if there was one already; it is left as it is.

    Raises
    ------
    RecordError
        If the system refuses.
    """
    work = _write_beside(path, content, 0o600 if private else 0o644)
    try:
        # A link fails if the name is taken, where a rename would overwrite on POSIX.
        link(work, path)
    except FileExistsError:
        return False
    except OSError:
        return _create(path, content, 0o600 if private else 0o644)
    finally:
        work.unlink(missing_ok=True)
    return True


def place_over(path: Path, content: bytes) -> None:
    """Put a file, in the place of a former one if there is one.

    Raises
    ------
    RecordError
        If the system refuses.
    """
    work = _write_beside(path, content, 0o644)
    try:
        work.replace(path)
    except OSError as error:
        work.unlink(missing_ok=True)
        raise _refused(path, error) from error


def _write_beside(path: Path, content: bytes, mode: int) -> Path:
    work = path.with_name(f".{path.name}.{os.urandom(6).hex()}")
    try:
        path.parent.mkdir(parents=True, exist_ok=True, mode=0o700)
        _write_exclusive(work, content, mode)
    except OSError as error:
        raise _refused(path, error) from error
    return work


def _create(path: Path, content: bytes, mode: int) -> bool:
    """The way for file systems without links: still only one of two writers wins."""
    try:
        _write_exclusive(path, content, mode)
    except FileExistsError:
        return False
    except OSError as error:
        raise _refused(path, error) from error
    return True


def _write_exclusive(path: Path, content: bytes, mode: int) -> None:
    handle = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL | getattr(os, "O_BINARY", 0), mode)
    try:
        with os.fdopen(handle, "wb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
    except OSError:
        path.unlink(missing_ok=True)
        raise


def _refused(path: Path, error: OSError) -> RecordError:
    return RecordError(
        f"{path} could not be written: {error.strerror or error}; see that the folder can be written, or "
        "name another one in the environment variable BENCHRUN_HOME"
    )
