"""Simulated calibration standards against the check numbers of the published models.

Source: scikit-rf documentation, SOLT calibration standards creation, which derives the usual offset-line
model; numbers computed from its low-loss form. The simulated standards use the exact distributed form,
which departs from it by about 1e-5 in the reflection coefficient.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.parts import build

F = np.array([1e9, 6e9, 18e9])
OPEN = {"standard": "open", "delay": 30e-12, "polynomial": [50e-15]}
O2 = {"standard": "open", "delay": 30e-12, "loss": 1.3e9, "polynomial": [50e-15, -300e-27, 20e-36, 0.1e-45]}
S1 = {"standard": "short", "delay": 30e-12, "loss": 1.3e9,
      "polynomial": [2e-12, -100e-24, 2e-33, -0.01e-42]}  # fmt: skip
S2 = {"standard": "short", "delay": 30e-12, "loss": 2.0e9, "impedance": 50.2}


def _gamma(spec: dict[str, Any], seed: int = 1) -> np.ndarray:
    return build({"kind": "standard", **spec}, Draws(seed)).matrix(F)[:, 0, 0]


@pytest.mark.parametrize(
    ("spec", "expected", "apart"),
    [
        (OPEN, [0.917756 - 0.397146j, -0.770159 - 0.637852j, 0.494309 - 0.869286j], 1e-6),
        (O2, [0.917795 - 0.396996j, -0.767433 - 0.638747j, 0.474875 - 0.876486j], 2e-5),
        (S1, [-0.927597 + 0.369431j, 0.639460 + 0.765502j, -0.869766 + 0.486250j], 2e-5),
        (S2, [-0.926150 + 0.370813j, 0.640285 + 0.763053j, -0.867980 + 0.485548j], 2e-5),
    ],
)
def test_reflections_of_opens_and_shorts(spec: dict[str, Any], expected: list[complex], apart: float) -> None:
    """At 1, 6 and 18 GHz."""
    np.testing.assert_allclose(_gamma(spec), expected, rtol=0, atol=apart)


@pytest.mark.parametrize(("which", "sign"), [("open", 1), ("short", -1)])
def test_ideal_ends(which: str, sign: int) -> None:
    """No offset, no fringing: +1 and -1."""
    np.testing.assert_allclose(_gamma({"standard": which}), sign, atol=1e-12)


def test_an_offset_short_turns_720_degrees_for_each_delay() -> None:
    """d(angle)/df = -720 degrees times the one-way delay."""
    f = np.linspace(1e9, 2e9, 11)
    part = build({"kind": "standard", "standard": "short", "delay": 30e-12}, Draws(1))
    turned = np.unwrap(np.angle(part.matrix(f)[:, 0, 0], deg=True), period=360)
    assert (turned[-1] - turned[0]) / 1e9 == pytest.approx(-720 * 30e-12, rel=1e-9)


def test_a_load_shows_its_resistance_and_inductance() -> None:
    """(Z - 50)/(Z + 50) with Z = R + j w L."""
    z = 50.4 + 2j * np.pi * F * 5e-12
    gamma = _gamma({"standard": "load", "resistance": 50.4, "inductance": 5e-12})
    np.testing.assert_allclose(gamma, (z - 50) / (z + 50), atol=1e-15)


def test_specimens_stay_inside_the_makers_tolerance() -> None:
    """Drawn about the definition, cut at two sigma, not all alike."""
    nominal = _gamma({"standard": "load"})
    seen = [
        np.max(abs(_gamma({"standard": "load", "spread": {"resistance": 0.25}}, seed) - nominal))
        for seed in range(40)
    ]
    assert max(seen) <= 0.5 / 100 * 1.01
    assert len({round(s, 9) for s in seen}) > 20


def test_an_unknown_standard_is_refused() -> None:
    """With its name."""
    with pytest.raises(ValueError, match="there is no standard 'sliding load'"):
        build({"kind": "standard", "standard": "sliding load"}, Draws(1))


def test_a_thru_shorter_than_its_definition_turns_the_phase_forward() -> None:
    """A drawn delay may be negative: exp(-j w tau) then leads, and loses its sign nowhere."""
    f = np.array([1e9])
    short = build({"kind": "standard", "standard": "thru", "delay": -0.1e-12}, Draws(1)).matrix(f)
    long = build({"kind": "standard", "standard": "thru", "delay": 0.1e-12}, Draws(1)).matrix(f)
    assert np.angle(short[0, 1, 0]) == pytest.approx(2 * np.pi * 1e9 * 0.1e-12)
    assert np.angle(long[0, 1, 0]) == pytest.approx(-2 * np.pi * 1e9 * 0.1e-12)
