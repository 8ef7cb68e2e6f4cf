"""The tree of commands that an instrument knows."""

from __future__ import annotations

import functools
import re
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TypeAlias

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.parameters import short

__all__ = ["Command", "Tree"]

Setter: TypeAlias = Callable[[tuple[str, ...]], None]
Getter: TypeAlias = Callable[[tuple[str, ...]], "str | bytes"]

_WRITTEN = re.compile(r"([A-Za-z_]+?)(\d*)", re.ASCII)
_DECLARED = re.compile(r"(\[?):?([A-Za-z_]+)(?:<(\d+)>)?\]?")


@functools.cache
def _declared(header: str) -> tuple[tuple[str, int, bool], ...]:
    """Words of a header with their greatest suffix, and whether they may be left out."""
    return tuple(
        (word, int(suffix or 1), bool(bracket)) for bracket, word, suffix in _DECLARED.findall(header)
    )


@dataclass(frozen=True)
class Command:
    """What a header does.

    Parameters
    ----------
    set
        Takes the parameters; None if it is only a query.
    get
        Takes the parameters and answers; None if there is no query.
    least, most
        How many parameters the setting takes.
    asks_least, asks_most
        How many the query takes.
    set_waits, get_waits
        Only carried out when no operation is pending.
    measures
        The query wants readings, and waits for them.
    last
        Its answer is of arbitrary form, so that no other query may follow it in a message.
    """

    set: Setter | None = None
    get: Getter | None = None
    least: int = 0
    most: int = 0
    asks_least: int = 0
    asks_most: int = 0
    set_waits: bool = False
    get_waits: bool = False
    measures: bool = False
    last: bool = False


@dataclass
class _Node:
    long: str = ""
    suffixes: int = 1
    optional: bool = False
    command: Command | None = None
    children: list[_Node] = field(default_factory=list)

    def fits(self, written: str) -> bool:
        match = _WRITTEN.fullmatch(written)
        if match is None or match[1].upper() not in (self.long.upper(), short(self.long)):
            return False
        if match[2] and (len(match[2]) > 9 or not 1 <= int(match[2]) <= self.suffixes):
            raise ScpiError(-114, written[:40])
        return True


class Tree:
    """Commands by their SCPI header, optional nodes in brackets.

    Examples
    --------
    >>> tree = Tree()
    >>> tree.add("[SENSe]:FREQuency:STARt", Command(get=lambda p: "1"))
    >>> tree.find(("FREQ", "star"), ()).get(())
    '1'
    """

    def __init__(self) -> None:
        self._root = _Node()
        self._known: dict[tuple[str, ...], Command] = {}
        self.headers: dict[str, None] = {}

    def add(self, header: str, command: Command) -> None:
        """Add one command, or put another in its place."""
        node = self._root
        for word, suffixes, optional in _declared(header):
            for found in node.children:
                if found.long == word:
                    break
            else:
                found = _Node(word, suffixes, optional)
                node.children.append(found)
            node = found
        node.command = command
        self.headers[header] = None
        self._known.clear()

    def find(self, header: tuple[str, ...], path: tuple[str, ...]) -> Command:
        """The command of a header, seen from the current path.

        Raises
        ------
        ScpiError
            -113 or -114.
        """
        whole = (*path, *header)
        if whole not in self._known:
            command = self._walk(self._root, whole)
            if command is None:
                raise ScpiError(-113, ":".join(whole)[:60])
            if len(self._known) > 1000:  # every spelling counts, and a client may invent them
                self._known.clear()
            self._known[whole] = command
        return self._known[whole]

    def _walk(self, node: _Node, words: tuple[str, ...]) -> Command | None:
        if not words:
            if node.command is not None:
                return node.command
            return next((found for c in node.children if c.optional and (found := self._walk(c, ()))), None)
        for child in node.children:
            if child.fits(words[0]) and (found := self._walk(child, words[1:])):
                return found
        for child in node.children:
            if child.optional and (found := self._walk(child, words)):
                return found
        return None
