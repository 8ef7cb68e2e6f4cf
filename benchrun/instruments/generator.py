"""The signal generator: one tone, on and off."""

from __future__ import annotations

from benchrun.errors import InvalidMeasurement
from benchrun.instruments.safety import switched_off
from benchrun.instruments.scalar_dialects import GeneratorDialect
from benchrun.scpi.session import Session

__all__ = ["SignalGenerator"]


class SignalGenerator:
    """A signal generator behind a session.

    Parameters
    ----------
    session
        The conversation.
    dialect
        How this family words requests.
    """

    def __init__(self, session: Session, dialect: GeneratorDialect) -> None:
        self.session = session
        self.dialect = dialect

    def preset(self) -> None:
        """Known state, output off.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.preset)

    def tone(self, frequency_hz: float, power_dbm: float) -> None:
        """Put out a tone: set it first, then switch on.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        values = {"frequency_hz": repr(float(frequency_hz)), "power_dbm": repr(float(power_dbm))}
        self.session.set(*(m.format(**values) for m in self.dialect.tone))
        self.session.set(*self.dialect.source_on)

    def check(self) -> None:
        """Ask, after a reading, whether the tone was what it should be.

        Raises
        ------
        InvalidMeasurement
            If its reference is not locked.
        InstrumentError, TransportError, ReplyError
        """
        if int(self.session.query_float(self.dialect.condition)) & (1 << self.dialect.unlocked):
            raise InvalidMeasurement(
                f"{self.session.name} reports an unlocked reference.",
                "Check the reference signal and the warm-up, then run again.",
            )

    def off(self) -> None:
        """Output off.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.source_off)

    def make_safe(self) -> str:
        """Output off, as far as the line allows; empty, or what is left on and what to do by hand."""
        return switched_off(self.session, self.off, "the output of")
