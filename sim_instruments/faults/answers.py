"""Answers that do not come, or come wrong. What each class says is what a careful engineer would see."""

from __future__ import annotations

import re

from sim_instruments.faults.line import FaultyLine, InstrumentFault
from sim_instruments.faults.when import When
from sim_instruments.scpi.instrument import Instrument

__all__ = [
    "CutShort", "Dribbling", "Garbage", "IdentityChanged", "LateAnswer", "LineClosed", "NoAnswer",
    "NotANumber", "StaleAnswer", "WrongBlockLength",
]  # fmt: skip

_LATE_S = 45.0
_READINGS = 64
"""Bytes above which an answer is taken for readings."""


def _block(response: bytes) -> re.Match[bytes] | None:
    """The header of a definite-length block (IEEE 488.2, 8.7.9)."""
    found = re.match(rb"#([1-9])", response)
    return re.match(rb"#[1-9](\d{%d})" % int(found[1]), response) if found else None


class _AnyAnswer(InstrumentFault):
    def fits(self, response: bytes, instrument: Instrument) -> bool:
        return True


class _Readings(InstrumentFault):
    def fits(self, response: bytes, instrument: Instrument) -> bool:
        return len(response) >= _READINGS and (response.count(b",") > 2 or _block(response) is not None)


class NoAnswer(_AnyAnswer):
    """The query times out. The error queue is empty: the instrument believes that it has answered."""

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Drop it."""
        line.mute = True


class LateAnswer(_AnyAnswer):
    """The query times out; most of a minute later the answer comes, as if to the next query."""

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Hold it back."""
        line.held_back = line.instrument.world.time_s + _LATE_S, response


class CutShort(_AnyAnswer):
    """The answer stops half way without its end, and the rest never comes: a timeout with bytes in hand."""

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Give the first half."""
        line.mute = line.no_end = True
        line.say(response[: max(1, len(response) // 2)])


class WrongBlockLength(InstrumentFault):
    """A block's header promises 8 bytes more than come: a strict reader waits for them until it gives up."""

    def fits(self, response: bytes, instrument: Instrument) -> bool:
        """Blocks only."""
        return _block(response) is not None

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Promise more."""
        found = _block(response)
        if found is not None:
            length = str(int(found[1]) + 8).encode()
            response = b"#" + str(len(length)).encode() + length + response[found.end() :]
        line.mute = True
        line.say(response)


class Garbage(_AnyAnswer):
    """Bytes that mean nothing, as many as were due: no number, block or identity is in them."""

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Replace all but the terminator; without LF, which would end it early."""
        noise = when.generator.integers(128, 256, max(len(response) - 1, 1), dtype="uint8").tobytes()
        line.say(noise + response[-1:])


class NotANumber(_Readings):
    """One reading in the middle is no number: NaN in a block, 9.91E37 in text (SCPI-1999, 7.2.1.5)."""

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Put it in."""
        found = _block(response)
        if found is None:
            values = response.rstrip(b"\n").split(b",")
            values[len(values) // 2] = b"9.91E37"
            line.say(b",".join(values) + b"\n")
            return
        middle = found.end() + (len(response) - found.end()) // 16 * 8  # all ones: NaN in each size and order
        line.say(response[:middle] + b"\xff" * 8 + response[middle + 8 :])


class StaleAnswer(_Readings):
    """Readings are those of the sweep before, to the last bit: noise that does not change gives it away."""

    def __init__(self) -> None:
        self._before: dict[int, bytes] = {}

    def fits(self, response: bytes, instrument: Instrument) -> bool:
        """There must have been others of the same length, and different."""
        if not super().fits(response, instrument):
            return False
        before = self._before.setdefault(len(response), response)
        return before != response

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Give the first of that length again."""
        line.say(self._before[len(response)])


class IdentityChanged(InstrumentFault):
    """``*IDN?`` names another serial number than before: somebody exchanged the instrument."""

    def fits(self, response: bytes, instrument: Instrument) -> bool:
        """The answer to ``*IDN?``."""
        return ",".join(instrument.identity).encode() in response

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Another serial number."""
        maker, model, serial, firmware = line.instrument.identity
        other = ",".join((maker, model, f"{serial}X", firmware))
        line.say(response.replace(",".join(line.instrument.identity).encode(), other.encode()))


class LineClosed(_AnyAnswer):
    """The connection is lost at once and stays so; opening it again fails."""

    once = True

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """Close."""
        line.mute = True
        line.instrument.line_closed = True


class Dribbling(_AnyAnswer):
    """The answer comes a few bytes at a time, but whole: slow, and correct."""

    def spoil(self, line: FaultyLine, response: bytes, when: When) -> None:
        """At most seven bytes at a time."""
        line.most = 7
        line.say(response)
