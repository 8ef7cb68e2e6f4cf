"""Program messages to units: where a message ends, its units, their headers and data elements.

IEEE 488.2 chapter 7 and SCPI-1999 Vol. 1, 6 to 8 (from memory). Each malformed kind has its own error number;
which one follows the descriptions in SCPI-1999 Vol. 2, 21.8.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from sim_instruments.scpi.element import block_end, check_element
from sim_instruments.scpi.errors import ScpiError

__all__ = ["Unit", "message_end", "units"]

_MNEMONIC = 12
"""Longest mnemonic, numeric suffix not counted."""
_HEADER = re.compile(r"(?:\*[A-Za-z]\w*|:?[A-Za-z]\w*(?::[A-Za-z]\w*)*)\??", re.ASCII)
_STRING = re.compile(r"\"(?:[^\"]|\"\")*\"|'(?:[^']|'')*'")
_STOPS = {";": re.compile(r"[;\"'#(]"), ",": re.compile(r"[,\"'#(]")}
_PARENTHESIS = re.compile(r"[()\"']")
_FRAME = re.compile(rb"[\n\"'#]")
_QUOTED = re.compile(rb"\"[^\"\n]*\"|'[^'\n]*'")
_CONTROLS = {**dict.fromkeys([*range(10), *range(11, 32)], " "), 0x85: "\xff", 0xA0: "\xff"}
"""Controls are white space (7.4.1.2); what Python takes for white space beyond ASCII is not."""
_BLOCK_LENGTH = re.compile(rb"#([1-9])(\d*)")


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
        Data elements as written: quotes kept, blocks with their header, byte for character.
    """

    header: tuple[str, ...]
    absolute: bool
    query: bool
    parameters: tuple[str, ...]

    @property
    def common(self) -> bool:
        """An IEEE 488.2 common command."""
        return self.header[0].startswith("*")


def message_end(data: bytearray, whole: bool) -> int | None:
    r"""Where the LF stands that ends the first message; LF within a definite block does not.

    Parameters
    ----------
    data
        What came in so far.
    whole
        END came with the last byte; a block of unstated length then reaches to it.

    Returns
    -------
    int or None
        Position of the LF, or ``len(data)`` where END alone ends the message; None while it has not ended.

    Examples
    --------
    >>> message_end(bytearray(b'A "#12";B\nC'), False)
    9
    >>> message_end(bytearray(b"A #12\n\n;B\n"), False)
    9
    """
    position, open_end = 0, len(data) if whole and data else None
    while match := _FRAME.search(data, position):
        found, position = match[0], match.end()
        if found == b"\n":
            return match.start()
        if found != b"#":
            quoted = _QUOTED.match(data, match.start())
            position = quoted.end() if quoted else position
        elif match.start() and data[match.start() - 1] in b" ,\t":
            if whole and data[position : position + 1] == b"0":
                return len(data)
            length = _BLOCK_LENGTH.match(data, match.start())
            if length is None:
                continue
            digits = int(length[1])
            if len(length[2]) >= digits:
                position = length.start(2) + digits + int(length[2][:digits])
            elif length.end() == len(data):  # the length itself is still coming
                return open_end
    return open_end


def units(message: str) -> list[Unit | ScpiError]:
    """Units in order; one that cannot be read stands as its error, and those after it are still read.

    Parameters
    ----------
    message
        Without its terminator, bytes as characters (latin-1).

    Examples
    --------
    >>> [unit.header for unit in units("SENS:FREQ:STAR 1 GHZ;*OPC?")]
    [('SENS', 'FREQ', 'STAR'), ('*OPC',)]
    """
    found: list[Unit | ScpiError] = []
    if "#" not in message and not message.isprintable():
        message = message.translate(_CONTROLS)
    for text in _split(message, ";"):
        if not text or text.isspace():
            continue
        try:
            found.append(_unit(text.lstrip()))
        except ScpiError as error:
            found.append(error)
    return found


def _unit(text: str) -> Unit:
    match = _HEADER.match(text)
    if match is None:
        known = text[0].isascii() and (text[0].isalnum() or text[0] in ":*?\"'(+-.,")
        raise ScpiError(-102 if known else -101, text[:40])
    head, rest = match[0], text[match.end() :]
    if rest and not rest[0].isspace():
        raise ScpiError(_after_header(rest[0]), text[:40])
    words = head.rstrip("?").lstrip(":").split(":")
    if any(len(word.lstrip("*").rstrip("0123456789")) > _MNEMONIC for word in words):
        raise ScpiError(-112, text[:40])
    parameters: tuple[str, ...] = ()
    if rest and not rest.isspace():
        parameters = tuple(map(check_element, _split(rest, ",")))
    return Unit(tuple(words), head.startswith(":"), head.endswith("?"), parameters)


def _after_header(c: str) -> int:
    if c in "\"'(#,+-.":
        return -111  # data where white space should be
    return -102 if c in ":?*" else -101


def _split(text: str, separator: str) -> list[str]:
    """At separators outside strings, blocks and parentheses."""
    parts, start, position = [], 0, 0
    stop = _STOPS[separator]
    while match := stop.search(text, position):
        at, position = match.start(), match.end()
        c = match[0]
        if c == separator:
            parts.append(text[start:at])
            start = position
        elif c in "\"'":
            string = _STRING.match(text, at)
            position = string.end() if string else len(text)
        elif c == "(":
            position = _closing(text, at)
        elif at and text[at - 1] in " \t,":
            position = block_end(text, at) or position
    parts.append(text[start:])
    return parts


def _closing(text: str, start: int) -> int:
    """Behind the parenthesis that closes the one at ``start``; right behind that one if none does."""
    depth, position = 0, start
    while match := _PARENTHESIS.search(text, position):
        position = match.end()
        if match[0] in "\"'":
            string = _STRING.match(text, match.start())
            position = string.end() if string else position
            continue
        depth += 1 if match[0] == "(" else -1
        if depth == 0:
            return position
    return start + 1
