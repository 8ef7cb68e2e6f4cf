"""A world with more than an analyzer's two ports: outlets of other instruments, and routes of switches.

An instrument owns outlets by number. What stands between two of them is found here for any pair; who looks
into an outlet (a spectrum analyzer, a power meter) gets the signal that arrives there from whatever source
is at the other end.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import replace
from typing import Protocol

import numpy as np

from sim_instruments.chains import between, joint_matrix
from sim_instruments.hands import Joint, Link
from sim_instruments.instruments.outlets import Outlet, Source, together
from sim_instruments.instruments.signals import KT0_MW_HZ, Gamma, Row, Signal, through
from sim_instruments.parts import Part, Surroundings
from sim_instruments.waves import Matrix, Real, flip, thru
from sim_instruments.world import World

__all__ = ["Routes", "WiredWorld"]


class Routes(Protocol):
    """What connects without hands; see :class:`sim_instruments.instruments.switch.Switch`."""

    def closed(self) -> Iterable[tuple[Link, list[Part]]]:
        """Links that stand, each with its parts, the switch's own among them."""
        ...

    def opened(self) -> Iterable[tuple[Link, list[Part]]]:
        """Links between two ports that stand open, each with its parts."""
        ...

    def leak(self, f_hz: Real) -> Real:
        """How much of a wave gets through the contacts of an open one, ``(f,)`` linear."""
        ...


def _quiet(f_hz: Real) -> Real:
    return np.full(len(f_hz), KT0_MW_HZ)


