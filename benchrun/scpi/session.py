"""One conversation with one instrument: settings, queries, blocks, the error queue.

What PyVISA leaves open is settled here and in :mod:`benchrun.scpi.line`: both terminators are LF on every
back end; a setting goes out with its ``*OPC?`` in one message (which also spares 40 ms of delayed
acknowledgement on raw sockets); deadlines are for the whole answer; blocks are read by exact count; the
error queue is emptied after each group of requests, so that an error belongs to those that caused it.
"""

from __future__ import annotations

import re
from typing import Any

from benchrun.clock import Clock
from benchrun.errors import (
    BenchError,
    FramingError,
    InstrumentError,
    ReplyError,
    TransportError,
)
from benchrun.rf.twoport import FloatArray
from benchrun.scpi.block import BLOCK_FORMS, decode, read_block
from benchrun.scpi.error_texts import standard_text
from benchrun.scpi.identity import Identity
from benchrun.scpi.keywords import compound
from benchrun.scpi.line import Due, Line
from benchrun.scpi.transcript import Transcript

__all__ = ["Session"]

_MAX_ERRORS = 100
_LONGEST_LINE = 1 << 20
_LONGEST_LIST = 1 << 26
_NUMBER = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")
_INTEGER = re.compile(r"[+-]?\d+")


