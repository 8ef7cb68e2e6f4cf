"""Shape factor, loaded Q and stop-band figures against filters with closed-form crossings."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort

F0, WIDTH = 150e6, 10e6
LOW = (np.sqrt(1 + (WIDTH / F0 / 2) ** 2) - WIDTH / F0 / 2) * F0  # lower 3 dB edge


def of_db(db: np.ndarray) -> TwoPort:
    s21 = 10 ** (np.asarray(db) / 20) + 0j
    return TwoPort(0 * s21, s21, s21, 0 * s21)


def butterworth(f_hz: np.ndarray, order: int) -> np.ndarray:
    """Band-pass level in dB; half power (3.0103 dB) at the edges, x = F0/WIDTH (f/F0 - F0/f)."""
    x = F0 / WIDTH * (f_hz / F0 - F0 / f_hz)
    return -10 * np.log10(1 + x ** (2 * order))


def measure(name: str, f_hz: np.ndarray, db: np.ndarray, **parameters):
    return FIGURES[name].measure(f_hz, of_db(db), "at most", trace="S21", **parameters)


HALF = 10 * np.log10(2)


@pytest.mark.parametrize("order", [1, 2, 3, 5])
def test_the_shape_factor_of_a_butterworth_filter(order: int) -> None:
    """Bandwidth at drop A goes as (10^(A/10) - 1)^(1/2n): closed form (any filter text)."""
    f_hz = np.linspace(20e6, 600e6, 20001)
    found = measure("shape factor", f_hz, butterworth(f_hz, order), drop=HALF, outer=20.0)
    assert_allclose(found.value, 99 ** (1 / (2 * order)), rtol=3e-5)


@pytest.mark.parametrize("order", [1, 3])
def test_the_loaded_q_of_a_butterworth_filter(order: int) -> None:
    """F0 / WIDTH = 15, whatever the order, since the edges multiply to F0 squared."""
    f_hz = np.linspace(100e6, 220e6, 10001)
    found = measure("loaded Q", f_hz, butterworth(f_hz, order), drop=HALF)
    assert_allclose(found.value, 15.0, rtol=1e-5)
    assert_allclose(found.at_hz, F0, rtol=1e-6)


def test_refining_the_grid_converges() -> None:
    errors = []
    for points in (201, 801, 3201):
        f_hz = np.linspace(100.123e6, 220e6, points)
        found = measure("loaded Q", f_hz, butterworth(f_hz, 3), drop=HALF)
        errors.append(abs(float(found.value) - 15.0))
    assert errors[1] < errors[0] / 3
    assert errors[2] < errors[1] / 3


@pytest.mark.parametrize("name", ["shape factor", "loaded Q"])
def test_a_response_that_does_not_fall_has_no_shape(name: str) -> None:
    f_hz = np.linspace(147e6, 153e6, 101)
    extra = {"outer": 60.0} if name == "shape factor" else {}
    with pytest.raises(InvalidMeasurement, match=f"{name} cannot be told"):
        measure(name, f_hz, butterworth(f_hz, 2), drop=3.0, **extra)


RETURNING = np.array([0.0, 0.0, -10.0, -40.0, -60.0, -30.0, -50.0, -60.0, -55.0])
"""Falls through 40 dB, comes back to 30 dB down, and falls again."""
GRID = np.arange(9.0) * 1e6 + 1e6


@pytest.mark.parametrize(("mirrored", "side"), [(False, "upper"), (True, "lower")])
def test_the_stop_band_begins_behind_the_last_return(mirrored: bool, side: str) -> None:
    """Last crossing of -40 dB: halfway from 30 to 50 dB down; the corner frequency is the first."""
    db = RETURNING[::-1] if mirrored else RETURNING
    wanted = {"stop-band edge": 6.5e6, "corner frequency": 4e6}
    for name, f in wanted.items():
        found = measure(name, GRID, db, drop=40.0, edge=side)
        assert_allclose(found.value, 10e6 - f if mirrored else f, rtol=1e-12)
        assert_allclose(found.at_hz, found.value)


@pytest.mark.parametrize("drop", [56.0, 70.0])
def test_no_stop_band_where_the_sweep_ends_above_it(drop: float) -> None:
    """Nothing is known of what follows the sweep's end, so there is no edge, even after a crossing."""
    with pytest.raises(InvalidMeasurement, match="stop-band edge cannot be told"):
        measure("stop-band edge", GRID, RETURNING, drop=drop, edge="upper")


