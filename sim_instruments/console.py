"""Hands by words: what somebody types to plug things together on a simulated bench."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from typing import TextIO

from sim_instruments.bench import SimulatedBench
from sim_instruments.look import draw
from sim_instruments.world import NoSuchItem, in_words

__all__ = ["HELP", "Console", "NotUnderstood", "read_links"]

HELP = """\
connect ITEM[, ITEM...] to port N                   hang a row of items on a port
connect ITEM[, ITEM...] from port N to port N       put a row of items between the ports
                                                    (several of these with "and" between them)
disconnect [port N]                                 take off what hangs there, or everything
unit SERIAL                                         lay a unit on the bench; connect it as "unit"
wait SECONDS                                        let time pass
time, look, help, stop"""

_ROW = re.compile(
    r"(?P<items>.+?)\s+(?:(?:to|on) port (?P<one>\d+)|from port (?P<near>\d+) to port (?P<far>\d+))"
)


class NotUnderstood(ValueError):
    """The words make no sense; the message says what would."""


def read_links(words: str, known: Sequence[int] = (1, 2)) -> list[tuple[list[str], list[int]]]:
    """Connections in words, as :meth:`sim_instruments.world.World.connect` takes them.

    Parameters
    ----------
    words
        What goes where.
    known
        Ports of the bench.

    Raises
    ------
    NotUnderstood

    Examples
    --------
    >>> read_links("jig-left, unit, jig-right from port 1 to port 2")
    [(['jig-left', 'unit', 'jig-right'], [1, 2])]
    >>> read_links("short to port 1 and open to port 2")
    [(['short'], [1]), (['open'], [2])]
    """
    links = []
    for text in re.split(r"\s+and\s+", words.strip()):
        match = _ROW.fullmatch(text)
        if match is None:
            raise NotUnderstood(
                f"{text!r} does not say what goes where; "
                'write "short to port 1", or "jig-left, unit, jig-right from port 1 to port 2"'
            )
        items = [item.strip() for item in match["items"].split(",")]
        if not all(items):
            raise NotUnderstood(f"{match['items']!r} has a comma without an item")
        ports = [int(match["one"])] if match["one"] else [int(match["near"]), int(match["far"])]
        links.append((items, ports))
    used = [port for _, ports in links for port in ports]
    for port in used:
        if port not in known:
            raise NotUnderstood(f"there is no port {port}; the bench has ports {in_words(known)}")
        if used.count(port) > 1:
            raise NotUnderstood(f"port {port} is named twice; a port takes one connection")
    return links


class Console:
    """Carries out what is typed.

    Parameters
    ----------
    bench
        Whose hands these are.
    out
        Where answers go.
    """

    def __init__(self, bench: SimulatedBench, out: TextIO) -> None:
        self.bench = bench
        self.out = out
        self._commands: dict[str, Callable[[str], str]] = {
            "connect": self._connect,
            "disconnect": self._disconnect,
            "unit": self._unit,
            "wait": self._wait,
            "time": lambda _: self._time(),
            "look": lambda _: self._look(),
            "help": lambda _: HELP,
        }

    def run(self, commands: TextIO, prompt: str = "") -> None:
        """Carry out line after line, until ``stop`` or the end."""
        while True:
            self._say(prompt, end="")
            line = commands.readline()
            if not line or line.strip().lower() == "stop":
                return
            self.carry_out(line)

    def carry_out(self, line: str) -> bool:
        """Carry out one line; gives whether it made sense."""
        word, _, rest = line.strip().partition(" ")
        if not word:
            return True
        command = self._commands.get(word.lower())
        if command is None:
            self._say(f"{word[:40]!r} is no command; there are {', '.join(self._commands)}, stop")
            return False
        try:
            with self.bench.world.lock:
                answer = command(rest.strip())
        except (NotUnderstood, NoSuchItem, ValueError) as error:
            self._say(f"not done: {error}")
            return False
        self._say(answer)
        return True

    def _connect(self, words: str) -> str:
        world = self.bench.world
        new = read_links(words, world.ports)
        taken = {port for _, ports in new for port in ports}
        world.connect([*self._others(taken), *new])
        return self._connected()

    def _disconnect(self, words: str) -> str:
        known = self.bench.world.ports
        match = re.fullmatch(r"(?:port )?(\d{1,4})", words, re.ASCII)
        if words and (match is None or int(match[1]) not in known):
            raise NotUnderstood(
                f'{words!r} is no port of this bench; write "disconnect", or "disconnect port N" '
                f"with N one of {in_words(known)}"
            )
        self.bench.world.connect(self._others({int(match[1])} if match else set(known)))
        return self._connected()

    def _others(self, taken: set[int]) -> list[tuple[list[str], list[int]]]:
        """What hangs on other ports, and stays there."""
        links = self.bench.world.links
        return [([*link.items], [*link.ports]) for link in links if not taken & {*link.ports}]

    def _unit(self, serial: str) -> str:
        if not serial:
            raise NotUnderstood(f"which one? This bench knows {', '.join(self.bench.serials) or 'none'}")
        self.bench.world.offer(serial)
        return f"unit {serial} lies on the bench"

    def _wait(self, words: str) -> str:
        match = re.fullmatch(r"(\d+(?:\.\d*)?)\s*(?:s|seconds?)?", words)
        if match is None:
            raise NotUnderstood(f'{words!r} is no time; write "wait 60"')
        self.bench.world.advance(float(match[1]))
        return self._time()

    def _time(self) -> str:
        world = self.bench.world
        minutes, seconds = divmod(world.time_s, 60.0)
        clock = f"{int(minutes)} min {seconds:.1f} s on the bench's clock"
        return f"{clock}, {world.temperature():.2f} degrees Celsius"

    def _look(self) -> str:
        return draw(self.bench)

    def _connected(self) -> str:
        return f"connected: {self.bench.world.connection}; {self._time()}"

    def _say(self, text: str, end: str = "\n") -> None:
        self.out.write(text + end)
        self.out.flush()
