"""A switch matrix: connections that the bench file lists, made without hands.

It understands, beside the common commands, ``SYSTem`` and ``STATus`` (brackets: may be left out)::

    ROUTe:CLOSe (@101,102)         and ROUTe:CLOSe? (@101:103), answered as 1,0,0
    ROUTe:CLOSe:STATe?             channels that are closed, as (@101,102)
    ROUTe:OPEN (@101)              and ROUTe:OPEN? (@101:103), answered as 0,1,1
    ROUTe:OPEN:ALL

Contacts take their time to settle, which ``*OPC``, ``*OPC?`` and ``*WAI`` heed. Two channels on one port
cannot be closed together: -221, or the first opens, by the manners of the model.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.hands import Link
from sim_instruments.instruments.routing import WiredWorld
from sim_instruments.instruments.settings import allowed, chosen
from sim_instruments.parts import Part, Surroundings
from sim_instruments.scpi.element import kind_of
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.tree import Command
from sim_instruments.values import number
from sim_instruments.waves import Matrix, Real, line, two
from sim_instruments.world import NoSuchItem

__all__ = ["Switch", "channel_list"]

Parameters = tuple[str, ...]
_LIST = re.compile(r"\(\s*@\s*(.*?)\s*\)")
_MOST = 1000
_SETTLED_S = 1e-9


def channel_list(element: str) -> list[int]:
    """Channels of a list, in order.

    Raises
    ------
    ScpiError
        -128, -148, -158 or -168 for no list, -171 for one that cannot be read, -223 for one too long.

    Examples
    --------
    >>> channel_list("(@101,103:105)")
    [101, 103, 104, 105]
    """
    kind = kind_of(element)
    if kind != "expression":
        raise ScpiError({"number": -128, "word": -148, "string": -158, "block": -168}[kind], element[:40])
    match = _LIST.fullmatch(element)
    if match is None:
        raise ScpiError(-171, element[:40])
    channels: list[int] = []
    for entry in match[1].split(","):
        found = re.fullmatch(r"\s*(\d{1,9})\s*(?::\s*(\d{1,9})\s*)?", entry, re.ASCII)
        if found is None:
            raise ScpiError(-171, element[:40])
        first, last = int(found[1]), int(found[2] or found[1])
        if last < first or last - first >= _MOST:
            raise ScpiError(-223 if last > first else -171, element[:40])
        channels += range(first, last + 1)
    return channels


class Switch(Instrument):
    """The instrument.

    Parameters
    ----------
    world
        Where it stands. A hand that connects something to a port takes the switch's cable off it.
    identity
        Four fields of ``*IDN?``.
    spec
        ``channels``: by number ``{items: [...], ports: [...]}``, as hands would connect them; ``loss`` (dB at
        1 GHz, of one contact with its cable); ``delay`` (s); ``isolation`` (dB at 1 GHz, through a whole open
        channel); ``repeatability`` (dB, one standard deviation, drawn at each switching); ``contact`` (ohm);
        ``settling`` (s); ``manners``: ``on conflict``: refuse or release.
    draws
        What makes this specimen.

    Raises
    ------
    ValueError
        If the description makes no sense.
    """

    def __init__(
        self,
        world: WiredWorld,
        identity: tuple[str, str, str, str],
        spec: Mapping[str, Any],
        draws: Draws,
    ) -> None:
        super().__init__(world, identity)
        allowed(
            "a switch matrix", spec, "kind", "model", "serial", "channels", "loss", "delay", "isolation",
            "repeatability", "contact", "settling", "manners",
        )  # fmt: skip
        self._wired, self._draws = world, draws
        self._links: dict[int, Link] = {}
        for channel, how in spec["channels"].items():
            allowed(f"channel {channel}", how, "items", "ports")
            self._links[int(channel)] = Link(tuple(how["items"]), tuple(int(p) for p in how["ports"]))
            for item in how["items"]:
                if item != "unit" and item not in world.items:
                    raise ValueError(f"channel {channel}: the bench has no {item!r}")
        self._loss_db, self._delay_s = number(spec.get("loss", 0.1)), number(spec.get("delay", 0.4e-9))
        self._isolation_db = number(spec.get("isolation", 90.0))
        self._repeat_db = number(spec.get("repeatability", 0.005))
        self._contact_ohm = number(spec.get("contact", 0.05))
        self._settling_s = number(spec.get("settling", 15e-3))
        manners = spec.get("manners", {})
        allowed("manners", manners, "on conflict")
        self._releases = chosen("manners", manners, "on conflict", "refuse", "release") == "release"
        self._closed: dict[int, int] = {}
        """Channels that are closed, each with the number of that switching."""
        self._moved: set[int] = set()
        self.cycles = 0
        self._due: float | None = None
        add = self.tree.add
        add("ROUTe:CLOSe", Command(self._close, lambda p: self._states(p, True), 1, 1, 1, 1))
        add("ROUTe:CLOSe:STATe", Command(get=lambda _: f"(@{','.join(map(str, self._closed))})"))
        add("ROUTe:OPEN", Command(self._open, lambda p: self._states(p, False), 1, 1, 1, 1))
        add("ROUTe:OPEN:ALL", Command(lambda _: self._change({})))
        world.switches.append(self)

    def reset(self) -> None:
        """Everything open."""
        self._closed, self._due = {}, None

    # -- commands ----------------------------------------------------------------------------------------

    def _known(self, parameters: Parameters) -> list[int]:
        channels = channel_list(parameters[0])
        for channel in channels:
            if channel not in self._links:
                raise ScpiError(-222, f"channel {channel}")
        return channels

    def _states(self, parameters: Parameters, closed: bool) -> str:
        return ",".join(str(int((c in self._closed) is closed)) for c in self._known(parameters))

    def _close(self, parameters: Parameters) -> None:
        after = dict(self._closed)
        for channel in self._known(parameters):
            if channel in after:
                continue
            ports = set(self._links[channel].ports)
            for other in [c for c in after if ports & set(self._links[c].ports)]:
                if not self._releases:
                    raise ScpiError(-221, f"channels {other} and {channel} share a port")
                del after[other]
            self.cycles += 1
            after[channel] = self.cycles
        self._change(after)

    def _open(self, parameters: Parameters) -> None:
        opened = self._known(parameters)
        self._change({c: n for c, n in self._closed.items() if c not in opened})

    def _change(self, after: dict[int, int]) -> None:
        if after != self._closed:
            self._moved = {c for c in after if after[c] != self._closed.get(c)}
            self._closed, self._due = after, self.world.time_s + self._settling_s

    # -- time --------------------------------------------------------------------------------------------

    def ready_s(self, readings: bool) -> float | None:
        """When contacts have settled."""
        return self._due

    def refresh(self) -> None:
        """Settled when the time is up."""
        if self._due is not None and self.world.time_s >= self._due - _SETTLED_S:
            self._due = None
        super().refresh()

    def asked(self) -> None:
        """A poll takes a millisecond."""
        if self._due is not None:
            self.world.advance(1e-3)

    # -- physics -----------------------------------------------------------------------------------------

    def closed(self) -> Iterable[tuple[Link, list[Part]]]:
        """Links that stand, each with its items between the switch's contacts; none while they bounce."""
        bounce = self._due is not None and self.world.time_s < self._due - _SETTLED_S
        for channel, cycle in self._closed.items():
            if bounce and channel in self._moved:
                continue
            if (parts := self._parts(channel)) is not None:
                link = self._links[channel]
                near = self._contact(f"{channel} near {cycle}")
                far = [self._contact(f"{channel} far {cycle}")] if len(link.ports) == 2 else []
                yield link, [near, *parts, *far]

    def leak(self, f_hz: Real) -> Real:
        """Through an open channel, ``(f,)`` linear: it grows by 20 dB a decade, as through a capacitance."""
        return np.asarray(10 ** (-self._isolation_db / 20) * np.minimum(f_hz / 1e9, 10.0))

    def opened(self) -> Iterable[tuple[Link, list[Part]]]:
        """Open channels between two ports."""
        for channel, link in self._links.items():
            if channel in self._closed or len(link.ports) != 2:
                continue
            if (parts := self._parts(channel)) is not None:
                yield link, parts

    def _parts(self, channel: int) -> list[Part] | None:
        """Items of a channel; None while its unit is not there."""
        try:
            return [self._wired.part(item) for item in self._links[channel].items]
        except NoSuchItem:
            return None

    def _contact(self, name: str) -> Part:
        """A contact with its cable; each switching is a little different."""
        loss_db = self._loss_db + self._draws.normal(f"loss {name}", self._repeat_db)
        r = (self._contact_ohm + abs(self._draws.normal(f"contact {name}", self._contact_ohm / 5))) / 100.0

        def response(f_hz: Real, _: Surroundings) -> Matrix:
            cable = line(f_hz, self._delay_s, 50.0, loss_db)
            cable[:, 0, 1] *= 1 - r
            cable[:, 1, 0] *= 1 - r
            shunt = np.full(len(f_hz), r + 0j)
            return two(cable[:, 0, 0] + shunt, cable[:, 0, 1], cable[:, 1, 0], cable[:, 1, 1] + shunt)

        return Part(2, response, "switch contact", "switch")
