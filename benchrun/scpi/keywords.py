"""SCPI keywords: short and long forms (SCPI-1999 Volume 1, 6.2.1, from memory)."""

from __future__ import annotations

import re

__all__ = ["matches", "short_form"]

_HEAD = re.compile(r"([A-Za-z]+)(\d*)")


def short_form(keyword: str) -> str:
    """The short form: four letters, or three where the fourth is a vowel of a longer word.

    Examples
    --------
    >>> short_form("FREQuency"), short_form("POWer"), short_form("MODE"), short_form("VOLTage")
    ('FREQ', 'POW', 'MODE', 'VOLT')
    """
    word = keyword.upper()
    if len(word) <= 4:
        return word
    return word[:3] if word[3] in "AEIOU" else word[:4]


def matches(keyword: str, written: str) -> int | None:
    """The numeric suffix if ``written`` is a keyword in exact short or long form, else None.

    Examples
    --------
    >>> matches("CALCulate", "calc2"), matches("CALCulate", "CALCULATE"), matches("CALCulate", "CALCUL")
    (2, 1, None)
    """
    head = _HEAD.fullmatch(written)
    if head is None or head[1].upper() not in (short_form(keyword), keyword.upper()):
        return None
    return int(head[2]) if head[2] else 1
