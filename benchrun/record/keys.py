"""The keys of one place: private halves that sign, public halves that are trusted.

::

    HOME/keys/NAME.pem            PKCS #8, mode 0600, with or without passphrase
    HOME/keys/NAME.public.pem     its public half
    HOME/trusted/KEYID.pem        a public key that is trusted here
    HOME/trusted/KEYID.json       its label, and what it may speak for

HOME is ``BENCHRUN_HOME``, or the folder for settings that the system gives each user.
"""

from __future__ import annotations

import os
import re
import stat
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Final

from benchrun.errors import InputError, RecordError
from benchrun.record.placing import exists, place_new, place_over, read_bytes
from benchrun.record.publickey import PublicKey
from benchrun.record.signer import FileSigner, Purpose, is_protected
from benchrun.record.trust import TrustedKey, TrustFolder

__all__ = ["REHEARSAL", "KeyInfo", "KeyStore", "TrustedKey", "home_folder"]

REHEARSAL: Final = "rehearsal"
"""Name of the key that signs simulated and replayed runs."""

_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._-]{0,63}")


@dataclass(frozen=True, slots=True)
class KeyInfo:
    """A private key of this place.

    Parameters
    ----------
    name, key_id
        Its name, and the id of its public half ("" if the public half is not known).
    purpose
        What it may speak for.
    protected
        Whether a passphrase opens it.
    """

    name: str
    key_id: str
    purpose: Purpose
    protected: bool


def home_folder(environ: Mapping[str, str] | None = None) -> Path:
    """Where keys lie: ``BENCHRUN_HOME``, else the user's folder for settings.

    Parameters
    ----------
    environ
        Environment variables; the process's own by default.

    Raises
    ------
    InputError
        If there is no home folder either.
    """
    env = os.environ if environ is None else environ
    try:
        return _home_folder(env)
    except RuntimeError as error:
        raise InputError(
            f"{error}; name a folder for keys in the environment variable BENCHRUN_HOME"
        ) from None


def _home_folder(env: Mapping[str, str]) -> Path:
    if own := env.get("BENCHRUN_HOME"):
        return Path(own).expanduser()
    if os.name == "nt" and (roaming := env.get("APPDATA")):
        return Path(roaming) / "benchrun"
    # XDG Base Directory Specification: relative values are to be ignored.
    config = env.get("XDG_CONFIG_HOME", "")
    return (Path(config) if Path(config).is_absolute() else Path.home() / ".config") / "benchrun"


