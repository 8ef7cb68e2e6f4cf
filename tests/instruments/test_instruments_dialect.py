"""Dialect files: slips are told at their place."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from benchrun.errors import InputError, Problem
from benchrun.instruments import dialect as room
from benchrun.instruments.dialect import load_dialect

INSTALLED = Path(room.__file__).parent / "dialects"
TEXT = (INSTALLED / "one-reading.yaml").read_text()


@pytest.mark.parametrize("name", ["one-reading", "whole-matrix"])
def test_installed_dialects_are_good(name):
    assert load_dialect(name).dialect == name


@pytest.mark.parametrize("name", ["one-readin", "../dialects/one-reading", "", "x" * 5000])
def test_an_unknown_dialect_is_told_where_it_was_used(name):
    with pytest.raises(InputError, match=r"^bench\.yaml:7:14: there is no dialect"):
        load_dialect(name, place=Problem("", "bench.yaml", 7, 14))


def test_the_nearest_dialect_is_offered():
    with pytest.raises(InputError, match=re.escape("Did you mean 'one-reading'?")):
        load_dialect("one-readng")


@pytest.mark.parametrize(
    ("old", "new", "where", "message"),
    [
        (
            "{start_hz}",
            "{begin_hz}",
            '"SENSe:FREQuency:STARt',
            "holds the placeholder {begin_hz}; allowed here are averages",
        ),
        ("{start_hz}", "{receiver}", '"SENSe:FREQuency:STARt', "holds the placeholder {receiver}; allowed"),
        ("{start_hz}", "{start_hz:>99999999}", '"SENSe:FREQuency:STARt', "holds the placeholder {start_hz}"),
        ("{start_hz}", "{start_hz", '"SENSe:FREQuency:STARt', "expected '}'"),
        ("CALCulate:DATA?", "CALC:DATA? {points}", "", "allowed here are receiver, source"),
        ('"ABORt"', '"ABORt {points}"', "", "none is allowed here"),
        ('"ABORt"', '"ABORT°"', "", "cannot be sent in one message"),
        ("preset:", "prset:", "prset", "Did you mean 'preset'?"),
        ("  values:", "  vlaues:", "vlaues", "Did you mean 'values'?"),
        ("wait: condition, condition:", "wait: condition, conditions:", "", "Did you mean 'condition'?"),
        ('condition: "STATus:OPERation:CONDition?", ', "", "condition, bit", "needs `condition`"),
        ("S12, S22", "S12, S12", "[S11", "each of S11, S21, S12, S22 once"),
        ("how: one by one", "how: all at once", "all at once", "leaves nothing for {receiver}"),
        ("{receiver},{source}", "1,2", "one by one", "says which reading is meant"),
        ("form: REAL,32 SWAPped", "form: REAL,32", "REAL", "form: 'REAL,32' is not known"),
    ],
)
def test_a_slip_is_told_at_its_place(tmp_path, old, new, where, message):
    text = TEXT.replace(old, new, 1)
    assert text != TEXT
    (tmp_path / "one-reading.yaml").write_text(text)
    with pytest.raises(InputError) as caught:
        load_dialect("one-reading", tmp_path)
    problem = next(p for p in caught.value.problems if message in str(p))
    assert problem.file.endswith("one-reading.yaml")
    assert text.split("\n")[problem.line - 1][problem.column - 1 :].startswith(where)
