"""The rehearsal: the same sequence and bench file, with a simulated bench handed in.

The only place where the product meets :mod:`sim_instruments`.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

from benchrun.clock import Clock, FunctionClock
from benchrun.errors import InputError
from benchrun.hookup import Hookup
from benchrun.sequence.bench import Bench
from benchrun.sequence.files import Loaded
from benchrun.sequence.models import Sequence
from sim_instruments.bench import BadBench, SimulatedBench, load_bench
from sim_instruments.doors.visa import simulated_visa
from sim_instruments.faults import FAULTS, inject, is_fault
from sim_instruments.world import NoSuchItem, World

__all__ = ["Rehearsal", "SimulatedHands", "prepare_rehearsal"]


class SimulatedHands:
    """Hands that do in the simulated world what a prompt asks."""

    def __init__(self, world: World) -> None:
        self._world = world

    def check(self, hookups: tuple[Hookup, ...]) -> None:
        """Everything asked for must lie on the simulated bench."""
        for hookup in hookups:
            for connection in hookup.connections:
                for item in connection.items:
                    if item.removesuffix(" turned round") not in ("unit", *self._world.items):
                        have = ", ".join(sorted(self._world.items)) or "nothing"
                        raise InputError(
                            f"the simulated bench has no {item!r} to connect {hookup.text}; it has {have}"
                        )

    def offer(self, serial: str) -> None:
        """Lay the unit on the simulated bench."""
        try:
            self._world.offer(serial)
        except NoSuchItem as error:
            raise InputError(str(error)) from None

    def connect(self, hookup: Hookup) -> None:
        """Connect; costs simulated seconds."""
        try:
            self._world.connect([(c.items, c.ports) for c in hookup.connections])
        except NoSuchItem as error:
            raise InputError(f"the simulated hands cannot connect {hookup.text}: {error}") from None


@dataclass(frozen=True, slots=True)
class Rehearsal:
    """A simulated bench, ready to be given to a job."""

    bench: SimulatedBench
    library: Any
    clock: Clock
    hands: SimulatedHands

    def unit_for(self, sequence: Sequence) -> str:
        """The first unit known on this bench that the sequence could mean.

        Raises
        ------
        InputError
            If there is none.
        """
        for serial in self.bench.serials:
            if re.fullmatch(sequence.unit.serial, serial):
                return serial
        have = ", ".join(self.bench.serials) or "none"
        raise InputError(
            f"the simulated bench has no unit whose serial number fits {sequence.unit.serial!r}; "
            f"it has {have}. Name one with --unit"
        )


def prepare_rehearsal(bench: Loaded[Bench], seed: int, faults: Iterable[str] = ()) -> Rehearsal:
    """The simulated bench that stands in for a real one.

    Parameters
    ----------
    bench
        The bench file; its ``rehearsal`` names the simulated bench.
    seed
        Of everything random in it.
    faults
        What goes wrong, by name; ``"NAME@N"`` lets N occasions pass before it.

    Raises
    ------
    InputError
        If the bench file names none, or what it names cannot be used.
    """
    name = bench.model.rehearsal
    if name is None:
        raise InputError(
            bench.document.problem(
                "names no simulated bench", ("bench",), "Add `rehearsal: NAME` to rehearse on it."
            )
        )
    if name.endswith(".yaml"):
        name = str(bench.folder / name)
    try:
        simulated = load_bench(name, seed)
    except BadBench as error:
        raise InputError(bench.document.problem(str(error), ("rehearsal",))) from error
    for fault in faults:
        simulated = _with_fault(simulated, fault, seed)
    world = simulated.world
    clock = FunctionClock(lambda: world.time_s, world.advance)
    return Rehearsal(simulated, simulated_visa(world, simulated.instruments), clock, SimulatedHands(world))


def _with_fault(bench: SimulatedBench, fault: str, seed: int) -> SimulatedBench:
    name, _, after = fault.partition("@")
    name = name.strip()
    if not is_fault(name):
        close = difflib.get_close_matches(name, FAULTS, 1, 0.5)
        hint = f"did you mean {close[0]!r}?" if close else f"known are {', '.join(FAULTS)}"
        raise InputError(f"there is no fault {name!r}; {hint}")
    if after and not after.strip().isdecimal():
        raise InputError(
            f"fault {fault!r}: {after!r} is no number of occasions; write it as in 'open for short@2'"
        )
    return inject(bench, name, after=int(after or 0), seed=seed)