class Session:
    """A conversation.

    Parameters
    ----------
    resource
        An open message-based PyVISA resource; this object closes it.
    clock
        Deadlines and transcript count in its seconds.
    transcript
        Where messages are kept.
    deadline_s
        For answers that need no measuring.
    patience_s
        Longest real wait where the clock is simulated, see :class:`benchrun.scpi.line.Line`.
    """

    def __init__(self, resource: Any, clock: Clock, transcript: Transcript, deadline_s: float = 5.0,
                 patience_s: float = 2.0) -> None:  # fmt: skip
        self._line = Line(resource, clock, patience_s)
        self.name = self._line.name
        self.clock = clock
        self.transcript = transcript
        self.deadline_s = deadline_s

    @property
    def closed(self) -> bool:
        """Whether the line was closed from this side."""
        return self._line.closed

    def write(self, message: str) -> None:
        """Send one program message.

        Raises
        ------
        TransportError
            If it does not go out.
        """
        self._send(message, self._due(message, None))

    def query(self, message: str, deadline_s: float | None = None) -> str:
        """Ask, and read one line.

        Parameters
        ----------
        message
            The query.
        deadline_s
            For the whole answer, from sending on.

        Raises
        ------
        TransportError
            If no whole answer comes in time.
        ReplyError
            If it is not plain text.
        """
        due = self._due(message, deadline_s)
        data = self._ask_line(message, due, _LONGEST_LINE)
        try:
            reply = data.decode("ascii")
        except UnicodeDecodeError:
            self._note("received", data[:40].decode("latin-1"))
            raise ReplyError(
                data[:40].decode("latin-1"), "plain text", resource=self.name, request=message
            ) from None
        self._note("received", reply)
        self._check_late(due)
        return reply

    def query_float(self, message: str, deadline_s: float | None = None) -> float:
        """Ask for one number.

        Raises
        ------
        ReplyError
            If the answer is none.
        TransportError
            If no whole answer comes in time.
        """
        reply = self.query(message, deadline_s).strip()
        if not _NUMBER.fullmatch(reply):
            raise ReplyError(reply, "a number", resource=self.name, request=message)
        return float(reply)

    def query_values(
        self, message: str, form: str, count: int | None = None, deadline_s: float | None = None
    ) -> FloatArray:
        """Ask for an array.

        Parameters
        ----------
        message
            The query.
        form
            ``"ASCii"`` or a key of :data:`benchrun.scpi.block.BLOCK_FORMS`.
        count
            How many numbers must come.
        deadline_s
            For the whole answer, from sending on.

        Raises
        ------
        TransportError
            If no whole answer comes in time, or its frame is wrong.
        ReplyError
            If it is not so many numbers.
        """
        due = self._due(message, deadline_s)
        if form == "ASCii":
            payload = self._ask_line(message, due, _LONGEST_LIST)
        else:
            self._send(message, due)
            payload = self._block(due, None if count is None else count * int(BLOCK_FORMS[form][-1]))
        self.transcript.note_block(self.clock.seconds(), self.name, payload)
        self._check_late(due)
        return decode(payload, form, count, self.name, message)

    def _block(self, due: Due, expected: int | None) -> bytes:
        def take(size: int) -> bytes:
            data = self._line.take(size, due)
            if len(data) < size:
                raise FramingError(f"ended its answer after {len(data)} bytes where {size} were due",
                                   resource=self.name, request=due.request)  # fmt: skip
            return data

        def rest() -> bytes:
            # An indefinite block ends with END; on lines without it, the known count says where.
            if expected is not None:
                return take(expected + 1)
            if self.name.upper().endswith("::SOCKET"):
                raise FramingError("sent a block of unstated length over a line that cannot signal its end",
                                   resource=self.name, request=due.request)  # fmt: skip
            return self._line.take(_LONGEST_LIST, due)

        def garbage() -> bytes:
            try:
                return self._line.take(60, Due(self.clock, min(0.2, max(due.left_s, 0.0)), due.request), True)
            except BenchError:
                return b""

        try:
            payload = read_block(take, rest, garbage, self.name, due.request)
        except TransportError as error:
            self._note("failed", str(error))
            raise
        self._line.half_read = False
        return payload

    def set(self, *settings: str, deadline_s: float | None = None) -> None:
        """Send settings as one message and wait until they are done.

        Parameters
        ----------
        *settings
            Program message units, each from the root of the tree; nothing is sent where there is none.
        deadline_s
            Until they are done.

        Raises
        ------
        InstrumentError
            If the error queue is not empty afterwards.
        TransportError, ReplyError
        """
        if settings:
            message = compound(*settings)
            self.complete(message, deadline_s)
            self.raise_errors(message)

    def complete(self, message: str, deadline_s: float | None = None) -> None:
        """Send a message with its ``*OPC?`` and wait for the "1".

        Raises
        ------
        TransportError, ReplyError
        """
        whole = f"{message};*OPC?"
        reply = self.query(whole, deadline_s).strip()
        if reply not in ("1", "+1"):
            raise ReplyError(reply, '"1" for *OPC?', resource=self.name, request=whole)

    def raise_errors(self, request: str) -> None:
        """Empty the error queue.

        Raises
        ------
        InstrumentError
            The first error found; the transcript has them all. A text that the instrument leaves empty is
            the standard's (SCPI-1999 Vol. 2, chapter 21).
        """
        first: InstrumentError | None = None
        for _ in range(_MAX_ERRORS):
            reply = self.query("SYST:ERR?")
            number, _, text = (part.strip() for part in reply.partition(","))
            if not _INTEGER.fullmatch(number):
                raise ReplyError(reply, "an error number and text", resource=self.name, request="SYST:ERR?")
            if int(number) == 0:
                break
            if first is None:
                said = text.removeprefix('"').removesuffix('"').replace('""', '"').strip()
                said = said or standard_text(int(number))
                first = InstrumentError(int(number), said, resource=self.name, request=request)
        else:
            raise ReplyError(
                f"{_MAX_ERRORS} errors", "an error queue that ends", resource=self.name, request="SYST:ERR?"
            ) from first
        if first is not None:
            raise first

    def identity(self) -> Identity:
        """Ask who it is."""
        return Identity.parse(self.query("*IDN?"), self.name)

    def clear(self) -> None:
        """Device clear: forget half-read answers and half-sent messages.

        Raises
        ------
        TransportError
        """
        try:
            self._line.clear()
        except TransportError as error:
            self._note("failed", str(error))
            raise

    def close(self) -> None:
        """Close the line; twice is once."""
        if trouble := self._line.close():
            self._note("failed", f"close: {trouble}")

    def _due(self, message: str, deadline_s: float | None) -> Due:
        return Due(self.clock, self.deadline_s if deadline_s is None else deadline_s, message)

    def _note(self, way: str, text: str) -> None:
        self.transcript.note(self.clock.seconds(), self.name, way, text)

    def _send(self, message: str, due: Due) -> None:
        self._note("sent", message)
        try:
            self._line.send(message, due)
        except TransportError as error:
            self._note("failed", str(error))
            raise

    def _ask_line(self, message: str, due: Due, longest: int) -> bytes:
        self._send(message, due)
        try:
            data = self._line.take(longest, due, until_lf=True)
            if len(data) >= longest and not data.endswith(b"\n"):
                raise FramingError(f"sent {len(data):,} bytes without an end of the message",
                                   resource=self.name, request=message)  # fmt: skip
        except TransportError as error:
            self._note("failed", str(error))
            raise
        self._line.half_read = False
        return data.rstrip(b"\r\n")

    def _check_late(self, due: Due) -> None:
        if due.left_s < 0:
            late = due.late(self.name)
            self._note("failed", str(late))
            raise late
