"""Impedance of a measured antenna and the end of a measured cable, against what their README expects.

Data: shared/data/antenna_oneport, the corrected readings (ref_*).
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.touchstone import read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "antenna_oneport"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")
LIGHT = 299_792_458.0

# Frequency, SWR, impedance as the README prints them.
TABLE = [
    (40.0000, 28.537, 137.24, 418.00), (60.2667, 1.668, 30.38, 4.65), (75.2000, 1.407, 64.04, 13.42),
    (90.1333, 1.400, 54.39, -17.09), (99.7333, 1.555, 38.17, -15.42), (120.0000, 2.074, 24.15, 1.91),
    (149.8667, 2.569, 26.80, 27.29), (179.7333, 2.169, 48.26, 38.96), (200.0000, 2.765, 53.85, 54.94),
]  # fmt: skip


def reflection(name: str) -> tuple[np.ndarray, np.ndarray]:
    data = read((FOLDER / name).read_bytes(), name)
    return data.f_hz, data.s[:, 0, 0]


def measure(name: str, file: str, **parameters) -> float:
    f_hz, plane = reflection(file)
    defaults = {"port": 1} | ({"reference": 50.0} if "reference" in FIGURES[name].parameters else {})
    return float(FIGURES[name].measure(f_hz, plane, "at most", **{**defaults, **parameters}).value)


@pytest.mark.parametrize(("mhz", "swr", "resistance", "reactance"), TABLE)
def test_the_impedance_of_the_antenna(mhz: float, swr: float, resistance: float, reactance: float) -> None:
    """The frequencies are printed to 0.1 kHz: the nearest sample is meant."""
    f_hz, _ = reflection("ref_antenna.s1p")
    where = float(f_hz[np.argmin(np.abs(f_hz - mhz * 1e6))])
    assert_allclose(measure("VSWR", "ref_antenna.s1p", at=where), swr, atol=6e-4)
    assert_allclose(measure("resistance", "ref_antenna.s1p", at=where), resistance, atol=6e-3)
    assert_allclose(measure("reactance", "ref_antenna.s1p", at=where), reactance, atol=6e-3)
    size, q = np.hypot(resistance, reactance), abs(reactance) / resistance
    assert_allclose(measure("impedance", "ref_antenna.s1p", at=where), size, atol=9e-3)
    assert_allclose(measure("Q", "ref_antenna.s1p", at=where), q, atol=4e-4)
    assert_allclose(
        measure("parallel resistance", "ref_antenna.s1p", at=where), size**2 / resistance, rtol=6e-4
    )


@pytest.mark.parametrize("end", ["open", "short"])
def test_the_end_of_a_cable_is_where_its_phase_says(end: str) -> None:
    """Against the slope of the phase, another way to it; its loss lies within what |S11| swings by."""
    file = f"ref_cable_{end}.s1p"
    f_hz, plane = reflection(file)
    slope = np.polyfit(f_hz, np.unwrap(np.angle(plane)), 1)[0]
    length = -slope / (2 * np.pi) * LIGHT / 2
    assert_allclose(measure("distance to fault", file, velocity=1.0), length, rtol=2e-3)
    loss = measure("return loss of the fault", file, velocity=1.0)
    size = np.abs(plane)
    assert size.min() < 10 ** (-loss / 20) < size.max()


def test_open_and_short_end_at_the_same_place() -> None:
    """Offsets of the standards alike: within 2 mm of 3.92 m, though one reflects with the other sign."""
    places = [measure("distance to fault", f"ref_cable_{end}.s1p", velocity=1.0) for end in ("open", "short")]
    assert_allclose(places[0], places[1], atol=2e-3)


def test_a_sweep_from_40_mhz_shows_no_impedance_along_the_cable() -> None:
    """Nothing is made up below the sweep: the figure says what sweep it needs."""
    with pytest.raises(InvalidMeasurement, match="needs at least 16 samples") as caught:
        measure("impedance at distance", "ref_cable_open.s1p", velocity=0.66, distance=1.0)
    assert "from one step upwards" in caught.value.advice
