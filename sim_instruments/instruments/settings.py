"""Settings as every instrument beside the analyzer has them: numbers, counts, keywords, switches, formats."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np

from sim_instruments.scpi.element import kind_of
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.parameters import boolean, choice, number, short, whole
from sim_instruments.scpi.tree import Command
from sim_instruments.values import number as value_of
from sim_instruments.waves import Real

__all__ = ["Format", "Settings", "allowed", "chosen", "limit"]

Parameters = tuple[str, ...]


def allowed(what: str, spec: Mapping[str, Any], *keys: str) -> None:
    """Refuse keys that mean nothing.

    Raises
    ------
    ValueError
        With the key and the known ones.
    """
    for key in spec:
        if key not in keys:
            raise ValueError(f"{what} has no {key!r}; known are {', '.join(keys)}")


def chosen(what: str, spec: Mapping[str, Any], key: str, *words: str) -> str:
    """One of several words; the first where nothing is said.

    Raises
    ------
    ValueError
        For another word.
    """
    if (word := str(spec.get(key, words[0]))) not in words:
        raise ValueError(f"{what}, {key}: {word!r}; allowed are {', '.join(words)}")
    return word


def limit(spec: Mapping[str, Any], key: str, low: float, high: float) -> tuple[float, float]:
    """A range under ``limits``, or the one given here.

    Raises
    ------
    ValueError
        If its ends are in the wrong order.
    """
    given = spec.get("limits", {}).get(key)
    if given is None:
        return low, high
    low, high = (value_of(end) for end in given)
    if not low < high:
        raise ValueError(f"limits of {key}: {given} is no range; write the lower end first")
    return low, high


class Settings:
    """Commands for the attributes of an instrument.

    Parameters
    ----------
    owner
        Whose attributes these are.
    may_change
        Called before a change; raises where none is taken.
    changed
        Called after it.
    nearest
        A number beyond its limits moves to the limit after -222, instead of leaving the setting.
    scientific
        Numbers are answered as NR3 (``+1.69000000000E+08``), otherwise as plainly as they go.
    """

    def __init__(
        self,
        owner: Instrument,
        may_change: Callable[[], None] = lambda: None,
        changed: Callable[[], None] = lambda: None,
        nearest: bool = False,
        scientific: bool = False,
    ) -> None:
        self.owner, self.nearest, self.scientific = owner, nearest, scientific
        self.may_change, self.changed = may_change, changed

    def words(self, value: float) -> str:
        """A number as this instrument answers it."""
        return f"{value:+.11E}" if self.scientific else f"{value:.15G}"

    def number(
        self,
        name: str,
        ends: tuple[float, float],
        suffixes: dict[str, float] | None = None,
        write: Callable[[float], None] | None = None,
        read: Callable[[], float] | None = None,
    ) -> Command:
        """A number within its limits; what it is now is its DEFault.

        Parameters
        ----------
        name
            Of the attribute.
        ends
            Least and greatest.
        suffixes
            Units and what they multiply by.
        write, read
            Instead of plainly setting and giving the attribute.
        """
        low, high = ends

        def now() -> float:
            return read() if read else float(getattr(self.owner, name))

        default = now()

        def put(parameters: Parameters) -> None:
            self.may_change()
            try:
                value = number(parameters[0], low, high, suffixes, default)
            except ScpiError as error:
                if error.number != -222 or not self.nearest:
                    raise
                self.owner.status.report(error)
                value = min(max(number(parameters[0], -math.inf, math.inf, suffixes), low), high)
            if write:
                write(value)
            else:
                setattr(self.owner, name, value)
            self.changed()

        def get(parameters: Parameters) -> str:
            if parameters and kind_of(parameters[0]) != "word":
                raise ScpiError(-108, parameters[0][:40])
            return self.words(number(parameters[0], low, high, None, default) if parameters else now())

        return Command(put, get, 1, 1, asks_most=1)

    def count(self, name: str, low: int, high: int) -> Command:
        """A whole number."""
        default = int(getattr(self.owner, name))

        def put(parameters: Parameters) -> None:
            self.may_change()
            setattr(self.owner, name, whole(parameters[0], low, high, default))
            self.changed()

        def get(parameters: Parameters) -> str:
            if parameters and kind_of(parameters[0]) != "word":
                raise ScpiError(-108, parameters[0][:40])
            return str(whole(parameters[0], low, high, default) if parameters else getattr(self.owner, name))

        return Command(put, get, 1, 1, asks_most=1)

    def word(self, name: str, *keywords: str) -> Command:
        """One of several keywords, answered in its short form."""

        def put(parameters: Parameters) -> None:
            self.may_change()
            setattr(self.owner, name, choice(parameters[0], *keywords))
            self.changed()

        return Command(put, lambda _: short(getattr(self.owner, name)), 1, 1)

    def switch(self, name: str, write: Callable[[bool], None] | None = None) -> Command:
        """ON or OFF, answered as 1 or 0."""

        def put(parameters: Parameters) -> None:
            on = boolean(parameters[0])
            self.may_change()
            if write:
                write(on)
            else:
                setattr(self.owner, name, on)
            self.changed()

        return Command(put, lambda _: str(int(getattr(self.owner, name))), 1, 1)


class Format:
    """How numbers in bulk go out: FORMat[:DATA] and FORMat:BORDer."""

    def __init__(self) -> None:
        self.reset()

    def reset(self) -> None:
        """ASCii, NORMal (SCPI-1999 Vol. 2, from memory)."""
        self.size, self.digits, self.border = 0, 0, "NORMal"

    def add_commands(self, instrument: Instrument) -> None:
        """Teach them to an instrument."""
        instrument.tree.add("FORMat[:DATA]", Command(self._put, lambda _: self._words(), 1, 2))
        instrument.tree.add("FORMat:BORDer", Command(self._put_border, lambda _: short(self.border), 1, 1))

    def _put(self, parameters: Parameters) -> None:
        kind, length = choice(parameters[0], "ASCii", "REAL"), parameters[1:]
        if kind == "ASCii":
            self.size, self.digits = 0, whole(length[0], 0, 17) if length else 0
            return
        size = whole(length[0], 0, 1 << 15) if length else 64
        if size not in (32, 64):
            raise ScpiError(-224, length[0][:40])
        self.size = size

    def _put_border(self, parameters: Parameters) -> None:
        self.border = choice(parameters[0], "NORMal", "SWAPped")

    def _words(self) -> str:
        return f"REAL,{self.size}" if self.size else f"ASC,{self.digits}"

    def encode(self, values: Real) -> bytes | str:
        """Values, ``(n,)``, as set."""
        if not self.size:
            return ",".join(f"{v:+.{(self.digits or 10) - 1}E}" for v in values.tolist())
        order = "<" if self.border == "SWAPped" else ">"
        data = np.asarray(values).astype(f"{order}f{self.size // 8}").tobytes()
        length = str(len(data))
        return f"#{len(length)}{length}".encode() + data
