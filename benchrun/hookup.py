"""What hands are asked to connect: the words shared by prompts, plans, records and the rehearsal.

A connection is a chain of named items from one port to another (or hanging on one port). A hook-up
is everything that must stand at the same time for one reading.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Connection", "Hookup"]


@dataclass(frozen=True, slots=True, order=True)
class Connection:
    """A chain of items on one port, or from one port to another.

    Parameters
    ----------
    items
        Names in order, from the first port on: ``("short",)``, ``("jig-left", "unit", "jig-right")``.
    ports
        One port number, or two.

    Examples
    --------
    >>> Connection(("short",), (1,)).text
    'short on port 1'
    >>> Connection(("jig-left", "unit", "jig-right"), (1, 2)).text
    'jig-left, unit, jig-right from port 1 to port 2'
    """

    items: tuple[str, ...]
    ports: tuple[int, ...]

    def __post_init__(self) -> None:
        if not self.items or len(self.ports) not in (1, 2):
            raise ValueError(
                f"a connection needs items and one or two ports, got {self.items} on {self.ports}"
            )

    @property
    def text(self) -> str:
        """The connection in words."""
        chain = ", ".join(self.items)
        if len(self.ports) == 1:
            return f"{chain} on port {self.ports[0]}"
        return f"{chain} from port {self.ports[0]} to port {self.ports[1]}"


@dataclass(frozen=True, slots=True, order=True)
class Hookup:
    """Everything that must be connected at once for one reading.

    Examples
    --------
    >>> Hookup.of("load", 1).text
    'load on port 1'
    >>> Hookup((Connection(("load",), (1,)), Connection(("load",), (2,)))).text
    'load on port 1 and load on port 2'
    """

    connections: tuple[Connection, ...]

    @classmethod
    def of(cls, item: str, *ports: int) -> Hookup:
        """One item on one port, or between two."""
        return cls((Connection((item,), ports),))

    @property
    def ports(self) -> tuple[int, ...]:
        """All ports that the hook-up touches, in order."""
        return tuple(sorted({p for c in self.connections for p in c.ports}))

    @property
    def text(self) -> str:
        """The hook-up in words; also the name under which its reading is kept."""
        return " and ".join(c.text for c in self.connections)
