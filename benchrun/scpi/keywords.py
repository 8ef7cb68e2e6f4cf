"""SCPI keywords: short and long forms (SCPI-1999 Volume 1, 6.2.1, from memory)."""

from __future__ import annotations

import re

__all__ = ["compound", "matches", "short_form"]

_HEAD = re.compile(r"([A-Za-z]+)(\d*)")


def short_form(keyword: str) -> str:
    """Give the short form: four letters, or three where the fourth is a vowel of a longer word.

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
    """Give the numeric suffix if ``written`` is a keyword in exact short or long form, else None.

    Examples
    --------
    >>> matches("CALCulate", "calc2"), matches("CALCulate", "CALCULATE"), matches("CALCulate", "CALCUL")
    (2, 1, None)
    """
    head = _HEAD.fullmatch(written)
    if head is None or head[1].upper() not in (short_form(keyword), keyword.upper()):
        return None
    return int(head[2]) if head[2] else 1


def compound(*units: str) -> str:
    """Join program message units so that each starts from the root of the tree.

    After ``;`` the path stays where it was unless ``:`` leads; a common command takes no ``:`` and moves no
    path (SCPI-1999 Volume 1, 6.2.4; IEEE 488.2, 7.6.1; from memory).

    Examples
    --------
    >>> compound("*RST", "INIT:CONT OFF", ":SENS:FREQ:STAR 1 MHZ", "*CLS")
    '*RST;:INIT:CONT OFF;:SENS:FREQ:STAR 1 MHZ;*CLS'
    """
    first, *others = units
    joined = [first.removeprefix(":")]
    joined += [unit if unit.startswith(("*", ":")) else f":{unit}" for unit in others]
    return ";".join(joined)
