"""The DSSE envelope: what is signed, how it is written down, and the check of its signatures.

Source: Dead Simple Signing Envelope 1.0 (secure-systems-lab/dsse, protocol.md and envelope.md): the
signature covers the exact payload bytes together with their type, so nothing need be brought into a
canonical form to be checked, and a key id in the envelope is only a hint.
"""

from __future__ import annotations

import base64
import binascii
import json
import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from benchrun.errors import CouldNotCheck, SignatureWrong
from benchrun.record.publickey import PublicKey
from benchrun.record.signer import Signer

__all__ = ["FILE_NAME", "PAYLOAD_TYPE", "Envelope", "Signature", "pae", "parse", "sign"]

FILE_NAME = "envelope.json"
"""Name of the envelope in a record's folder."""

PAYLOAD_TYPE = "application/vnd.in-toto+json"
"""Payload type of in-toto statements."""

_BASE64 = re.compile(r"[A-Za-z0-9+/]*={0,2}")


@dataclass(frozen=True, slots=True)
class Signature:
    """One signature of an envelope.

    Parameters
    ----------
    key_id
        The hint which key made it; may be empty.
    sig
        The signature's bytes.
    """

    key_id: str
    sig: bytes


@dataclass(frozen=True, slots=True)
class Envelope:
    """Signed bytes with their type.

    Parameters
    ----------
    payload
        The bytes.
    payload_type
        How they are to be read.
    signatures
        At least one for a signed envelope.
    """

    payload: bytes
    payload_type: str
    signatures: tuple[Signature, ...]

    @property
    def signed_bytes(self) -> bytes:
        """What the signatures cover, see :func:`pae`."""
        return pae(self.payload_type, self.payload)

    def to_json(self) -> bytes:
        """The one form in which benchrun writes it: standard base64, one key a line, LF at the end."""
        data = {
            "payload": base64.b64encode(self.payload).decode(),
            "payloadType": self.payload_type,
            "signatures": [
                {"keyid": one.key_id, "sig": base64.b64encode(one.sig).decode()} for one in self.signatures
            ],
        }
        return (json.dumps(data, indent=1) + "\n").encode()

    def makers(self, keys: Iterable[PublicKey]) -> tuple[PublicKey | None, ...]:
        """For each signature the key that made it, or None where none of ``keys`` did."""
        pool, message = tuple(keys), self.signed_bytes
        found: list[PublicKey | None] = []
        for one in self.signatures:
            hinted_first = sorted(pool, key=lambda key: key.key_id != one.key_id)
            found.append(next((key for key in hinted_first if key.fits(one.sig, message)), None))
        return tuple(found)

    def verify(self, keys: Iterable[PublicKey], threshold: int = 1) -> tuple[PublicKey, ...]:
        """Check that enough different keys signed this.

        Parameters
        ----------
        keys
            Trusted keys.
        threshold
            How many different ones must have signed (DSSE counts keys, not signatures).

        Returns
        -------
        tuple of PublicKey
            The keys that did.

        Raises
        ------
        SignatureWrong
            If fewer did.
        ValueError
            If ``threshold`` is below 1.
        """
        if threshold < 1:
            raise ValueError(f"threshold is {threshold}; at least one signature is needed")
        good = tuple(dict.fromkeys(key for key in self.makers(keys) if key))
        if len(good) < threshold:
            raise SignatureWrong(
                f"{len(good)} of the {len(self.signatures)} signatures are by trusted keys; "
                f"needed: {threshold}"
            )
        return good


def pae(payload_type: str, payload: bytes) -> bytes:
    """The pre-authentication encoding: the bytes that are signed.

    Parameters
    ----------
    payload_type
        Type of the payload.
    payload
        Its bytes.

    Returns
    -------
    bytes
        ``"DSSEv1" SP LEN(type) SP type SP LEN(payload) SP payload`` (DSSE protocol.md, "Signature
        Definition").

    Examples
    --------
    >>> pae("http://example.com/HelloWorld", b"hello world")
    b'DSSEv1 29 http://example.com/HelloWorld 11 hello world'
    """
    kind = payload_type.encode()
    return b"DSSEv1 %d %b %d %b" % (len(kind), kind, len(payload), payload)


def sign(payload: bytes, signers: Iterable[Signer], payload_type: str = PAYLOAD_TYPE) -> Envelope:
    """Sign bytes.

    Parameters
    ----------
    payload
        The bytes.
    signers
        Who signs, one signature each.
    payload_type
        Type of the payload.

    Returns
    -------
    Envelope
        The signed envelope.
    """
    message = pae(payload_type, payload)
    made = tuple(Signature(signer.key_id, signer.sign(message)) for signer in signers)
    return Envelope(payload, payload_type, made)


def parse(text: bytes) -> Envelope:
    """Read an envelope; unknown fields are ignored, base64 may be standard or URL-safe, as DSSE asks.

    Parameters
    ----------
    text
        The JSON text.

    Raises
    ------
    CouldNotCheck
        If it is no envelope; the sentence says what is wrong.
    """
    try:
        data = json.loads(text)
    except (ValueError, RecursionError) as error:
        raise CouldNotCheck(f"is not JSON text ({error}); it may be cut off or damaged") from None
    if not isinstance(data, dict):
        raise CouldNotCheck("holds no JSON object, so it is no DSSE envelope")
    kind = data.get("payloadType")
    listed = data.get("signatures")
    if not isinstance(kind, str) or not isinstance(listed, list) or not listed:
        raise CouldNotCheck('lacks "payloadType" or "signatures", so it is no signed DSSE envelope')
    return Envelope(_decode(data.get("payload"), "payload"), kind, tuple(_signature(one) for one in listed))


def _signature(data: Any) -> Signature:
    if not isinstance(data, dict):
        raise CouldNotCheck(f"has a signature that is no JSON object: {str(data)[:40]!r}")
    key_id = data.get("keyid", "")
    if not isinstance(key_id, str):
        raise CouldNotCheck(f'has a "keyid" that is no text: {str(key_id)[:40]!r}')
    return Signature(key_id, _decode(data.get("sig"), "sig"))


def _decode(text: Any, field: str) -> bytes:
    if not isinstance(text, str):
        raise CouldNotCheck(f'has no text "{field}", so it is no DSSE envelope')
    standard = text.replace("-", "+").replace("_", "/")
    if not _BASE64.fullmatch(standard):
        raise CouldNotCheck(f'has a "{field}" that is not base64 text')
    try:
        return base64.b64decode(standard.rstrip("=") + "=" * (-len(standard.rstrip("=")) % 4))
    except binascii.Error:
        raise CouldNotCheck(f'has a "{field}" whose base64 text is cut off') from None
