"""The DC supply: on with a current limit, off again, and what it measures."""

from __future__ import annotations

from benchrun.errors import InvalidMeasurement
from benchrun.instruments.safety import switched_off
from benchrun.instruments.scalar_dialects import SupplyDialect
from benchrun.scpi.session import Session

__all__ = ["Supply"]

_NEAR = 0.05
"""Greatest relative difference between the voltage set and the voltage measured."""


class Supply:
    """A supply behind a session.

    Parameters
    ----------
    session
        The conversation.
    dialect
        How this family words requests.
    """

    def __init__(self, session: Session, dialect: SupplyDialect) -> None:
        self.session = session
        self.dialect = dialect
        self.on = False

    def preset(self) -> None:
        """Known state, output off.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.preset)

    def feed(self, voltage_v: float, current_a: float) -> float:
        """Switch on with a current limit that trips, and measure.

        Returns
        -------
        float
            The current drawn, in ampere.

        Raises
        ------
        InvalidMeasurement
            If the limit tripped, or the voltage does not stand.
        InstrumentError, TransportError, ReplyError
        """
        values = {"voltage_v": repr(float(voltage_v)), "current_a": repr(float(current_a))}
        self.session.set(*(m.format(**values) for m in self.dialect.feed))
        self.on = True  # from here on it may be on, whatever the answer
        self.session.set(*self.dialect.source_on)
        return self.current(voltage_v, current_a)

    def current(self, voltage_v: float, current_a: float) -> float:
        """The current drawn now, in ampere.

        Raises
        ------
        InvalidMeasurement
            If the limit tripped, or the voltage does not stand.
        InstrumentError, TransportError, ReplyError
        """
        if self.session.query_float(self.dialect.tripped):
            raise InvalidMeasurement(
                f"{self.session.name} tripped: the unit draws more than {current_a:g} A at {voltage_v:g} V.",
                "Look for a short or a wrong polarity before switching on again.",
            )
        volts = self.session.query_float(self.dialect.voltage)
        amperes = self.session.query_float(self.dialect.current)
        self.session.raise_errors(self.dialect.current)
        if abs(volts - voltage_v) > _NEAR * voltage_v:
            raise InvalidMeasurement(
                f"{self.session.name} gives {volts:.3g} V where {voltage_v:g} V were set.",
                "Check the leads, and the limit of the current.",
            )
        return amperes

    def off(self) -> None:
        """Switch off.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.source_off)
        self.on = False

    def make_safe(self) -> str:
        """Output off, as far as the line allows; empty, or what is left on and what to do by hand."""
        return switched_off(self.session, self.off, "the supply")
