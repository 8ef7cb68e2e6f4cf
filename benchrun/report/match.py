"""How matching networks are shown: a drawing from source to load, and what each is good for."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Sequence
from typing import TextIO

from rich.console import Console
from rich.table import Table
from rich.text import Text

from benchrun.quantity import Dimension, render
from benchrun.rf.design.choices import Choice
from benchrun.rf.design.parts import Branch, Element, Line, Stub

__all__ = ["as_json", "drawing", "show"]

_UNITS = {"coil": Dimension.INDUCTANCE, "capacitor": Dimension.CAPACITANCE, "resistor": Dimension.IMPEDANCE}


def drawing(elements: Iterable[Element], source: str, load: str) -> tuple[str, str, str]:
    r"""A network in three lines of text: the way through, the branches, the ground.

    Examples
    --------
    >>> from benchrun.rf.design import l_sections
    >>> ladder = l_sections(25 + 0j, 1e9)[0].real()
    >>> print("\n".join(drawing(ladder.elements, "50 ohm", "load")))
    50 ohm ----+----[3.9 nH]---- load
           [3.3 pF]
               |
    """
    top, middle, bottom = f"{source} --", "", ""
    for element in elements:
        value = _value(element)
        if isinstance(element, Line) or element.place == "series":
            top += f"--{value}--"
            continue
        joint = len(top) + 2
        start = max(joint - len(value) // 2, len(middle) + 1)
        joint = start + len(value) // 2
        top = top.ljust(joint, "-") + "+--"
        middle = middle.ljust(start) + value
        # A stub ends in itself, and needs no ground of ours.
        bottom = bottom.ljust(joint) + ("|" if isinstance(element, Branch) else " ")
    reach = max(len(top), len(middle) + 1 if len(middle) > len(top) else 0)
    return f"{top.ljust(reach, '-')}-- {load}", middle, bottom.rstrip()


def _value(element: Element) -> str:
    if isinstance(element, Branch):
        return "[" + ", ".join(render(part.value, _UNITS[part.kind]) for part in element.parts) + "]"
    line = element.line if isinstance(element, Stub) else element
    what = f"{element.end} stub " if isinstance(element, Stub) else "line "
    return f"[{what}{line.wavelengths:.3f} wavelengths]"


def show(choices: Sequence[Choice], load_ohm: complex, at_hz: float, vswr: float, stream: TextIO) -> None:
    """Print all choices.

    Parameters
    ----------
    choices
        The best first.
    load_ohm, at_hz, vswr
        What was asked.
    stream
        Where to.
    """
    console = Console(file=stream, highlight=False)
    if not console.is_terminal:
        console = Console(file=stream, highlight=False, width=120)
    sign = "-" if load_ohm.imag < 0 else "+"
    load = f"{load_ohm.real:.4g} {sign} {abs(load_ohm.imag):.4g}j ohm"
    frequency = render(at_hz, Dimension.FREQUENCY)
    console.print(Text(f"{load} at {frequency}, {len(choices)} ways to match it", style="bold"))
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="underline")
    for name in ("", "kind", "from source to load", "VSWR", f"band, VSWR {vswr:g}", "Q", "loss", "yield"):
        table.add_column(name, justify="left" if name in ("kind", "from source to load") else "right")
    for number, one in enumerate(choices, 1):
        table.add_row(
            str(number), one.kind, one.ladder.name, _ratio(one.vswr), _band(one), f"{one.q:.1f}",
            f"{one.loss_db:.2f} dB", f"{100 * one.good:.0f} %",
        )  # fmt: skip
    console.print(table)
    for number, one in enumerate(choices, 1):
        console.print()
        console.print(Text(f"{number}. {one.kind}: {one.ladder.name}"))
        for text in drawing(one.ladder.elements, f"{one.ladder.source_ohm:g} ohm", "load"):
            if text.strip():
                console.print(Text(f"   {text}"), soft_wrap=True)
    console.print()
    console.print(
        Text("A choice is proven by a sweep: build it, and judge its VSWR with a sequence."), soft_wrap=True
    )


def _ratio(vswr: float) -> str:
    return f"{vswr:.2f}" if vswr < 100 else "over 100"


def _band(one: Choice) -> str:
    if math.isnan(one.low_hz) and math.isnan(one.high_hz):
        return "all that is known" if one.good > 0.5 else "none"
    low = "below" if math.isnan(one.low_hz) else render(one.low_hz, Dimension.FREQUENCY)
    high = "above" if math.isnan(one.high_hz) else render(one.high_hz, Dimension.FREQUENCY)
    return f"{low} to {high}"


def as_json(choices: Sequence[Choice], load_ohm: complex, at_hz: float, vswr: float) -> str:
    """The same for programs, in SI units; null where the load's data do not reach."""

    def edge(value: float) -> float | None:
        return value if math.isfinite(value) else None

    return json.dumps(
        {
            "load_ohm": [load_ohm.real, load_ohm.imag],
            "at_hz": at_hz,
            "vswr": vswr,
            "choices": [
                {
                    "kind": one.kind,
                    "name": one.ladder.name,
                    "elements": [_element(element) for element in one.ladder.elements],
                    "vswr": edge(one.vswr),
                    "low_hz": edge(one.low_hz),
                    "high_hz": edge(one.high_hz),
                    "q": one.q,
                    "loss_db": one.loss_db,
                    "yield": one.good,
                }
                for one in choices
            ],
        }
    )


def _element(element: Element) -> dict[str, object]:
    if isinstance(element, Branch):
        (part,) = element.parts  # matching networks have one part a branch
        unit = _UNITS[part.kind].unit
        return {"place": element.place, "part": part.kind, "value": part.value, "unit": unit,
                "tolerance": part.tolerance}  # fmt: skip
    line = element.line if isinstance(element, Stub) else element
    found: dict[str, object] = {"wavelengths": line.wavelengths, "z_ohm": line.z_ohm}
    if isinstance(element, Stub):
        return {"place": element.place, "part": f"{element.end} stub", **found}
    return {"place": "series", "part": "line", **found}
