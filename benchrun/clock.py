"""Time as a seam: the wall, or a rehearsal that never sleeps."""

from __future__ import annotations

import time
from collections.abc import Callable
from datetime import UTC, datetime
from typing import Protocol

__all__ = ["Clock", "FunctionClock", "SystemClock"]


class Clock(Protocol):
    """Where a run reads the time."""

    def utc(self) -> datetime:
        """Date and time, aware, in UTC: goes into records."""
        ...

    def seconds(self) -> float:
        """Monotonic bench time in seconds: deadlines and durations count in it."""
        ...

    def wait(self, seconds: float) -> None:
        """Let bench time pass."""
        ...


class SystemClock:
    """The clock of the machine."""

    def utc(self) -> datetime:
        """Date and time in UTC."""
        return datetime.now(UTC)

    def seconds(self) -> float:
        """Monotonic seconds."""
        return time.monotonic()

    def wait(self, seconds: float) -> None:
        """Sleep."""
        time.sleep(seconds)


class FunctionClock:
    """A clock read from somewhere else: the simulated bench, or a test.

    Parameters
    ----------
    seconds
        Gives bench time in seconds.
    advance
        Lets that many seconds of bench time pass, without sleeping.
    utc
        Gives the date; the machine's by default, since a record is written in real time even when
        its bench time was simulated.
    """

    def __init__(
        self,
        seconds: Callable[[], float],
        advance: Callable[[float], None],
        utc: Callable[[], datetime] | None = None,
    ) -> None:
        self._seconds = seconds
        self._advance = advance
        self._utc = utc or (lambda: datetime.now(UTC))

    def utc(self) -> datetime:
        """Date and time in UTC."""
        return self._utc()

    def seconds(self) -> float:
        """Bench time in seconds."""
        return self._seconds()

    def wait(self, seconds: float) -> None:
        """Let simulated time pass."""
        self._advance(seconds)
