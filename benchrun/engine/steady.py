"""A network analyzer that gets a second chance where the line failed, and only there.

Once for each reading, and only after faults of the line: a broken frame, an answer that did not come, a
connection that was lost. Then the line is cleared or made anew, the instrument must be the same one, it is
preset and set up again, and a whole new sweep is read: nothing of the broken answer is used. What an
instrument complains of, overloads, stale or impossible readings are never repeated away.
"""

from __future__ import annotations

from collections.abc import Callable

from benchrun.errors import ConnectionLost, DeadlineExceeded, FramingError, InstrumentError, TransportError
from benchrun.instruments.analyzer import NetworkAnalyzer, Readings, SweepSettings
from benchrun.instruments.dialect import Dialect
from benchrun.scpi.session import Session

__all__ = ["SteadyAnalyzer"]

_LINE = (FramingError, DeadlineExceeded, ConnectionLost)
_QUERY_ERRORS = range(-499, -399)
"""SCPI-1999 Vol. 2, 21.8.12: what a broken exchange leaves in the queue by itself."""


class SteadyAnalyzer(NetworkAnalyzer):
    """A network analyzer whose sweeps are repeated once after a fault of the line.

    Parameters
    ----------
    session, dialect
        As of a network analyzer.
    recover
        Gives a line that works again to the same instrument, given whether the old one is lost; raises if
        there is none, or another instrument answers.
    repeats
        Where each repetition is written down.
    """

    def __init__(
        self, session: Session, dialect: Dialect, recover: Callable[[bool], Session], repeats: list[str]
    ) -> None:
        super().__init__(session, dialect)
        self._recover = recover
        self._repeats = repeats

    def set_up(self, settings: SweepSettings) -> None:
        """Set up a sweep; once more after a fault of the line.

        Raises
        ------
        InputError
            If the dialect has no words for such a sweep.
        IdentityError, InstrumentError, TransportError, ReplyError
        """
        try:
            super().set_up(settings)
        except _LINE as error:
            self._begin_again(error, "set up")
            super().set_up(settings)

    def sweep(self) -> Readings:
        """Sweep once and read everything; a whole new sweep after a fault of the line.

        Raises
        ------
        InvalidMeasurement
            As for a network analyzer.
        IdentityError, InstrumentError, TransportError, ReplyError
        """
        settings = self._settings
        try:
            return super().sweep()
        except _LINE as error:
            assert settings is not None  # a sweep without set-up ends in another error
            self._begin_again(error, "swept")
            super().set_up(settings)
            return super().sweep()

    def _begin_again(self, error: TransportError, what: str) -> None:
        try:
            self.session = self._recover(isinstance(error, ConnectionLost))
            self._forget_broken_queries()
            self.preset()
        except TransportError as again:  # what went wrong first is what must be mended
            raise error from again
        self._repeats.append(f"{what} again: {error}")

    def _forget_broken_queries(self) -> None:
        try:
            self.session.raise_errors("the broken exchange")
        except InstrumentError as left:
            if left.number not in _QUERY_ERRORS:
                raise
