"""IEEE 488.2 data blocks as pure functions of bytes (8.7.9 definite, 8.7.10 indefinite, from memory)."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from benchrun.errors import FramingError, ReplyError
from benchrun.rf.twoport import FloatArray

__all__ = ["BLOCK_FORMS", "decode", "read_block"]

BLOCK_FORMS = {
    "REAL,64 NORMal": ">f8",
    "REAL,32 NORMal": ">f4",
    "REAL,64 SWAPped": "<f8",
    "REAL,32 SWAPped": "<f4",
}
"""numpy types by the standard's words (SCPI-1999 FORMat, BORDer)."""


_LONGEST = 1 << 28


def read_block(
    take: Callable[[int], bytes],
    rest: Callable[[], bytes],
    garbage: Callable[[], bytes],
    resource: str,
    request: str,
) -> bytes:
    """Read one block, by its header and the exact count.

    Parameters
    ----------
    take
        Returns exactly so many bytes.
    rest
        Returns all up to the end of the message, with its terminator: for an indefinite block.
    garbage
        Returns what else has come, where the answer is no block: for the complaint.
    resource, request
        For complaints.

    Returns
    -------
    bytes
        The payload.

    Raises
    ------
    ReplyError
        If the answer is no block.
    FramingError
        If the block is not followed by the terminator.
    """
    head = take(1)
    if head == b"#":
        head += take(1)
    if len(head) != 2 or not head[1:].isdigit():
        said = (head + garbage()).rstrip(b"\r\n").decode("latin-1") if head != b"\n" else ""
        raise ReplyError(said, "a data block (#...)", resource=resource, request=request)
    digits = int(head[1:])
    if digits == 0:
        return _unframed(rest(), "an indefinite block", resource, request)
    length = take(digits)
    if not length.isdigit() or int(length) > _LONGEST:
        said = (head + length).decode("latin-1")
        raise ReplyError(said, f"a block length up to {_LONGEST:,}", resource=resource, request=request)
    return _unframed(take(int(length) + 1), f"a block of {int(length)} bytes", resource, request)


def _unframed(data: bytes, what: str, resource: str, request: str) -> bytes:
    if data[-1:] != b"\n":
        raise FramingError(
            f"sent {what}, but the byte after it is {data[-1:]!r} and not the end of the message",
            resource=resource,
            request=request,
        )
    return data[:-1]


def decode(payload: bytes, form: str, count: int | None, resource: str, request: str) -> FloatArray:
    """Payload to numbers.

    Parameters
    ----------
    payload
        Bytes of a block, or ASCII text for ``"ASCii"``.
    form
        A key of :data:`BLOCK_FORMS`, or ``"ASCii"``.
    count
        How many numbers there must be; None for any.

    Raises
    ------
    ReplyError
        If it is not that many whole numbers.
    """
    if form == "ASCii":
        try:
            values = np.array([float(x) for x in payload.decode("ascii").split(",")])
        except ValueError:
            raise ReplyError(
                payload[:60].decode("latin-1"), "numbers joined by commas", resource=resource, request=request
            ) from None
    else:
        kind = np.dtype(BLOCK_FORMS[form])
        if len(payload) % kind.itemsize:
            raise ReplyError(
                f"{len(payload)} bytes",
                f"a multiple of {kind.itemsize} bytes",
                resource=resource,
                request=request,
            )
        values = np.frombuffer(payload, kind).astype(np.float64)
    if count is not None and len(values) != count:
        raise ReplyError(f"{len(values)} numbers", f"{count} numbers", resource=resource, request=request)
    return values