class KeyStore:
    """Keys and trust under one folder. It is made when something is first put into it.

    Parameters
    ----------
    home
        The folder; see :func:`home_folder`.
    """

    def __init__(self, home: Path | None = None) -> None:
        self.home = home_folder() if home is None else home
        self._trust = TrustFolder(self.home / "trusted")

    def rehearsal(self) -> FileSigner:
        """The rehearsal key; made and trusted for rehearsals on first use.

        Two processes that come at the same time get the same key.

        Raises
        ------
        RecordError
            If the folder cannot be written or the key not be read.
        """
        path = self._private(REHEARSAL)
        if not exists(path):
            place_new(path, FileSigner.generate(REHEARSAL).to_pem(), private=True)
        signer = self._open(REHEARSAL, None)
        if self._trust.find(signer.key_id) is None:
            place_over(self._public(REHEARSAL), signer.public_key.pem)
            self._trust.put(TrustedKey(signer.public_key, "rehearsal key of this place", REHEARSAL))
        return signer

    def make(self, name: str, passphrase: str | None = None) -> KeyInfo:
        """Make a bench key and trust it here.

        Parameters
        ----------
        name
            Letters, digits and ``. _ -``.
        passphrase
            Protects the file; None leaves it unprotected.

        Raises
        ------
        InputError
            If the name is taken, reserved or not possible, or the passphrase empty.
        RecordError
            If the system refuses.
        """
        self._check_name(name)
        if name.casefold() == REHEARSAL:
            raise InputError(f"{name!r} is the name of the key for rehearsals; choose another name")
        if passphrase is not None and not passphrase:
            raise InputError("the passphrase is empty; give one, or none at all")
        signer = FileSigner.generate()
        if not place_new(self._private(name), signer.to_pem(passphrase), private=True):
            raise InputError(f"there is a key {name!r} already; choose another name")
        place_over(self._public(name), signer.public_key.pem)
        self._trust.put(TrustedKey(signer.public_key, name, "bench"))
        return KeyInfo(name, signer.key_id, "bench", passphrase is not None)

    def list(self) -> tuple[KeyInfo, ...]:
        """The private keys of this place, by name."""
        names = sorted(
            path.stem for path in (self.home / "keys").glob("*.pem") if not path.name.endswith(".public.pem")
        )
        return tuple(self._info(name) for name in names if _NAME.fullmatch(name))

    def signer(self, name: str | None = None, passphrase: str | None = None) -> FileSigner:
        """A private key, ready to sign.

        Parameters
        ----------
        name
            Which; None if there is only one bench key.
        passphrase
            Opens a protected one.

        Raises
        ------
        InputError
            If there is none or more than one, or the passphrase does not open it.
        RecordError
            If it cannot be read, or others could read it too.
        """
        if name is None:
            names = [info.name for info in self.list() if info.purpose == "bench"]
            if not names:
                raise InputError(
                    f"there is no key to sign measured runs with in {self.home}; make one with: "
                    "benchrun keys make NAME"
                )
            if len(names) > 1:
                raise InputError(f"there are {len(names)} keys ({', '.join(names)}); say which one signs")
            name = names[0]
        return self._open(name, passphrase)

    def export(self, name: str) -> bytes:
        """The public half of a key, as PEM.

        Raises
        ------
        InputError
            If there is no such key.
        RecordError
            If it cannot be read.
        """
        self._check_name(name)
        if exists(self._public(name)):
            return PublicKey.from_pem(read_bytes(self._public(name))).pem
        return self._open(name, None).public_key.pem

    def trust(self, pem: bytes, label: str, purpose: Purpose = "bench") -> TrustedKey:
        """Trust a public key from now on.

        Parameters
        ----------
        pem
            The key, PEM.
        label
            Whose it is.
        purpose
            What it may speak for.

        Raises
        ------
        InputError
            If it is no Ed25519 public key, the label is empty, or the key is trusted for something else.
        RecordError
            If the system refuses.
        """
        key = TrustedKey(PublicKey.from_pem(pem), label.strip(), purpose)
        self._trust.put(key)
        return key

    def distrust(self, key_id: str) -> TrustedKey:
        """Trust a key no more.

        Parameters
        ----------
        key_id
            Its id, or the beginning of it: at least 8 digits.

        Raises
        ------
        InputError
            If no or more than one trusted key begins so.
        """
        return self._trust.remove(key_id)

    def trusted(self, purpose: Purpose | None = None) -> tuple[TrustedKey, ...]:
        """The trusted public keys, by id.

        Parameters
        ----------
        purpose
            Only those that may speak for this; None for all.

        Raises
        ------
        CouldNotCheck
            If an entry is damaged.
        """
        return tuple(key for key in self._trust.all() if purpose in (None, key.purpose))

    def find(self, key_id: str) -> TrustedKey | None:
        """The trusted key with this id, or None."""
        return self._trust.find(key_id)

    def _private(self, name: str) -> Path:
        return self.home / "keys" / f"{name}.pem"

    def _public(self, name: str) -> Path:
        return self.home / "keys" / f"{name}.public.pem"

    def _check_name(self, name: str) -> None:
        if not _NAME.fullmatch(name) or name.endswith((".", ".public")):
            raise InputError(f"{name!r} is no name for a key; use up to 64 letters, digits and . _ -")

    def _open(self, name: str, passphrase: str | None) -> FileSigner:
        self._check_name(name)
        path = self._private(name)
        if not exists(path):
            known = ", ".join(info.name for info in self.list()) or "none"
            raise InputError(
                f"there is no key {name!r} in {self.home} (there: {known}); make one "
                f"with: benchrun keys make {name}"
            )
        if os.name != "nt" and (mode := stat.S_IMODE(path.stat().st_mode)) & 0o077:
            raise RecordError(
                f"others can read the private key {path} (mode {mode:04o}), so it proves nothing; allow only "
                f"yourself with: chmod 600 {path} (or keep keys where modes are kept: BENCHRUN_HOME)"
            )
        try:
            return FileSigner.from_pem(read_bytes(path), _purpose(name), passphrase)
        except InputError as error:
            raise InputError(f"key {name!r} ({path}): {error}") from None

    def _info(self, name: str) -> KeyInfo:
        protected = is_protected(read_bytes(self._private(name)))
        try:
            key_id = PublicKey.from_pem(self.export(name)).key_id
        except (InputError, RecordError):
            key_id = ""
        return KeyInfo(name, key_id, _purpose(name), protected)


def _purpose(name: str) -> Purpose:
    return "rehearsal" if name == REHEARSAL else "bench"
