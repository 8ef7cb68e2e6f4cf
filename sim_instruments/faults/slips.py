# ruff: noqa: ARG001 - every slip is asked for with the world, and some need nothing of it
"""Hands that slip, and a room that changes. What each function says is what a careful engineer would see."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

from sim_instruments.hands import TURNED, Link, Slip
from sim_instruments.world import World

__all__ = [
    "cable_moved", "connected_late", "drift", "fixture_left_out", "loose_connection", "nothing_connected",
    "open_for_short", "temperature_step", "unit_reversed", "wrong_port", "wrong_standard",
]  # fmt: skip

Links = tuple[Link, ...]


def _items(change: Callable[[tuple[str, ...]], tuple[str, ...]]) -> Callable[[Links], Links]:
    """A change of the items of each link; a link that is left without any is not made."""

    def links(asked: Links) -> Links:
        changed = (replace(link, items=change(link.items)) for link in asked)
        return tuple(link for link in changed if link.items)

    return links


def _standards(world: World) -> list[str]:
    return sorted(name for name, part in world.items.items() if part.kind == "standard" and part.ports == 1)


def wrong_standard(world: World) -> Slip:
    """Another standard than was asked for.

    Corrected readings of the three do not fit together: the unit looks active, or lossy beyond reason.
    """
    known = _standards(world)

    def change(items: tuple[str, ...]) -> tuple[str, ...]:
        return tuple(
            known[(known.index(i) + 1) % len(known)] if i in known and len(known) > 1 else i for i in items
        )

    return Slip(_items(change))


def open_for_short(world: World) -> Slip:
    """An open where the short belongs.

    Every reading of the calibration is a large reflection, but the solved directivity and source match are
    far from what the analyzer ever had.
    """

    def change(items: tuple[str, ...]) -> tuple[str, ...]:
        return tuple("open" if item == "short" else item for item in items)

    return Slip(_items(change))


def loose_connection(world: World) -> Slip:
    """The first joint is not tightened.

    A reflection of some percent, a contact resistance that is another at every sweep, figures that do not
    repeat.
    """
    return Slip(loose=True)


def wrong_port(world: World) -> Slip:
    """What belongs on one port hangs on the other: the port that is read shows an open connector."""

    def change(asked: Links) -> Links:
        if any(len(link.ports) != 1 for link in asked):
            return asked
        return tuple(replace(link, ports=(3 - link.ports[0],)) for link in asked)

    return Slip(change)


def unit_reversed(world: World) -> Slip:
    """The unit stands with its port 2 at port 1: S11 and S22 change places, which a symmetric one hides."""

    def change(items: tuple[str, ...]) -> tuple[str, ...]:
        two = any(item == "unit" and world.part(item).ports == 2 for item in items)
        return tuple(f"{item}{TURNED}" if item == "unit" and two else item for item in items)

    return Slip(_items(change))


def nothing_connected(world: World) -> Slip:
    """Nothing was connected: both ports show open connectors, transmission is noise and leakage."""
    return Slip(lambda _: ())


def fixture_left_out(world: World) -> Slip:
    """The unit without its jig.

    De-embedding takes away what is not there, so that phase runs backwards and loss comes out too small.
    """

    def change(items: tuple[str, ...]) -> tuple[str, ...]:
        return tuple(item for item in items if not _fixture(world, item))

    return Slip(_items(change))


def _fixture(world: World, item: str) -> bool:
    return item in world.items and world.items[item].kind == "fixture"


def connected_late(world: World) -> Slip:
    """Hands say "done" a minute and a half too early: the next sweep reads what hung there before."""
    return Slip(late_s=90.0)


def cable_moved(world: World) -> Slip:
    """When the unit goes in, the test cables are bent.

    Phases are off by up to some degrees at 1 GHz, magnitudes hardly.
    """
    return Slip(then=world.move_cables, only="unit")


def temperature_step(world: World) -> Slip:
    """A door opens: within some minutes the room is 6 K warmer, and phases drift with the cables."""
    return Slip(then=lambda: world.step_temperature(6.0))


def drift(world: World) -> None:
    """The room warms by 4 K an hour: what was calibrated an hour ago is off by more than when it was new."""
    world.drift_k_h += 4.0
