"""Writing a record: whole, or not at all.

Everything is prepared and signed in memory, written into a hidden folder beside its final place, brought to
the medium, and only then renamed. Whoever looks into the records folder sees either no record or all of it.
"""

from __future__ import annotations

import contextlib
import errno
import os
from pathlib import Path

from benchrun.errors import RecordError, RecordNotWritten
from benchrun.record.draft import Draft
from benchrun.record.envelope import FILE_NAME, sign
from benchrun.record.payload import check_path
from benchrun.record.signer import Signer
from benchrun.record.statement import build
from benchrun.record.storage import DISK, Storage

__all__ = [
    "MAX_FILE_BYTES",
    "PUBLIC_KEY_FILE",
    "RecordRescued",
    "refusal",
    "rescue",
    "write",
    "write_or_rescue",
]

PUBLIC_KEY_FILE = "public-key.pem"
"""The signer's public half in the record, for whoever has only openssl; trust never comes from it."""

MAX_FILE_BYTES = 256 * 1024 * 1024
"""Greatest size of one file of a record."""

_ADVICE = {
    errno.ENOSPC: "the disk is full: free some space",
    errno.EDQUOT: "your share of the disk is used up: free some space",
    errno.EACCES: "you may not write there: ask for the right to, or give another folder with --records",
    errno.EPERM: "you may not write there: ask for the right to, or give another folder with --records",
    errno.EROFS: "the file system can only be read: give another folder with --records",
    errno.ENOTDIR: "a file stands where a folder is needed: give another folder with --records",
    errno.EEXIST: "a file stands where a folder is needed: give another folder with --records",
    errno.ENAMETOOLONG: "the path is too long: give another folder with --records",
    errno.EIO: "the medium reported a fault: have it checked, and give another folder with --records",
}


class RecordRescued(RecordNotWritten):
    """The record could not be stored where it belongs, but stands whole elsewhere.

    Parameters
    ----------
    message
        What happened.
    folder
        The record's folder.
    """

    def __init__(self, message: str, folder: Path) -> None:
        super().__init__(message, folder)
        self.message = message
        self.folder = folder

    def __str__(self) -> str:
        return (
            f"{self.message} Nothing is lost: the record stands in {self.folder}; move it where it belongs."
        )


def write(draft: Draft, folder: Path, name: str, signer: Signer, storage: Storage = DISK) -> Path:
    """Sign a record and write it.

    Parameters
    ----------
    draft
        Payload and files.
    folder
        The records folder; it is made if missing.
    name
        Wanted name of the record: letters, digits and ``. _ + -``. If it is taken, ``-2``, ``-3`` ... follow.
    signer
        Whose key; a rehearsal key signs no measured run and a bench key no other.
    storage
        The file system.

    Returns
    -------
    pathlib.Path
        The record's folder.

    Raises
    ------
    RecordError
        If the draft cannot become a record (names, sizes, missing files, a key of the wrong purpose).
    RecordNotWritten
        If the system refused; nothing of the record was left behind.
    """
    contents = _contents(draft, name, signer)
    work = folder / f".{name}.{os.urandom(6).hex()}.partial"
    stored = work
    try:
        storage.make_dir(folder)
        _fill(work, contents, draft.twins, storage)
        stored = _rename_to_free(work, folder, name, storage)
        storage.sync(folder)
    except OSError as error:
        left = _remove(work, stored, storage)
        raise RecordNotWritten(str(refusal(folder, error)) + left) from error
    except BaseException:
        # A stop while writing: the caller may rescue the draft, a half record helps nobody.
        _remove(work, stored, storage)
        raise
    return stored


def rescue(
    draft: Draft, name: str, signer: Signer, storage: Storage = DISK, place: Path | None = None
) -> Path | None:
    """Write the record into a new folder in the system's temporary one, since its own place refuses it.

    Parameters
    ----------
    draft, name, signer, storage
        As for :func:`write`.
    place
        Another folder than the system's temporary one.

    Returns
    -------
    pathlib.Path or None
        The record's folder; None if that place refuses it too.
    """
    # Imported here: a run that writes where it should never needs it.
    import tempfile

    try:
        folder = Path(tempfile.mkdtemp(prefix="benchrun-rescued-", dir=place))
    except OSError:
        return None
    try:
        return write(draft, folder, name, signer, storage)
    except RecordNotWritten:
        with contextlib.suppress(OSError):
            folder.rmdir()
        return None


