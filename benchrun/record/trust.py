"""Public keys that are trusted in one place, each with a label and what it may speak for."""

from __future__ import annotations

import json
import re
from dataclasses import dataclass
from pathlib import Path

from benchrun.errors import CouldNotCheck, InputError, RecordError
from benchrun.record.placing import exists, place_over, read_bytes
from benchrun.record.publickey import PublicKey
from benchrun.record.signer import Purpose

__all__ = ["TrustFolder", "TrustedKey"]


@dataclass(frozen=True, slots=True)
class TrustedKey:
    """A public key that is trusted here.

    Parameters
    ----------
    public_key
        The key.
    label
        Whose it is, in the user's words.
    purpose
        What it may speak for.
    """

    public_key: PublicKey
    label: str
    purpose: Purpose

    @property
    def key_id(self) -> str:
        """Its id."""
        return self.public_key.key_id


class TrustFolder:
    """A folder with two files a key: ``KEYID.pem``, and ``KEYID.json`` for label and purpose.

    Parameters
    ----------
    folder
        The folder; made when the first key is put into it.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def put(self, key: TrustedKey) -> None:
        """Trust a key from now on; an entry for the same key is replaced.

        Raises
        ------
        InputError
            If the label is not printable text, or the key is trusted for something else.
        RecordError
            If the system refuses.
        """
        if not key.label.strip() or not key.label.isprintable():
            raise InputError(f"the label {key.label!r} must be printable text that says whose key this is")
        known = self.find(key.key_id)
        if known and known.purpose != key.purpose:
            raise InputError(
                f"key {key.key_id[:16]} is trusted as a {known.purpose} key ({known.label}) and cannot be a "
                f"{key.purpose} key too"
            )
        about = {"keyid": key.key_id, "label": key.label, "purpose": key.purpose}
        # The JSON file makes the entry count, so it comes last.
        place_over(self._file(key.key_id, ".pem"), key.public_key.pem)
        text = json.dumps(about, indent=1, ensure_ascii=False) + "\n"
        place_over(self._file(key.key_id, ".json"), text.encode())

    def remove(self, beginning: str) -> TrustedKey:
        """Trust a key no more.

        Parameters
        ----------
        beginning
            Its id, or at least the first 8 digits of it.

        Raises
        ------
        InputError
            If no or more than one trusted key begins so.
        RecordError
            If the system refuses.
        """
        if len(beginning) < 8:
            raise InputError(f"{beginning!r} is too short; give at least 8 digits of the key's id")
        fits = [key for key in self.all() if key.key_id.startswith(beginning.lower())]
        if len(fits) != 1:
            raise InputError(
                f"{beginning!r} is the beginning of {len(fits)} trusted keys and must be that of one; see "
                "them with: benchrun keys list"
            )
        try:
            for suffix in (".json", ".pem"):
                self._file(fits[0].key_id, suffix).unlink(missing_ok=True)
        except OSError as error:
            raise RecordError(f"the trust in {beginning} could not be removed: {error}") from error
        return fits[0]

    def all(self) -> tuple[TrustedKey, ...]:
        """All trusted keys, by id.

        Raises
        ------
        CouldNotCheck
            If an entry is damaged.
        """
        return tuple(self._load(path.stem) for path in sorted(self.folder.glob("*.json")))

    def find(self, key_id: str) -> TrustedKey | None:
        """The trusted key with this id, or None.

        Raises
        ------
        CouldNotCheck
            If its entry is damaged.
        """
        if not re.fullmatch("[0-9a-f]{64}", key_id) or not exists(self._file(key_id, ".json")):
            return None
        return self._load(key_id)

    def _file(self, key_id: str, suffix: str) -> Path:
        return self.folder / f"{key_id}{suffix}"

    def _load(self, key_id: str) -> TrustedKey:
        path = self._file(key_id, ".json")
        try:
            about = json.loads(read_bytes(path))
            public = PublicKey.from_pem(read_bytes(path.with_suffix(".pem")))
            key = TrustedKey(public, str(about["label"]), about["purpose"])
            if key.purpose not in ("bench", "rehearsal") or not key.key_id == about["keyid"] == key_id:
                raise ValueError("its name, key and purpose do not belong together")
        except (InputError, RecordError, ValueError, KeyError, TypeError, RecursionError) as error:
            raise CouldNotCheck(
                f"the trusted key {path} is damaged ({error}); remove both of its files and trust the key "
                "anew with: benchrun keys trust FILE"
            ) from None
        return key
