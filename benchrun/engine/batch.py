"""A batch at the bench: unit after unit under one calibration, as a person types or scans serial numbers."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass

from benchrun.engine.job import Outcome, Turn
from benchrun.engine.operators import Mistyped, Person
from benchrun.errors import InputError, Stopped
from benchrun.hookup import Hookup

__all__ = ["HELP", "BatchDesk", "BatchPerson", "Skipped"]

HELP = (
    "Type or scan each serial number. `again REASON` tests the last unit once more, `skip SERIAL REASON` "
    "leaves one out, `end` ends the batch. At a connection, `undo SERIAL` mends a mistyped serial number."
)
_END = frozenset({"end", "stop", "s", "quit", "q"})


@dataclass(frozen=True, slots=True)
class Skipped:
    """A unit that was left out, and why."""

    serial: str
    reason: str


class BatchDesk:
    """Asks for the next serial number until there are no more.

    Parameters
    ----------
    ask
        Shows a request and waits for a line; EOFError where the input ends.
    tell
        Shows a line.
    check
        Raises :class:`InputError` for a serial number that the sequence does not take.
    past
        Units of this batch that another process has tested.
    """

    def __init__(
        self,
        ask: Callable[[str], str],
        tell: Callable[[str], None],
        check: Callable[[str], object],
        past: Iterable[str] = (),
    ) -> None:
        self._ask, self._tell, self._check = ask, tell, check
        self._said: dict[str, str] = dict.fromkeys(past, "tested before the break")
        self._last = next(reversed(self._said), "")
        self._helped = False
        self.skipped: list[Skipped] = []

    def concluded(self, outcome: Outcome) -> None:
        """Remember what a unit came to; its serial number may have been mended."""
        self._said[outcome.unit] = outcome.conclusion.value
        self._last = outcome.unit

    def next(self) -> Turn | None:
        """The next unit; None at the end of the batch."""
        if not self._helped:
            self._helped = True
            self._tell(HELP)
        while True:
            try:
                line = self._ask("Serial number of the next unit").strip()
            except EOFError:
                return None
            if line.lower() in _END:
                return None
            try:
                turn = self._understood(line)
            except InputError as error:
                self._tell(str(error))
                continue
            if turn is not None:
                return turn

    def _understood(self, line: str) -> Turn | None:
        word, _, rest = line.partition(" ")
        if word.lower() == "skip":
            serial, _, reason = rest.strip().partition(" ")
            self._check(serial)
            self._need(reason, "skip SERIAL REASON")
            self.skipped.append(Skipped(serial, reason.strip()))
            self._tell(f"{serial} is left out: {reason.strip()}")
            return None
        if word.lower() == "again":
            if not self._last:
                raise InputError("no unit has been tested yet that could be tested again")
            self._need(rest, "again REASON")
            return Turn(self._last, rest.strip())
        if not line:
            return None
        self._check(line)
        if line not in self._said:
            return Turn(line)
        # The same number twice is a slip of the scanner more often than a wish.
        reason = self._ask(
            f"{line} was in this batch already ({self._said[line]}). To test it again, give the reason"
        ).strip()
        return Turn(line, reason) if reason and reason.lower() not in _END else None

    @staticmethod
    def _need(reason: str, form: str) -> None:
        if not reason.strip():
            raise InputError(f"give the reason, as in: {form}")


class BatchPerson(Person):
    """A person at the bench who may find that a serial number was mistyped.

    Parameters
    ----------
    ask
        As for a person.
    """

    def __init__(self, ask: Callable[[str], str]) -> None:
        super().__init__(self._asked)
        self._really_ask = ask

    def _asked(self, request: str) -> str:
        answer = self._really_ask(request)
        word, _, serial = answer.strip().partition(" ")
        if word.lower() == "undo":
            while not serial.strip():
                try:
                    serial = self._really_ask("The right serial number")
                except EOFError:
                    raise Stopped("nobody answered: the input ended") from None
            raise Mistyped(serial.strip())
        return answer

    def connect(self, hookup: Hookup) -> None:
        """Ask, and wait for Enter.

        Raises
        ------
        Mistyped
            If the serial number was wrong.
        Stopped
            If the operator ends the run.
        """
        super().connect(hookup)
