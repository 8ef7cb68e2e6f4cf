"""Switching a source off, as far as its line allows."""

from __future__ import annotations

from collections.abc import Callable

from benchrun.errors import BenchError
from benchrun.scpi.session import Session

__all__ = ["switched_off"]


def switched_off(session: Session, off: Callable[[], None], what: str) -> str:
    """Switch off; where that fails, clear the line once and say it again.

    A half-read answer may stand in the way of the first attempt.

    Parameters
    ----------
    session
        The line.
    off
        Switches off, or raises.
    what
        What is switched off, for the sentence.

    Returns
    -------
    str
        Empty when it is off; otherwise what may still be on, and what to do by hand.
    """
    try:
        off()
    except BenchError:
        try:
            session.clear()
            off()
        except BenchError as error:
            return f"{what} {session.name} may still be on ({error}): switch it off by hand"
    return ""
