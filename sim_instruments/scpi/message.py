"""Program messages to units: headers and typed parameters (SCPI-1999 Vol. 1, 6 to 8, from memory)."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass

from sim_instruments.scpi.errors import ScpiError

__all__ = ["FREQUENCY", "POWER", "TIME", "Unit", "boolean", "choice", "number", "numbers", "string", "units"]

FREQUENCY = {"HZ": 1.0, "KHZ": 1e3, "MHZ": 1e6, "MAHZ": 1e6, "GHZ": 1e9}
TIME = {"S": 1.0, "MS": 1e-3, "US": 1e-6, "NS": 1e-9}
POWER = {"DBM": 1.0}

_HEADER = re.compile(r"\*[A-Za-z]+\??|:?[A-Za-z]\w*(?::[A-Za-z]\w*)*\??")
_NUMBER = re.compile(r"([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:\s*[eE]\s*[+-]?\d+)?)\s*([A-Za-z%/]+)?")


@dataclass(frozen=True)
class Unit:
    """One program message unit.

    Parameters
    ----------
    header
        Mnemonics as written, without colons and the question mark; ``("*IDN",)`` for a common one.
    absolute
        Began with a colon.
    query
        Ended in a question mark.
    parameters
        Texts, quotes kept.
    """

    header: tuple[str, ...]
    absolute: bool
    query: bool
    parameters: tuple[str, ...]

    @property
    def common(self) -> bool:
        """An IEEE 488.2 common command."""
        return self.header[0].startswith("*")


def units(message: str) -> list[Unit | ScpiError]:
    """Units in order; one that cannot be read stands as its error, and those after it are still read."""
    found: list[Unit | ScpiError] = []
    for text in _split(message, ";"):
        stripped = text.strip()
        if not stripped:
            continue
        try:
            found.append(_unit(stripped))
        except ScpiError as error:
            found.append(error)
    return found


def _unit(text: str) -> Unit:
    match = _HEADER.match(text)
    if match is None:
        raise ScpiError(-101 if not text[0].isalnum() else -102, text[:40])
    head, rest = match[0], text[match.end() :]
    if rest and not rest[0].isspace():
        raise ScpiError(-101 if not rest[0].isascii() or not rest[0].isprintable() else -102, text[:40])
    parameters = tuple(p.strip() for p in _split(rest.strip(), ",")) if rest.strip() else ()
    if any(not p for p in parameters):
        raise ScpiError(-103 if len(parameters) > 1 else -109, text[:40])
    query = head.endswith("?")
    words = head.rstrip("?").lstrip(":").split(":")
    return Unit(tuple(words), head.startswith(":"), query, parameters)


def _split(text: str, separator: str) -> list[str]:
    """At separators outside quotes and parentheses."""
    if separator not in text:
        return [text]
    parts, start, quote, depth = [], 0, "", 0
    for i, c in enumerate(text):
        if quote:
            quote = "" if c == quote else quote
        elif c in "\"'":
            quote = c
        elif c == "(":
            depth += 1
        elif c == ")":
            depth -= 1
        elif c == separator and depth == 0:
            parts.append(text[start:i])
            start = i + 1
    parts.append(text[start:])
    return parts


def number(
    text: str, low: float, high: float, suffixes: dict[str, float] | None = None, default: float | None = None
) -> float:
    """A numeric parameter within its range; MINimum, MAXimum and DEFault count.

    Raises
    ------
    ScpiError
        -104, -121, -128, -131, -138 or -222.
    """
    word = text.upper()
    if word in ("MIN", "MINIMUM"):
        return low
    if word in ("MAX", "MAXIMUM"):
        return high
    if word in ("DEF", "DEFAULT") and default is not None:
        return default
    match = _NUMBER.fullmatch(text)
    if match is None:
        if text[:1] in "\"'(#":
            raise ScpiError(-104, text[:40])
        raise ScpiError(-121 if text[:1].isdigit() else -141, text[:40])
    value = float(match[1].replace(" ", ""))
    if match[2]:
        if not suffixes:
            raise ScpiError(-138, text[:40])
        if match[2].upper() not in suffixes:
            raise ScpiError(-131, text[:40])
        value *= suffixes[match[2].upper()]
    if not math.isfinite(value) or not low <= value <= high:
        raise ScpiError(-222, text[:40])
    return value


def numbers(
    texts: tuple[str, ...], low: float, high: float, suffixes: dict[str, float] | None = None
) -> list[float]:
    """A list of numeric parameters."""
    return [number(text, low, high, suffixes) for text in texts]


def boolean(text: str) -> bool:
    """ON, OFF, or a number that rounds to zero or not."""
    word = text.upper()
    if word in ("ON", "OFF"):
        return word == "ON"
    return round(number(text, -32768, 32767)) != 0


def choice(text: str, *keywords: str) -> str:
    """One of several keywords in short or long form; gives the long form as written here.

    Raises
    ------
    ScpiError
        -224.
    """
    for keyword in keywords:
        if text.upper() in (keyword.upper(), short(keyword)):
            return keyword
    raise ScpiError(-224, text[:40])


def string(text: str) -> str:
    """A quoted string.

    Raises
    ------
    ScpiError
        -104 or -151.
    """
    if text[:1] not in ("'", '"'):
        raise ScpiError(-104, text[:40])
    if len(text) < 2 or text[-1] != text[0]:
        raise ScpiError(-151, text[:40])
    return text[1:-1].replace(text[0] * 2, text[0])


def short(keyword: str) -> str:
    """The capitals of a keyword, which are its short form."""
    return "".join(c for c in keyword if c.isupper() or not c.isalpha())
