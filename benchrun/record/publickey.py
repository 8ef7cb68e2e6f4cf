"""The public half of an Ed25519 key: its PEM form, its id, and the check of one signature.

Sources: RFC 8032 (Ed25519), RFC 8410 (SubjectPublicKeyInfo of Ed25519, a constant prefix before the
32 bytes), RFC 7468 (PEM). The arithmetic is the ``cryptography`` package's.
"""

from __future__ import annotations

import base64
import binascii
import hashlib
import re
from dataclasses import dataclass

from benchrun.errors import InputError

__all__ = ["PublicKey"]

_SPKI_PREFIX = bytes.fromhex("302a300506032b6570032100")
_PEM = re.compile(rb"\s*-----BEGIN PUBLIC KEY-----\s+([A-Za-z0-9+/=\s]+?)\s*-----END PUBLIC KEY-----\s*")


@dataclass(frozen=True, slots=True)
class PublicKey:
    """An Ed25519 public key.

    Parameters
    ----------
    raw
        The 32 bytes of RFC 8032, 5.1.5.

    Examples
    --------
    >>> key = PublicKey(bytes.fromhex("d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a"))
    >>> key.pem.splitlines()[1]
    b'MCowBQYDK2VwAyEA11qYAYKxCrfVS/7TyWQHOg7hcvPapiMlrwIaaPcHURo='
    >>> PublicKey.from_pem(key.pem) == key
    True
    """

    raw: bytes

    @property
    def der(self) -> bytes:
        """SubjectPublicKeyInfo as DER (RFC 8410, 4)."""
        return _SPKI_PREFIX + self.raw

    @property
    def pem(self) -> bytes:
        """The same as PEM, as openssl reads it."""
        body = base64.b64encode(self.der)
        return b"-----BEGIN PUBLIC KEY-----\n" + body + b"\n-----END PUBLIC KEY-----\n"

    @property
    def key_id(self) -> str:
        """SHA-256 of the DER form, 64 lower-case hexadecimal digits."""
        return hashlib.sha256(self.der).hexdigest()

    @classmethod
    def from_pem(cls, pem: bytes) -> PublicKey:
        """Read a PEM public key.

        Raises
        ------
        InputError
            If it is not PEM, or not an Ed25519 public key.
        """
        if b"PRIVATE KEY" in pem:
            raise InputError(
                "this is a private key; only the public half is trusted and handed round: "
                "benchrun keys export NAME prints it"
            )
        found = _PEM.fullmatch(pem)
        if not found:
            raise InputError('this is no public key in PEM form ("-----BEGIN PUBLIC KEY-----")')
        try:
            der = base64.b64decode(b"".join(found[1].split()), validate=True)
        except binascii.Error:
            raise InputError("the base64 text of the public key is damaged; export it again") from None
        if len(der) != len(_SPKI_PREFIX) + 32 or not der.startswith(_SPKI_PREFIX):
            raise InputError(
                "the public key is of another kind than Ed25519; records are signed with Ed25519"
            )
        return cls(der[len(_SPKI_PREFIX) :])

    def fits(self, signature: bytes, message: bytes) -> bool:
        """Whether ``signature`` is this key's over ``message`` (RFC 8032, 5.1.7)."""
        from cryptography.exceptions import InvalidSignature
        from cryptography.hazmat.primitives.asymmetric.ed25519 import Ed25519PublicKey

        try:
            Ed25519PublicKey.from_public_bytes(self.raw).verify(signature, message)
        except (InvalidSignature, ValueError):
            return False
        return True
