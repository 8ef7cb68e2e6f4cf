"""Corridors, slopes, relative lines, and the worst point by margin and by margin over uncertainty."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from benchrun.rf.masks import Mask, MaskLine, band_mask, slope_line, worst_point

GRID = np.arange(1.0, 11.0) * 1e6


def line(side: str, *corners: tuple[float, float], **extra: str) -> MaskLine:
    f, level = np.array(corners, dtype=float).T
    return MaskLine(side, f, level, **extra)


def test_a_line_may_be_straight_in_magnitude() -> None:
    """Halfway between 0 dB and 1/10 (-20 dB) on a linear axis is 0.55."""
    drawn = line("at most", (1e6, 0.0), (3e6, -20.0), levels="magnitude")
    assert_allclose(drawn.limit_at(np.array([1e6, 2e6, 3e6])), [0.0, 20 * np.log10(0.55), -20.0], atol=1e-12)


@pytest.mark.parametrize(("every", "level"), [("decade", -20.0), ("octave", -20.0 * np.log2(10))])
def test_a_slope_falls_by_the_decade_or_octave(every: str, level: float) -> None:
    drawn = slope_line("at most", [(1e5, -1.0), (1e6, 0.0)], 1e7, -20.0, every)
    assert_allclose(drawn.limit_at(np.array([1e5, 1e6, 1e7])), [-1.0, 0.0, level], rtol=1e-12)
    middle = drawn.limit_at(np.array([2e6]))[0]
    assert_allclose(middle, level * np.log10(2), rtol=1e-12)


@pytest.mark.parametrize(
    ("points", "last", "every", "said"),
    [
        ([(1e6, 0.0)], 1e7, "century", "per 'decade' or 'octave', not per 'century'"),
        ([(1e6, 0.0)], 1e6, "decade", "does not go up from above 0 Hz"),
        ([(0.0, 0.0)], 1e6, "decade", "does not go up from above 0 Hz"),
    ],
)
def test_a_slope_that_cannot_be_drawn(points, last: float, every: str, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        slope_line("at most", points, last, -20.0, every)


@pytest.mark.parametrize(
    ("extra", "said"),
    [
        ({"levels": "watt"}, "levels of a mask line is 'watt'; allowed are 'dB', 'magnitude'"),
        ({"spacing": "cubic"}, "spacing of a mask line is 'cubic'"),
        ({"relative_to": "noise"}, "relative_to of a mask line is 'noise'"),
    ],
)
def test_an_unknown_word_is_named_with_what_is_allowed(extra, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        line("at most", (1e6, 0.0), (2e6, 0.0), **extra)
    with pytest.raises(ValueError, match="side of a mask line is 'below'"):
        line("below", (1e6, 0.0), (2e6, 0.0))


def test_every_corner_needs_a_number() -> None:
    with pytest.raises(ValueError, match="a finite number, at each"):
        line("at most", (1e6, 0.0), (2e6, np.nan))
    with pytest.raises(ValueError, match="a finite number, at each"):
        MaskLine("at most", np.array([1e6, 2e6]), np.array([1.0]))


def test_a_corridor_is_two_lines() -> None:
    f, lower, upper = np.array([2e6, 5e6]), np.array([-2.0, -3.0]), np.array([0.0, -1.0])
    mask = band_mask("pass band", f, lower, upper)
    assert [x.side for x in mask.lines] == ["at least", "at most"]
    assert_array_equal(mask.lines[0].level_db, lower)
    assert_array_equal(mask.lines[1].level_db, upper)
    assert mask.band == (2e6, 5e6)
    with pytest.raises(ValueError, match=r"closed at 5e\+06 Hz: at least 1 dB and at most -1 dB"):
        band_mask("pass band", f, np.array([-2.0, 1.0]), upper)


def test_a_relative_mask_moves_with_its_reference() -> None:
    fixed = line("at most", (1e6, 1.0), (10e6, 1.0))
    mask = Mask("m", (line("at least", (1e6, -3.0), (10e6, -3.0), relative_to="figure"), fixed))
    moved = mask.resolved(-7.5)
    assert_array_equal(moved.lines[0].level_db, [-10.5, -10.5])
    assert moved.lines[0].relative_to == ""
    assert moved.lines[1] is fixed


def test_the_worst_point_of_a_trace() -> None:
    """The least margin, at a sample."""
    level = np.array([-9.0, -8, -7, -3, -5, -6, -6, -6, -6, -6])
    found = worst_point(line("at most", (1e6, 0.0), (10e6, -4.5)), GRID, level)
    # Margins at 4 MHz: -1.5 + 3 = 1.5; at 10 MHz: -4.5 + 6 = 1.5; at 4 MHz first.
    assert_allclose([found.f_hz, found.level_db, found.limit_db, found.margin_db], [4e6, -3.0, -1.5, 1.5])
    assert np.isnan(found.ratio)


def test_a_corner_between_samples_counts() -> None:
    """A step at 4.5 MHz: the trace there, by its own interpolation, against the stricter level."""
    drawn = line("at most", (1e6, 0.0), (4.5e6, 0.0), (4.5e6, -20.0), (10e6, -20.0))
    level = -np.arange(10.0) * 5
    found = worst_point(drawn, GRID, level)
    assert_allclose(
        [found.f_hz, found.level_db, found.limit_db, found.margin_db], [4.5e6, -17.5, -20.0, -2.5]
    )


@pytest.mark.parametrize("side", ["at most", "at least"])
def test_a_line_relative_to_the_peak(side: str) -> None:
    """3 dB below the greatest sample of each trace, draw by draw."""
    shape = -((GRID / 1e6 - 5) ** 2) / 4
    drawn = line(side, (3e6, -3.0), (7e6, -3.0), relative_to="peak")
    found = worst_point(drawn, GRID, np.stack([shape - 20, shape + 2]))
    assert_allclose(found.limit_db, [-23.0, -1.0])
    assert_allclose(found.margin_db, [-3.0, -3.0] if side == "at most" else [2.0, 2.0])


def test_the_least_sure_point_is_another_than_the_tightest() -> None:
    """0.3 dB of margin at 0.02 dB is sure; 4 dB at the noise's 5 dB is not."""
    level = np.array([-0.5] * 5 + [-44.0] * 5)
    drawn = line("at most", (1e6, -0.2), (5e6, -0.2), (6e6, -40.0), (10e6, -40.0))
    towards = np.where(GRID <= 5e6, 0.02, 5.0)
    by_margin = worst_point(drawn, GRID, level, towards)
    by_both = worst_point(drawn, GRID, level, towards, by="uncertainty")
    assert_allclose([by_margin.f_hz, by_margin.margin_db, by_margin.ratio], [1e6, 0.3, 15.0])
    assert_allclose([by_both.f_hz, by_both.margin_db, by_both.ratio], [6e6, 4.0, 0.8])


