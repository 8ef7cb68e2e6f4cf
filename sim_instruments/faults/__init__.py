"""Everything that can go wrong on a bench, by name; this table is the only place that knows it all.

Faults of parts stand in words in bench files (``faults: ["L2 +15 %"]``) and are put in by the same words
after ``part:``; see :mod:`sim_instruments.faults.parts`.
"""

from __future__ import annotations

import inspect
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import cast

from sim_instruments.bench import SimulatedBench
from sim_instruments.faults import answers, conditions, slips, spoilt
from sim_instruments.faults.line import FaultyInstrument, FaultyLine, InstrumentFault, bare
from sim_instruments.faults.parts import PART, PART_FAULTS, PartFault, part_fault
from sim_instruments.faults.when import When
from sim_instruments.hands import Slip
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.units import Units
from sim_instruments.world import World

__all__ = [
    "FAULTS", "PART", "PART_FAULTS", "Fault", "FaultyInstrument", "FaultyLine", "InstrumentFault",
    "PartFault", "When", "inject", "is_fault", "part_fault",
]  # fmt: skip


@dataclass(frozen=True)
class Fault:
    """A fault.

    Parameters
    ----------
    name
        As :func:`inject` takes it.
    where
        ``"instrument"``, ``"hands"`` or ``"room"``.
    make
        A class of instrument fault, or a function ``(world) -> Slip | None``.
    once
        It happens one time only.
    """

    name: str
    where: str
    make: type[InstrumentFault] | Callable[[World], Slip | None]
    once: bool = False

    @property
    def seen(self) -> str:
        """What a careful engineer would see."""
        return " ".join((inspect.getdoc(self.make) or "").split())


_INSTRUMENT: Mapping[str, type[InstrumentFault]] = {
    "no answer": answers.NoAnswer,
    "late answer": answers.LateAnswer,
    "answer cut short": answers.CutShort,
    "wrong block length": answers.WrongBlockLength,
    "garbage": answers.Garbage,
    "NaN in data": answers.NotANumber,
    "stale answer": answers.StaleAnswer,
    "error queued": conditions.ErrorQueued,
    "queue overflow": conditions.QueueOverflow,
    "identity changed": answers.IdentityChanged,
    "restart in mid-sweep": conditions.Restart,
    "line closed": answers.LineClosed,
    "dribbling": answers.Dribbling,
    "unlock": spoilt.Unlock,
    "overload": spoilt.Overload,
}
_HANDS: Mapping[str, Callable[[World], Slip | None]] = {
    "wrong standard": slips.wrong_standard,
    "open for short": slips.open_for_short,
    "loose connection": slips.loose_connection,
    "wrong port": slips.wrong_port,
    "cable moved": slips.cable_moved,
    "unit reversed": slips.unit_reversed,
    "nothing connected": slips.nothing_connected,
    "fixture left out": slips.fixture_left_out,
    "connected late": slips.connected_late,
}
_ROOM: Mapping[str, Callable[[World], Slip | None]] = {
    "temperature step": slips.temperature_step,
    "drift": slips.drift,
}

FAULTS: Mapping[str, Fault] = {
    **{name: Fault(name, "instrument", make, make.once) for name, make in _INSTRUMENT.items()},
    **{name: Fault(name, "hands", make, name == "cable moved") for name, make in _HANDS.items()},
    **{name: Fault(name, "room", make, True) for name, make in _ROOM.items()},
}
"""By name."""


def inject(
    bench: SimulatedBench,
    name: str,
    *,
    after: int = 0,
    probability: float = 1.0,
    seed: int = 0,
    resource: str | None = None,
) -> SimulatedBench:
    """A bench on which something goes wrong.

    Parameters
    ----------
    bench
        Its world is changed, so use what is returned from here on; several faults may be injected one after
        the other.
    name
        One of :data:`FAULTS`, or ``"part: L2 +15 %"``, whose occasions are units laid on the bench from now
        on.
    after
        Occasions that pass before it: answers or sweeps of an instrument, connections that it could spoil;
        drift begins at once.
    probability
        At each occasion from then on.
    seed
        Of that chance.
    resource
        The instrument's resource name; none: all of them.

    Raises
    ------
    ValueError
        For a name, a resource, or an occasion that is none.

    Examples
    --------
    >>> from sim_instruments.bench import load_bench
    >>> bench = inject(load_bench("workshop", 1), "open for short")
    >>> bench.world.connect([(["short"], [1])])
    >>> bench.world.connection
    'open on port 1'
    """
    if name.startswith(PART):
        return _into_units(bench, name, When(name, after, probability, seed))
    if name not in FAULTS:
        raise ValueError(
            f"there is no fault {name!r}; known are {', '.join(FAULTS)}, and those of parts, as "
            f"'{PART} {PART_FAULTS[0].words}'"
        )
    fault = FAULTS[name]
    when = When(name, after, probability, seed, fault.once)
    if isinstance(fault.make, type):
        return _into_instruments(bench, fault.make, when, resource)
    slip = fault.make(bench.world)
    if slip is not None:
        bench.world.hands.slips.append((slip, when))
    else:
        when()  # it goes on from the first
    return replace(bench, injected=(*bench.injected, when))


def is_fault(name: str) -> bool:
    """Whether :func:`inject` could know a fault of this name.

    Examples
    --------
    >>> is_fault("unlock"), is_fault("part: L2 +15 %"), is_fault("part: sad"), is_fault("earthquake")
    (True, True, False, False)
    """
    if name.startswith(PART):
        return part_fault(name.removeprefix(PART)) is not None
    return name in FAULTS


def _into_units(bench: SimulatedBench, name: str, when: When) -> SimulatedBench:
    words, units = name.removeprefix(PART).strip(), bench.world.units
    if part_fault(words) is None:
        known = ", ".join(repr(fault.words) for fault in PART_FAULTS)
        raise ValueError(f"{words!r} is no fault of a part; write it as one of {known}")
    if not isinstance(units, Units) or not units.families:
        raise ValueError(f"this bench has no units that could have the fault {words!r}")
    units.spoil(words, when)
    return replace(bench, injected=(*bench.injected, when))


def _into_instruments(
    bench: SimulatedBench, make: type[InstrumentFault], when: When, resource: str | None
) -> SimulatedBench:
    if resource is not None and resource not in bench.instruments:
        raise ValueError(f"there is no instrument {resource!r}; there are {', '.join(bench.instruments)}")
    suited = [
        name
        for name, instrument in bench.instruments.items()
        if resource in (None, name) and make().suits(bare(instrument)[0])
    ]
    if not suited:
        raise ValueError(f"no {when.name!r} can come to {resource or 'any instrument of this bench'}")
    changed = {
        name: cast(Instrument, FaultyInstrument(instrument, make(), when)) if name in suited else instrument
        for name, instrument in bench.instruments.items()
    }
    return replace(bench, instruments=changed, injected=(*bench.injected, when))
