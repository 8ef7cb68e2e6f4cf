"""One instrument behind every door, opened through PyVISA as any program would."""

from __future__ import annotations

import contextlib
from collections.abc import Callable, Iterator
from typing import Any

import pytest
import pyvisa

from sim_instruments.doors.hislip import HislipDoor
from sim_instruments.doors.socket import SocketDoor
from sim_instruments.doors.visa import simulated_visa
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.scpi.parameters import string
from sim_instruments.scpi.tree import Command
from sim_instruments.world import World


class Talker(Instrument):
    """Gives blocks of any bytes; its operations take ten simulated seconds."""

    def __init__(self, world: World) -> None:
        super().__init__(world, ("SIMULATED", "TALKER", "7", "1.0"))
        self.due: float | None = None
        self.fired = 0
        self.payload = b""
        self.tree.add("BLOCk", Command(get=lambda _: b"#6%06d" % len(self.payload) + self.payload))
        self.tree.add("OPEN", Command(get=lambda _: b"#0" + self.payload))
        self.tree.add("ECHO", Command(get=lambda p: string(p[0]), asks_least=1, asks_most=1))
        self.tree.add("STARt", Command(lambda _: self.start()))
        self.tree.add("BREak", Command(lambda _: self.nonsense))  # type: ignore[attr-defined]

    def start(self) -> None:
        self.due = self.world.time_s + 10.0

    def ready_s(self, readings: bool) -> float | None:
        return self.due

    def refresh(self) -> None:
        if self.due is not None and self.world.time_s >= self.due - 1e-9:
            self.due = None
        super().refresh()

    def fire(self) -> None:
        self.fired += 1
        if self.fired > 3:
            raise ScpiError(-211)


@pytest.fixture
def talker() -> Talker:
    return Talker(World(1))


@pytest.fixture(scope="session")
def real_manager() -> Iterator[pyvisa.ResourceManager]:
    manager = pyvisa.ResourceManager("@py")
    yield manager
    manager.close()


DOORS = ("visa gpib", "visa tcpip", "visa socket", "socket", "hislip")


@pytest.fixture(params=DOORS)
def door(request) -> str:
    return str(request.param)


@pytest.fixture
def opener(door, talker, real_manager) -> Iterator[Callable[..., Any]]:
    """Opens a client's session through the door."""
    with contextlib.ExitStack() as stack:
        if door.startswith("visa"):
            name = {"gpib": "GPIB0::7::INSTR", "tcpip": "TCPIP0::bench::inst0::INSTR"}.get(
                door[5:], "TCPIP0::bench::5025::SOCKET"
            )
            manager = pyvisa.ResourceManager(simulated_visa(talker.world, {name: talker}))
            stack.callback(manager.close)
        else:
            served = stack.enter_context((SocketDoor if door == "socket" else HislipDoor)(talker))
            name, manager = served.resource, real_manager

        def open_one(**settings: Any) -> Any:
            resource = manager.open_resource(
                name, **{"read_termination": "\n", "write_termination": "\n", "timeout": 2000, **settings}
            )

            def close() -> None:
                with contextlib.suppress(pyvisa.errors.InvalidSession):
                    resource.close()

            stack.callback(close)
            return resource

        yield open_one


@pytest.fixture
def client(opener) -> Any:
    return opener()