def test_what_is_not_resolvable_is_the_least_sure() -> None:
    """An infinite uncertainty makes the ratio 0, below any other that is inside."""
    towards = np.where(GRID == 7e6, np.inf, 0.1)
    found = worst_point(
        line("at most", (1e6, 0.0), (10e6, 0.0)), GRID, np.full(10, -50.0), towards, "uncertainty"
    )
    assert (found.f_hz, found.ratio) == (7e6, 0.0)


def test_without_any_uncertainty_a_margin_is_infinitely_sure() -> None:
    drawn = line("at most", (1e6, 0.0), (10e6, 0.0))
    assert worst_point(drawn, GRID, np.full(10, -1.0), np.zeros(10), "uncertainty").ratio == np.inf
    assert worst_point(drawn, GRID, np.full(10, 1.0), np.zeros(10), "uncertainty").ratio == -np.inf


def test_a_hole_in_the_trace_cannot_be_told() -> None:
    level = np.full(10, -30.0)
    level[4] = np.nan
    assert np.isnan(worst_point(line("at most", (1e6, 0.0), (10e6, 0.0)), GRID, level).margin_db)
    assert worst_point(line("at most", (6e6, 0.0), (10e6, 0.0)), GRID, level).margin_db == 30.0


@pytest.mark.parametrize(
    ("drawn", "extra", "said"),
    [
        (line("at most", (0.5e6, 0.0), (2e6, 0.0)), {}, "the line runs from 500000 Hz to"),
        (line("at most", (2e6, 0.0), (11e6, 0.0)), {}, r"covers only 1e\+06 Hz to 1e\+07 Hz"),
        (line("at most", (2e6, 0.0), (3e6, 0.0), relative_to="figure"), {}, "measure it, and lay"),
        (line("at most", (2e6, 0.0), (3e6, 0.0)), {"by": "uncertainty"}, "where one is given"),
        (line("at most", (2e6, 0.0), (3e6, 0.0)), {"by": "eye"}, "not 'eye'"),
    ],
)
def test_what_cannot_be_laid_is_refused(drawn: MaskLine, extra, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        worst_point(drawn, GRID, np.zeros(10), **extra)


@settings(derandomize=True, max_examples=30, deadline=None)
@given(
    levels=st.lists(st.floats(-100, 20), min_size=10, max_size=10), shift=st.floats(-50, 50),
    side=st.sampled_from(["at most", "at least"]),
)  # fmt: skip
def test_moving_trace_and_line_together_changes_no_margin(levels, shift: float, side: str) -> None:
    drawn, level = line(side, (1.3e6, -20.0), (8.2e6, -35.0)), np.array(levels)
    one = worst_point(drawn, GRID, level).margin_db
    assert_allclose(worst_point(drawn.resolved(shift), GRID, level + shift).margin_db, one, atol=1e-9)
    towards = 1.0 if side == "at most" else -1.0
    assert worst_point(drawn, GRID, level + towards).margin_db <= one - 1.0 + 1e-9
