"""Hook-ups: the words that prompts, plans, records and the rehearsal share."""

from __future__ import annotations

import pytest

from benchrun.hookup import Connection, Hookup


@pytest.mark.parametrize(
    ("items", "ports", "text"),
    [
        (("short",), (1,), "short on port 1"),
        (("adapter", "open"), (2,), "adapter, open on port 2"),
        (("thru",), (1, 2), "thru from port 1 to port 2"),
        (("jig-left", "unit", "jig-right"), (1, 2), "jig-left, unit, jig-right from port 1 to port 2"),
    ],
)
def test_a_connection_reads_as_a_hand_would_do_it(items, ports, text: str) -> None:
    assert Connection(items, ports).text == text


@pytest.mark.parametrize(("items", "ports"), [((), (1,)), (("short",), ()), (("short",), (1, 2, 3))])
def test_a_connection_needs_items_and_one_or_two_ports(items, ports) -> None:
    with pytest.raises(ValueError, match="items and one or two ports"):
        Connection(items, ports)


def test_of_is_the_common_case() -> None:
    assert Hookup.of("thru", 1, 2) == Hookup((Connection(("thru",), (1, 2)),))


def test_a_hookup_joins_its_connections() -> None:
    both = Hookup((Connection(("load",), (2,)), Connection(("load",), (1,))))
    assert both.text == "load on port 2 and load on port 1"
    assert both.ports == (1, 2)


def test_a_port_touched_twice_is_named_once() -> None:
    both = Hookup((Connection(("cable",), (1, 2)), Connection(("probe",), (1,))))
    assert both.ports == (1, 2)


def test_hookups_are_keys_and_sort() -> None:
    """Readings are kept under them, and plans list them in a fixed order."""
    one, two = Hookup.of("open", 1), Hookup.of("short", 1)
    assert {one: 1}[Hookup.of("open", 1)] == 1
    assert sorted([two, one]) == [one, two]


def test_a_hookup_cannot_be_changed() -> None:
    with pytest.raises(AttributeError):
        Hookup.of("open", 1).connections = ()  # type: ignore[misc]
