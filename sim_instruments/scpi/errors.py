"""Error numbers and texts (SCPI-1999 Volume 2, chapter 21), as far as instruments here report them."""

from __future__ import annotations

__all__ = ["TEXTS", "ScpiError", "event_bit"]

TEXTS = {
    0: "No error",
    -100: "Command error",
    -101: "Invalid character",
    -102: "Syntax error",
    -103: "Invalid separator",
    -104: "Data type error",
    -108: "Parameter not allowed",
    -109: "Missing parameter",
    -113: "Undefined header",
    -114: "Header suffix out of range",
    -120: "Numeric data error",
    -121: "Invalid character in number",
    -128: "Numeric data not allowed",
    -131: "Invalid suffix",
    -138: "Suffix not allowed",
    -141: "Invalid character data",
    -148: "Character data not allowed",
    -151: "Invalid string data",
    -158: "String data not allowed",
    -200: "Execution error",
    -211: "Trigger ignored",
    -213: "Init ignored",
    -220: "Parameter error",
    -221: "Settings conflict",
    -222: "Data out of range",
    -223: "Too much data",
    -224: "Illegal parameter value",
    -230: "Data corrupt or stale",
    -240: "Hardware error",
    -241: "Hardware missing",
    -300: "Device-specific error",
    -310: "System error",
    -350: "Queue overflow",
    -363: "Input buffer overrun",
    -365: "Time out error",
    -400: "Query error",
    -410: "Query INTERRUPTED",
    -420: "Query UNTERMINATED",
    -430: "Query DEADLOCKED",
    -440: "Query UNTERMINATED after indefinite response",
}


class ScpiError(Exception):
    """Something for the error queue.

    Parameters
    ----------
    number
        One of :data:`TEXTS`, or a positive device number.
    detail
        What it was about; follows the text after a semicolon.
    """

    def __init__(self, number: int, detail: str = "") -> None:
        super().__init__(number, detail)
        self.number = number
        self.detail = detail

    @property
    def entry(self) -> str:
        """As the queue gives it: at most 255 characters of text."""
        text = TEXTS.get(self.number, "Device-specific error")
        if self.detail:
            text += ";" + self.detail.replace('"', "'")
        return f'{self.number},"{text[:255]}"'


def event_bit(number: int) -> int:
    """Bit of the standard event status register that an error sets (21.8)."""
    if -199 <= number <= -100:
        return 32
    if -299 <= number <= -200:
        return 16
    if -499 <= number <= -400:
        return 4
    return 8
