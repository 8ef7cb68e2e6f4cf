"""Pads: the usual resistances, and what they do between 50 ohm ports."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.parts import build
from sim_instruments.parts.pad import arms

F = np.array([1e6, 1e9])
# Loss in dB, tee series and shunt, pi shunt and series, from the usual design equations.
TABLE = [
    (1, 2.8751, 433.3366, 869.5482, 5.7692),
    (3, 8.5499, 141.9262, 292.4022, 17.6148),
    (6, 16.6139, 66.9310, 150.4760, 37.3519),
    (10, 25.9747, 35.1364, 96.2475, 71.1512),
    (20, 40.9091, 10.1010, 61.1111, 247.5000),
    (40, 49.0099, 1.0001, 51.0101, 2499.7500),
]


@pytest.mark.parametrize(("loss", "t_series", "t_shunt", "p_shunt", "p_series"), TABLE)
def test_resistances(loss: float, t_series: float, t_shunt: float, p_shunt: float, p_series: float) -> None:
    """To the printed digits."""
    assert arms(loss, "tee") == pytest.approx((t_series, t_shunt), abs=6e-5)
    assert arms(loss, "pi") == pytest.approx((p_series, p_shunt), abs=6e-5)


@pytest.mark.parametrize("shape", ["tee", "pi"])
@pytest.mark.parametrize("loss", [1, 10, 40])
def test_a_pad_is_matched_and_loses_what_it_says(loss: float, shape: str) -> None:
    """Exact resistors: no reflection, exactly its loss."""
    m = build({"kind": "pad", "loss": f"{loss} dB", "shape": shape}, Draws(1)).matrix(F)
    np.testing.assert_allclose(m[:, 0, 0], 0, atol=1e-14)
    np.testing.assert_allclose(-20 * np.log10(abs(m[:, 1, 0])), loss, rtol=1e-12)


def test_a_wrong_shunt_arm_shows_in_loss_and_match() -> None:
    """R2 a fifth too large: about 1 dB less loss, and a reflection."""
    m = build({"kind": "pad", "loss": "10 dB", "faults": ["R2 +20 %"]}, Draws(1)).matrix(F)
    assert 8.5 < -20 * np.log10(abs(m[0, 1, 0])) < 9.5
    assert abs(m[0, 0, 0]) > 0.025


def test_lead_inductance_spoils_a_pad_at_high_frequency() -> None:
    """One nanohenry under the shunt arm: less loss at 1 GHz than at 1 MHz."""
    m = build({"kind": "pad", "loss": "20 dB", "lead": "1 nH"}, Draws(1)).matrix(F)
    low, high = -20 * np.log10(abs(m[:, 1, 0]))
    assert low == pytest.approx(20, abs=1e-3)
    assert high < 19
