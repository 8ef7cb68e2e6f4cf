"""Reading a record, and checking that it is the one that was signed."""

from __future__ import annotations

import hashlib
import os
import stat
from dataclasses import dataclass
from pathlib import Path

from benchrun.errors import CouldNotCheck, DigestWrong, InputError, SignatureWrong
from benchrun.record.envelope import FILE_NAME, PAYLOAD_TYPE, Envelope, parse
from benchrun.record.keys import KeyStore, TrustedKey
from benchrun.record.payload import Payload
from benchrun.record.publickey import PublicKey
from benchrun.record.statement import Statement
from benchrun.record.statement import parse as parse_statement
from benchrun.record.write import MAX_FILE_BYTES, PUBLIC_KEY_FILE

__all__ = ["MAX_ENVELOPE_BYTES", "Record", "Verified", "read", "verify"]

MAX_ENVELOPE_BYTES = 16 * 1024 * 1024
"""Greatest size of an envelope that is read."""

_CHUNK = 1 << 20


@dataclass(frozen=True, slots=True)
class Record:
    """A record that was read, not yet believed.

    Parameters
    ----------
    folder
        Where it lies.
    envelope
        Its envelope.
    statement
        What the envelope holds.
    """

    folder: Path
    envelope: Envelope
    statement: Statement

    @property
    def payload(self) -> Payload:
        """What is said about the run."""
        return self.statement.payload

    @property
    def files(self) -> tuple[str, ...]:
        """Its files, but for the envelope."""
        return tuple(self.statement.subjects)

    def path(self, file: str) -> Path:
        """Where one of its files lies."""
        return self.folder / file

    def content(self, file: str) -> bytes:
        """The bytes of one of its files, checked against the digest in the statement.

        Parameters
        ----------
        file
            POSIX relative path as in :attr:`files`.

        Raises
        ------
        DigestWrong
            If the file is missing or changed.
        CouldNotCheck
            If the record has no such file, or it cannot be read.
        """
        wanted = self.statement.subjects.get(file)
        if wanted is None:
            raise CouldNotCheck(f"{self.folder} has no file {file!r}")
        content = b"".join(_chunks(self.folder, file, MAX_FILE_BYTES))
        _compare(self.folder, file, hashlib.sha256(content).hexdigest(), wanted)
        return content


@dataclass(frozen=True, slots=True)
class Verified:
    """A record that is the one that was signed, by keys that are trusted.

    Parameters
    ----------
    record
        The record.
    keys
        Who signed it.
    """

    record: Record
    keys: tuple[TrustedKey, ...]


def read(folder: Path) -> Record:
    """Read a record without checking it: for showing, never for believing.

    Parameters
    ----------
    folder
        The record's folder.

    Raises
    ------
    CouldNotCheck
        If it is no record, or one of a later version.
    """
    return _read(folder, _envelope_bytes(folder))


def verify(folder: Path, store: KeyStore) -> Verified:
    """Check signature, trust, and every file of a record.

    Parameters
    ----------
    folder
        The record's folder.
    store
        Whose keys are trusted.

    Returns
    -------
    Verified
        The record and who signed it.

    Raises
    ------
    SignatureWrong
        If the signature does not fit, the key is not trusted, or may not speak for such a run.
    DigestWrong
        If a file was changed, is missing, or was added; the sentence names it.
    CouldNotCheck
        If no verdict was possible.
    """
    text = _envelope_bytes(folder)
    where = folder / FILE_NAME
    try:
        envelope = parse(text)
    except CouldNotCheck as error:
        raise CouldNotCheck(f"{where}: {error}") from None
    if envelope.to_json() != text:
        raise SignatureWrong(f"{where}: was changed: it is not in the form in which benchrun writes it")
    if envelope.payload_type != PAYLOAD_TYPE:
        raise SignatureWrong(f"{where}: its payload is {envelope.payload_type[:80]!r}, not {PAYLOAD_TYPE}")
    keys = _trusted_makers(folder, envelope, store)
    record = _read(folder, text)
    _check_purpose(record, keys)
    _check_files(record)
    return Verified(record, keys)


def _envelope_bytes(folder: Path) -> bytes:
    if not folder.is_dir():
        raise CouldNotCheck(f"{folder} is no folder, so it is no record; give the folder that a run named")
    if not os.path.lexists(folder / FILE_NAME):
        raise CouldNotCheck(f"{folder} is no record: it has no {FILE_NAME}")
    try:
        return b"".join(_chunks(folder, FILE_NAME, MAX_ENVELOPE_BYTES))
    except DigestWrong as error:
        raise CouldNotCheck(str(error)) from None


def _read(folder: Path, text: bytes) -> Record:
    try:
        envelope = parse(text)
        return Record(folder, envelope, parse_statement(envelope.payload))
    except CouldNotCheck as error:
        raise CouldNotCheck(f"{folder / FILE_NAME}: {error}") from None


