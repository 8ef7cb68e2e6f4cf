"""Ending a run from outside: Ctrl-C and SIGTERM become one exception, at a moment that can bear it."""

from __future__ import annotations

import contextlib
import signal
import threading
from collections.abc import Iterator
from types import FrameType, TracebackType
from typing import Any

from benchrun.errors import Stopped

__all__ = ["StopSignals"]

_NAMES = ("SIGINT", "SIGTERM", "SIGHUP", "SIGBREAK")  # the last two each on one kind of system only
_ENDING: tuple[int, ...] = tuple(getattr(signal, name) for name in _NAMES if hasattr(signal, name))


class StopSignals:
    """While entered, Ctrl-C, SIGTERM and the end of the terminal ask for a stop.

    Only within :meth:`armed` does the first of them raise :class:`Stopped`, in the main thread. Outside of
    it (switching off, writing the record) a stop waits: it changes nothing there, and must not leave a
    source on or half a record.

    Parameters
    ----------
    signals
        Which; left alone where the run is not in the main thread, and those that whoever started the
        program wants ignored (``nohup``).
    """

    def __init__(self, signals: tuple[int, ...] = _ENDING) -> None:
        self._signals = signals if threading.current_thread() is threading.main_thread() else ()
        self._before: dict[int, Any] = {}
        self._armed = False
        self.asked = False

    def __enter__(self) -> StopSignals:
        for number in self._signals:
            if signal.getsignal(number) is not signal.SIG_IGN:
                self._before[number] = signal.signal(number, self._arrived)
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        for number, handler in self._before.items():
            signal.signal(number, handler)

    def _arrived(self, number: int, frame: FrameType | None) -> None:
        self.asked = True
        if self._armed:
            self._armed = False
            who = "the operator" if number == signal.SIGINT else "the system"
            raise Stopped(f"{who} ended the run")

    @contextlib.contextmanager
    def armed(self) -> Iterator[None]:
        """A context in which a stop comes through at once, also one that was asked for before."""
        if self.asked:
            raise Stopped
        self._armed = True
        try:
            yield
        finally:
            self._armed = False
