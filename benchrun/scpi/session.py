"""One conversation with one instrument, over one PyVISA resource.

What PyVISA leaves open is settled here: both terminators are LF on every back end; a setting goes out with
its ``*OPC?`` in one message (which also spares 40 ms of delayed acknowledgement on raw sockets); deadlines
are for the whole answer (PyVISA's is only for a pause within it); blocks are read by exact count; the error
queue is emptied after each group of requests, so that an error belongs to those that caused it.
"""

from __future__ import annotations

from typing import Any

import pyvisa

from benchrun.clock import Clock
from benchrun.errors import ConnectionLost, DeadlineExceeded, FramingError, InstrumentError, ReplyError
from benchrun.rf.twoport import FloatArray
from benchrun.scpi.block import decode, read_block
from benchrun.scpi.faults import is_dead, translate
from benchrun.scpi.identity import Identity
from benchrun.scpi.transcript import Transcript

__all__ = ["Session"]

_LOWER = (pyvisa.errors.VisaIOError, pyvisa.errors.InvalidSession, OSError, RuntimeError)
_MAX_ERRORS = 100


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
    """

    def __init__(self, resource: Any, clock: Clock, transcript: Transcript, deadline_s: float = 5.0) -> None:
        self._line = resource
        self.name = str(resource.resource_name)
        self.clock = clock
        self.transcript = transcript
        self.deadline_s = deadline_s
        self.closed = False
        resource.read_termination = "\n"
        resource.write_termination = "\n"

    def write(self, message: str) -> None:
        """Send one program message.

        Raises
        ------
        TransportError
            If it does not go out.
        """
        if self.closed:
            raise ConnectionLost("the session is closed", resource=self.name, request=message)
        self.transcript.note(self.clock.seconds(), self.name, "sent", message)
        try:
            self._line.write(message)
        except _LOWER as error:
            raise self._failed(error, message, 0.0, self.deadline_s) from error

    def query(self, message: str, deadline_s: float | None = None) -> str:
        """Ask, and read one line.

        Raises
        ------
        TransportError
            If no whole answer comes in time.
        """
        limit = deadline_s or self.deadline_s
        self.write(message)
        start = self.clock.seconds()
        data = self._read(message, start, limit, lambda: self._line.read_raw())
        try:
            reply: str = data.decode("ascii").rstrip("\r\n")
        except UnicodeDecodeError:
            raise ReplyError(
                data[:40].decode("latin-1"), "plain text", resource=self.name, request=message
            ) from None
        self.transcript.note(self.clock.seconds(), self.name, "received", reply)
        self._check_late(message, start, limit)
        return reply

    def query_float(self, message: str, deadline_s: float | None = None) -> float:
        """Ask for one number.

        Raises
        ------
        ReplyError
            If the answer is none.
        """
        reply = self.query(message, deadline_s)
        try:
            return float(reply)
        except ValueError:
            raise ReplyError(reply, "a number", resource=self.name, request=message) from None

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
            For the whole answer.

        Raises
        ------
        TransportError, ReplyError
        """
        if form == "ASCii":
            return decode(self.query(message, deadline_s).encode(), form, count, self.name, message)
        limit = deadline_s or self.deadline_s
        self.write(message)
        start = self.clock.seconds()

        def take(size: int) -> bytes:
            data: bytes = self._read(
                message, start, limit, lambda: self._line.read_bytes(size, chunk_size=max(size, 1))
            )
            if len(data) != size:
                raise FramingError(
                    f"sent {len(data)} bytes where {size} were due", resource=self.name, request=message
                )
            return data

        def rest() -> bytes:
            # Without an end-of-message signal an indefinite block ends at its LF, which binary data may
            # hold too: such lines are told from the others by what the count should be.
            data: bytes = self._read(message, start, limit, lambda: self._line.read_raw())
            size = None if count is None else count * (8 if "64" in form else 4) + 1
            while size is not None and len(data) < size:
                data += self._read(message, start, limit, lambda: self._line.read_raw())
            return data

        self._line.read_termination = None
        try:
            payload = self._framed(message, take, rest, start, limit)
        finally:
            self._line.read_termination = "\n"
        self.transcript.note_block(self.clock.seconds(), self.name, payload)
        self._check_late(message, start, limit)
        return decode(payload, form, count, self.name, message)

    def _framed(self, message: str, take: Any, rest: Any, start: float, limit: float) -> bytes:
        try:
            self._line.set_visa_attribute(pyvisa.constants.ResourceAttribute.termchar_enabled, False)
            return read_block(take, lambda: self._with_termchar(rest), self.name, message)
        except _LOWER as error:
            raise self._failed(error, message, self.clock.seconds() - start, limit) from error

    def _with_termchar(self, rest: Any) -> bytes:
        self._line.read_termination = "\n"
        return bytes(rest())

    def set(self, *settings: str, deadline_s: float | None = None) -> None:
        """Send settings as one message and wait until they are done.

        Raises
        ------
        InstrumentError
            If the error queue is not empty afterwards.
        TransportError, ReplyError
        """
        message = ";:".join(s.removeprefix(":") for s in settings)
        self.complete(message, deadline_s)
        self.raise_errors(message)

    def complete(self, message: str, deadline_s: float | None = None) -> None:
        """Send a message with its ``*OPC?`` and wait for the "1".

        Raises
        ------
        TransportError, ReplyError
        """
        whole = f"{message};*OPC?"
        reply = self.query(whole, deadline_s)
        if reply.strip() != "1":
            raise ReplyError(reply, '"1" for *OPC?', resource=self.name, request=whole)

    def raise_errors(self, request: str) -> None:
        """Empty the error queue.

        Raises
        ------
        InstrumentError
            The first error found; the transcript has them all.
        """
        first: InstrumentError | None = None
        for _ in range(_MAX_ERRORS):
            reply = self.query("SYST:ERR?")
            number, _, text = reply.partition(",")
            try:
                code = int(number)
            except ValueError:
                raise ReplyError(
                    reply, "an error number and text", resource=self.name, request="SYST:ERR?"
                ) from None
            if code == 0:
                break
            first = first or InstrumentError(
                code, text.strip().strip('"'), resource=self.name, request=request
            )
        else:
            raise ReplyError(
                f"{_MAX_ERRORS} errors", "an error queue that ends", resource=self.name, request="SYST:ERR?"
            )
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
        except _LOWER as error:
            raise self._failed(error, "device clear", 0.0, self.deadline_s) from error

    def close(self) -> None:
        """Close the line; twice is once."""
        if not self.closed:
            self.closed = True
            try:
                self._line.close()
            except _LOWER as error:
                self.transcript.note(self.clock.seconds(), self.name, "failed", f"close: {error}")

    def _read(self, message: str, start: float, limit: float, read: Any) -> Any:
        remaining = limit - (self.clock.seconds() - start)
        if remaining <= 0:
            raise self._late(message, limit - remaining, limit)
        self._line.timeout = max(remaining * 1000.0, 1.0)
        try:
            return read()
        except _LOWER as error:
            raise self._failed(error, message, self.clock.seconds() - start, limit) from error

    def _check_late(self, message: str, start: float, limit: float) -> None:
        elapsed = self.clock.seconds() - start
        if elapsed > limit:
            raise self._late(message, elapsed, limit)

    def _late(self, message: str, elapsed: float, limit: float) -> DeadlineExceeded:
        return DeadlineExceeded(f"took {elapsed:.3g} s for a whole answer, allowed are {limit:.3g} s", resource=self.name,
                                request=message, elapsed_s=elapsed, limit_s=limit)  # fmt: skip

    def _failed(self, error: Exception, message: str, elapsed: float, limit: float) -> Exception:
        found: Exception = translate(error, self.name, message, elapsed, limit)
        if isinstance(found, DeadlineExceeded) and is_dead(self._line):
            found = ConnectionLost(
                "closed the line; check its power and cable, then run again",
                resource=self.name,
                request=message,
            )
        self.transcript.note(self.clock.seconds(), self.name, "failed", str(found))
        return found
