"""Hands: they make the connections that were asked for, and now and then others."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

from sim_instruments.draws import Draws

__all__ = ["TURNED", "Hands", "Joint", "Link", "Slip"]

TURNED = " turned round"
"""Follows the name of an item that stands with port 2 first."""


@dataclass(frozen=True)
class Link:
    """Items in a row, from one port to another or hanging on one port."""

    items: tuple[str, ...]
    ports: tuple[int, ...]

    @property
    def text(self) -> str:
        """In words."""
        row = ", ".join(self.items)
        if len(self.ports) == 1:
            return f"{row} on port {self.ports[0]}"
        return f"{row} from port {self.ports[0]} to port {self.ports[1]}"


@dataclass(frozen=True)
class Joint:
    """One made connection.

    Parameters
    ----------
    size
        Reflection at 1 GHz, linear.
    angle
        Its phasor.
    contact_ohm
        In line with it, if it is loose.
    """

    size: float
    angle: complex
    contact_ohm: float = 0.0


@dataclass(frozen=True)
class Slip:
    """Something that hands do instead of what was asked.

    Parameters
    ----------
    change
        ``links asked -> links made``; the same links: this slip does not fit what was asked.
    loose
        The joints are left loose.
    late_s
        The connection stands only so much later than it was said to.
    then
        What else happens when the connection is made.
    only
        It fits only connections with this item.
    """

    change: Callable[[tuple[Link, ...]], tuple[Link, ...]] | None = None
    loose: bool = False
    late_s: float = 0.0
    then: Callable[[], None] | None = None
    only: str = ""

    def fits(self, asked: tuple[Link, ...]) -> bool:
        """Whether it can happen to this connection."""
        if self.only and not any(self.only in link.items for link in asked):
            return False
        if self.change is not None:
            return self.change(asked) != asked
        return bool(asked)


@dataclass
class Hands:
    """The operator's hands.

    Parameters
    ----------
    slips
        What can go wrong, each with what says whether it does, asked at each connection that it fits; the
        first that happens is the one.
    """

    slips: list[tuple[Slip, Callable[[], bool]]] = field(default_factory=list)

    def make(self, asked: tuple[Link, ...]) -> tuple[tuple[Link, ...], Slip | None]:
        """What is connected in the end, and the slip that made it so."""
        for slip, when in self.slips:
            if slip.fits(asked) and when():
                return (slip.change(asked) if slip.change else asked), slip
        return asked, None

    def loosened(self, joint: Joint, draws: Draws) -> Joint:
        """A joint that was left hand-tight or less: a gap, and a contact that wanders."""
        return replace(
            joint,
            size=abs(draws.uniform("gap", 0.03, 0.08)),
            contact_ohm=draws.uniform("contact", 0.8, 4.0),
        )
