"""A simulated bench for anybody's program: every instrument on loopback, and hands on the console."""

from __future__ import annotations

import contextlib
import threading
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TextIO

from sim_instruments.bench import SimulatedBench
from sim_instruments.console import HELP, Console
from sim_instruments.doors.hislip import HislipDoor
from sim_instruments.doors.socket import SocketDoor

__all__ = ["Served", "opened", "serve"]


@dataclass(frozen=True)
class Served:
    """Where one instrument can be reached.

    Parameters
    ----------
    name
        Its resource name in the bench file.
    identity
        Its answer to ``*IDN?``, in words.
    socket, hislip
        VISA resource names of its doors.
    """

    name: str
    identity: str
    socket: str
    hislip: str


@contextlib.contextmanager
def opened(bench: SimulatedBench, first_port: int = 0) -> Iterator[list[Served]]:
    """Open a socket and a HiSLIP door on loopback for each instrument.

    Parameters
    ----------
    first_port
        The sockets and HiSLIP doors take this TCP port and those after it; 0: free ones.

    Raises
    ------
    OSError
        If a port cannot be had.
    """
    with contextlib.ExitStack() as stack:
        served, port = [], first_port
        for name, instrument in bench.instruments.items():
            plain = stack.enter_context(SocketDoor(instrument, port=port))
            slip = stack.enter_context(HislipDoor(instrument, port=port + 1 if port else 0))
            served.append(Served(name, " ".join(instrument.identity[:3]), plain.resource, slip.resource))
            port += 2 if port else 0
        yield served


def serve(
    bench: SimulatedBench, commands: TextIO, out: TextIO, first_port: int = 0, forever: bool = False
) -> None:
    """Open the doors, say where they are, and do what is typed until ``stop`` or the end.

    Parameters
    ----------
    commands
        Where lines come from.
    out
        Where answers go.
    first_port
        See :func:`opened`.
    forever
        Go on without a console, until interrupted.

    Raises
    ------
    OSError
        If a port cannot be had.
    """
    with opened(bench, first_port) as doors:
        for one in doors:
            out.write(f"{one.identity} ({one.name})\n  {one.hislip}\n  {one.socket}\n")
        out.write(f"units: {', '.join(bench.serials) or 'none'}\n")
        out.write(
            "sweeps and hands take time on the bench's clock only; interrupt to end.\n"
            if forever
            else HELP + "\n"
        )
        out.flush()
        if forever:
            threading.Event().wait()
        Console(bench, out).run(commands, "> ")