class WiredWorld(World):
    """A world whose outlets are not only ports 1 and 2."""

    def __post_init__(self) -> None:
        super().__post_init__()
        self.outlets: dict[int, Outlet] = {1: Outlet(), 2: Outlet()}
        self.switches: list[Routes] = []
        self.supply: Callable[[], float] | None = None
        """Volts that the active parts are fed with now; None: their rated voltage."""

    def own(self, port: int, gamma: Gamma, source: Source | None = None, owner: str = "") -> None:
        """Give an instrument an outlet; further sources on the same one go through a combiner.

        Parameters
        ----------
        port
            Its number.
        gamma
            What it reflects.
        source
            What sends out of it.
        owner
            The instrument, in words.

        Raises
        ------
        ValueError
            If the port belongs to another instrument.
        """
        outlet = self.outlets.get(port)
        if outlet is None:
            self.outlets[port] = Outlet(gamma, [source] if source else [], [owner])
        elif source is not None and outlet.sources:
            outlet.sources.append(source)
            outlet.owners.append(owner)
        else:
            raise ValueError(f"port {port} belongs to another instrument already")

    def surroundings(self) -> Surroundings:
        """What parts feel; active ones take what their supply gives."""
        if self.supply is not None:
            self.supply_v = self.supply()
        return super().surroundings()

    # -- what is connected -------------------------------------------------------------------------------

    @property
    def ports(self) -> tuple[int, ...]:
        """Where something can be connected."""
        return tuple(sorted(self.outlets))

    def standing(self) -> list[tuple[Link, bool]]:
        """What is connected now, and whether a switch has done it."""
        with self.lock:
            return [(link, link not in self.links) for link, _, _ in self._rows()]

    @property
    def connection(self) -> str:
        """What is connected, in words, by hand and by switches."""
        with self.lock:
            rows = [link.text for link, _, _ in self._rows()]
        return " and ".join(sorted(rows)) or "nothing"

    @property
    def has_active(self) -> bool:
        """Whether something is connected that heeds the level."""
        with self.lock:
            return any(part.gain_factor is not None for part in self.connected_parts())

    def connected_parts(self) -> list[Part]:
        """Everything that stands between outlets or hangs on one."""
        return [part for _, parts, _ in self._rows() for part in parts]

    def _rows(self) -> list[tuple[Link, list[Part], list[Joint]]]:
        """Links by hand, then those of switches whose cables no hand has taken off."""
        self._settle()
        rows = [
            (link, [self.part(item) for item in link.items], self._joints.get(link, []))
            for link in self.links
        ]
        for switch in self.switches:
            rows += [(link, parts, []) for link, parts in switch.closed() if self._is_cabled(link)]
        return rows

    def _is_cabled(self, link: Link) -> bool:
        """Whether no hand has taken a switch's cables off the ports of this link."""
        return not {port for other in self.links for port in other.ports} & set(link.ports)

    def _leaks(self) -> Iterator[tuple[Routes, Link, list[Part]]]:
        """Links that stand open but let a little through."""
        for switch in self.switches:
            for link, parts in switch.opened():
                if self._is_cabled(link):
                    yield switch, link, parts

    # -- what that does ----------------------------------------------------------------------------------

    def between_ports(
        self,
        f_hz: Real,
        power_dbm: float | Real | None = None,
        driven: int = 1,
        ports: tuple[int, int] = (1, 2),
    ) -> Matrix:
        """True S-parameters between any two reference planes, joints and switches included, ``(f, 2, 2)``.

        Parameters
        ----------
        f_hz
            ``(f,)``.
        power_dbm
            Level of the wave that meets the connection, one or ``(f,)``; none given: too low to matter.
        driven
            The port it comes from.
        ports
            Which two; what leads from one of them to a third port ends in that port's reflection.
        """
        with self.lock:
            around = self.surroundings()
            rows: list[tuple[tuple[int, ...], list[Part], list[Matrix]]] = []
            for link, parts, joints in self._rows():
                made = [joint_matrix(f_hz, self._now(joint)) for joint in joints]
                row = self._seen_from(link, parts, made, ports, len(f_hz))
                if row is not None:
                    rows.append(row)
            m = between(f_hz, rows, around, power_dbm, 2 if driven == ports[1] else 1)
            return self._with_leaks(f_hz, m, ports)

    def _seen_from(
        self, link: Link, parts: list[Part], made: list[Matrix], ports: tuple[int, int], count: int
    ) -> tuple[tuple[int, ...], list[Part], list[Matrix]] | None:
        """A link as it looks from two ports, which are called 1 and 2; None: it does not touch them."""
        here = [ports.index(port) + 1 for port in link.ports if port in ports]
        if len(here) == len(link.ports) or not here:
            return (tuple(here), parts, made) if here else None
        end = self.outlets[next(port for port in link.ports if port not in ports)].gamma
        if link.ports[0] not in ports:
            parts, made = [_turned(part) for part in reversed(parts)], [flip(m) for m in reversed(made)]
        # The last joint goes to the end of the row; a part that only reflects closes it.
        closing = Part(1, lambda f_hz, _: end(f_hz)[:, None, None])
        return tuple(here), [*parts, closing], made or [thru(count)] * (len(parts) + 1)

    def _with_leaks(self, f_hz: Real, m: Matrix, ports: tuple[int, int]) -> Matrix:
        """Open contacts let a little through."""
        for switch, link, parts in self._leaks():
            if set(link.ports) != set(ports):
                continue
            whole = between(f_hz, [((1, 2), parts, [])], self.surroundings())
            whole = whole if link.ports == ports else flip(whole)
            m, share = m.copy(), switch.leak(f_hz)
            m[:, 1, 0] += share * whole[:, 1, 0]
            m[:, 0, 1] += share * whole[:, 0, 1]
        return m

    def path(self, from_port: int, to_port: int, f_hz: Real) -> Matrix | None:
        """True S-parameters from one port to another, ``(f, 2, 2)``, at low level; None: not connected."""
        with self.lock:
            if not any(set(link.ports) == {from_port, to_port} for link, _, _ in self._rows()):
                return None
            return self.between_ports(f_hz, ports=(from_port, to_port))

    def arriving(self, port: int) -> Signal:
        """The signal that runs into a port now: through what is connected, and through open contacts."""
        with self.lock:
            came = [
                self._sent(port, link, parts, [self._now(joint) for joint in joints])
                for link, parts, joints in self._rows()
                if len(link.ports) == 2 and port in link.ports
            ]
            for switch, link, parts in self._leaks():
                if port in link.ports:
                    whole = self._sent(port, link, parts, [])
                    came.append(replace(whole, wave=whole.wave * switch.leak(whole.f_hz), noise=_quiet))
            return together(came)

    def _sent(self, port: int, link: Link, parts: list[Part], joints: list[Joint]) -> Signal:
        if back := link.ports[0] == port:
            parts, joints = [_turned(part) for part in reversed(parts)], joints[::-1]
        far = self.outlets[next(p for p in link.ports if p != port)]
        row = Row(parts, _by_number(joints, back), far.gamma, self.outlets[port].gamma)
        return through(row, far.signal(), self.surroundings())


def _by_number(joints: list[Joint], back: bool) -> Callable[[Real, int], Matrix]:
    def joint(f_hz: Real, k: int) -> Matrix:
        m = joint_matrix(f_hz, joints[k]) if joints else thru(len(f_hz))
        return flip(m) if back else m

    return joint


def _turned(part: Part) -> Part:
    """With port 2 first; whatever it did to strong waves, it does not do from behind."""
    if part.ports == 1:
        return part
    return Part(2, lambda f_hz, around: flip(part.response(f_hz, around)), part.says, part.kind)
