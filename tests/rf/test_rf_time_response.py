"""Impulse and step responses against exact lines, and against scikit-rf where both do the same."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.timedomain import (
    WINDOWS,
    dc_by_causality,
    envelope,
    even,
    gated,
    harmonics,
    impulse,
    step,
    window,
)
from benchrun.rf.timedomain.blocks import by_rows
from benchrun.rf.timedomain.window import turns

STEP = 5e6
F_HZ = STEP * np.arange(1, 401)


def stepped_line(f_hz, z_ohm, delay_s, end_ohm, z0=50.0):
    """Input reflection of lossless line sections by their exact input impedances (any line text)."""
    z = np.full(len(f_hz), complex(end_ohm))
    for z_line, delay in list(zip(z_ohm, delay_s, strict=True))[::-1]:
        t = 1j * np.tan(2 * np.pi * f_hz * delay)
        z = z_line * (z + z_line * t) / (z_line + z * t)
    return (z - z0) / (z + z0)


def with_dc(plane: np.ndarray, dc: float) -> skrf.Network:
    frequency = skrf.Frequency(0, F_HZ[-1], len(F_HZ) + 1, unit="hz")
    return skrf.Network(frequency=frequency, s=np.concatenate([[dc], plane])[:, None, None], z0=50)


@pytest.mark.parametrize("shape", WINDOWS)
def test_windows_are_symmetric_and_never_zero(shape: str) -> None:
    """Full windows are alike from both ends; the low-pass half begins with 1 and falls."""
    whole, half = window(shape, 64), window(shape, 65, low_pass=True)
    assert_allclose(whole, whole[::-1], rtol=1e-12)
    assert whole.min() > 0
    assert half[0] == 1.0
    assert np.all(np.diff(half) <= 1e-12)


def test_kaiser_beats_the_others_in_its_side_lobes() -> None:
    """44 dB for beta 6 (Kaiser and Schafer, 1980, from memory): outside the first null at 2.16 steps."""
    spectrum = np.abs(np.fft.fft(window("Kaiser", 256), 8192))
    lobes = spectrum[int(2.2 * 32) : 4096] / spectrum[0]
    assert -46 < 20 * np.log10(lobes.max()) < -43


def test_an_unknown_window_is_named() -> None:
    with pytest.raises(ValueError, match=r"'Bartlett' is no window; known are rectangular, Hann"):
        window("Bartlett", 8)


@settings(derandomize=True, max_examples=30, deadline=None)
@given(angle=st.floats(-50, 50), first=st.floats(-1e4, 1e4), points=st.integers(1, 700))
def test_turns_are_the_exponential(angle: float, first: float, points: int) -> None:
    exact = np.exp(1j * angle * (first + np.arange(points)))
    assert_allclose(turns(angle, first, points), exact, atol=2e-9)


def test_the_step_response_is_scikit_rf_s() -> None:
    """Same samples, no window, DC known: cumulative trapezoids there, half-counted sums here.

    scikit-rf starts its sum at half a period before 0 with nothing, here half of the first sample counts.
    """
    plane = stepped_line(F_HZ, [75.0, 35.0], [3e-9, 5e-9], 110.0)
    t, value = step(F_HZ, plane, "rectangular", 2, dc=60 / 160)
    # Its times are not compared: for an even count it ends its axis on +T/2, where an FFT has no sample.
    _, other = with_dc(plane, 60 / 160).step_response(window=None, n=len(t))
    assert_allclose(value - value[0], other, atol=1e-9)


def test_the_impulse_response_is_scikit_rf_s() -> None:
    """Up to the scale: here a full reflection has height 1."""
    plane = stepped_line(F_HZ, [75.0, 35.0], [3e-9, 5e-9], 110.0)
    t, value = impulse(F_HZ, plane, "rectangular", 2, dc=60 / 160)
    _, other = with_dc(plane, 60 / 160).impulse_response(window=None, n=len(t), bandpass=False)
    assert_allclose(value, other * len(t) / (2 * len(F_HZ) + 1), atol=1e-9)


def test_the_envelope_is_scikit_rf_s() -> None:
    plane = stepped_line(F_HZ, [75.0, 35.0], [3e-9, 5e-9], 110.0)
    t, value = envelope(STEP, plane, "rectangular")
    network = skrf.Network(f=F_HZ, f_unit="hz", s=plane[:, None, None])
    _, other = network.impulse_response(window=None, n=len(t), bandpass=True)
    assert_allclose(np.fft.fftshift(value), other * len(t) / len(F_HZ), atol=1e-9)


@pytest.mark.parametrize(("end", "height"), [(np.inf, 1.0), (0.0, -1.0), (100.0, 1 / 3)])
@pytest.mark.parametrize("shape", WINDOWS)
def test_an_impulse_has_the_sign_and_the_size_of_its_reflection(end, height, shape) -> None:
    """At the end of 50 ohm of line; the time is there and back."""
    gamma = 1.0 if np.isinf(end) else (end - 50) / (end + 50)
    plane = gamma * np.exp(-4j * np.pi * F_HZ * 10e-9)
    t, value = impulse(F_HZ, plane, shape, 16)
    peak = np.argmax(np.abs(value))
    assert_allclose(value[peak], height, rtol=6e-3)
    assert_allclose(t[peak], 20e-9, atol=t[1] - t[0])


def test_a_step_climbs_to_each_reflection_in_turn() -> None:
    """75 then 50 ohm: 0.2, then 0.2 - 0.2 (1 - 0.04) and its echoes (bounce diagram, any text)."""
    plane = stepped_line(F_HZ, [75.0], [10e-9], 50.0)
    t, value = step(F_HZ, plane)
    for when, level in ((-5e-9, 0.0), (10e-9, 0.2), (30e-9, 0.2 - 0.2 * 0.96), (50e-9, 0.008 - 0.192 * 0.04)):
        assert_allclose(value[np.argmin(np.abs(t - when))], level, atol=2e-4)


def test_a_reflection_at_the_plane_has_risen_by_half_at_zero() -> None:
    t, value = step(F_HZ, np.full(400, 0.3 + 0j))
    assert_allclose(value[np.argmin(np.abs(t))], 0.15, atol=1e-5)
    assert_allclose(value[np.argmin(np.abs(t - 5e-9))], 0.3, atol=1e-4)


@pytest.mark.parametrize(
    ("z_ohm", "delay_s", "end"),
    [
        ([75.0], [1e-9], 75.0),
        ([75.0], [30e-9], 75.0),
        ([75.0, 30.0], [5e-9, 8e-9], 100.0),
        ([50.0], [9e-9], 0.0),
    ],
)
def test_the_value_at_zero_is_the_resistance_at_the_end(z_ohm, delay_s, end) -> None:
    """At 0 Hz a lossless line is a wire; also where the line turns several times below the first samples."""
    dc, unrest = dc_by_causality(harmonics(F_HZ, stepped_line(F_HZ, z_ohm, delay_s, end)))
    assert_allclose(dc, (end - 50) / (end + 50), atol=1e-3)
    assert unrest < 1e-3


def test_a_response_that_does_not_die_away_is_told() -> None:
    """A long open line between reflections rings beyond the period: unrest says so."""
    dc, unrest = dc_by_causality(harmonics(F_HZ, stepped_line(F_HZ, [400.0], [37e-9], 1e9)))
    assert unrest > 0.02
    assert np.isfinite(dc)


def test_a_sweep_with_its_zero_uses_it() -> None:
    f_hz = np.concatenate([[0.0], F_HZ])
    plane = np.concatenate([[0.37 + 0j], np.full(400, 0.37 + 0j)])
    found = harmonics(f_hz, plane)
    assert found.dc == 0.37
    assert_allclose(found.plane, 0.37)
    assert_allclose(step(f_hz, plane)[1][-1], 0.37, atol=1e-3)


def test_a_sweep_above_its_step_is_thinned_to_its_lowest_frequency() -> None:
    """From 4 steps upwards: every fourth sample is a multiple of the lowest; no value is made up."""
    f_hz = np.arange(4, 401) * STEP
    plane = np.exp(-2j * np.pi * f_hz * 7e-9)
    found = harmonics(f_hz, plane)
    assert found.step_hz == 4 * STEP
    assert_allclose(found.plane, plane[::4], rtol=0, atol=0)


def test_a_logarithmic_sweep_is_resampled_to_its_widest_step() -> None:
    f_hz = np.geomspace(5e6, 1.2e9, 801)
    plane = np.exp(-2j * np.pi * f_hz * 7e-9)
    found = harmonics(f_hz, plane)
    assert_allclose(found.step_hz, f_hz[-1] - f_hz[-2])
    k = np.arange(1, found.plane.shape[-1] + 1)
    assert_allclose(found.plane, np.exp(-2j * np.pi * k * found.step_hz * 7e-9), atol=1e-3)
    grid, values = even(f_hz, plane)
    assert_allclose(np.diff(grid), f_hz[-1] - f_hz[-2])
    assert_allclose(values, np.exp(-2j * np.pi * grid * 7e-9), atol=1e-3)


def test_a_sweep_too_coarse_to_resample_is_refused() -> None:
    f_hz = np.geomspace(5e6, 1.2e9, 101)
    plane = np.exp(-2j * np.pi * f_hz * 60e-9)
    for take in (even, harmonics):
        with pytest.raises(InvalidMeasurement, match="samples are too far apart to be put on some") as caught:
            take(f_hz, plane)
        assert "Sweep in equal steps" in caught.value.advice


@pytest.mark.parametrize("f_hz", [np.linspace(900e6, 960e6, 1601), np.linspace(1e6, 15e6, 15)])
def test_a_sweep_that_starts_too_high_has_no_low_pass_view(f_hz) -> None:
    with pytest.raises(InvalidMeasurement, match="needs at least 16 samples"):
        harmonics(f_hz, np.ones(len(f_hz), complex))


def test_a_gate_keeps_one_of_two_reflections() -> None:
    """The one in its middle exactly, up to the sweep's ends; the other is what remains without it."""
    one, other = 0.2 * np.exp(-2j * np.pi * F_HZ * 20e-9), 0.1 * np.exp(-2j * np.pi * F_HZ * 60e-9 + 1j)
    f, kept = gated(F_HZ, one + other, 12e-9, 28e-9)
    assert_allclose(f, F_HZ)
    assert_allclose(kept[40:-40], one[40:-40], atol=3e-4)
    _, left = gated(F_HZ, one + other, 12e-9, 28e-9, keep=False)
    assert_allclose(left + kept, one + other, atol=1e-12)
    assert_allclose(gated(F_HZ, one, 12e-9, 28e-9)[1], one, atol=1e-12)
    # At the very ends the other's side lobes come through; they stay below a fifth of it.
    assert np.max(np.abs(kept - one)) < 0.02


