"""The world: what is plugged into what, how late it is, how warm it is.

One object, handed in wherever it is needed; two worlds know nothing of each other. Time never sleeps: it
advances when hands work, sweeps run and somebody waits.
"""

from __future__ import annotations

import itertools
import threading
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from sim_instruments.chains import between, joint_matrix
from sim_instruments.draws import Draws
from sim_instruments.hands import TURNED, Hands, Joint, Link
from sim_instruments.parts import Part, Surroundings
from sim_instruments.waves import Matrix, Real, flip

__all__ = ["Link", "NoSuchItem", "World", "in_words"]

_CONNECT_S = 25.0
"""Seconds that a practised hand needs to clean, align and tighten one connection."""
_REFLECTION = 4e-4
"""Reflection of one joint made with a torque wrench at 1 GHz, standard deviation, linear (common practice:
0.0005 to 0.003 for the connectors meant here)."""
_BY_HAND = 3.0
"""How much worse a joint is that was tightened by feel."""
_LIFE = 500.0
"""Matings after which a connector's repeatability has doubled (common practice: some hundreds)."""


class NoSuchItem(KeyError):
    """The bench has nothing of that name, or it cannot be connected so."""

    def __str__(self) -> str:
        return str(self.args[0])


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
    time_s
        Since the world was made.
    drift_k_h
        Kelvin that the room warms in an hour.
    torque_wrench
        Whether hands use one.
    humidity
        Relative, 0 to 1; above 0.6 films of water make joints less repeatable.
    supply_v
        What feeds active parts; none given: their rated voltage.
    """

    seed: int
    items: Mapping[str, Part] = field(default_factory=dict)
    units: Callable[[str], Part] | None = None
    temperature_c: float = 23.0
    time_s: float = 0.0
    drift_k_h: float = 0.0
    torque_wrench: bool = True
    humidity: float = 0.45
    supply_v: float | None = None

    def __post_init__(self) -> None:
        self.lock = threading.RLock()
        self.draws = Draws(self.seed)
        self.hands = Hands()
        self.links: tuple[Link, ...] = ()
        self.serial = ""
        self.bend = 0.0
        self.matings: dict[str, int] = {}
        self._heating = self.draws.uniform("heating", 0.0, 2.0 * np.pi)
        self._unit: Part | None = None
        self._count = self._readings = 0
        self._joints: dict[Link, list[Joint]] = {}
        self._later: tuple[float, tuple[Link, ...], bool] | None = None
        self._steps: list[tuple[float, float]] = []

    # -- time and room -----------------------------------------------------------------------------------

    def advance(self, seconds: float) -> None:
        """Let time pass."""
        with self.lock:
            self.time_s += max(float(seconds), 0.0)

    def temperature(self) -> float:
        """Room temperature now, in degrees Celsius: a slow swing of the heating, 0.3 K either way."""
        swing = 0.3 * float(np.sin(2.0 * np.pi * self.time_s / 2400.0 + self._heating))
        stepped = sum(k * (1 - np.exp(-max(self.time_s - at, 0.0) / 120.0)) for at, k in self._steps)
        return self.temperature_c + swing + self.drift_k_h * self.time_s / 3600.0 + float(stepped)

    def step_temperature(self, kelvin: float) -> None:
        """Somebody opens a door: within minutes the room is warmer or colder."""
        self._steps.append((self.time_s, kelvin))

    def move_cables(self) -> None:
        """Somebody leans on the test cables."""
        self._count += 1
        draw = (self.draws / "bend" / self._count).uniform("by", 0.7, 1.3)
        self.bend += draw if (self.draws / "bend" / self._count).uniform("way", 0.0, 1.0) > 0.5 else -draw

    def surroundings(self) -> Surroundings:
        """What parts feel."""
        return Surroundings(self.temperature(), self.bend, self.supply_v)

    # -- hands -------------------------------------------------------------------------------------------

    def offer(self, serial: str) -> None:
        """Put a unit on the bench.

        Raises
        ------
        NoSuchItem
            If the bench has no such unit.
        """
        if self.units is None:
            raise NoSuchItem("this bench has no units")
        with self.lock:
            self._unit, self.serial = self.units(serial), serial
            self.matings.pop("unit", None)
            # The unit before it was taken out, so what held it is open.
            self._joints = {link: joints for link, joints in self._joints.items() if not _holds_unit(link)}

    def connect(self, links: Sequence[tuple[Sequence[str], Sequence[int]]]) -> None:
        """Hands: take off what is on these ports and make these connections.

        Parameters
        ----------
        links
            Items in order, and one or two port numbers, for each connection.

        Raises
        ------
        NoSuchItem
            If the bench has no such item, no unit was offered, or the ports do not take it.
        """
        asked = tuple(Link(tuple(items), tuple(ports)) for items, ports in links)
        with self.lock:
            self._check(asked)
            made, slip = self.hands.make(asked)
            self._settle()
            self._later = None
            if slip is not None and slip.late_s:
                self._later = self.time_s + slip.late_s, made, False
            else:
                self._make(made, slip is not None and slip.loose)
            if slip is not None and slip.then is not None:
                slip.then()

    def _check(self, asked: tuple[Link, ...]) -> None:
        taken: set[int] = set()
        for link in asked:
            for port in link.ports:
                if port not in self.ports:
                    raise NoSuchItem(
                        f"nothing can be connected to port {port}; there are ports {in_words(self.ports)}"
                    )
                if port in taken:
                    raise NoSuchItem(f"port {port} cannot take two connections at once")
                taken.add(port)
            between_two = link.items if len(link.ports) == 2 else link.items[:-1]
            for item in link.items:
                if self.part(item).ports == 1 and item in between_two:
                    raise NoSuchItem(f"{item!r} has one port and cannot stand between two others")

    @property
    def ports(self) -> tuple[int, ...]:
        """Where something can be connected."""
        return 1, 2

    def standing(self) -> list[tuple[Link, bool]]:
        """What is connected now, and whether a switch has done it."""
        with self.lock:
            self._settle()
            return [(link, False) for link in self.links]

    def _settle(self) -> None:
        """Let a connection that was promised come about when its time has come."""
        if self._later is not None and self.time_s >= self._later[0]:
            (_, links, loose), self._later = self._later, None
            self._make(links, loose)

    def _make(self, wanted: tuple[Link, ...], loose: bool) -> None:
        standing = {
            link: self._joints[link] for link in self.links if link in wanted and link in self._joints
        }
        self.links = wanted
        self._joints = {link: standing.get(link) or self._mate(link, loose) for link in wanted}

    def _mate(self, link: Link, loose: bool) -> list[Joint]:
        """Make the connections of a link: each has a draw of its own, wears, and takes its time."""
        joints: list[Joint] = []
        names = [f"port {link.ports[0]}", *link.items, *(f"port {p}" for p in link.ports[1:])]
        for pair in itertools.pairwise(names):
            self._count += 1
            self.time_s += _CONNECT_S
            for name in pair:
                self.matings[name] = self.matings.get(name, 0) + 1
            wear = 1 + max(self.matings[name] for name in pair) / _LIFE
            damp = 1 + 5 * max(self.humidity - 0.6, 0.0)
            sigma = _REFLECTION * wear * damp * (1.0 if self.torque_wrench else _BY_HAND)
            draw = self.draws / "mating" / self._count
            joint = Joint(draw.normal("size", sigma), draw.phase("angle"))
            joints.append(self.hands.loosened(joint, draw) if loose and not joints else joint)
        return joints

    # -- what is there -----------------------------------------------------------------------------------

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
        if name.endswith(TURNED):
            inner = self.part(name.removesuffix(TURNED))
            return Part(inner.ports, lambda f_hz, around: flip(inner.response(f_hz, around)), kind=inner.kind)
        try:
            return self.items[name]
        except KeyError:
            raise NoSuchItem(
                f"the bench has no {name!r}; there are {', '.join(sorted(self.items))}"
            ) from None

    @property
    def connection(self) -> str:
        """What is connected, in words."""
        with self.lock:
            self._settle()
            return " and ".join(sorted(link.text for link in self.links)) or "nothing"

    @property
    def has_active(self) -> bool:
        """Whether something is connected that heeds the level."""
        return any(self.part(item).gain_factor is not None for link in self.links for item in link.items)

    def between_ports(self, f_hz: Real, power_dbm: float | Real | None = None, driven: int = 1) -> Matrix:
        """True S-parameters between the reference planes of ports 1 and 2, joints included, ``(f, 2, 2)``.

        Parameters
        ----------
        f_hz
            ``(f,)``.
        power_dbm
            Level of the wave that meets the connection, one or ``(f,)``; none given: too low to matter.
        driven
            The port it comes from.
        """
        with self.lock:
            self._settle()
            around = self.surroundings()
            rows: list[tuple[tuple[int, ...], list[Part], list[Matrix]]] = []
            for link in self.links:
                made = [joint_matrix(f_hz, self._now(j)) for j in self._joints.get(link, ())]
                rows.append((link.ports, [self.part(item) for item in link.items], made))
            return between(f_hz, rows, around, power_dbm, driven)

    def _now(self, joint: Joint) -> Joint:
        """A loose contact is another one at every reading."""
        if not joint.contact_ohm:
            return joint
        self._readings += 1
        wander = (self.draws / "contact" / self._readings).uniform("wander", 0.3, 1.7)
        return replace(joint, contact_ohm=joint.contact_ohm * wander)

    def truth(self, f_hz: Real) -> Matrix:
        """True S-parameters of the unit itself, ``(f, n, n)``: for tests and studies, not for a sequence."""
        return self.part("unit").matrix(f_hz, self.surroundings())


def in_words(ports: Sequence[int]) -> str:
    """Numbers of ports in a sentence.

    Examples
    --------
    >>> in_words((1, 2, 3))
    '1, 2 and 3'
    """
    *some, last = map(str, ports)
    return f"{', '.join(some)} and {last}" if some else last


def _holds_unit(link: Link) -> bool:
    return "unit" in link.items or f"unit{TURNED}" in link.items
