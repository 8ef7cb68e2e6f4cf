"""Distance to a fault and impedance along a line, against exact lines."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort

LIGHT = 299_792_458.0
VELOCITY = 0.66
F_HZ = 2e6 * np.arange(1, 1001)


def way(distance_m: float) -> float:
    """There and back, in seconds."""
    return 2 * distance_m / (VELOCITY * LIGHT)


def reflection(distance_m: float, size: complex, f_hz=F_HZ, loss_db_per_m: float = 0.0) -> np.ndarray:
    loss = 10 ** (-2 * distance_m * loss_db_per_m * np.sqrt(f_hz / 1e9) / 20)
    return size * loss * np.exp(-2j * np.pi * f_hz * way(distance_m))


def section(z_ohm: float, length_m: float, end_ohm: float, f_hz=F_HZ) -> np.ndarray:
    """A line of another impedance between 50 ohm and its end (exact input impedance)."""
    t = 1j * np.tan(np.pi * f_hz * way(length_m))
    z = z_ohm * (end_ohm + z_ohm * t) / (z_ohm + end_ohm * t)
    return (z - 50) / (z + 50)


def measure(name: str, plane, f_hz=F_HZ, **parameters):
    extra = {"reference": 50.0} if name == "impedance at distance" else {}
    parameters = {"velocity": VELOCITY, "port": 1, **extra, **parameters}
    return FIGURES[name].measure(f_hz, plane, "at most", **parameters)


@pytest.mark.parametrize("distance", [0.0, 0.5, 3.21, 17.77, 45.0])
def test_a_single_fault_is_found_to_a_thousandth_of_what_is_resolved(distance: float) -> None:
    """Resolution v c / 2B = 49.5 mm here; the place between the samples of time is found far finer."""
    plane = reflection(distance, 0.1j)
    found = measure("distance to fault", plane)
    assert_allclose(found.value, distance, atol=49.5e-6)
    assert_allclose(measure("return loss of the fault", plane).value, 20.0, atol=1e-4)
    assert_allclose(found.at_hz, 1.001e9)


def test_loss_makes_a_fault_look_smaller_not_nearer() -> None:
    plane = reflection(20.0, 1.0, loss_db_per_m=0.2)
    assert_allclose(measure("distance to fault", plane).value, 20.0, atol=2e-3)
    assert 4.0 < measure("return loss of the fault", plane).value < 8.0


def test_a_stretch_of_line_leaves_the_connector_out() -> None:
    """A great reflection at the plane, a small one at 8 m: `within` looks only where it is told."""
    plane = reflection(0.0, 0.2) + reflection(8.0, 0.02)
    assert_allclose(measure("distance to fault", plane).value, 0.0, atol=1e-4)
    assert_allclose(measure("distance to fault", plane, within=(1.0, 12.0)).value, 8.0, atol=1e-3)
    assert_allclose(measure("return loss of the fault", plane, within=(1.0, 12.0)).value, 34.0, atol=0.05)


def test_the_flank_of_a_peak_outside_is_no_fault() -> None:
    plane = reflection(5.0, 0.3)
    with pytest.raises(InvalidMeasurement, match="distance to fault cannot be told"):
        measure("distance to fault", plane, within=(5.03, 9.0))


def test_noise_alone_is_no_fault() -> None:
    """The greatest of many samples of noise stands not six times above their median."""
    generator = np.random.default_rng(7)
    noise = generator.normal(size=(20, 1000)) + 1j * generator.normal(size=(20, 1000))
    assert np.all(np.isnan(measure("distance to fault", noise).value))
    assert np.all(np.isnan(measure("return loss of the fault", noise).value))
    found = measure("distance to fault", noise * 1e-3 + reflection(12.0, 0.05)).value
    assert_allclose(found, 12.0, atol=5e-3)


def test_a_place_beyond_the_repetition_is_refused() -> None:
    """2 MHz steps repeat after 500 ns: 49.5 m of this line."""
    with pytest.raises(InvalidMeasurement, match="repeats after 500 ns"):
        measure("distance to fault", reflection(5.0, 0.3), within=(1.0, 60.0))


def test_a_narrow_sweep_finds_a_fault_too() -> None:
    """900 MHz to 960 MHz: no sign, but the place; resolution 1.65 m."""
    f_hz = np.linspace(900e6, 960e6, 401)
    found = measure("distance to fault", reflection(30.0, 0.5, f_hz), f_hz)
    assert_allclose(found.value, 30.0, atol=1.65e-3)


def test_refining_the_grid_keeps_the_place() -> None:
    for points in (64, 201, 801, 3201):
        f_hz = np.linspace(100e6, 1.1e9, points)
        assert_allclose(measure("distance to fault", reflection(2.0, 0.1, f_hz), f_hz).value, 2.0, atol=1e-4)


@settings(derandomize=True, max_examples=25, deadline=None)
@given(distance=st.floats(0.3, 45.0), size=st.floats(1e-3, 1.0), turn=st.floats(-3, 3))
def test_places_scale_with_the_velocity_and_levels_with_the_size(distance, size, turn) -> None:
    plane = reflection(distance, size * np.exp(1j * turn))
    found = float(measure("distance to fault", plane).value)
    assert_allclose(found, distance, atol=5e-4)
    slower = measure("distance to fault", plane, velocity=VELOCITY / 2).value
    assert_allclose(slower, found / 2, rtol=1e-12)
    assert_allclose(measure("return loss of the fault", plane).value, -20 * np.log10(size), atol=1e-4)


@pytest.mark.parametrize("z_ohm", [20.0, 47.0, 50.0, 75.0, 200.0])
def test_the_first_section_of_a_line_is_read_exactly(z_ohm: float) -> None:
    """Matched at its far end: the impedance in its middle is its own (definition)."""
    found = measure("impedance at distance", section(z_ohm, 4.0, z_ohm), distance=2.0)
    assert_allclose(found.value, z_ohm, rtol=2e-4)


def test_each_section_in_turn() -> None:
    """50 ohm end behind 75 ohm: beyond it the bounce diagram leaves 0.2 - 0.2 (1 - 0.04) = 0.008."""
    plane = section(75.0, 4.0, 50.0)
    assert_allclose(measure("impedance at distance", plane, distance=2.0).value, 75.0, rtol=2e-4)
    beyond = measure("impedance at distance", plane, distance=6.0).value
    assert_allclose(beyond, 50 * 1.008 / 0.992, rtol=3e-4)


def test_a_higher_frequency_converges_on_the_section() -> None:
    """Near a joint the rise of the step blurs; twice the frequency halves it."""
    errors = []
    for points in (125, 250, 500, 1000):
        f_hz = 2e6 * np.arange(1, points + 1)
        found = measure("impedance at distance", section(75.0, 4.0, 75.0, f_hz), f_hz, distance=0.45)
        errors.append(abs(float(found.value) - 75.0))
    assert errors[0] > errors[1] > errors[3]
    assert errors[3] < 0.05


def test_the_value_at_zero_may_be_measured() -> None:
    f_hz = np.concatenate([[0.0], F_HZ])
    plane = np.concatenate([[0.2 + 0j], section(75.0, 4.0, 75.0)])
    assert_allclose(measure("impedance at distance", plane, f_hz, distance=2.0).value, 75.0, rtol=2e-4)


@pytest.mark.parametrize(
    ("f_hz", "distance", "said"),
    [
        (F_HZ, 40.0, r"the sweep shows only 312.5 ns"),
        (F_HZ, 0.01, r"resolves only 24.73 mm of this line"),
        (np.linspace(900e6, 960e6, 401), 1.0, r"needs at least 16 samples"),
    ],
)
def test_what_the_sweep_cannot_show_is_refused(f_hz, distance: float, said: str) -> None:
    with pytest.raises(InvalidMeasurement, match=said):
        measure("impedance at distance", section(75.0, 4.0, 75.0, f_hz), f_hz, distance=distance)


def test_a_line_that_rings_beyond_the_period_has_no_impedance() -> None:
    with pytest.raises(InvalidMeasurement, match="impedance at distance cannot be told"):
        measure("impedance at distance", section(400.0, 18.0, 1e9), distance=2.0)


def test_an_open_has_no_impedance() -> None:
    with pytest.raises(InvalidMeasurement, match="impedance at distance cannot be told"):
        measure("impedance at distance", reflection(1.0, 1.0), distance=3.0)


@pytest.mark.parametrize("name", ["distance to fault", "return loss of the fault", "impedance at distance"])
def test_each_draw_alone_and_either_port(name: str) -> None:
    """Bit for bit; port 2 is read from S22."""
    draws = np.stack([section(z, 4.0, 60.0) for z in (45.0, 75.0, 90.0)])
    extra = {"distance": 2.0} if name == "impedance at distance" else {}
    found = measure(name, draws, **extra)
    assert found.value.shape == found.at_hz.shape == (3,)
    for row in range(3):
        alone = measure(name, draws[row], **extra)
        assert_array_equal(found.value[row], alone.value)
    two = TwoPort(0 * draws, 0 * draws, 0 * draws, draws)
    assert_array_equal(measure(name, two, port=2, **extra).value, found.value)


def test_a_draw_that_rings_is_nan_and_leaves_the_others() -> None:
    draws = np.stack([section(75.0, 4.0, 75.0), section(400.0, 18.0, 1e9)])
    found = measure("impedance at distance", draws, distance=2.0).value
    assert_allclose(found[0], 75.0, rtol=2e-4)
    assert np.isnan(found[1])


@settings(derandomize=True, max_examples=20, deadline=None)
@given(z_ohm=st.floats(15.0, 160.0), factor=st.floats(0.3, 3.0))
def test_impedance_scales_with_the_reference(z_ohm: float, factor: float) -> None:
    plane = section(z_ohm, 4.0, z_ohm)
    one = float(measure("impedance at distance", plane, distance=2.0).value)
    assert_allclose(one, z_ohm, rtol=5e-4)
    other = measure("impedance at distance", plane, distance=2.0, reference=50.0 * factor).value
    assert_allclose(other, one * factor, rtol=1e-12)