def test_a_gate_against_scikit_rf() -> None:
    """Another program's gate (another edge, no correction of ends) agrees in the middle of the sweep."""
    one, other = 0.2 * np.exp(-2j * np.pi * F_HZ * 20e-9), 0.1 * np.exp(-2j * np.pi * F_HZ * 60e-9 + 1j)
    network = skrf.Network(f=F_HZ, f_unit="hz", s=(one + other)[:, None, None])
    theirs = network.time_gate(center=20, span=24, t_unit="ns", method="fft", fft_window=("kaiser", 6))
    _, ours = gated(F_HZ, one + other, 10e-9, 30e-9)
    assert_allclose(np.abs(ours[100:300]), np.abs(theirs.s[100:300, 0, 0]), rtol=2e-2)


@pytest.mark.parametrize("low_high", [(20e-9, 20.2e-9), (0.0, 199.9e-9), (30e-9, 10e-9)])
def test_a_gate_that_cannot_be_laid(low_high) -> None:
    with pytest.raises(InvalidMeasurement, match=r"a gate of .* cannot be laid: the sweep resolves 1 ns"):
        gated(F_HZ, np.ones(400, complex), *low_high)


@settings(derandomize=True, max_examples=25, deadline=None)
@given(delay=st.floats(5e-9, 120e-9), turn=st.floats(-3, 3), size=st.floats(0.01, 2))
def test_a_gate_follows_its_reflection(delay: float, turn: float, size: float) -> None:
    plane = size * np.exp(-2j * np.pi * F_HZ * delay + 1j * turn)
    _, kept = gated(F_HZ, plane, delay - 4e-9, delay + 4e-9)
    assert_allclose(kept, plane, rtol=1e-9)
    _, kept = gated(F_HZ, plane, delay + 30e-9, delay + 50e-9)
    assert np.max(np.abs(kept[30:-30])) < 0.01 * size


