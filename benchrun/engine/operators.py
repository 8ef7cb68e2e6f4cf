"""Who answers when hands are needed: a person, nobody, or whoever a rehearsal brings."""

from __future__ import annotations

from collections.abc import Callable
from typing import Protocol

from benchrun.errors import InputError, Stopped
from benchrun.hookup import Connection, Hookup

__all__ = ["Mistyped", "Nobody", "Operator", "Person"]


class Mistyped(Exception):
    """The serial number of the unit on the bench is another one.

    Parameters
    ----------
    serial
        The right one.
    """

    def __init__(self, serial: str) -> None:
        super().__init__(serial)
        self.serial = serial


class Operator(Protocol):
    """Hands."""

    def check(self, hookups: tuple[Hookup, ...]) -> None:
        """Say before the run whether these connections can be made.

        Raises
        ------
        InputError
            If not.
        """
        ...

    def offer(self, serial: str) -> None:
        """Lay a unit on the bench.

        Raises
        ------
        InputError
            If there is no such unit.
        """
        ...

    def connect(self, hookup: Hookup) -> None:
        """Make a connection, and come back when it stands.

        Raises
        ------
        Stopped
            If the operator ends the run.
        Mistyped
            If the serial number was wrong.
        """
        ...


class Person:
    """A person at the bench.

    Parameters
    ----------
    ask
        Shows a request and waits for a line. An empty one goes on, "stop" ends the run, and anything else
        may mean "not yet": then the request is made again.
    """

    _GO = frozenset({"", "y", "yes", "ok", "done"})
    _STOP = frozenset({"stop", "s", "quit", "q"})

    def __init__(self, ask: Callable[[str], str]) -> None:
        self._ask = ask

    def check(self, hookups: tuple[Hookup, ...]) -> None:
        """A person can connect anything."""

    def offer(self, serial: str) -> None:
        """The label is read when the unit is connected."""
        self._serial = serial

    def connect(self, hookup: Hookup) -> None:
        """Ask, and wait for Enter."""
        text = Hookup(tuple(self._labelled(c) for c in hookup.connections)).text
        while True:
            try:
                answer = self._ask(f"Connect {text}").strip().lower()
            except EOFError:
                raise Stopped("nobody answered: the input ended") from None
            if answer in self._STOP:
                raise Stopped
            if answer in self._GO:
                return

    def _labelled(self, connection: Connection) -> Connection:
        items = tuple(f"unit {self._serial}" if item == "unit" else item for item in connection.items)
        return Connection(items, connection.ports)


class Nobody:
    """No hands at all: a run that needs one connection, which stands already."""

    _serial: str | None = None

    def check(self, hookups: tuple[Hookup, ...]) -> None:
        """Refuse a run that needs anything connected in between."""
        if len(hookups) > 1:
            first, second = hookups[0].text, hookups[1].text
            raise InputError(
                f"the sequence needs {len(hookups)} different connections (first {first}, then {second}), "
                "and nobody is there to make them; run it without --unattended"
            )

    def offer(self, serial: str) -> None:
        """It is in place already, and no other can take its place."""
        if self._serial not in (None, serial):
            raise InputError(
                f"unit {self._serial} is to be in place, and nobody is there to change it for {serial}; "
                "run it without --unattended, or one unit at a time"
            )
        self._serial = serial

    def connect(self, hookup: Hookup) -> None:
        """It stands already."""
