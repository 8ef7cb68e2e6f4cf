"""The declared noise holds for stated conditions, and follows a sweep's own."""

from __future__ import annotations

import math

import pytest

from benchrun.errors import InputError
from benchrun.sequence.bench import Bench, NoiseAt
from benchrun.sequence.files import load_model
from benchrun.sequence.find import find
from benchrun.uncertainty.residual import ResidualTerms


def test_the_floor_follows_bandwidth_level_and_averages() -> None:
    """Noise power is proportional to bandwidth (kTB), common practice for the rest."""
    declared = NoiseAt.model_construct(bandwidth=1e3, power=-10.0)
    assert declared.factors(1e3, -10.0, 1) == (1.0, 1.0)
    floor, trace = declared.factors(10e3, -10.0, 1)
    assert floor == pytest.approx(math.sqrt(10))
    assert trace == pytest.approx(math.sqrt(10))
    floor, trace = declared.factors(1e3, -30.0, 1)
    assert floor == pytest.approx(10.0)
    assert trace == 1.0
    assert declared.factors(1e3, -10.0, 16) == (0.25, 0.25)


def test_only_noise_is_scaled() -> None:
    terms = ResidualTerms(directivity=0.01, noise_floor=1e-5, trace_noise=1e-3).scaled(3.0, 2.0)
    assert (terms.directivity, terms.noise_floor, terms.trace_noise) == pytest.approx((0.01, 3e-5, 2e-3))


def test_the_installed_benches_state_their_conditions() -> None:
    for name in ("workshop", "workshop-second", "amplifier"):
        path = find("bench", name)
        bench = load_model(path.read_bytes(), str(path), Bench, path).model
        assert bench.uncertainty.noise_at is not None
        assert bench.uncertainty.noise_at.bandwidth == 1e3


def test_conditions_need_their_units() -> None:
    path = find("bench", "workshop")
    text = path.read_text().replace("noise at: {bandwidth: 1 kHz,", "noise at: {bandwidth: 1000,")
    with pytest.raises(InputError, match="1000 has no unit"):
        load_model(text.encode(), "bench.yaml", Bench)
