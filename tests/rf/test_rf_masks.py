"""Mask lines: what the limit is between the corners, at a step, and where there is none."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose, assert_array_equal

from benchrun.rf.masks import Mask, MaskLine


def line(side: str, *corners: tuple[float, float], spacing: str = "linear") -> MaskLine:
    f, level = np.array(corners, dtype=float).T
    return MaskLine(side, f, level, spacing)


def test_a_linear_line_is_straight_over_frequency() -> None:
    found = line("at most", (100e6, 0.0), (200e6, -20.0), (400e6, -60.0)).limit_at(
        np.array([100e6, 125e6, 200e6, 300e6, 400e6])
    )
    assert_allclose(found, [0.0, -5.0, -20.0, -40.0, -60.0], rtol=1e-12)


def test_a_logarithmic_line_falls_by_the_octave() -> None:
    """-6.02 dB an octave from 0 dB at 100 MHz is 20 dB a decade: the asymptote of one pole."""
    drawn = line("at most", (100e6, 0.0), (1e9, -20.0), spacing="log")
    assert_allclose(drawn.limit_at(np.array([200e6, 400e6, 800e6])), -20 * np.log10([2, 4, 8]), rtol=1e-12)
    assert_allclose(drawn.limit_at(np.array([np.sqrt(100e6 * 1e9)])), [-10.0], rtol=1e-12)


@pytest.mark.parametrize("spacing", ["linear", "log"])
@pytest.mark.parametrize(("side", "stricter"), [("at most", -40.0), ("at least", 0.0)])
def test_at_a_step_the_stricter_level_counts(side: str, stricter: float, spacing: str) -> None:
    """A point exactly on the step must keep both levels, whichever way the line steps."""
    down = line(side, (1e6, 0.0), (2e6, 0.0), (2e6, -40.0), (3e6, -40.0), spacing=spacing)
    up = line(side, (1e6, -40.0), (2e6, -40.0), (2e6, 0.0), (3e6, 0.0), spacing=spacing)
    for drawn in (down, up):
        assert drawn.limit_at(np.array([2e6]))[0] == stricter
    assert_array_equal(down.limit_at(np.array([1.999e6, 2.001e6])), [0.0, -40.0])


@pytest.mark.parametrize(("side", "stricter"), [("at most", -40.0), ("at least", 0.0)])
@pytest.mark.parametrize(
    "corners",
    [[(1e6, 0.0), (1e6, -40.0), (2e6, -40.0)], [(1e6, -40.0), (1e6, 0.0), (2e6, 0.0)]],
)
def test_a_line_may_begin_with_a_step(side: str, stricter: float, corners) -> None:
    assert line(side, *corners).limit_at(np.array([1e6]))[0] == stricter


@pytest.mark.parametrize(("side", "stricter"), [("at most", -40.0), ("at least", 0.0)])
@pytest.mark.parametrize(
    "corners",
    [[(1e6, 0.0), (2e6, 0.0), (2e6, -40.0)], [(1e6, -40.0), (2e6, -40.0), (2e6, 0.0)]],
)
def test_a_line_may_end_with_a_step(side: str, stricter: float, corners) -> None:
    assert line(side, *corners).limit_at(np.array([2e6]))[0] == stricter


def test_a_line_covers_its_ends_and_nothing_beyond() -> None:
    drawn = line("at most", (1e6, 0.0), (2e6, 0.0))
    covered = drawn.inside(np.array([0.999999e6, 1e6, 1.5e6, 2e6, 2.000001e6]))
    assert_array_equal(covered, [False, True, True, True, False])


@pytest.mark.parametrize("corners", [[(1e6, 0.0)], [(2e6, 0.0), (1e6, 0.0)], [(1e6, 0), (3e6, 0), (2e6, 0)]])
def test_a_line_needs_two_points_in_order(corners) -> None:
    with pytest.raises(ValueError, match="two or more points whose frequencies do not go backwards"):
        line("at most", *corners)


def test_a_logarithmic_line_cannot_start_at_zero() -> None:
    with pytest.raises(ValueError, match="starts above 0 Hz"):
        line("at most", (0.0, 0.0), (1e6, -3.0), spacing="log")


def test_a_mask_spans_all_its_lines() -> None:
    mask = Mask("m", (line("at most", (5e6, 0), (6e6, 0)), line("at least", (1e6, 0), (2e6, 0))))
    assert mask.band == (1e6, 6e6)
