"""Bytes over one PyVISA resource, with a deadline for the whole answer.

PyVISA's timeout is only for a pause within an answer, and pyvisa-py restarts it with every byte, so a
dribbling instrument would never be late. Reading in small pieces that grow while the line is quick keeps
each call short: the deadline is looked at between them. (A line that turns slow within one piece, 64 KiB
at most, is noticed at its end only.)
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import pyvisa
from pyvisa.constants import ResourceAttribute, StatusCode

from benchrun.clock import Clock, SystemClock
from benchrun.errors import ConnectionLost, DeadlineExceeded, FramingError, TransportError
from benchrun.scpi.faults import is_dead, translate

__all__ = ["Due", "Line"]

_LOWER = (pyvisa.errors.VisaIOError, pyvisa.errors.InvalidSession, OSError, RuntimeError)
_ENDED = (StatusCode.success, StatusCode.success_termination_character_read)
_SLICE_S = 0.25
_LARGEST_PIECE = 65536
_DRAIN_S = 0.5
_QUIET_MS = 100.0
_LONGEST_MS = 86_400_000.0


@dataclass(slots=True)
class Due:
    """How long one answer may still take, in seconds of the session's clock.

    Parameters
    ----------
    clock
        What counts.
    limit_s
        From the moment of making this object.
    request
        What was asked, for complaints.
    """

    clock: Clock
    limit_s: float
    request: str
    piece: int = 1
    start_s: float = field(init=False)

    def __post_init__(self) -> None:
        self.start_s = self.clock.seconds()

    @property
    def elapsed_s(self) -> float:
        """Seconds gone."""
        return self.clock.seconds() - self.start_s

    @property
    def left_s(self) -> float:
        """Seconds left; negative when late."""
        return self.limit_s - self.elapsed_s

    def late(self, resource: str) -> DeadlineExceeded:
        """Make the error of a missed deadline."""
        elapsed, limit = self.elapsed_s, self.limit_s
        return DeadlineExceeded(
            f"took {elapsed:.3g} s for a whole answer, allowed are {limit:.3g} s",
            resource=resource,
            request=self.request,
            elapsed_s=elapsed,
            limit_s=limit,
        )


class Line:
    """A PyVISA resource with LF as terminator, deadlines, and this project's errors.

    Parameters
    ----------
    resource
        An open message-based PyVISA resource; this object closes it.
    clock
        Deadlines count in its seconds.
    patience_s
        Longest real time to wait for a byte where the clock is simulated: bench seconds do not pass by
        themselves there, and an answer that has not come by then never will.
    """

    def __init__(self, resource: Any, clock: Clock, patience_s: float = 2.0) -> None:
        self._resource = resource
        self.name = str(resource.resource_name)
        self._clock = clock
        self._patience_s = None if isinstance(clock, SystemClock) else patience_s
        self._socket = self.name.upper().endswith("::SOCKET")
        self._timeout_ms = 0.0
        self.half_read = False
        self.closed = False
        resource.read_termination = "\n"
        resource.write_termination = "\n"
        self._termchar = True

    def send(self, message: str, due: Due) -> None:
        """Send one program message; what was left unread of an earlier answer is thrown away first.

        Raises
        ------
        TransportError
        """
        if self.closed:
            raise ConnectionLost("the session is closed", resource=self.name, request=message)
        if not message.isascii() or any(ord(c) < 32 for c in message):
            raise FramingError("holds characters that cannot be sent in one message; plain ASCII only",
                               resource=self.name, request=repr(message))  # fmt: skip
        if self.half_read:
            self.clear()
        try:
            self._resource.write(message)
        except _LOWER as error:
            raise self._failed(error, due) from error

    def take(self, size: int, due: Due, until_lf: bool = False) -> bytes:
        """Read so many bytes; fewer only where the message ends before.

        Parameters
        ----------
        size
            Greatest number of bytes.
        due
            Deadline of the whole answer.
        until_lf
            Stop after an LF (text); otherwise LF is a byte like any other (blocks).

        Raises
        ------
        TransportError
        """
        self._set_termchar(until_lf)
        data, self.half_read = bytearray(), True
        while len(data) < size:
            before = due.elapsed_s
            chunk, ended = self._low_read(min(due.piece, size - len(data)), due)
            data += chunk
            if ended or (until_lf and chunk.endswith(b"\n")):
                break
            if not chunk:
                raise FramingError("ended its answer with nothing", resource=self.name, request=due.request)
            slow = due.piece > 1 and due.elapsed_s - before > due.left_s / 100.0
            due.piece = max(due.piece // 16, 2) if slow else min(due.piece * 16, _LARGEST_PIECE)
        return bytes(data)

    def _low_read(self, size: int, due: Due) -> tuple[bytes, bool]:
        while True:
            left = due.left_s
            if left <= 0:
                raise due.late(self.name)
            # A dead socket looks like a silent one: waiting in slices lets us peek at it. Only where one byte
            # is awaited, because pyvisa-py loses what came in before a timeout.
            sliced = self._socket and size == 1 and self._patience_s is None and left > _SLICE_S
            wait = _SLICE_S if sliced else min(left, self._patience_s or left)
            self._set_timeout(wait * 1000.0)
            try:
                return self._visa_read(size)
            except _LOWER as error:
                fault = self._failed(error, due)
                if not isinstance(fault, DeadlineExceeded):
                    raise fault from error
                if sliced:
                    continue
                if self._patience_s is not None:
                    self._clock.wait(max(due.left_s, 0.0))  # the bench would have waited that long
                raise fault from error

    def _visa_read(self, size: int) -> tuple[bytes, bool]:
        line = self._resource
        with line.ignore_warning(StatusCode.success_device_not_present, StatusCode.success_max_count_read):
            chunk, status = line.visalib.read(line.session, size)
        return bytes(chunk), status in _ENDED

    def _set_timeout(self, milliseconds: float) -> None:
        wanted = min(max(milliseconds, 1.0), _LONGEST_MS)
        if not 0.95 * self._timeout_ms <= wanted <= 1.05 * self._timeout_ms:
            self._resource.timeout = self._timeout_ms = wanted

    def _set_termchar(self, wanted: bool) -> None:
        if wanted is not self._termchar:
            self._resource.set_visa_attribute(ResourceAttribute.termchar_enabled, wanted)
            self._termchar = wanted

    def clear(self) -> None:
        """Forget half-read answers: device clear, or reading a raw socket empty.

        pyvisa-py's own clear of a raw socket never returns when the other side has closed it.

        Raises
        ------
        TransportError
        """
        self.half_read = False
        if self._socket:
            self._drain()
            return
        try:
            self._resource.clear()
        except _LOWER as error:
            raise self._failed(error, Due(self._clock, _DRAIN_S, "device clear")) from error

    def _drain(self) -> None:
        due = Due(SystemClock(), _DRAIN_S, "clear")
        self._set_termchar(False)
        self._set_timeout(_QUIET_MS)
        while due.left_s > 0:
            try:
                self._visa_read(due.piece)
            except _LOWER as error:
                fault = self._failed(error, due)
                if isinstance(fault, DeadlineExceeded):
                    return  # quiet
                raise fault from error
            due.piece = min(due.piece * 16, 4096)

    def close(self) -> str:
        """Close; twice is once. Returns what went wrong, or nothing."""
        if self.closed:
            return ""
        self.closed = True
        try:
            self._resource.close()
        except _LOWER as error:
            return str(error)
        return ""

    def _failed(self, error: Exception, due: Due) -> TransportError:
        fault = translate(error, self.name, due.request, due.elapsed_s, due.limit_s)
        if isinstance(fault, DeadlineExceeded) and is_dead(self._resource):
            return ConnectionLost("closed the line; check its power and cable, then run again",
                                  resource=self.name, request=due.request)  # fmt: skip
        return fault
