"""The spectrum analyzer, used to read the level of one tone at a time."""

from __future__ import annotations

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.instruments.scalar_dialects import SpectrumDialect
from benchrun.quantity import Dimension, render
from benchrun.scpi.session import Session

__all__ = ["SpectrumAnalyzer"]

_SPAN_IN_BANDWIDTHS = 20.0
_DEADLINE_S = 60.0


class SpectrumAnalyzer:
    """A spectrum analyzer behind a session.

    Parameters
    ----------
    session
        The conversation.
    dialect
        How this family words requests.
    most_dbm
        Greatest level that its range can be set to.
    """

    def __init__(self, session: Session, dialect: SpectrumDialect, most_dbm: float = 20.0) -> None:
        self.session = session
        self.dialect = dialect
        self.most_dbm = most_dbm

    def preset(self) -> None:
        """Known state.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.preset)

    def level(self, frequency_hz: float, bandwidth_hz: float, reference_dbm: float) -> float:
        """Level of the strongest line within ten bandwidths of a frequency, in dBm.

        Parameters
        ----------
        frequency_hz
            Where it is expected.
        bandwidth_hz
            Resolution bandwidth.
        reference_dbm
            Greatest level expected, for the attenuator.

        Raises
        ------
        InvalidMeasurement
            For an overload, an unlocked reference, or readings that are no numbers.
        InstrumentError, TransportError, ReplyError
        """
        words = self.dialect
        values = {
            "centre_hz": repr(float(frequency_hz)),
            "span_hz": repr(_SPAN_IN_BANDWIDTHS * bandwidth_hz),
            "bandwidth_hz": repr(float(bandwidth_hz)),
            "reference_dbm": repr(min(float(reference_dbm), self.most_dbm)),
        }
        self.session.set(*(m.format(**values) for m in words.window))
        self.session.set(*words.sweep, deadline_s=_DEADLINE_S)
        trace = self.session.query_values(words.values, words.form)
        self.session.raise_errors(words.values)
        where = render(frequency_hz, Dimension.FREQUENCY)
        if len(trace) == 0 or not np.isfinite(trace).all() or np.max(np.abs(trace)) > 1e6:
            raise InvalidMeasurement(f"{self.session.name} gave no numbers near {where}.", "Read again.")
        bits = int(self.session.query_float(words.condition))
        if bits & (1 << words.overload):
            raise InvalidMeasurement(
                f"{self.session.name} reports an overload near {where}.",
                "Put a pad before it or lower the source level, then read again.",
            )
        if bits & (1 << words.unlocked):
            raise InvalidMeasurement(
                f"{self.session.name} reports an unlocked reference near {where}.",
                "Check the reference signal and the warm-up, then read again.",
            )
        return float(np.max(trace))

    def make_safe(self) -> str:
        """It has no source: nothing to switch off."""
        return ""
