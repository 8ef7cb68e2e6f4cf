"""What every figure has in common, over the whole table, so that a new one cannot be forgotten."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_array_equal

from benchrun.errors import InvalidMeasurement
from benchrun.quantity import Dimension
from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.band import at, in_band, samples
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(100e6, 200e6, 101)
NAMES = sorted(name for name, kind in FIGURES.items() if kind.domain == "sweep")
CHECKED = {
    "insertion loss", "gain", "rejection", "return loss", "VSWR", "mismatch loss", "ripple", "reciprocity",
    "corner frequency", "bandwidth", "centre frequency", "group delay", "group delay variation", "phase",
    "resistance", "reactance", "impedance", "parallel resistance", "parallel reactance", "Q",
    "shape factor", "loaded Q", "stop-band edge", "nearest stop-band crossing",
    "flatness", "slope", "flatness about the slope", "phase linearity", "electrical length",
    "group delay slope", "group delay parabola", "group delay ripple",
    "isolation", "directivity", "port balance", "passivity",
    "distance to fault", "return loss of the fault", "impedance at distance",
}  # fmt: skip
"""Each of these has a closed-form check in the files beside this one."""

NEEDED = {"drop": 10.0, "outer": 12.0, "velocity": 0.7, "distance": 0.5}
"""What a limit must say, where the figure has no default for it."""

ON_ANY_SWEEP = [name for name in NAMES if name != "impedance at distance"]
"""All but the one that needs a sweep from its step upwards; its like tests are in test_rf_fig_along.py."""


def bandpass(rows: int = 0) -> TwoPort:
    """A tuned circuit at 150.3 MHz, Q = 15 (each row another centre); without loss."""
    f0 = 150.3e6 * (1 + 0.001 * np.arange(rows)[:, None]) if rows else 150.3e6
    x = 15.0 * (F_HZ / f0 - f0 / F_HZ)
    s21 = 1 / (1 + 1j * x)
    return TwoPort(s21 * 1j * x, s21, s21, s21 * 1j * x)


def complete(name: str) -> dict[str, object]:
    """Parameters as the sequence room fills them in."""
    wanted = {}
    for key, parameter in FIGURES[name].parameters.items():
        if key == "over":
            wanted[key] = (141.3e6, 157.7e6)
        elif key == "aperture":
            wanted[key] = 2e6
        elif key in NEEDED and parameter.default is None:
            wanted[key] = NEEDED[key]
        elif key not in ("at", "against", "within"):
            wanted[key] = parameter.default
    return wanted


def test_every_figure_has_a_closed_form_check() -> None:
    """A new figure has to be added above, together with its check."""
    assert set(NAMES) == CHECKED


@pytest.mark.parametrize("name", NAMES)
def test_a_figure_is_taken_in_exactly_one_way(name: str) -> None:
    kind = FIGURES[name]
    assert sum(way is not None for way in (kind.trace, kind.scalar, kind.between)) == 1
    assert kind.name == name
    assert kind.meaning
    assert kind.ports in (1, 2)
    assert kind.reach_hz == "" or kind.reach_hz in kind.parameters


@pytest.mark.parametrize("name", NAMES)
def test_the_sense_says_which_figures_are_one_magnitude_in_decibels(name: str) -> None:
    """Halving every S-parameter moves such a figure by 6.02 dB, in the direction of its sense."""
    kind = FIGURES[name]
    if kind.sense == 0:
        return
    assert kind.dimension is Dimension.RATIO
    full = kind.measure(F_HZ, bandpass(), "at most", **complete(name)).value
    half = kind.measure(F_HZ, bandpass().map(lambda s: s / 2), "at most", **complete(name)).value
    np.testing.assert_allclose(half - full, -kind.sense * 20 * np.log10(2), rtol=1e-9)


@pytest.mark.parametrize("name", ON_ANY_SWEEP)
@pytest.mark.parametrize("side", ["at most", "at least"])
def test_each_draw_is_measured_as_if_it_stood_alone(name: str, side: str) -> None:
    """(d, f) gives (d,), bit for bit what each row gives."""
    kind, draws = FIGURES[name], bandpass(5)
    found = kind.measure(F_HZ, draws, side, **complete(name))
    assert found.value.shape == (5,)
    assert found.at_hz.shape == (5,)
    for row in range(5):
        alone = kind.measure(F_HZ, TwoPort(*(p[row] for p in draws.planes)), side, **complete(name))
        assert_array_equal(found.value[row], alone.value)
        assert_array_equal(found.at_hz[row], alone.at_hz)


@pytest.mark.parametrize("name", [n for n in ON_ANY_SWEEP if FIGURES[n].ports == 1])
def test_a_reflection_figure_needs_one_port_only(name: str) -> None:
    two = bandpass()
    alone = FIGURES[name].measure(F_HZ, two.s11, "at most", **complete(name))
    assert alone.value == FIGURES[name].measure(F_HZ, two, "at most", **complete(name)).value


@pytest.mark.parametrize("name", [n for n in NAMES if "over" in FIGURES[n].parameters])
@pytest.mark.parametrize("band", [(90e6, 150e6), (150e6, 200.1e6), (300e6, 400e6)])
def test_a_band_outside_the_sweep_is_refused(name: str, band) -> None:
    """Never a number from beyond the data; band and sweep are both named."""
    with pytest.raises(InvalidMeasurement, match=r"covers only 100 MHz to 200 MHz") as caught:
        FIGURES[name].measure(F_HZ, bandpass(), "at most", **{**complete(name), "over": band})
    assert name in caught.value.reason
    assert "Widen the sweep" in caught.value.advice


@pytest.mark.parametrize("name", [n for n in NAMES if "at" in FIGURES[n].parameters])
@pytest.mark.parametrize("where", [99e6, 201e6])
def test_a_frequency_outside_the_sweep_is_refused(name: str, where: float) -> None:
    with pytest.raises(InvalidMeasurement, match="covers only"):
        FIGURES[name].measure(F_HZ, bandpass(), "at most", **{**complete(name), "over": None, "at": where})


@pytest.mark.parametrize("name", [n for n in NAMES if "at" in FIGURES[n].parameters])
def test_one_frequency_gives_one_value_there(name: str) -> None:
    """Asked at one frequency, or over a narrow band around it: the same to the width of the band."""
    kind, parameters = FIGURES[name], complete(name)
    point = kind.measure(F_HZ, bandpass(), "at most", **{**parameters, "over": None, "at": 145.25e6})
    band = kind.measure(F_HZ, bandpass(), "at most", **{**parameters, "over": (145.2499e6, 145.2501e6)})
    assert point.at_hz == 145.25e6
    np.testing.assert_allclose(point.value, band.value, rtol=1e-4)


def test_the_whole_sweep_is_a_band() -> None:
    """Edges equal to the ends of the sweep are inside it, in spite of rounding in the grid."""
    grid = np.geomspace(5e6, 1.2e9, 801)
    zero, one = np.zeros(801, complex), np.ones(801, complex)
    found = FIGURES["gain"].measure(
        grid, TwoPort(zero, one, one, zero), "at most", over=(5e6, 1.2e9), trace="S21"
    )
    assert found.value == 0.0


def test_a_figure_of_the_whole_sweep_has_no_band() -> None:
    assert FIGURES["bandwidth"].band({"drop": 3.0}) is None


def test_an_aperture_widens_the_band_that_is_needed() -> None:
    assert FIGURES["group delay"].band({"over": (10.0, 20.0), "aperture": 4.0}) == (8.0, 22.0)
    assert FIGURES["group delay"].band({"at": 15.0, "aperture": 4.0}) == (13.0, 17.0)


def test_samples_are_the_edges_and_what_lies_between() -> None:
    grid = np.arange(1.0, 6.0)
    assert_array_equal(samples(grid, 2.0, 4.0), [2.0, 3.0, 4.0])
    assert_array_equal(samples(grid, 1.5, 4.5), [1.5, 2.0, 3.0, 4.0, 4.5])
    assert_array_equal(samples(grid, 2.2, 2.8), [2.2, 2.8])


def test_in_band_keeps_leading_axes() -> None:
    grid, values = np.arange(1.0, 6.0), np.arange(20.0).reshape(2, 2, 5)
    f, v = in_band(grid, values, 1.5, 3.0)
    assert_array_equal(f, [1.5, 2.0, 3.0])
    assert_array_equal(v[1, 1], [15.5, 16.0, 17.0])


def test_a_sample_has_its_own_value_next_to_a_hole() -> None:
    """A neighbour of nan has no say on a sample, but between the two there is no value."""
    grid, values = np.arange(1.0, 5.0), np.array([np.nan, 2.0, 3.0, np.nan])
    assert_array_equal(at(grid, values, np.array([2.0, 3.0, 1.5, 3.5])), [2.0, 3.0, np.nan, np.nan])
