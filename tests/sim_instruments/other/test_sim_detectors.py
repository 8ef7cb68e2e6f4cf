"""Filter and detectors: shape, noise bandwidth, statistics.

Gaussian filter and detector statistics: common practice; moments of log-exponential noise from Abramowitz and
Stegun, chapter 6.
"""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.instruments.detectors import (
    NOISE_BANDWIDTH,
    Sweep,
    exponential_integral,
    seen_tone,
    shown,
)

GRID = np.linspace(-5e6, 5e6, 4001)


def _noise_db(detector: str, video_hz: float = 1e4, dwell_s: float = 1e-2, tone: float = 0.0):
    sweep = Sweep(GRID, 1e4, video_hz, dwell_s, detector)
    tones, noise = np.full(len(GRID), tone), np.ones(len(GRID))
    return 10 * np.log10(shown(sweep, tones, noise, np.random.default_rng(1)))


def test_the_filter_is_3_db_down_at_half_its_bandwidth() -> None:
    """By the definition of its bandwidth; 12 dB at the whole of it, as a Gaussian."""
    sweep = Sweep(np.array([0.0, 5e3, 1e4]), 1e4, 1e4, 1.0, "SAMPle")
    np.testing.assert_allclose(10 * np.log10(seen_tone(sweep, 0.0)), [0, -3.0103, -12.0412], atol=1e-4)


def test_the_noise_bandwidth_is_the_area_of_the_filter() -> None:
    """1.0645 of the 3 dB bandwidth."""
    f = np.linspace(-1e5, 1e5, 20001)
    area = np.trapezoid(seen_tone(Sweep(f, 1e4, 1e4, 1.0, "SAMPle"), 0.0), f)
    assert area / 1e4 == pytest.approx(NOISE_BANDWIDTH, rel=1e-6)
    assert pytest.approx(1.0645, abs=1e-4) == NOISE_BANDWIDTH


def test_the_average_detector_takes_the_mean_over_its_bucket() -> None:
    """Against a numerical mean of the filter over each bucket."""
    wide = Sweep(np.linspace(-5e4, 5e4, 6), 1e4, 1e4, 1.0, "AVERage")
    fine = np.arange(-1e4, 1e4) + 0.5  # middles of 1 Hz: an error of the second order
    means = [np.mean(seen_tone(Sweep(f + fine, 1e4, 1e4, 1.0, "SAMPle"), 3e3)) for f in wide.f_hz]
    np.testing.assert_allclose(seen_tone(wide, 3e3), means, atol=1e-8)


def test_the_peak_detector_misses_no_tone_between_points() -> None:
    """A bucket wider than the filter: full level where the sample detector sees nothing."""
    f = np.linspace(0, 1e6, 11)
    assert np.max(seen_tone(Sweep(f, 1e3, 1e3, 1.0, "POSitive"), 333e3)) == 1.0
    assert np.max(seen_tone(Sweep(f, 1e3, 1e3, 1.0, "SAMPle"), 333e3)) < 1e-100


def test_one_sample_of_noise_is_rayleigh() -> None:
    """Mean power right, mean of the logarithm 2.51 dB below it, deviation 5.57 dB."""
    level = _noise_db("SAMPle")
    assert 10 * np.log10(np.mean(10 ** (level / 10))) == pytest.approx(0.0, abs=0.2)
    assert np.mean(level) == pytest.approx(-2.507, abs=0.25)
    assert np.std(level) == pytest.approx(5.57, abs=0.25)


@pytest.mark.parametrize("narrowed", [10.0, 100.0])
def test_the_video_filter_averages_the_logarithm(narrowed: float) -> None:
    """Still 2.51 dB low, the deviation down by the root of the ratio of bandwidths."""
    level = _noise_db("SAMPle", video_hz=1e4 / narrowed)
    assert np.mean(level) == pytest.approx(-2.507, abs=0.1)
    assert np.std(level) == pytest.approx(5.57 / np.sqrt(narrowed), rel=0.05)


def test_the_average_detector_reads_the_mean_power() -> None:
    """No log-averaging error; a hundred samples leave a tenth of the scatter in power."""
    level = 10 ** (_noise_db("AVERage") / 10)
    assert np.mean(level) == pytest.approx(1.0, abs=0.01)
    assert np.std(level) == pytest.approx(0.1, rel=0.05)


def test_the_peak_detector_reads_noise_high_by_the_count() -> None:
    """Mean of the greatest of n exponential values: the harmonic number of n (order statistics)."""
    for dwell_s, n in ((1e-3, 10), (1e-2, 100)):
        level = 10 ** (_noise_db("POSitive", dwell_s=dwell_s) / 10)
        assert np.mean(level) == pytest.approx(sum(1 / k for k in range(1, n + 1)), rel=0.03)


@pytest.mark.parametrize(("detector", "video_hz"), [("SAMPle", 1e4), ("SAMPle", 1e2), ("AVERage", 1e4)])
def test_a_strong_tone_reads_its_own_level(detector: str, video_hz: float) -> None:
    """40 dB above noise: noise adds some thousandths of a decibel."""
    level = _noise_db(detector, video_hz, tone=1e4)
    assert np.mean(level) == pytest.approx(40.0, abs=0.01)


def test_log_averaged_tone_and_noise_of_equal_power() -> None:
    """Against many draws of the sum of a phasor and complex noise."""
    rng = np.random.default_rng(2)
    n = (rng.standard_normal(200_000) + 1j * rng.standard_normal(200_000)) / np.sqrt(2)
    drawn = np.mean(20 * np.log10(abs(1 + n)))
    assert np.mean(_noise_db("SAMPle", 1e1, tone=1.0)) == pytest.approx(drawn, abs=0.03)


def test_the_exponential_integral() -> None:
    """Values of Abramowitz and Stegun, tables 5.1 and 5.2."""
    x = np.array([0.01, 0.5, 1.0, 2.0, 5.0])
    np.testing.assert_allclose(
        exponential_integral(x), [4.0379296, 0.5597736, 0.2193839, 0.0489005, 0.0011483], atol=2e-5
    )
