"""Figures of a tone, their uncertainty, and the file that keeps its readings."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.errors import CouldNotCheck
from benchrun.evaluate.network import combine
from benchrun.evaluate.readings import Levels, decode, encode, suffix
from benchrun.quantity import QuantityError
from benchrun.rf.figures import FIGURES
from benchrun.rf.tone import Tone
from benchrun.uncertainty.level import LevelTerms

F = 169.4e6 * np.arange(1.0, 4.0)


def amplifier(gain_db: float = 16.0, p1db_dbm: float = 20.0, most_dbm: float = 10.0) -> Tone:
    """A stage whose gain falls by exactly 1 dB where its output is ``p1db_dbm``: linear in output power."""
    level = np.linspace(-20.0, most_dbm, 301)
    drop = 10.0 ** ((level + gain_db - 1.0 - p1db_dbm) / 10.0)
    read = np.stack([level + gain_db - drop, level - 30.0, level - 45.0], -1)
    return Tone(level, read, np.full(301, 0.08))


def measure(name: str, tone: Tone, side: str = "at least", **parameters: float) -> float:
    return float(FIGURES[name].measure(F, tone, side, **parameters).value)


def test_gain_is_that_at_the_lowest_level() -> None:
    assert measure("tone gain", amplifier()) == pytest.approx(16.0, abs=5e-3)


def test_compression_by_its_definition() -> None:
    """1 dB below small-signal gain (common definition); the levels are interpolated."""
    assert measure("output compression", amplifier(), drop=1.0) == pytest.approx(20.0, abs=0.03)
    assert measure("input compression", amplifier(), drop=1.0) == pytest.approx(5.0, abs=0.03)


def test_without_compression_the_highest_level_is_a_bound() -> None:
    tone = amplifier(most_dbm=0.0)
    assert measure("output compression", tone, drop=1.0) == pytest.approx(float(tone.read_dbm[-1, 0]))
    assert FIGURES["output compression"].sides == ("at least",)


def test_the_strongest_harmonic_counts_and_says_where() -> None:
    found = FIGURES["harmonic level"].measure(F, amplifier(most_dbm=-10.0), "at most")
    assert float(found.value) == pytest.approx(-46.0, abs=0.05)
    assert float(found.at_hz) == 2 * 169.4e6


def test_supply_current_is_that_at_the_highest_level() -> None:
    assert measure("supply current", amplifier()) == 0.08


def test_figures_of_s_parameters_refuse_a_tone() -> None:
    with pytest.raises(TypeError, match="not from a tone"):
        FIGURES["insertion loss"].measure(F, amplifier(), "at most", over=(170e6, 400e6), trace="S21")


@pytest.mark.parametrize(
    ("figure", "terms", "expected"),
    [
        ("tone gain", LevelTerms(absolute=0.5), 0.0),
        ("tone gain", LevelTerms(linearity=0.05), 0.05 * np.sqrt(2)),
        ("output level", LevelTerms(absolute=0.5), 0.5),
        ("harmonic level", LevelTerms(response=0.3), 0.3),
        ("harmonic level", LevelTerms(linearity=0.05), 0.05 * np.sqrt(2)),
        ("supply current", LevelTerms(current=0.001), 0.001),
        ("output compression", LevelTerms(absolute=0.5), 0.5),
    ],
)
def test_each_source_counts_where_it_should(figure: str, terms: LevelTerms, expected: float) -> None:
    """GUM:1995, 5.1.2: what two readings share cancels in a difference, what they do not adds in squares."""
    tone = Tone(
        np.array([-10.0, 0.0, 6.0]), np.array([[6.0, -40.0], [15.5, -20.0], [20.0, -5.0]]), np.full(3, 0.08)
    )
    parameters = {"drop": 1.0} if "compression" in figure else {}
    kind = FIGURES[figure]
    nominal = float(kind.measure(F[:2], tone, "at least", **parameters).value)
    varied = terms.vary(tone)
    moved = kind.measure(F[:2], varied, "at least", **parameters).value
    assert float(combine(moved - nominal, len(moved))) == pytest.approx(expected, abs=1e-9)


def test_level_terms_are_read_with_their_units() -> None:
    assert LevelTerms.from_mapping({"current": "1 mA", "response": "0.3 dB"}) == LevelTerms(
        response=0.3, current=1e-3
    )
    with pytest.raises(QuantityError, match="no level term; known are absolute"):
        LevelTerms.from_mapping({"absolut": "0.1 dB"})
    with pytest.raises(QuantityError, match="not in A"):
        LevelTerms.from_mapping({"current": "1 dB"})


def test_levels_read_back_to_the_last_bit() -> None:
    levels = Levels(
        np.array([-10.0, 0.1]), np.array([[1 / 3, -40.0], [2 / 3, -30.0]]), np.array([0.08, np.nan])
    )
    again = decode(encode(F[:2], levels, "unit"), f"x{suffix(levels)}")
    assert isinstance(again, Levels)
    np.testing.assert_array_equal(again.read_dbm, levels.read_dbm)
    np.testing.assert_array_equal(again.supply_a, levels.supply_a)


@pytest.mark.parametrize(
    "raw", [b"", b"[]", b'{"source_dbm": [1]}', b'{"source_dbm": [1], "read_dbm": [1], "supply_a": [1]}']
)
def test_what_is_no_table_of_levels_is_refused(raw: bytes) -> None:
    with pytest.raises(CouldNotCheck, match=r"x\.json is no table of levels"):
        decode(raw, "x.json")
