"""A bench as a drawing in the terminal: what is plugged into what."""

from __future__ import annotations

from io import StringIO

from rich.console import Console, Group, RenderableType
from rich.markup import escape
from rich.panel import Panel
from rich.table import Table
from rich.text import Text

from sim_instruments.bench import SimulatedBench
from sim_instruments.scpi.instrument import Instrument
from sim_instruments.world import Link

__all__ = ["draw", "drawing", "owners"]

_COLD = 1 << 4
"""Bit of QUEStionable (temperature)."""


def drawing(bench: SimulatedBench) -> RenderableType:
    """The bench for a rich console: instruments, a row for each connection, what lies about."""
    world = bench.world
    with world.lock:
        standing, minutes = world.standing(), world.time_s / 60.0
        heading = f"{minutes:.1f} min, {world.temperature():.1f} °C"
        serial = world.serial
    rows: list[RenderableType] = []
    for link, switched in sorted(standing, key=lambda entry: entry[0].ports):
        rows.append(_row(link, serial, switched))
    busy = {port for link, _ in standing for port in link.ports}
    rows += [Text(f"port {port}  ──  nothing", style="dim") for port in world.ports if port not in busy]
    used = {item for link, _ in standing for item in link.items}
    lying = [name for name in world.items if name not in used]
    if serial and "unit" not in used:
        lying.append(f"unit {serial}")
    about = Table.grid(padding=(0, 2))
    for resource, instrument in bench.instruments.items():
        what = f"{resource}  {' '.join(instrument.identity[:3])}"
        about.add_row("instrument", escape(what + (", warming up" if is_cold(instrument) else "")))
    for port, whose in owners(bench).items():
        about.add_row(f"port {port}", escape(whose))
    about.add_row("on the table", escape(", ".join(lying) or "nothing"))
    for known, says in bench.serials.items():
        about.add_row("in the drawer", escape(f"{known}: {says}"))
    return Group(Panel(Group(*rows), title=heading, title_align="right", expand=False, padding=(1, 2)), about)


def owners(bench: SimulatedBench) -> dict[int, str]:
    """Whose each port is, in words."""
    outlets = getattr(bench.world, "outlets", {})
    return {
        port: " and ".join(outlets[port].owners if port in outlets else []) or "network analyzer"
        for port in bench.world.ports
    }


def is_cold(instrument: Instrument) -> bool:
    """Whether it says that it is still warming up."""
    instrument.status_byte(False)  # brings its conditions up to the bench's time
    return bool(instrument.status.questionable.condition & _COLD)


def _row(link: Link, serial: str, switched: bool) -> RenderableType:
    """One connection from left to right; a double line is a joint, a broken one a switch's cable."""
    row, joint = Table.grid(), "╌╌╌" if switched else "═══"
    cells: list[RenderableType] = [_middle(f"port {link.ports[0]} ")]
    for item in link.items:
        name = f"unit {serial}" if item == "unit" and serial else item
        cells += [_middle(joint), Panel(escape(name), expand=False, style="bold" if item == "unit" else "")]
    if len(link.ports) == 2:
        cells += [_middle(joint), _middle(f" port {link.ports[1]}")]
    row.add_row(*cells)
    return row


def _middle(text: str) -> Text:
    """At the height of the boxes' middle line."""
    return Text(f"\n{text}")


def draw(bench: SimulatedBench, width: int = 100, colour: bool = False) -> str:
    """The drawing as text.

    Parameters
    ----------
    width
        In characters.
    colour
        With terminal colours.

    Examples
    --------
    >>> from sim_instruments.bench import load_bench
    >>> bench = load_bench("workshop", 1)
    >>> bench.world.connect([(["short"], [1])])
    >>> "port 2  ──  nothing" in draw(bench)
    True
    """
    out = StringIO()
    console = Console(file=out, width=width, force_terminal=colour, color_system="auto" if colour else None)
    console.print(drawing(bench))
    return out.getvalue().rstrip("\n")
