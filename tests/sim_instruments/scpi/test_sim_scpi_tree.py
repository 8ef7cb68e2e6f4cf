"""The command tree: forms, optional nodes, suffixes (SCPI-1999 Vol. 1, 6.2, from memory)."""

from __future__ import annotations

import pytest

from sim_instruments.scpi.errors import ScpiError
from sim_instruments.scpi.tree import Command, Tree


@pytest.fixture
def tree() -> Tree:
    tree = Tree()
    for header in (
        "[SENSe<2>]:FREQuency[:CW]",
        "[SENSe<2>]:FREQuency:STARt",
        "INITiate[:IMMediate][:ALL]",
        "INITiate:CONTinuous",
        "SYSTem:ERRor[:NEXT]",
        "SYSTem:ERRor:ALL",
    ):
        tree.add(header, Command(get=lambda _, header=header: header))
    return tree


@pytest.mark.parametrize(
    ("written", "header"),
    [
        ("FREQ", "[SENSe<2>]:FREQuency[:CW]"),
        ("frequency:cw", "[SENSe<2>]:FREQuency[:CW]"),
        ("SENS:FREQ", "[SENSe<2>]:FREQuency[:CW]"),
        ("SENSE1:FREQUENCY:STAR", "[SENSe<2>]:FREQuency:STARt"),
        ("sens2:Freq:Start", "[SENSe<2>]:FREQuency:STARt"),
        ("INIT", "INITiate[:IMMediate][:ALL]"),
        ("INIT:ALL", "INITiate[:IMMediate][:ALL]"),
        ("INIT:IMM:ALL", "INITiate[:IMMediate][:ALL]"),
        ("INIT:CONT", "INITiate:CONTinuous"),
        ("SYST:ERR", "SYSTem:ERRor[:NEXT]"),
        ("SYST:ERR:NEXT", "SYSTem:ERRor[:NEXT]"),
        ("SYST:ERR:ALL", "SYSTem:ERRor:ALL"),
    ],
)
def test_a_header_is_found_in_every_form(tree, written, header):
    assert tree.find(tuple(written.split(":")), ()).get(()) == header


@pytest.mark.parametrize(
    ("written", "code"),
    [
        ("FREQU", -113), ("FRE", -113), ("SENS", -113), ("SENS:FREQ:STARTS", -113), ("FREQ:STAR:CW", -113),
        ("IMM", -113), ("SENS0:FREQ", -114), ("SENS3:FREQ", -114), ("FREQ2:STAR", -114), ("INIT2", -114),
        ("SENS" + "9" * 5000 + ":FREQ", -114),
    ],
)  # fmt: skip
def test_what_is_not_there_says_so(tree, written, code):
    with pytest.raises(ScpiError) as caught:
        tree.find(tuple(written.split(":")), ())
    assert caught.value.number == code


def test_a_path_goes_before(tree):
    assert tree.find(("STAR",), ("SENS", "FREQ")).get(()) == "[SENSe<2>]:FREQuency:STARt"


def test_another_command_takes_the_place_of_the_first(tree):
    assert tree.find(("INIT", "CONT"), ()).get(()) == "INITiate:CONTinuous"
    tree.add("INITiate:CONTinuous", Command(get=lambda _: "new"))
    assert tree.find(("INIT", "CONT"), ()).get(()) == "new"


def test_invented_spellings_are_not_kept_for_ever(tree):
    for n in range(3000):
        tree.find((f"SENS{'0' * (n % 8)}1", "FREQ" if n % 2 else "FREQUENCY"), ())
        tree.find(("".join(c.upper() if n >> i & 1 else c for i, c in enumerate("frequency")),), ())
    assert len(tree._known) <= 1001