def test_draws_share_every_step() -> None:
    """(d, f) gives (d, t), each as it would be alone."""
    planes = np.stack([stepped_line(F_HZ, [z], [9e-9], 60.0) for z in (40.0, 75.0)])
    for view in (impulse, step):
        t, both = view(F_HZ, planes)
        assert both.shape == (2, len(t))
        assert_allclose(both[1], view(F_HZ, planes[1])[1], rtol=0, atol=1e-15)
    assert_allclose(gated(F_HZ, planes, 0, 40e-9)[1][0], gated(F_HZ, planes[0], 0, 40e-9)[1], atol=1e-15)


@pytest.mark.parametrize("count", [1, 1 << 18, 1 << 21])
def test_blocks_of_draws_are_put_together_again(count: int) -> None:
    """In one block, in blocks of four with a rest, or row by row: each row its own, in its place."""
    plane, seen = np.arange(42.0).reshape(2, 7, 3) + 0j, []

    def function(block: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        seen.append(len(block))
        return block.real.sum(-1), block.real.max(-1)

    total, greatest = by_rows(plane, count, function)
    assert_allclose(total, plane.real.sum(-1))
    assert_allclose(greatest, plane.real.max(-1))
    assert seen == {1: [14], 1 << 18: [4, 4, 4, 2], 1 << 21: [1] * 14}[count]
