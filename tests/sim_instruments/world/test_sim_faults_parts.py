"""Faults of the unit, put in by name."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.bench import SimulatedBench, load_bench
from sim_instruments.faults import FAULTS, PART_FAULTS, inject, is_fault, part_fault
from sim_instruments.parts import KINDS
from sim_instruments.world import NoSuchItem

F = np.linspace(100e6, 400e6, 31)
UNITS = {
    "ladder": "HF-0001", "coupled resonators": "PS-0001", "antenna": "WA-0001", "cable": "JC-0001",
    "amplifier": "DA-0001",
}  # fmt: skip
"""A good unit of each kind that a fault is tried on."""


def _with(*faults: str, **chance: int) -> SimulatedBench:
    bench = load_bench("workshop", 1)
    for fault in faults:
        bench = inject(bench, f"part: {fault}", **chance)
    return bench


def _truth(bench: SimulatedBench, serial: str) -> np.ndarray:
    bench.world.offer(serial)
    return bench.world.truth(F)


@pytest.mark.parametrize("fault", PART_FAULTS, ids=lambda fault: fault.words)
def test_every_fault_spoils_a_good_unit(fault) -> None:
    """Its S-parameters differ, or what its stage does; and it says what would be seen."""
    serial = UNITS[(fault.kinds or ("ladder",))[0]]
    sound, spoilt = load_bench("workshop", 1), _with(fault.words)
    moved = np.max(abs(_truth(sound, serial) - _truth(spoilt, serial)))
    assert moved > 1e-3 or sound.world.part("unit").stage != spoilt.world.part("unit").stage
    assert part_fault(fault.words) is fault
    assert is_fault(f"part: {fault.words}")
    assert len(fault.seen.split()) >= 10
    assert set(fault.kinds) <= set(KINDS)


def test_it_comes_beside_the_faults_that_a_unit_has() -> None:
    """HF-9001 has a coil out of tolerance already."""
    bench = _with("open joint at C1")
    bench.world.offer("HF-9001")
    assert bench.world.part("unit").says == "L2 +15 %; open joint at C1"


def test_occasions_are_units_laid_on_the_bench() -> None:
    """The first is spared, the second not."""
    bench, sound = _with("L2 +15 %", after=1), load_bench("workshop", 1)
    truth = _truth(sound, "HF-0001")
    np.testing.assert_array_equal(_truth(bench, "HF-0001"), truth)
    assert np.max(abs(_truth(bench, "HF-0001") - truth)) > 1e-2
    assert [(when.seen, when.happened) for when in bench.injected] == [(2, 1)]


def test_a_unit_that_cannot_have_it_is_refused() -> None:
    """With what it can have."""
    bench = _with("water in the cable")
    with pytest.raises(NoSuchItem, match=r"unit PD-0001 cannot have the fault.*water in the cable"):
        bench.world.offer("PD-0001")


@pytest.mark.parametrize(
    ("name", "says"),
    [
        ("part: sad", "'sad' is no fault of a part; write it as one of 'L2 \\+15 %'"),
        ("part: L99 +15 %", "no unit of this bench can have the fault 'L99 \\+15 %'"),
        ("earthquake", "there is no fault 'earthquake'"),
    ],
)
def test_a_fault_that_is_none_is_refused(name: str, says: str) -> None:
    """At once, and not when a unit comes."""
    with pytest.raises(ValueError, match=says):
        inject(load_bench("workshop", 1), name)
    assert name not in FAULTS
