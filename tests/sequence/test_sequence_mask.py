"""Mask files: corridors, slopes, levels straight in magnitude, lines that count from something measured."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.errors import InputError
from benchrun.sequence.checks import check_masks
from benchrun.sequence.schema import schema

HEAD = "mask: m\nedition: 1\ntitle: T\nlines:\n"


def lines(load_text, text):
    return load_text(HEAD + text, "mask").model.build().lines


def test_a_corridor_is_a_line_on_either_side(load_text):
    low, high = lines(
        load_text, "  - {between: [[1 GHz, -3 dB, 1 dB], [2 GHz, -5 dB, 0 dB]], spacing: log}\n"
    )
    assert (low.side, high.side, low.spacing) == ("at least", "at most", "log")
    middle = np.array([np.sqrt(2.0) * 1e9])
    assert low.limit_at(middle)[0] == pytest.approx(-4.0)
    assert high.limit_at(middle)[0] == pytest.approx(0.5)


@pytest.mark.parametrize(("per", "end"), [("decade", -40.0), ("octave", -30.0 - 10.0 * np.log2(10.0))])
def test_a_slope_continues_the_last_corner(load_text, per, end):
    slope = f"{{slope: -10 dB, per: {per}, to: 1 GHz}}"
    text = f"  - {{side: at most, through: [[100 MHz, -30 dB]], then: {slope}}}\n"
    (line,) = lines(load_text, text)
    assert line.limit_at(np.array([1e8, 1e9])) == pytest.approx([-30.0, end])


def test_levels_straight_in_magnitude(load_text):
    text = "  - {side: at most, levels: magnitude, through: [[1 GHz, 0 dB], [3 GHz, -20 dB]]}\n"
    (line,) = lines(load_text, text)
    assert line.limit_at(np.array([2e9]))[0] == pytest.approx(20.0 * np.log10(0.55))


@pytest.mark.parametrize(
    ("line", "expected"),
    [
        ("{side: at most}", "6:5: has `through` (a line) and `between` (a corridor) both or not at all"),
        ("{through: [[1 GHz, 0 dB], [2 GHz, 0 dB]]}", "5:5: has no `side`"),
        ("{side: at most, through: [[1 GHz, 0 dB]]}", "a line needs two, or a slope"),
        ("{side: at most, through: [[1 GHz, 0 dB], [1 GHz, -9 dB]]}", "all its corners are at 1 GHz"),
        ("{between: [[2 GHz, 0 dB, 1 dB], [1 GHz, 0 dB, 1 dB]]}", "goes backwards from 2 GHz to 1 GHz"),
        ("{between: [[1 GHz, 2 dB, 1 dB], [2 GHz, 0 dB, 1 dB]]}", "the corridor is closed at 1 GHz"),
        (
            "{side: at most, between: [[1 GHz, 0 dB, 1 dB], [2 GHz, 0 dB, 1 dB]]}",
            "means nothing for a corridor",
        ),
        (
            "{side: at most, through: [[1 GHz, 0 dB]], then: {slope: -9 dB, per: octave, to: 1 GHz}}",
            "the slope goes backwards from 1 GHz to 1 GHz",
        ),
        (
            "{side: at most, spacing: linear, through: [[1 GHz, 0 dB]], "
            "then: {slope: -9 dB, per: octave, to: 2 GHz}}",
            "write `spacing: log`",
        ),
        (
            "{side: at most, levels: magnitude, through: [[1 GHz, 0 dB]], "
            "then: {slope: -9 dB, per: octave, to: 2 GHz}}",
            "write `levels: dB`",
        ),
        (
            "{side: at most, relative to: peak, through: [[1 GHz, -1 dB], [2 GHz, 0 dB]]}",
            "over the trace's own peak is never exceeded",
        ),
        (
            "{side: at most, levels: log, through: [[1 GHz, 0 dB], [2 GHz, 0 dB]]}",
            "levels: 'log' is not allowed here",
        ),
    ],
)
def test_lines_that_make_no_sense_are_refused_at_their_place(load_text, line, expected):
    with pytest.raises(InputError) as caught:
        load_text(f"{HEAD}  - {line}\n", "mask")
    assert expected.split(": ", 1)[-1] in str(caught.value)
    assert "f.yaml:5:" in str(caught.value)


def test_lines_cross_only_with_what_counts_from_the_same(load_text):
    text = "  - {{side: at most, {0}through: [[1 GHz, -9 dB], [2 GHz, -9 dB]]}}\n"
    text += "  - {{side: at least, {1}through: [[1 GHz, -5 dB], [2 GHz, -5 dB]]}}\n"
    assert len(lines(load_text, text.format("relative to: peak, ", ""))) == 2
    with pytest.raises(InputError, match="lines cross near 1 GHz"):
        lines(load_text, text.format("relative to: peak, ", "relative to: peak, "))


RELATIVE = HEAD + "  - {side: at most, relative to: figure, through: [[10 MHz, -9 dB], [1 GHz, -9 dB]]}\n"
ABSOLUTE = RELATIVE.replace("relative to: figure, ", "")


@pytest.mark.parametrize(
    ("mask", "reference", "expected"),
    [
        (RELATIVE, "", "mask stop counts from a figure, but the limit names none"),
        (RELATIVE, ", reference: {figure: insertion loss, at: 169 MHz}", ""),
        (ABSOLUTE, ", reference: {figure: insertion loss, at: 169 MHz}", "mask stop counts from no figure"),
        (RELATIVE, ", reference: {figure: insertion loss, at: 2 GHz}", "reference of the mask lies at 2 GHz"),
    ],
)
def test_what_a_mask_counts_from_is_named_in_its_limit(load_text, good, mask, reference, expected):
    loaded = load_text(good.replace("mask: stop}", f"mask: stop{reference}}}"))
    problems = check_masks(loaded, {"stop": load_text(mask, "mask").model.build()})
    assert [expected in str(p) for p in problems] == ([True] if expected else [])


@pytest.mark.parametrize("figure", ["corner frequency, drop: 3 dB", "insertion loss, over: 10 MHz to 20 MHz"])
def test_only_a_level_at_one_frequency_can_be_counted_from(load_text, good, figure):
    with pytest.raises(InputError, match="`reference` needs a level at one frequency"):
        load_text(good.replace("mask: stop}", f"mask: stop, reference: {{figure: {figure}}}}}"))


def test_an_editor_is_told_of_the_keys():
    from benchrun.sequence.mask import MaskFile

    keys = schema(MaskFile)["$defs"]["Line"]["properties"]
    assert {"between", "then", "levels", "relative to"} <= set(keys)
