"""Slips of hands and changes of the room: each does what its description says."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.bench import SimulatedBench, load_bench
from sim_instruments.faults import FAULTS, When, inject
from sim_instruments.world import World

F = np.linspace(10e6, 1e9, 51)
JIG = [(["jig-left", "unit", "jig-right"], [1, 2])]


def _bench(name: str, *, after: int = 0, probability: float = 1.0, serial: str = "HF-9002") -> SimulatedBench:
    bench = inject(load_bench("workshop", 1), name, after=after, probability=probability)
    bench.world.offer(serial)
    return bench


def _connected(world: World, links: list[tuple[list[str], list[int]]]) -> str:
    world.connect(links)
    return world.connection


@pytest.mark.parametrize("name", FAULTS)
def test_every_fault_says_what_is_seen(name: str) -> None:
    """A sentence for an engineer."""
    assert len(FAULTS[name].seen) > 50
    assert FAULTS[name].seen.endswith(".")


def test_a_fault_that_is_none_is_refused() -> None:
    """With the known ones; so are a resource and an occasion that are none."""
    bench = load_bench("workshop", 1)
    with pytest.raises(ValueError, match="there is no fault 'gremlin'; known are no answer"):
        inject(bench, "gremlin")
    with pytest.raises(ValueError, match="there is no instrument 'GPIB0::3::INSTR'"):
        inject(bench, "no answer", resource="GPIB0::3::INSTR")
    with pytest.raises(ValueError, match=r"not after 0 with 1\.5"):
        inject(bench, "no answer", probability=1.5)


def test_occasions_pass_first_and_chance_is_seeded() -> None:
    """After two; about a third of the rest; the same for the same seed, once if once."""
    when = When("x", after=2, probability=0.3, seed=4)
    seen = [when() for _ in range(1002)]
    assert not any(seen[:2])
    assert 250 < sum(seen) < 350
    again, other = When("x", 2, 0.3, 4), When("x", 2, 0.3, 5)
    assert seen == [again() for _ in range(1002)]
    assert seen != [other() for _ in range(1002)]
    assert sum(When("x", once=True)() for _ in range(3)) == 3
    once = When("x", once=True)
    assert [once() for _ in range(3)] == [True, False, False]


def test_wrong_standard() -> None:
    """Another one-port standard hangs there; other parts are not touched."""
    world = _bench("wrong standard").world
    assert _connected(world, [(["short"], [1])]) in ("open on port 1", "load on port 1")
    assert _connected(world, [(["thru"], [1, 2])]) == "thru from port 1 to port 2"


def test_open_for_short() -> None:
    """Reflection with the wrong sign."""
    world = _bench("open for short").world
    assert _connected(world, [(["short"], [1])]) == "open on port 1"
    assert world.between_ports(F)[0, 0, 0].real > 0.9
    assert _connected(world, [(["load"], [1])]) == "load on port 1"


def test_after_counts_only_what_the_slip_fits() -> None:
    """The first short goes well, whatever else is connected; the second does not."""
    world = _bench("open for short", after=1).world
    seen = [_connected(world, [([item], [1])]) for item in ("load", "short", "load", "short")]
    assert seen == ["load on port 1", "short on port 1", "load on port 1", "open on port 1"]


def test_loose_connection() -> None:
    """Reflects some percent, loses power, and is another at each reading."""
    world = _bench("loose connection").world
    world.connect([(["thru"], [1, 2])])
    one, two = world.between_ports(F), world.between_ports(F)
    assert np.max(abs(one[:, 0, 0])) > 0.02
    assert np.max(abs(one[:, 1, 0])) < 0.998
    assert np.max(abs(one - two)) > 1e-4


def test_wrong_port() -> None:
    """Port 1 shows an open connector while port 2 has the load."""
    world = _bench("wrong port").world
    assert _connected(world, [(["load"], [1])]) == "load on port 2"
    m = world.between_ports(F)
    assert abs(m[0, 0, 0]) > 0.99
    assert abs(m[0, 1, 1]) < 0.01
    assert _connected(world, JIG).endswith("from port 1 to port 2")


def test_unit_reversed() -> None:
    """S11 and S22 exchanged, S21 as it was; a one-port unit cannot be reversed."""
    straight, turned = load_bench("workshop", 1).world, _bench("unit reversed").world
    straight.offer("HF-9002")
    for world in (straight, turned):
        world.connect([(["unit"], [1, 2])])
    assert turned.connection == "unit turned round from port 1 to port 2"
    a, b = straight.between_ports(F), turned.between_ports(F)
    np.testing.assert_allclose(a[:, 0, 0], b[:, 1, 1], atol=5e-3)
    np.testing.assert_allclose(a[:, 1, 0], b[:, 1, 0], atol=5e-3)
    assert np.max(abs(a[:, 0, 0] - b[:, 0, 0])) > 0.05
    whip = _bench("unit reversed", serial="WA-0001").world
    assert _connected(whip, [(["unit"], [1])]) == "unit on port 1"


def test_a_reversed_unit_is_let_go_when_the_next_is_offered() -> None:
    """Its joints are not those of the next unit."""
    world = _bench("unit reversed").world
    world.connect(JIG)
    made = world.matings["port 1"]
    world.offer("HF-0001")
    world.connect(JIG)
    assert world.matings["port 1"] == made + 1


def test_nothing_connected() -> None:
    """Open connectors, nothing through."""
    world = _bench("nothing connected").world
    assert _connected(world, JIG) == "nothing"
    assert not world.between_ports(F)[:, 1, 0].any()


def test_fixture_left_out() -> None:
    """The unit alone: some 400 ps less delay."""
    bench, whole = _bench("fixture left out"), load_bench("workshop", 1)
    whole.world.offer("HF-9002")
    whole.world.connect(JIG)
    assert _connected(bench.world, JIG) == "unit from port 1 to port 2"
    f = np.linspace(50e6, 150e6, 11)
    ratio = np.unwrap(np.angle(bench.world.between_ports(f)[:, 1, 0] / whole.world.between_ports(f)[:, 1, 0]))
    assert (ratio[-1] - ratio[0]) / (2 * np.pi * 100e6) == pytest.approx(400e-12, rel=0.1)


def test_connected_late() -> None:
    """What hung there before still hangs there, for a minute and a half."""
    world = _bench("connected late", after=1).world
    assert _connected(world, [(["short"], [1])]) == "short on port 1"
    assert _connected(world, [(["open"], [1])]) == "short on port 1"
    world.advance(60.0)
    assert world.between_ports(F)[0, 0, 0].real < -0.9
    world.advance(31.0)
    assert world.between_ports(F)[0, 0, 0].real > 0.9
    assert world.connection == "open on port 1"


def test_cable_moved() -> None:
    """When the unit goes in, once: phases turn, magnitudes hardly."""
    bench = _bench("cable moved")
    world, receivers = bench.world, bench.instruments["GPIB0::16::INSTR"].readings.receivers  # type: ignore[attr-defined]
    world.connect([(["thru"], [1, 2])])
    assert world.bend == 0.0
    world.connect(JIG)
    assert 0.5 < abs(world.bend) < 1.5
    moved = world.bend
    world.connect([])
    world.connect(JIG)
    assert world.bend == moved
    device = world.between_ports(F)
    before, after = (receivers.raw(F, device, 23.0, bend=b)[:, 1, 0] for b in (0.0, moved))
    turned = np.angle(after / before, deg=True)
    assert 0.05 < abs(turned[-1]) < 8
    np.testing.assert_allclose(abs(after / before), 1.0, atol=0.03)


def test_temperature_step() -> None:
    """Six kelvin within some minutes of the connection, once."""
    world = _bench("temperature step", after=1).world
    world.connect([(["short"], [1])])
    before = world.temperature()
    world.connect([(["open"], [1])])
    assert world.temperature() == pytest.approx(before, abs=0.3)
    world.advance(900.0)
    assert world.temperature() == pytest.approx(before + 6.0, abs=0.7)
    world.connect([(["load"], [1])])
    world.advance(900.0)
    assert world.temperature() == pytest.approx(before + 6.0, abs=0.7)


def test_drift() -> None:
    """Four kelvin an hour."""
    calm, warming = load_bench("workshop", 1).world, _bench("drift").world
    for world in (calm, warming):
        world.advance(7200.0)
    assert warming.temperature() - calm.temperature() == pytest.approx(8.0)


def test_two_slips_may_wait_at_once() -> None:
    """Each for its own occasion."""
    bench = inject(_bench("open for short"), "unit reversed")
    assert _connected(bench.world, [(["short"], [1])]) == "open on port 1"
    assert "turned round" in _connected(bench.world, JIG)


def test_a_torque_wrench_makes_tighter_joints_and_wear_looser_ones() -> None:
    """Three times tighter than by feel; twice as loose after 500 matings; damp air loosens too."""

    def spread(**state: float) -> float:
        seen = []
        for seed in range(40):
            world = load_bench("workshop", seed).world
            world.torque_wrench = bool(state.get("wrench", True))
            world.humidity = state.get("humidity", 0.45)
            world.matings["port 1"] = int(state.get("worn", 0))
            world.connect([(["thru"], [1, 2])])
            seen.append(abs(world.between_ports(np.array([1e9]))[0, 0, 0]))
        return float(np.sqrt(np.mean(np.square(seen))))

    tight = spread()
    assert spread(wrench=0) == pytest.approx(3 * tight, rel=0.2)
    assert 1.3 * tight < spread(worn=500) < 2.2 * tight
    assert spread(humidity=0.9) > 2 * tight