def test_the_nearest_stop_band_crossing() -> None:
    """From the edge of the pass band, on the side where it is nearer; the band's own peak counts."""
    f_hz = np.arange(0.0, 21.0) * 1e6 + 100e6
    db = np.interp(f_hz, [100e6, 106e6, 108e6, 112e6, 118e6, 120e6], [-60, -60, 0, 0, -60, -60])
    found = measure("nearest stop-band crossing", f_hz, db, over=(109e6, 111e6), drop=30.0)
    assert_allclose([found.value, found.at_hz], [2e6, 107e6], rtol=1e-9)
    found = measure("nearest stop-band crossing", f_hz, db, over=(110.5e6, 111.7e6), drop=15.0)
    assert_allclose([found.value, found.at_hz], [1.8e6, 113.5e6], rtol=1e-9)


def test_one_side_without_a_stop_band_leaves_the_other() -> None:
    f_hz = np.arange(0.0, 21.0) * 1e6 + 100e6
    rising = np.interp(f_hz, [100e6, 106e6, 120e6], [-60.0, 0.0, 0.0])
    found = measure("nearest stop-band crossing", f_hz, rising, over=(108e6, 118e6), drop=30.0)
    assert_allclose([found.value, found.at_hz], [5e6, 103e6], rtol=1e-9)
    falling = rising[::-1]
    found = measure("nearest stop-band crossing", f_hz, falling, over=(102e6, 112e6), drop=30.0)
    assert_allclose([found.value, found.at_hz], [5e6, 117e6], rtol=1e-9)


def test_a_band_that_is_down_at_its_own_edge_has_no_distance_left() -> None:
    f_hz = np.linspace(100e6, 200e6, 101)
    found = measure("nearest stop-band crossing", f_hz, butterworth(f_hz, 3), over=(120e6, 155e6), drop=3.0)
    assert found.value == 0.0
    assert found.at_hz == 120e6


def test_no_stop_band_at_all() -> None:
    with pytest.raises(InvalidMeasurement, match="nearest stop-band crossing cannot be told"):
        measure("nearest stop-band crossing", GRID, np.zeros(9), over=(3e6, 5e6), drop=10.0)


def test_a_draw_without_a_crossing_is_nan() -> None:
    f_hz = np.linspace(100e6, 220e6, 1001)
    db = np.stack([butterworth(f_hz, 3), np.zeros(1001), butterworth(f_hz, 1)])
    for name, extra in (("loaded Q", {"drop": 3.0}), ("shape factor", {"drop": 3.0, "outer": 6.0}),
                        ("stop-band edge", {"drop": 3.0, "edge": "upper"}),
                        ("nearest stop-band crossing", {"drop": 3.0, "over": (148e6, 152e6)})):  # fmt: skip
        found = measure(name, f_hz, db, **extra).value
        assert np.isnan(found[1])
        assert np.all(np.isfinite(found[[0, 2]]))


@settings(derandomize=True, max_examples=30, deadline=None)
@given(scale=st.floats(0.01, 100.0), gain=st.floats(-60.0, 20.0), order=st.integers(1, 5))
def test_scaling_frequency_and_level(scale: float, gain: float, order: int) -> None:
    """Ratios of frequencies do not change, frequencies do by the factor, and level has no say."""
    f_hz = np.linspace(100e6, 220e6, 601)
    db = butterworth(f_hz, order)
    for name, extra, power in (
        ("loaded Q", {"drop": 3.0}, 0), ("shape factor", {"drop": 1.0, "outer": 3.0}, 0),
        ("stop-band edge", {"drop": 3.0, "edge": "lower"}, 1),
    ):  # fmt: skip
        one = measure(name, f_hz, db, **extra).value
        other = measure(name, f_hz * scale, db + gain, **extra).value
        assert_allclose(other, one * scale**power, rtol=1e-9)


@settings(derandomize=True, max_examples=20, deadline=None)
@given(drops=st.lists(st.floats(1.0, 60.0), min_size=2, max_size=5, unique=True))
def test_a_greater_drop_lies_farther_out(drops) -> None:
    """Monotone, also for a response that comes back."""
    edges = [
        float(measure("stop-band edge", GRID, np.minimum(RETURNING, -0.0) * 2, drop=d, edge="upper").value)
        for d in sorted(drops)
    ]
    assert edges == sorted(edges)
