"""Data elements as written: which kind one is, and whether its letters are in order (IEEE 488.2, 7.7)."""

from __future__ import annotations

import re
from typing import Literal, TypeAlias

from sim_instruments.scpi.errors import ScpiError

__all__ = ["Kind", "block_data", "block_end", "check_element", "kind_of", "number_parts"]

Kind: TypeAlias = Literal["word", "number", "string", "block", "expression"]

_LONGEST = 12
_DIGITS = 255
_EXPONENT = 32_000
_NUMBER = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+))(?:\s*[eE]\s*([+-]?\d+))?", re.ASCII)
_SUFFIX = re.compile(r"\s*(/?[A-Za-z]+(?:[./-]?[A-Za-z0-9]+)*)", re.ASCII)
_WORD = re.compile(r"[A-Za-z]\w*", re.ASCII)
_OTHER_BASE = re.compile(r"#(?:[hH][0-9a-fA-F]+|[qQ][0-7]+|[bB][01]+)")
_STRING = re.compile(r"\"(?:[^\"]|\"\")*\"|'(?:[^']|'')*'")


def kind_of(text: str) -> Kind:
    """The kind of an element that :func:`check_element` has passed."""
    first = text[0]
    if first == "#":
        return "number" if text[1] in "hHqQbB" else "block"
    if first in "\"'":
        return "string"
    if first == "(":
        return "expression"
    return "word" if first.isalpha() else "number"


def check_element(text: str) -> str:
    """One data element without the white space around it.

    Raises
    ------
    ScpiError
        -101, -103, -109, -112 to -171 by what is wrong with it.

    Examples
    --------
    >>> check_element(" 1.5 GHZ ")
    '1.5 GHZ'
    """
    element = text.lstrip()
    if not element:
        raise ScpiError(-109, "an empty data element")
    if element[0] == "#":
        return _check_hash(element)
    element = element.rstrip()
    first = element[0]
    if first in "\"'":
        end = _STRING.match(element)
        if end is None:
            raise ScpiError(-151, element[:40])
        if not element.isascii():
            raise ScpiError(-151, ascii(element[:40]))
    elif first.isascii() and (first.isdigit() or first in "+-."):
        return _check_number(element)
    elif first.isascii() and first.isalpha():
        return _check_word(element)
    elif first == "(":
        return _check_expression(element)
    else:
        raise ScpiError(-101, ascii(element[:40]))
    return _nothing_after(element, end.end())


def _check_number(element: str) -> str:
    match = _NUMBER.match(element)
    if match is None:
        raise ScpiError(-121, element[:40])
    if len(match[1]) > _DIGITS:
        digits = match[1].lstrip("+-").lstrip("0").replace(".", "")
        if len(digits) > _DIGITS:
            raise ScpiError(-124, element[:40])
    if match[2] and (len(match[2]) > 7 or abs(int(match[2])) > _EXPONENT):
        raise ScpiError(-123, element[:40])
    rest = element[match.end() :]
    if not rest:
        return element
    suffix = _SUFFIX.match(rest)
    if suffix is None:
        if rest.lstrip()[0] in "%/":
            raise ScpiError(-131, element[:40])
        raise ScpiError(-103 if rest[0].isspace() else -121, ascii(element[:40]))
    if len(suffix[1]) > _LONGEST:
        raise ScpiError(-134, element[:40])
    tail = rest[suffix.end() :]
    if tail:
        raise ScpiError(-103 if tail[0].isspace() else -131, ascii(element[:40]))
    return element


def _check_word(element: str) -> str:
    match = _WORD.match(element)
    assert match is not None  # it begins with a letter
    rest = element[match.end() :]
    if rest and not rest[0].isspace():
        raise ScpiError(-141, ascii(element[:40]))
    if rest:
        raise ScpiError(-103, ascii(element[:40]))
    if len(match[0]) > _LONGEST:
        raise ScpiError(-144, element[:40])
    return element


def _check_expression(element: str) -> str:
    depth = 0
    for i, c in enumerate(element):
        depth += (c == "(") - (c == ")")
        if depth == 0:
            return _nothing_after(element, i + 1)
    raise ScpiError(-171, ascii(element[:40]))


def _check_hash(element: str) -> str:
    if element[1:2] in tuple("hHqQbB"):
        element = element.rstrip()
        if (match := _OTHER_BASE.match(element)) is None:
            raise ScpiError(-121, element[:40])
        if match.end() < len(element) and not element[match.end()].isspace():
            raise ScpiError(-121, element[:40])
        return _nothing_after(element, match.end())
    end = block_end(element, 0)
    if end is None:
        raise ScpiError(-161, ascii(element[:20]))
    _nothing_after(element.rstrip() if len(element.rstrip()) > end else element[:end], end)
    return element[:end]


def _nothing_after(element: str, end: int) -> str:
    if end < len(element):
        raise ScpiError(-103, ascii(element[end : end + 40]))
    return element


def block_end(text: str, start: int) -> int | None:
    """Behind the arbitrary block that begins at ``start`` with ``#``; None where it is none or cut short."""
    digits = text[start + 1 : start + 2]
    if digits == "0":
        return len(text)
    if not (digits.isascii() and digits.isdigit()):
        return None
    data = start + 2 + int(digits)
    length = text[start + 2 : data]
    if len(length) < int(digits) or not (length.isascii() and length.isdigit()):
        return None
    return data + int(length) if data + int(length) <= len(text) else None


def block_data(element: str) -> bytes:
    """Payload of a block element.

    Examples
    --------
    >>> block_data("#15HELLO")
    b'HELLO'
    """
    return element[2 + int(element[1]) :].encode("latin-1")


def number_parts(element: str) -> tuple[float, str]:
    """Value and suffix, in capitals, of a numeric element; base 16, 8 and 2 count.

    Examples
    --------
    >>> number_parts("#HFF"), number_parts("1.5 e3 kHz")
    ((255.0, ''), (1500.0, 'KHZ'))
    """
    if element[0] == "#":
        digits = int(element[2:], {"h": 16, "q": 8, "b": 2}[element[1].lower()])
        return float(digits) if digits < 1 << 1000 else float("inf"), ""
    match = _NUMBER.match(element)
    assert match is not None  # check_element has passed it
    value = float(match[1]) if match[2] is None else float(f"{match[1]}e{match[2]}")
    return value, element[match.end() :].strip().upper()