def write_or_rescue(
    draft: Draft,
    folder: Path,
    name: str,
    signer: Signer,
    storage: Storage = DISK,
    place: Path | None = None,
) -> Path:
    """Write a record; if its place refuses it, rescue it and say where it is.

    Parameters
    ----------
    draft, folder, name, signer, storage
        As for :func:`write`.
    place
        As for :func:`rescue`.

    Returns
    -------
    pathlib.Path
        The record's folder.

    Raises
    ------
    RecordRescued
        If it stands in the temporary folder instead.
    RecordNotWritten
        If it could not be stored anywhere.
    """
    try:
        return write(draft, folder, name, signer, storage)
    except RecordNotWritten as error:
        rescued = rescue(draft, name, signer, storage, place)
        if rescued is None:
            raise
        raise RecordRescued(str(error), rescued) from error


def _contents(draft: Draft, name: str, signer: Signer) -> dict[str, bytes]:
    """All files of the record in the order of writing, the envelope last."""
    wanted = "bench" if draft.payload.origin == "measured" else "rehearsal"
    if signer.purpose != wanted:
        raise RecordError(
            f"a run that is {draft.payload.origin} is signed by a {wanted} key, not by the {signer.purpose} "
            f"key {signer.key_id[:16]}; make a bench key with: benchrun keys make NAME"
        )
    files = {**draft.files, PUBLIC_KEY_FILE: signer.public_key.pem}
    _check_names(name, draft, files)
    envelope = sign(build(draft.payload, files), [signer])
    return {**files, FILE_NAME: envelope.to_json()}


def _check_names(name: str, draft: Draft, files: dict[str, bytes]) -> None:
    try:
        if "/" in name or len(name) > 120:
            raise ValueError(f"{name!r} is no name for a record; letters, digits and . _ + - are allowed")
        for path in (name, *files):
            check_path(path)
    except ValueError as error:
        raise RecordError(f"the record was not written: {error}") from None
    # Names that differ only in case would become one file on some systems.
    folded: dict[str, str] = {FILE_NAME.casefold(): FILE_NAME}
    if PUBLIC_KEY_FILE in draft.files:
        raise RecordError(f"the record was not written: {PUBLIC_KEY_FILE} is written by the record itself")
    for path in files:
        other = folded.setdefault(path.casefold(), path)
        if other != path or path == FILE_NAME:
            raise RecordError(
                f"the record was not written: {path!r} and {other!r} cannot both be files of it"
            )
        if len(files[path]) > MAX_FILE_BYTES:
            raise RecordError(
                f"the record was not written: {path} has {len(files[path])} bytes; at most {MAX_FILE_BYTES}"
            )
    if missing := [path for path in draft.payload.files if path not in draft.files]:
        raise RecordError(f"the record was not written: the payload names {missing[0]!r}, which is not there")


def _fill(work: Path, contents: dict[str, bytes], twins: dict[str, Path], storage: Storage) -> None:
    folders = {work}
    for path in contents:
        folders.update((work / path).parents[: path.count("/") + 1])
    for one in sorted(folders):
        storage.make_dir(one)
    for path, content in contents.items():
        if path not in twins or not storage.share_file(work / path, content, twins[path]):
            storage.write_file(work / path, content)
    for one in sorted(folders, reverse=True):
        storage.sync(one)


def _rename_to_free(work: Path, folder: Path, name: str, storage: Storage) -> Path:
    """Give the finished folder the first free name; two writers at once cannot get the same one."""
    number = 1
    while True:
        target = folder / (name if number == 1 else f"{name}-{number}")
        # Renaming onto an EMPTY folder succeeds on POSIX, so look first; a finished record is never empty,
        # so that between looking and renaming another writer can only make the rename fail.
        if not os.path.lexists(target):
            try:
                storage.rename(work, target)
            except OSError as error:
                if not os.path.lexists(target) or error.errno not in _TAKEN:
                    raise
            else:
                return target
        number += 1


_TAKEN = {errno.EEXIST, errno.ENOTEMPTY, errno.ENOTDIR, errno.EACCES}


def _remove(work: Path, stored: Path, storage: Storage) -> str:
    """Remove what was written; returns a sentence about what could not be removed."""
    try:
        if stored != work:
            # Hidden first: a record that is half removed must not stand there under its name.
            storage.rename(stored, work)
        storage.remove_tree(work)
    except OSError as error:
        left = stored if os.path.lexists(stored) else work
        return f" {left} could not be removed ({error.strerror}); it does not count, remove it by hand."
    return ""


def refusal(folder: Path, error: OSError) -> RecordNotWritten:
    """What to say when the system refuses to store anything in a folder of records."""
    said = error.strerror or str(error)
    advice = _ADVICE.get(error.errno or 0, "see to it, or give another folder with --records")
    return RecordNotWritten(f"the record was not written into {folder}: the system said {said!r}; {advice}.")
