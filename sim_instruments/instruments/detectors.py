"""What a swept receiver shows of tones and noise: resolution filter, video filter, detector.

The resolution filter is Gaussian, its bandwidth counted at -3 dB, its noise bandwidth 1.0645 times that. The
envelope of noise is Rayleigh, so its power is exponential: its logarithm, averaged by the video filter, lies
2.51 dB below the power and scatters by 5.57 dB over the root of the count (common practice; the moments of a
log-exponential variable are -0.5772 and pi^2/6, Abramowitz and Stegun 6.3 and 6.4).
"""

from __future__ import annotations

import math

import numpy as np

from sim_instruments.waves import Real

__all__ = ["NOISE_BANDWIDTH", "Sweep", "exponential_integral", "seen_tone", "shown"]

NOISE_BANDWIDTH = math.sqrt(math.pi / math.log(2.0)) / 2.0
"""Of the Gaussian filter over its 3 dB bandwidth: 1.0645."""
_FAR = 6.0
"""Resolution bandwidths from its middle at which the filter lets nothing through: -434 dB."""


class Sweep:
    """Settings that decide what is shown.

    Parameters
    ----------
    f_hz
        Middles of the buckets, ``(f,)``.
    resolution_hz, video_hz
        Bandwidths.
    dwell_s
        Spent in one bucket.
    detector
        ``POSitive``, ``SAMPle`` or ``AVERage`` (of the power).
    """

    def __init__(
        self, f_hz: Real, resolution_hz: float, video_hz: float, dwell_s: float, detector: str
    ) -> None:
        self.f_hz, self.resolution_hz, self.video_hz = f_hz, resolution_hz, video_hz
        self.dwell_s, self.detector = dwell_s, detector
        self.bucket_hz = float(f_hz[1] - f_hz[0]) if len(f_hz) > 1 else 0.0


def seen_tone(sweep: Sweep, f_hz: float) -> Real:
    """Share of a tone's power that the filter lets through, ``(f,)``, as the detector takes it.

    Examples
    --------
    >>> sweep = Sweep(np.array([0.0, 50.0, 100.0]), 100.0, 100.0, 1.0, "SAMPle")
    >>> [round(float(x), 4) for x in seen_tone(sweep, 0.0)]
    [1.0, 0.5, 0.0625]
    """
    off = np.abs(sweep.f_hz - f_hz)
    half = sweep.bucket_hz / 2
    scale = 2.0 * math.sqrt(math.log(2.0)) / sweep.resolution_hz
    if sweep.detector == "POSitive":
        off = np.maximum(off - half, 0.0)
    if sweep.detector != "AVERage" or half == 0.0:
        return np.asarray(np.exp(-np.minimum((off * scale) ** 2, 700.0)))
    share = np.zeros(len(off))
    for k in np.flatnonzero(off < half + _FAR * sweep.resolution_hz):
        span = math.erf((off[k] + half) * scale) - math.erf((off[k] - half) * scale)
        share[k] = span * math.sqrt(math.pi) / (4 * half * scale)
    return share


def shown(sweep: Sweep, tones_mw: Real, noise_mw: Real, generator: np.random.Generator) -> Real:
    """What is shown in each bucket, in milliwatt, ``(f,)``.

    Parameters
    ----------
    tones_mw
        Power of tones as :func:`seen_tone` has it, ``(f,)``.
    noise_mw
        Mean power of noise in the resolution filter, ``(f,)``.
    generator
        Chance.
    """
    narrowed = max(sweep.resolution_hz / sweep.video_hz, 1.0)
    width_hz = min(sweep.resolution_hz, sweep.video_hz)
    count = max(sweep.dwell_s * width_hz, 1.0)
    size = len(sweep.f_hz)
    if sweep.detector == "AVERage":
        count = max(sweep.dwell_s * sweep.resolution_hz, 1.0)
        mean = generator.gamma(count, 1.0 / count, size)
        cross = 2.0 * np.sqrt(tones_mw * noise_mw / (2.0 * count)) * generator.standard_normal(size)
        return np.maximum(tones_mw + noise_mw * mean + cross, noise_mw * 1e-3)
    peak = sweep.detector == "POSitive"
    if narrowed <= 1.0:
        return _wide(tones_mw, noise_mw, count if peak else 1.0, generator)
    return _narrow(tones_mw, noise_mw, narrowed, count if peak else 1.0, generator)


def _wide(tones_mw: Real, noise_mw: Real, count: float, generator: np.random.Generator) -> Real:
    """Video as wide as resolution: one sample of the envelope, or the greatest of ``count``."""
    size = len(tones_mw)
    # The greatest of n exponential values has the distribution (1 - exp(-x))^n.
    greatest = -np.log(-np.expm1(np.log(generator.uniform(1e-12, 1.0, size)) / count))
    angle = generator.uniform(-np.pi, np.pi, size) / count  # of many, the one in phase is the greatest
    return np.asarray(np.abs(np.sqrt(tones_mw) + np.sqrt(noise_mw * greatest) * np.exp(1j * angle)) ** 2)


def _narrow(
    tones_mw: Real, noise_mw: Real, narrowed: float, count: float, generator: np.random.Generator
) -> Real:
    """Video averages the logarithm of the envelope, of tone and noise together."""
    ratio = tones_mw / noise_mw
    mean = np.log(np.maximum(tones_mw, 1e-300)) + exponential_integral(ratio)
    mean = np.where(ratio > 1e-12, mean, np.log(noise_mw) - np.euler_gamma)
    spread = 1.0 / np.sqrt((6.0 / np.pi**2 + ratio / 2.0) * narrowed)
    normal = generator.standard_normal((len(tones_mw), max(min(round(count), 64), 1))).max(axis=1)
    return np.asarray(np.exp(mean + spread * normal))


def exponential_integral(x: Real) -> Real:
    """E1 of positive values, ``(n,)``, within 1e-4 (Abramowitz and Stegun 5.1.53 and 5.1.54).

    Examples
    --------
    >>> [round(float(v), 4) for v in exponential_integral(np.array([0.5, 1.0, 2.0]))]
    [0.5598, 0.2194, 0.0489]
    """
    x = np.maximum(np.asarray(x, np.float64), 1e-300)
    low, high = np.minimum(x, 1.0), np.clip(x, 1.0, 700.0)
    series = np.polynomial.polynomial.polyval(
        low, [-0.57721566, 0.99999193, -0.24991055, 0.05519968, -0.00976004, 0.00107857]
    ) - np.log(low)
    ends = (high**2 + 2.334733 * high + 0.250621) / (high**2 + 3.330657 * high + 1.681534)
    return np.where(x <= 1.0, series, ends * np.exp(-high) / high)
