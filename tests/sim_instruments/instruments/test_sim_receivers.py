"""The simulated analyzer's insides against the published error models.

12-term model after Rehnmark 1974 and 8-term model with switch terms after Marks 1997, both as scikit-rf
states them; written here from the formulas, apart from the wave-by-wave chain that the simulation uses.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.instruments.receivers import Receivers
from sim_instruments.waves import line, two

F = np.linspace(10e6, 3e9, 41)
SPEC: dict[str, Any] = {
    "directivity": "28 dB", "source match": "22 dB", "load match": "24 dB", "isolation": "90 dB",
    "tracking": "0.6 dB", "cable": {"delay": "4.9 ns", "loss": "0.9 dB", "drift": "2e-5"},
    "noise": "-152 dBm", "trace noise": "0.0015 dB",
}  # fmt: skip
T_C = 23.4


def _receivers(seed: int = 1, **changes: Any) -> Receivers:
    return Receivers({**SPEC, **changes}, Draws(seed) / "instrument")


def _device() -> np.ndarray:
    return line(F, 0.7e-9, 30.0, 3.0) * np.array([[1, 0.4], [2.0, 1]])


def _embed(s: np.ndarray, one: Any, other: Any) -> np.ndarray:
    """True to raw by the 12-term formulas."""
    s11, s12, s21, s22 = s[:, 0, 0], s[:, 0, 1], s[:, 1, 0], s[:, 1, 1]
    det = s11 * s22 - s12 * s21
    d1 = 1 - one.source_match * s11 - one.load_match * s22 + one.source_match * one.load_match * det
    d2 = 1 - other.load_match * s11 - other.source_match * s22 + other.source_match * other.load_match * det
    return two(
        one.directivity + one.tracking * (s11 - one.load_match * det) / d1,
        other.isolation + other.transmission * s12 / d2,
        one.isolation + one.transmission * s21 / d1,
        other.directivity + other.tracking * (s22 - other.load_match * det) / d2,
    )


class _Terms:
    """Terms of the check vector."""

    def __init__(self, **terms: complex) -> None:
        for name, value in terms.items():
            setattr(self, name, np.array([value]))


def test_the_formula_here_gives_the_check_vector() -> None:
    """The vector computed for the 12-term formulas (one frequency)."""
    one = _Terms(directivity=0.05 - 0.02j, source_match=0.1 + 0.05j, tracking=0.95 + 0.02j,
                 load_match=0.08 - 0.06j, transmission=0.97 - 0.03j, isolation=1e-4 + 2e-4j)  # fmt: skip
    other = _Terms(directivity=-0.04 + 0.03j, source_match=0.07 - 0.09j, tracking=0.93 - 0.05j,
                   load_match=0.09 + 0.04j, transmission=0.96 + 0.04j, isolation=-1e-4 + 1e-4j)  # fmt: skip
    s = np.array([[[0.2 + 0.1j, 0.6 - 0.3j], [0.5 - 0.4j, -0.15 + 0.25j]]])
    expected = [[0.233479 + 0.042450j, 0.614311 - 0.244127j], [0.500014 - 0.388548j, -0.144728 + 0.242343j]]
    np.testing.assert_allclose(_embed(s, one, other)[0], expected, rtol=0, atol=6e-7)


def test_readings_obey_the_twelve_terms_that_the_chain_holds() -> None:
    """Raw from the chain of waves equals the device embedded by formula."""
    receivers = _receivers()
    terms = [receivers.true_terms(F, port, T_C) for port in (1, 2)]
    raw = receivers.raw(F, _device(), T_C)
    np.testing.assert_allclose(raw, _embed(_device(), *terms), rtol=0, atol=1e-13)


def test_switch_terms_and_eight_terms_tell_the_same_story() -> None:
    """12 -> 8: GF and GR from the terms equal the switch, and both estimates of k agree."""
    receivers = _receivers()
    one, other = (receivers.true_terms(F, port, T_C) for port in (1, 2))
    step = one.load_match - other.source_match
    forward = step / (other.tracking + other.directivity * step)
    k = one.transmission / (other.tracking + other.directivity * step)
    back_step = other.load_match - one.source_match
    reverse = back_step / (one.tracking + one.directivity * back_step)
    k_again = (one.tracking + one.directivity * back_step) / other.transmission
    np.testing.assert_allclose(receivers.switch_term(F, 1, T_C), forward, rtol=0, atol=1e-12)
    np.testing.assert_allclose(receivers.switch_term(F, 2, T_C), reverse, rtol=0, atol=1e-12)
    np.testing.assert_allclose(k, k_again, rtol=1e-11)
    assert np.max(abs(forward)) > 1e-3


def test_ports_and_specimens_differ() -> None:
    """Port 1 is not port 2, and one instrument is not the next."""
    receivers = _receivers()
    one, two_ = receivers.true_terms(F, 1, T_C), receivers.true_terms(F, 2, T_C)
    other = _receivers(2).true_terms(F, 1, T_C)
    assert np.max(abs(one.directivity - two_.directivity)) > 1e-3
    assert np.max(abs(one.source_match - other.source_match)) > 1e-3


def test_error_terms_have_the_size_asked_for() -> None:
    """Root mean square over many specimens within a quarter."""
    own = [_receivers(seed, cable={"delay": 0.0, "loss": 0.0}) for seed in range(60)]
    terms = [r.true_terms(F, 1, 23.0) for r in own]
    for name, level_db in (("directivity", 28), ("load_match", 24)):
        rms = np.sqrt(np.mean([abs(getattr(t, name)) ** 2 for t in terms]))
        assert rms == pytest.approx(10 ** (-level_db / 20), rel=0.25)


@pytest.mark.parametrize("bandwidth", [10.0, 100.0, 1e4])
def test_the_floor_rises_ten_db_for_a_decade_of_bandwidth(bandwidth: float) -> None:
    """-152 dBm in 1 Hz, seen against a source of -10 dBm; within 0.3 dB."""
    receivers, nothing = _receivers(), np.zeros((4001, 2, 2), np.complex128)
    seen = receivers.noisy(nothing, bandwidth, -10.0, 1)
    level = 10 * np.log10(np.mean(abs(seen) ** 2))
    assert level == pytest.approx(-152 + 10 * np.log10(bandwidth) + 10, abs=0.3)


@pytest.mark.parametrize("averages", [4, 100])
def test_averages_lower_the_noise_by_their_root(averages: int) -> None:
    """10 log N dB, of floor and trace noise alike; within 0.3 dB."""
    receivers = _receivers()
    for m in (np.zeros((4001, 2, 2), np.complex128), np.ones((4001, 2, 2), np.complex128)):
        one = np.std(receivers.noisy(m, 1e3, -10.0, 1))
        many = np.std(receivers.noisy(m, 1e3, -10.0, averages))
        assert 20 * np.log10(one / many) == pytest.approx(10 * np.log10(averages), abs=0.3)


def test_more_power_lifts_readings_above_the_floor() -> None:
    """Ten dB more source, ten dB less noise."""
    receivers, nothing = _receivers(), np.zeros((4001, 2, 2), np.complex128)
    low, high = (np.std(receivers.noisy(nothing, 1e3, power, 1)) for power in (-30.0, -20.0))
    assert 20 * np.log10(low / high) == pytest.approx(10.0, abs=0.3)


def test_trace_noise_is_in_proportion_to_the_reading() -> None:
    """0.0015 dB rms in 1 kHz on a full reading."""
    receivers, full = _receivers(noise="-200 dBm"), np.ones((4001, 2, 2), np.complex128)
    level_db = 20 * np.log10(abs(receivers.noisy(full, 1e3, 0.0, 1)))
    assert np.std(level_db) == pytest.approx(0.0015 / np.sqrt(2), rel=0.05)


def test_cables_change_with_temperature() -> None:
    """Two parts in 100 000 of the delay for a kelvin: twice 4.9 ns, seen in the reflection's phase."""
    receivers = _receivers(directivity="200 dB", **{"source match": "200 dB"})
    short = np.broadcast_to(-np.eye(2), (len(F), 2, 2)).astype(np.complex128)
    cold, warm = (receivers.raw(F, short, t)[:, 0, 0] for t in (23.0, 33.0))
    turned = np.angle(warm / cold)
    np.testing.assert_allclose(turned, -2 * np.pi * F * 2 * 4.9e-9 * 2e-4, rtol=0.05)


def test_without_a_source_there_is_only_noise() -> None:
    """Ratios of noise: of the order of one, uncorrelated from point to point."""
    seen = _receivers().nothing(2001)[:, 0, 0]
    assert 0.3 < np.median(abs(seen)) < 3
    assert abs(np.mean(seen[1:] / abs(seen[1:]) * np.conj(seen[:-1] / abs(seen[:-1])))) < 0.1
