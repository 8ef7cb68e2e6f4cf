"""The world: what is plugged into what, how late it is, how warm it is.

One object, handed in wherever it is needed; two worlds know nothing of each other. Time never sleeps: it
advances when hands work, sweeps run and somebody waits.
"""

from __future__ import annotations

import threading
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts import Part, Surroundings
from sim_instruments.waves import Matrix, Plane, Real, both, chain, seen_through, thru, two

__all__ = ["Link", "NoSuchItem", "World"]

_CONNECT_S = 25.0
"""Seconds that a practised hand needs to clean, align and tighten one connection."""
_REFLECTION = 4e-4
"""Reflection of one well made joint at 1 GHz, standard deviation, linear (common practice: 0.0005 to 0.003
for the connectors meant here, tighter with a torque wrench)."""


class NoSuchItem(KeyError):
    """The bench has nothing of that name."""

    def __str__(self) -> str:
        return str(self.args[0])


@dataclass(frozen=True)
class Link:
    """Items in a row, from one port to another or hanging on one port."""

    items: tuple[str, ...]
    ports: tuple[int, ...]

    @property
    def text(self) -> str:
        """In words."""
        row = ", ".join(self.items)
        if len(self.ports) == 1:
            return f"{row} on port {self.ports[0]}"
        return f"{row} from port {self.ports[0]} to port {self.ports[1]}"


@dataclass
class World:
    """A bench in its room.

    Parameters
    ----------
    seed
        Decides every draw.
    items
        What lies on the bench, by name.
    units
        Gives the unit of a serial number; raises :class:`NoSuchItem`.
    temperature_c
        Mean room temperature.
    """

    seed: int
    items: Mapping[str, Part] = field(default_factory=dict)
    units: Callable[[str], Part] | None = None
    temperature_c: float = 23.0
    time_s: float = 0.0

    def __post_init__(self) -> None:
        self.lock = threading.RLock()
        self.draws = Draws(self.seed)
        self.links: tuple[Link, ...] = ()
        self.serial = ""
        self._unit: Part | None = None
        self._matings = 0
        self._joints: dict[Link, list[tuple[float, complex]]] = {}

    def advance(self, seconds: float) -> None:
        """Let time pass."""
        with self.lock:
            self.time_s += max(float(seconds), 0.0)

    def temperature(self) -> float:
        """Room temperature now, in degrees Celsius: a slow swing of the heating, 0.3 K either way."""
        phase = self.draws.uniform("heating", 0.0, 2.0 * np.pi)
        return self.temperature_c + 0.3 * float(np.sin(2.0 * np.pi * self.time_s / 2400.0 + phase))

    def offer(self, serial: str) -> None:
        """Put a unit on the bench.

        Raises
        ------
        NoSuchItem
            If the bench has no such unit.
        """
        if self.units is None:
            raise NoSuchItem("this bench has no units")
        self._unit, self.serial = self.units(serial), serial
        with self.lock:  # the unit before it was taken out, so what held it is open
            self._joints = {link: joints for link, joints in self._joints.items() if "unit" not in link.items}

    def connect(self, links: Sequence[tuple[Sequence[str], Sequence[int]]]) -> None:
        """Hands: take off what is on these ports and make these connections.

        Parameters
        ----------
        links
            Items in order, and one or two port numbers, for each connection.

        Raises
        ------
        NoSuchItem
            If the bench has no such item, or no unit was offered.
        """
        wanted = tuple(Link(tuple(items), tuple(ports)) for items, ports in links)
        for link in wanted:
            for item in link.items:
                self.part(item)
        with self.lock:
            standing = {
                link: self._joints[link] for link in self.links if link in wanted and link in self._joints
            }
            self.links = wanted
            self._joints = {link: standing.get(link) or self._mate(link) for link in wanted}

    def _mate(self, link: Link) -> list[tuple[float, complex]]:
        """Make the connections of a link: each has a draw of its own, and takes its time."""
        joints = []
        for _ in range(len(link.items) + len(link.ports) - 1):
            self._matings += 1
            self.time_s += _CONNECT_S
            draw = self.draws / "mating" / self._matings
            joints.append((draw.normal("size", _REFLECTION), draw.phase("angle")))
        return joints

    def part(self, name: str) -> Part:
        """What a name means now.

        Raises
        ------
        NoSuchItem
            With the names there are.
        """
        if name == "unit":
            if self._unit is None:
                raise NoSuchItem("no unit lies on the bench")
            return self._unit
        try:
            return self.items[name]
        except KeyError:
            raise NoSuchItem(
                f"the bench has no {name!r}; there are {', '.join(sorted(self.items))}"
            ) from None

    @property
    def connection(self) -> str:
        """What is connected, in words."""
        return " and ".join(sorted(link.text for link in self.links)) or "nothing"

    def surroundings(self) -> Surroundings:
        """What parts feel."""
        return Surroundings(self.temperature())

    def between_ports(self, f_hz: Real) -> Matrix:
        """True S-parameters between the reference planes of ports 1 and 2, joints included, ``(f, 2, 2)``."""
        with self.lock:
            around = self.surroundings()
            ends = [_open_end(f_hz), _open_end(f_hz)]
            for link in self.links:
                if len(link.ports) == 2:
                    row = [self._joint(f_hz, link, 0)]
                    for position, item in enumerate(link.items):
                        row += [self.part(item).matrix(f_hz, around), self._joint(f_hz, link, position + 1)]
                    whole = chain(*row)
                    return whole if link.ports == (1, 2) else whole[:, ::-1, ::-1]
                ends[link.ports[0] - 1] = self._hanging(f_hz, link, around)
            return both(*ends)

    def _hanging(self, f_hz: Real, link: Link, around: Surroundings) -> Plane:
        *before, last = link.items
        end = self.part(last)
        gamma = (
            end.matrix(f_hz, around)[:, 0, 0]
            if end.ports == 1
            else seen_through(end.matrix(f_hz, around), _open_end(f_hz))
        )
        for position in reversed(range(len(before))):
            through = self._joint(f_hz, link, position + 1)
            gamma = seen_through(chain(self.part(before[position]).matrix(f_hz, around), through), gamma)
        return seen_through(self._joint(f_hz, link, 0), gamma)

    def _joint(self, f_hz: Real, link: Link, joint: int) -> Matrix:
        """A small lossless step: unitary, growing with frequency."""
        if link not in self._joints:
            return thru(len(f_hz))
        size, angle = self._joints[link][joint]
        r = size * f_hz / 1e9
        through = np.sqrt(1 - r**2) + 0j
        step = np.asarray(1j * r * angle, np.complex128)
        return two(step, through, through, -np.conj(step))

    def truth(self, f_hz: Real) -> Matrix:
        """True S-parameters of the unit itself, ``(f, n, n)``: for tests and studies, not for a sequence."""
        return self.part("unit").matrix(f_hz, self.surroundings())


def _open_end(f_hz: Real) -> Plane:
    """An open connector: fringing capacitance and a little radiation (common practice)."""
    y = 1j * 2 * np.pi * f_hz * 45e-15 * 50.0 + 1e-4 * (f_hz / 1e9) ** 2
    return np.asarray((1 - y) / (1 + y))
