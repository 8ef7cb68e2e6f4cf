"""The README's tables say what the registries hold, neither more nor less."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest

import sim_instruments
from sim_instruments.bench import load_bench
from sim_instruments.draws import Draws
from sim_instruments.faults import FAULTS, PART_FAULTS
from sim_instruments.instruments.kinds import KINDS as INSTRUMENTS
from sim_instruments.parts import KINDS as PARTS
from sim_instruments.parts import build

README = (Path(sim_instruments.__file__).parent / "README.md").read_text(encoding="utf-8")
SECTIONS = {
    "Network analyzer": ("GPIB0::16::INSTR",),
    "Signal generator": ("GPIB0::19::INSTR",),
    "Spectrum analyzer": ("GPIB0::22::INSTR", "GPIB0::23::INSTR"),
    "Supply": ("GPIB0::5::INSTR",),
    "Power meter": ("GPIB0::13::INSTR",),
    "Switch matrix": ("GPIB0::9::INSTR",),
    "Thermometer": ("GPIB0::30::INSTR",),
}
"""Instruments of the amplifier's bench that between them have all commands of a section."""


def _rows(after: str) -> list[list[str]]:
    """Cells of the first table behind some words, without its head."""
    lines = README[README.index(after) :].splitlines()
    start = next(k for k, line in enumerate(lines) if line.startswith("|---"))
    rows = []
    for line in lines[start + 1 :]:
        if not line.startswith("|"):
            break
        rows.append([cell.strip() for cell in line.strip("|").split("|")])
    return rows


def _quoted(cell: str) -> list[str]:
    return re.findall(r"`([^`]+)`", cell)


@pytest.fixture(scope="module")
def bench():
    return load_bench("amplifier", 1)


@pytest.mark.parametrize("section", SECTIONS)
def test_the_commands_are_those_of_the_instruments(bench, section: str) -> None:
    """Every header of the tree, and none besides."""
    told = [header for row in _rows(f"### {section}\n") for header in _quoted(row[0])]
    known = {h for name in SECTIONS[section] for h in bench.instruments[name].tree.headers}
    assert sorted(told) == sorted(h for h in known if not h.startswith(("STATus", "SYSTem")))


def test_every_fault_stands_there_with_what_is_seen() -> None:
    """Name, place and words, in the order of the registry."""
    rows = [(_quoted(row[0])[0], *row[1:]) for row in _rows("## What can go wrong")]
    assert rows == [(f.name, f.where, f.seen.replace("``", "`")) for f in FAULTS.values()]


def test_every_fault_of_a_part_stands_there_with_what_is_seen() -> None:
    """Words, parts and what is seen."""
    rows = [(_quoted(row[0])[0], *row[1:]) for row in _rows("Faults of the unit are put in")]
    assert rows == [(f.words, ", ".join(f.kinds) or "all", f.seen) for f in PART_FAULTS]


def _known_keys(spec: Mapping[str, Any]) -> set[str]:
    """Keys that a part takes, from what it says when given another."""
    with pytest.raises(ValueError, match="does not know 'sad'") as caught:
        build({**spec, "sad": 1}, Draws(1))
    return set(str(caught.value).partition("known are ")[2].split(", "))


@pytest.mark.parametrize("kind", PARTS)
def test_every_kind_of_part_stands_there_with_its_keys(kind: str) -> None:
    """No key is forgotten."""
    (row,) = [row for row in _rows("| kind of part |") if _quoted(row[0]) == [kind]]
    told = _quoted(row[1])
    if kind == "cable":  # what else it takes are the keys of one section of a line
        (line,) = [line for line in _rows("| kind of part |") if _quoted(line[0]) == ["line"]]
        told += _quoted(line[1])
    assert _known_keys({"kind": kind}) <= set(told)


def test_every_kind_of_instrument_stands_there() -> None:
    """Those of the table of kinds, and the two analyzers."""
    kinds = [_quoted(row[0])[0] for row in _rows("| kind of instrument |")]
    assert sorted(kinds) == sorted([*INSTRUMENTS, "network analyzer", "recorded readings"])


@pytest.mark.parametrize("key", ["limts", "reciever"])
def test_a_slip_of_the_pen_in_an_analyzer_is_refused(tmp_path: Path, key: str) -> None:
    """It would pass for a default."""
    text = (Path(sim_instruments.__file__).parent / "benches" / "workshop.yaml").read_text(encoding="utf-8")
    (tmp_path / "b.yaml").write_text(text.replace("    limits:", f"    {key}:", 1), encoding="utf-8")
    with pytest.raises(ValueError, match=f"a network analyzer has no '{key}'"):
        load_bench(str(tmp_path / "b.yaml"), 1)
