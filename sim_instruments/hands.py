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
        ``(links asked, draws) -> links made``; the same links: this slip does not fit what was asked.
    loose
        The joints are left loose.
    late_s
        The connection stands only so much later than it was said to.
    """

    change: Callable[[tuple[Link, ...], Draws], tuple[Link, ...]] | None = None
    loose: bool = False
    late_s: float = 0.0

    def fits(self, asked: tuple[Link, ...], draws: Draws) -> bool:
        """Whether it can happen to this connection."""
        if self.change is not None:
            return self.change(asked, draws) != asked
        return bool(asked)


@dataclass
class Hands:
    """The operator's hands.

    Parameters
    ----------
    draws
        Chance.
    slip
        What goes wrong when ``when`` says so.
    when
        Told at each connection that the slip fits; whether it happens.
    """

    draws: Draws
    slip: Slip | None = None
    when: Callable[[], bool] = field(default=lambda: False)

    def make(self, asked: tuple[Link, ...]) -> tuple[tuple[Link, ...], Slip | None]:
        """What is connected in the end, and the slip that made it so."""
        if self.slip is None or not self.slip.fits(asked, self.draws) or not self.when():
            return asked, None
        change = self.slip.change
        return (change(asked, self.draws) if change else asked), self.slip

    def loosened(self, joint: Joint, draws: Draws) -> Joint:
        """A joint that was left hand-tight or less: a gap, and a contact that wanders."""
        return replace(
            joint,
            size=abs(draws.uniform("gap", 0.03, 0.08)),
            contact_ohm=draws.uniform("contact", 0.8, 4.0),
        )