def _trusted_makers(folder: Path, envelope: Envelope, store: KeyStore) -> tuple[TrustedKey, ...]:
    """Who signed; every signature must be good, since each byte of the envelope is to be accounted for."""
    where = folder / FILE_NAME
    trusted = {key.public_key: key for key in store.trusted()}
    makers = envelope.makers(trusted)
    for one, maker in zip(envelope.signatures, makers, strict=True):
        if maker is None:
            raise SignatureWrong(f"{where}: {_why_not(folder, envelope, one.key_id, store)}")
        if maker.key_id != one.key_id:
            raise SignatureWrong(
                f"{where}: was changed: it names key {one.key_id[:16]!r}, but {maker.key_id[:16]} signed it"
            )
    found = [trusted[maker] for maker in makers if maker]
    if len({key.key_id for key in found}) < len(found):
        raise SignatureWrong(f"{where}: was changed: it holds two signatures by the same key")
    return tuple(found)


def _why_not(folder: Path, envelope: Envelope, key_id: str, store: KeyStore) -> str:
    if known := store.find(key_id):
        return f"the signature does not fit: key {key_id[:16]} ({known.label}) did not sign these bytes"
    try:
        enclosed = PublicKey.from_pem(b"".join(_chunks(folder, PUBLIC_KEY_FILE, 10_000)))
    except (InputError, CouldNotCheck, DigestWrong):
        enclosed = None
    if enclosed and enclosed.key_id == key_id and enclosed in envelope.makers([enclosed]):
        return (
            f"it is signed by key {key_id[:16]}, which is not trusted here; if you know from elsewhere whose "
            f"key that is: benchrun keys trust {folder / PUBLIC_KEY_FILE}"
        )
    return f"the signature does not fit, or key {key_id[:16]!r} is not trusted here (benchrun keys list)"


def _check_purpose(record: Record, keys: tuple[TrustedKey, ...]) -> None:
    wanted = "bench" if record.payload.origin == "measured" else "rehearsal"
    for key in keys:
        if key.purpose != wanted:
            raise SignatureWrong(
                f"{record.folder / FILE_NAME}: says that the run was {record.payload.origin}, but key "
                f"{key.key_id[:16]} ({key.label}) is a {key.purpose} key and cannot speak for that"
            )


def _check_files(record: Record) -> None:
    subjects = record.statement.subjects
    found = _walk(record.folder)
    for name in subjects:
        if name not in found:
            other = next((one for one in found if one.casefold() == name.casefold()), "")
            raise DigestWrong(
                f"{record.folder / name}: is missing" + (f"; {other!r} is another name" if other else "")
            )
    for name in sorted(found):
        if name not in subjects and name != FILE_NAME:
            shown = name if name.isprintable() else ascii(name)
            raise DigestWrong(f"{record.folder / shown}: was added after the record was signed")
    if missing := [name for name in record.payload.files if name not in subjects]:
        raise CouldNotCheck(f"{record.folder / FILE_NAME}: the run names {missing[0]!r}, which is not signed")
    for name, wanted in subjects.items():
        digest = hashlib.sha256()
        for chunk in _chunks(record.folder, name, MAX_FILE_BYTES):
            digest.update(chunk)
        _compare(record.folder, name, digest.hexdigest(), wanted)


def _walk(folder: Path) -> set[str]:
    """All that lies in the folder: files, and folders that hold nothing."""
    found: set[str] = set()

    def refuse(error: OSError) -> None:
        raise CouldNotCheck(f"{folder}: cannot be read: {error.strerror or error}")

    for place, folders, files in os.walk(folder, onerror=refuse):
        inside = Path(place).relative_to(folder)
        links = [name for name in folders if Path(place, name).is_symlink()]
        found.update((inside / name).as_posix() for name in files)
        if links:
            raise DigestWrong(
                f"{Path(place) / links[0]}: is a link, where the record has a folder or nothing"
            )
        if not folders and not files and place != str(folder):
            found.add(inside.as_posix())
    return found


def _chunks(folder: Path, name: str, limit: int) -> list[bytes]:
    """A file's contents in pieces; only a regular file below the limit is read at all."""
    path = folder / name
    # O_NONBLOCK, so that a named pipe in place of the file cannot hold the check up for ever.
    flags = (
        os.O_RDONLY | getattr(os, "O_NOFOLLOW", 0) | getattr(os, "O_NONBLOCK", 0) | getattr(os, "O_BINARY", 0)
    )
    try:
        if path.is_symlink():
            raise DigestWrong(f"{path}: is a link, where the signed file should be")
        with os.fdopen(os.open(path, flags), "rb") as file:
            about = os.fstat(file.fileno())
            if not stat.S_ISREG(about.st_mode):
                raise DigestWrong(f"{path}: is no plain file")
            if about.st_size > limit:
                raise DigestWrong(f"{path}: has {about.st_size} bytes; benchrun writes no more than {limit}")
            pieces, left = [], limit
            while left > 0 and (piece := file.read(min(_CHUNK, left))):
                pieces.append(piece)
                left -= len(piece)
            return pieces
    except FileNotFoundError:
        raise DigestWrong(f"{path}: is missing") from None
    except OSError as error:
        raise CouldNotCheck(f"{path}: cannot be read: {error.strerror or error}") from error


def _compare(folder: Path, name: str, found: str, wanted: str) -> None:
    if found != wanted:
        raise DigestWrong(
            f"{folder / name}: was changed: its SHA-256 is {found[:16]}..., and {wanted[:16]}... was signed"
        )
