"""Instruments that warm up, drift, compress and have spurious responses."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.instruments.ageing import Ageing
from sim_instruments.instruments.noise import Noise
from sim_instruments.instruments.receivers import Receivers, WorldReadings
from sim_instruments.parts import build
from sim_instruments.world import World

F = np.linspace(10e6, 1e9, 100)
SPEC: dict[str, Any] = {
    "directivity": "28 dB", "source match": "22 dB", "load match": "24 dB", "isolation": "116 dB",
    "tracking": "0.6 dB", "cable": {"delay": "4.9 ns", "loss": "0.9 dB"}, "noise": "-152 dBm",
    "trace noise": "0.0015 dB",
}  # fmt: skip


def _off_db(ageing: Ageing, time_s: float, temperature_c: float = 23.0) -> float:
    return float(8.686 * abs(np.log(ageing.factor(1, time_s, temperature_c))))


def test_a_warm_instrument_without_drift_stands_still() -> None:
    """A factor of one at any time."""
    ageing = Ageing({}, Draws(1))
    assert [ageing.factor(p, t, 30.0) for p in (1, 2) for t in (0.0, 1e5)] == [1.0] * 4


def test_a_cold_instrument_warms_up() -> None:
    """Off by its size when switched on, by 1/e of it after the time constant."""
    ageing = Ageing({"warm-up": {"size": "0.3 dB", "time": 1200}, "on for": 0}, Draws(1))
    assert _off_db(ageing, 0.0) == pytest.approx(0.3)
    assert _off_db(ageing, 1200.0) == pytest.approx(0.3 / np.e)
    assert _off_db(ageing, 12000.0) < 1e-4


def test_drift_is_slow_and_of_its_size() -> None:
    """Root mean square over days and specimens; little within a minute."""
    t = np.arange(0, 400_000, 900.0)
    off = [[_off_db(Ageing({"drift": {"size": "0.02 dB"}}, Draws(s)), x) for x in t] for s in range(5)]
    assert np.sqrt(np.mean(np.square(off))) == pytest.approx(0.02, rel=0.15)
    ageing = Ageing({"drift": {"size": "0.02 dB"}}, Draws(1))
    assert abs(ageing.factor(1, 60.0, 23.0) - ageing.factor(1, 0.0, 23.0)) * 8.686 < 0.01


def test_the_room_moves_an_instrument() -> None:
    """In proportion to the kelvins away from 23."""
    ageing = Ageing({"drift": {"temperature": "0.01 dB"}}, Draws(1))
    assert _off_db(ageing, 0.0, 28.0) == pytest.approx(0.05)


def test_drift_shows_in_readings_and_in_the_true_terms() -> None:
    """Twelve terms at a time embed to the readings at that time: tracking has moved, directivity has not."""
    receivers = Receivers({**SPEC, "drift": {"size": "0.5 dB"}}, Draws(1))
    early, late = (receivers.true_terms(F, 1, 23.0, time_s=t) for t in (0.0, 4000.0))
    assert np.max(abs(early.tracking / late.tracking - 1)) > 0.005
    short = np.broadcast_to(-np.eye(2), (len(F), 2, 2)).astype(np.complex128)
    for t, terms in ((0.0, early), (4000.0, late)):
        raw = receivers.raw(F, short, 23.0, time_s=t)[:, 0, 0]
        expected = terms.directivity - terms.tracking / (1 + terms.source_match)
        np.testing.assert_allclose(raw, expected, rtol=0, atol=1e-13)


def test_a_receiver_compresses_by_a_tenth_at_its_level() -> None:
    """-0.1 dB there, a tenth of that 10 dB below (to first order), none where it is not said."""
    noise = Noise({**SPEC, "compression": "12 dBm"}, np.random.default_rng(1))
    at, below = 20 * np.log10(noise.compressed(np.array([12.0, 2.0])))
    assert at == pytest.approx(-0.1, abs=1e-9)
    assert below == pytest.approx(-0.01, rel=0.02)
    full = np.ones((4, 2, 2), np.complex128)
    quiet = {**SPEC, "noise": "-250 dBm", "trace noise": 0}
    for spec, expected in ((quiet, 0.0), ({**quiet, "compression": "12 dBm"}, -0.1)):
        seen = Noise(spec, np.random.default_rng(1)).on(full, 10.0, 12.0, 1)
        np.testing.assert_allclose(20 * np.log10(abs(seen)), expected, atol=1e-6)


def test_spurious_responses_stand_at_their_multiples() -> None:
    """-100 dBm against -10 dBm of source: 90 dB below one, only within the bandwidth."""
    noise = Noise({**SPEC, "spurious": {"every": "100 MHz", "level": "-100 dBm"}}, np.random.default_rng(1))
    f = np.array([99.9e6, 100e6, 100.0004e6, 100.002e6, 300e6])
    np.testing.assert_allclose(noise.spurs(f, 1e3, -10.0), [0, 10**-4.5, 10**-4.5, 0, 10**-4.5])


def test_an_amplifier_compresses_in_the_reading_of_its_own_direction() -> None:
    """Swept at -20 and at +5 dBm: S21 falls by about a decibel, S12 does not."""
    stage = {"kind": "amplifier", "gain": 16, "at": 169e6, "corner": 900e6, "input": 16, "output": 14,
             "reverse": 28, "P1dB": 20, "noise figure": 3, "supply": 5, "current": 0.08}  # fmt: skip
    world = World(1, {"stage": build(stage, Draws(1))})
    world.connect([(["stage"], [1, 2])])
    quiet = {**SPEC, "noise": "-250 dBm", "trace noise": 0, "isolation": 300}
    readings = WorldReadings(world, Receivers(quiet, Draws(1)))
    f = np.array([160e6, 169e6, 178e6])
    low, high = (readings.read(f, 1e3, p, 1, True) for p in (-20.0, 5.0))
    change = 20 * np.log10(abs(high / low))
    np.testing.assert_allclose(change[:, 1, 0], -1.0, atol=0.1)
    np.testing.assert_allclose(change[:, 0, 1], 0.0, atol=0.05)


def _levels(power: object, spec: dict[str, Any]) -> np.ndarray:
    """S21 and S12 of the stage in dB, at one frequency, ``(f, 2)``."""
    stage = {"kind": "amplifier", "gain": 16, "at": 169e6, "corner": 900e6, "input": 16, "output": 14,
             "reverse": 28, "P1dB": 20, "noise figure": 3, "supply": 5, "current": 0.08}  # fmt: skip
    world = World(1, {"stage": build(stage, Draws(1))})
    world.connect([(["stage"], [1, 2])])
    readings = WorldReadings(world, Receivers(spec, Draws(1)))
    m = readings.read(np.full(3, 169e6), 1e3, power, 1, True)  # type: ignore[arg-type]
    return np.asarray(20 * np.log10(abs(m[:, [1, 0], [0, 1]])))


def test_a_power_sweep_compresses_point_by_point() -> None:
    """The same readings as three sweeps of one level each: amplifier and receivers heed the point's."""
    spec = {**SPEC, "noise": "-250 dBm", "trace noise": 0, "compression": "12 dBm"}
    swept = _levels(np.array([-20.0, 0.0, 5.0]), spec)
    for k, level in enumerate((-20.0, 0.0, 5.0)):
        np.testing.assert_allclose(swept[k], _levels(level, spec)[k], rtol=0, atol=1e-9)
    assert swept[2, 0] < swept[0, 0] - 1.0


def test_the_floor_of_a_power_sweep_falls_as_the_level_rises() -> None:
    """20 dB more source, 20 dB less noise against it: 3000 points each, within a decibel."""
    noise = Noise({**SPEC, "trace noise": 0, "noise": "-100 dBm"}, np.random.default_rng(1))
    seen = noise.on(np.zeros((6000, 2, 2), np.complex128), 1e3, np.repeat([-30.0, -10.0], 3000), 1)
    low, high = 20 * np.log10(np.sqrt(np.mean(abs(seen.reshape(2, 3000, 4)) ** 2, axis=(1, 2))))
    assert low == pytest.approx(-40.0, abs=0.2)
    assert high == pytest.approx(-60.0, abs=0.2)
