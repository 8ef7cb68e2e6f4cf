"""Sources as a bench file declares them, and the distributions behind their sizes."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchrun.quantity import QuantityError
from benchrun.uncertainty.distribution import Distribution
from benchrun.uncertainty.sources import GROUPS, UNDECLARED, Sources


def test_values_are_read_with_their_units():
    found = Sources.from_mapping(
        {
            "noise": {"floor": "-150 dBm", "trace": "0.002 dB"},
            "drift": {
                "per hour": "0.01 dB",
                "over": "30 min",
                "delay per kelvin": "98 fs",
                "room": "0.5 degC",
            },
            "connector": {"repeatability": "60 dB"},
            "cable": {"phase": "0.1 deg"},
            "fixture": {"launch": "2 fF"},
        }
    )
    assert found.connector_repeatability == pytest.approx(1e-3)
    assert found.cable_phase == pytest.approx(math.radians(0.1))
    assert found.fixture_launch == pytest.approx(2e-15)
    assert found.drift == pytest.approx((10 ** (0.01 / 20) - 1) / 2)


def test_every_key_of_the_table_reaches_a_field():
    examples = {
        "floor": "-150 dBm", "trace": "0.1 dB", "deviation": "0.1 dB", "per hour": "0.1 dB",
        "per kelvin": "0.1 dB", "delay per kelvin": "98 fs", "over": "1 h", "room": "0.7 degC",
        "reflection": "60 dB", "magnitude": "0.1 dB", "phase": "1 deg", "repeatability": "60 dB",
        "leakage": "90 dB", "delay": "1 ps", "impedance": "0.1 ohm", "loss": "0.1 dB", "launch": "2 fF",
    }  # fmt: skip
    for group, keys in GROUPS.items():
        for key in keys:
            text = "70 dB" if (group, key) == ("connector", "floor") else examples[key]
            assert Sources.from_mapping({group: {key: text}}) != UNDECLARED, (group, key)


def test_noise_follows_bandwidth_level_and_averages():
    # Common practice: power in proportion to bandwidth, over the source's level, down with averaging.
    sources = Sources.from_mapping({"noise": {"floor": "-150 dBm", "trace": "0.002 dB"}})
    floor, trace = sources.noise(1e3, -10.0, 1)
    assert floor == pytest.approx(10 ** (-110 / 20))
    assert sources.noise(1e5, -30.0, 100) == pytest.approx((10 * floor, trace))


@pytest.mark.parametrize(
    ("declared", "said"),
    [
        ({"weather": {}}, "'weather' is no source; known are noise, linearity"),
        ({"noise": {"colour": "1 dB"}}, "noise does not know 'colour'; it takes floor, trace, distribution"),
        (
            {"connector": {"distribution": "gaussian"}},
            "connector: 'gaussian' is no distribution; known",
        ),
        ({"connector": {"repeatability": "60"}}, "'60' has no unit"),
    ],
)
def test_what_is_not_known_is_refused_in_a_sentence(declared, said):
    with pytest.raises(QuantityError, match=said):
        Sources.from_mapping(declared)


def test_conditions_alone_declare_nothing():
    assert not UNDECLARED.declared
    assert not Sources.from_mapping({"drift": {"over": "2 h", "room": "1 degC"}}).declared
    assert Sources.from_mapping({"isolation": {"leakage": "110 dB"}}).declared


@pytest.mark.parametrize("shape", list(Distribution))
@pytest.mark.parametrize("vector", [False, True])
def test_draws_have_unit_deviation_and_no_mean(shape, vector):
    draws = shape.draw(np.random.default_rng(4), 100_000, vector)
    assert draws.shape == (100_000, 2 if vector else 1)
    assert draws.mean(axis=0) == pytest.approx(0.0, abs=0.015)
    assert draws.std(axis=0) == pytest.approx(1.0, abs=0.01)
    if vector:
        assert np.mean(draws[:, 0] * draws[:, 1]) == pytest.approx(0.0, abs=0.015)


@pytest.mark.parametrize(
    ("shape", "vector", "size"),
    # JCGM 101:2008, table 1 (from memory): a rectangle's half-width over sqrt(3), an amplitude over sqrt(2),
    # the radius of a disk over 2.
    [
        (Distribution.RECTANGULAR, False, math.sqrt(3.0)),
        (Distribution.U_SHAPED, False, math.sqrt(2.0)),
        (Distribution.RECTANGULAR, True, 2.0),
        (Distribution.U_SHAPED, True, math.sqrt(2.0)),
    ],
)
def test_bounded_draws_stay_within_their_size(shape, vector, size):
    draws = shape.draw(np.random.default_rng(5), 20_000, vector)
    reach = np.hypot.reduce(draws, axis=1) if vector else np.abs(draws[:, 0])
    assert reach.max() <= size * (1 + 1e-12)
    assert reach.max() > 0.999 * size
    assert shape.standard(size, vector) == pytest.approx(1.0)
    if shape is Distribution.U_SHAPED and vector:
        assert reach.min() == pytest.approx(size)
