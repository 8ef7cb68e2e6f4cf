"""The world: connections, joints, time, temperature and chance."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.bench import load_bench
from sim_instruments.draws import Draws
from sim_instruments.parts import build
from sim_instruments.world import NoSuchItem, World

F = np.linspace(10e6, 1e9, 51)
PAD = {"kind": "pad", "loss": "10 dB", "tolerance": "1 %"}


def _world(seed: int = 1) -> World:
    draws = Draws(seed)
    items = {
        "pad": build(PAD, draws / "pad"),
        "short": build({"kind": "standard", "standard": "short"}, draws),
        "thru": build({"kind": "standard", "standard": "thru"}, draws),
    }
    return World(seed, items)


def test_the_same_seed_gives_the_same_world() -> None:
    """Two worlds of one seed are one world; another seed is another."""
    one, same, other = (load_bench("workshop", seed).world for seed in (7, 7, 8))
    for world in (one, same, other):
        world.offer("HF-0001")
        world.connect([(["jig-left", "unit", "jig-right"], [1, 2])])
    np.testing.assert_array_equal(one.between_ports(F), same.between_ports(F))
    assert np.max(abs(one.between_ports(F) - other.between_ports(F))) > 1e-4


def test_a_draw_does_not_depend_on_what_was_drawn_before() -> None:
    """Chance goes by name, not by order."""
    late = Draws(3) / "a"
    late.normal("else", 1.0)
    assert late.normal("this", 1.0) == (Draws(3) / "a").normal("this", 1.0)
    assert late.normal("this", 1.0) != (Draws(3) / "b").normal("this", 1.0)


def test_draws_are_cut_where_the_maker_sorts() -> None:
    """Normal within two sigma."""
    values = np.array([(Draws(5) / k).normal("x", 1.0) for k in range(2000)])
    assert np.max(abs(values)) == 2.0
    assert np.std(values) == pytest.approx(0.96, abs=0.04)


def test_joints_lose_no_power() -> None:
    """A connection alone, around an ideal thru, is unitary."""
    world = _world()
    world.connect([(["thru"], [1, 2])])
    m = world.between_ports(F)
    product = np.conj(np.swapaxes(m, 1, 2)) @ m
    np.testing.assert_allclose(product, np.broadcast_to(np.eye(2), product.shape), atol=1e-12)
    assert 0 < np.max(abs(m[:, 0, 0])) < 5e-3


def test_a_connection_made_again_is_not_the_same_connection() -> None:
    """Taking off and putting on again draws anew; leaving it on does not."""
    world = _world()
    world.connect([(["short"], [1])])
    first = world.between_ports(F)
    world.connect([(["short"], [1])])
    np.testing.assert_array_equal(world.between_ports(F), first)
    world.connect([])
    world.connect([(["short"], [1])])
    again = world.between_ports(F)
    assert 0 < np.max(abs(again[:, 0, 0] - first[:, 0, 0])) < 5e-3


def test_connections_cost_time() -> None:
    """Both ends of a part: two connections."""
    world = _world()
    world.connect([(["short"], [1])])
    one = world.time_s
    world.connect([(["pad"], [1, 2])])
    assert world.time_s - one == pytest.approx(2 * one)
    assert 10 < one < 60


def test_from_port_two_to_port_one_is_the_chain_turned_round() -> None:
    """What hangs the other way round reads the other way round."""
    spec = {"kind": "ladder", "elements": [{"name": "R1", "place": "series", "resistor": 50},
                                           {"name": "R2", "place": "shunt", "resistor": 50}]}  # fmt: skip
    world = World(1, {"ell": build(spec, Draws(1))})
    world.connect([(["ell"], [1, 2])])
    ahead = world.between_ports(F)
    world.connect([(["ell"], [2, 1])])
    np.testing.assert_allclose(world.between_ports(F)[:, 0, 0], ahead[:, 1, 1], atol=5e-3)
    assert abs(ahead[0, 0, 0] - ahead[0, 1, 1]) > 0.1


def test_nothing_connected_reads_as_open_ends() -> None:
    """Two open connectors: nearly all reflected, nothing through."""
    m = _world().between_ports(F)
    assert np.all(abs(m[:, 0, 0]) > 0.999)
    assert np.all(m[:, 1, 0] == 0)


def test_a_two_port_on_one_port_ends_open() -> None:
    """A 10 dB pad with its far end open shows about 20 dB return loss."""
    world = _world()
    world.connect([(["pad"], [1])])
    level = -20 * np.log10(abs(world.between_ports(F)[:, 0, 0]))
    np.testing.assert_allclose(level, 20.0, atol=0.5)


@pytest.mark.parametrize(
    ("links", "says"),
    [
        ([(["sling"], [1])], "the bench has no 'sling'; there are pad, short, thru"),
        ([(["unit"], [1])], "no unit lies on the bench"),
        ([(["short"], [3])], "port 3; there are ports 1 and 2"),
        ([(["short"], [1]), (["pad"], [1])], "port 1 cannot take two connections"),
        ([(["short"], [1, 2])], "'short' has one port and cannot stand between two"),
        ([(["short", "pad"], [1])], "'short' has one port and cannot stand between two"),
    ],
)
def test_connections_that_cannot_be_made_are_refused(
    links: list[tuple[list[str], list[int]]], says: str
) -> None:
    """With what was asked and what there is."""
    with pytest.raises(NoSuchItem, match=says):
        _world().connect(links)


def test_a_refused_connection_changes_nothing() -> None:
    """What stood before stands still."""
    world = _world()
    world.connect([(["pad"], [1, 2])])
    with pytest.raises(NoSuchItem):
        world.connect([(["sling"], [1])])
    assert world.connection == "pad from port 1 to port 2"


def test_the_room_swings_slowly_about_its_mean() -> None:
    """Heating: a few tenths of a kelvin either way."""
    world, seen = _world(), []
    for _ in range(240):
        world.advance(30.0)
        seen.append(world.temperature())
    assert 0.4 < max(seen) - min(seen) < 1.0
    assert np.mean(seen) == pytest.approx(23.0, abs=0.1)
    assert max(abs(np.diff(seen))) < 0.05


def test_time_never_runs_backwards() -> None:
    """A negative wait is no wait."""
    world = _world()
    world.advance(5.0)
    world.advance(-3.0)
    assert world.time_s == 5.0
