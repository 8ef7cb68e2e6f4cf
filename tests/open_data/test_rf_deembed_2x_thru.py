"""2x-thru after IEEE 370 on a fixture whose exact truth is known.

Data: shared/data/ieee370_nzc. Synthetic, with halves that are 8 % wider in front of the device on purpose.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration import differ
from benchrun.rf.deembedding.orientation import facing, refuse_turned
from benchrun.rf.deembedding.two_x_thru import Split, split_nzc, split_zc
from benchrun.rf.touchstone import read
from benchrun.rf.twoport import TwoPort

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "ieee370_nzc"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")


def load(name: str) -> TwoPort:
    return read((FOLDER / name).read_bytes(), name).two_port


@pytest.fixture(scope="module")
def f_hz() -> np.ndarray:
    return read((FOLDER / "two_x_thru.s2p").read_bytes(), "two_x_thru.s2p").f_hz


@pytest.fixture(scope="module")
def nzc(f_hz) -> Split:
    return split_nzc(f_hz, load("two_x_thru.s2p"))


@pytest.fixture(scope="module")
def zc(f_hz) -> Split:
    return split_zc(f_hz, load("two_x_thru.s2p"), load("fixture_dut_fixture.s2p"))


def test_the_reference_device_is_reproduced(nzc: Split) -> None:
    found = nzc.without(load("fixture_dut_fixture.s2p"))
    assert differ(found, load("ref_nzc_dut.s2p")) < 1e-8
    assert differ(nzc.left, load("ref_nzc_fixture1.s2p")) < 1e-8


def test_how_near_the_truth_each_method_comes(nzc: Split, zc: Split) -> None:
    """NZC 0.4692 dB and 0.06556 (README); impedance correction brings both nearer."""
    truth, reading = load("true_dut.s2p"), load("fixture_dut_fixture.s2p")

    def off(split: Split) -> tuple[float, float]:
        found = split.without(reading)
        level = np.abs(20 * np.log10(np.abs(found.s21 / truth.s21)))
        return float(np.median(level)), float(np.median(np.abs(found.s11 - truth.s11)))

    found = nzc.without(reading)
    assert_allclose(np.max(np.abs(20 * np.log10(np.abs(found.s21 / truth.s21)))), 0.4692, atol=1e-3)
    assert_allclose(np.max(np.abs(found.s11 - truth.s11)), 0.06556, atol=1e-4)
    assert off(zc)[0] < 0.8 * off(nzc)[0]
    assert off(zc)[1] < 0.6 * off(nzc)[1]


def test_scikit_rf_takes_the_same_halves_out(nzc: Split, f_hz) -> None:
    """Its own removal by transfer matrices against ours in the S-domain: within 1e-9."""
    from skrf.calibration.deembedding import IEEEP370_SE_NZC_2xThru

    frequency = skrf.Frequency.from_f(f_hz, unit="hz")
    dm = IEEEP370_SE_NZC_2xThru(skrf.Network(frequency=frequency, s=load("two_x_thru.s2p").matrix))
    reading = load("fixture_dut_fixture.s2p")
    theirs = dm.deembed(skrf.Network(frequency=frequency, s=reading.matrix))
    assert_allclose(nzc.without(reading).matrix, theirs.s, atol=1e-9)


def test_the_2x_thru_out_of_itself_leaves_nothing(nzc: Split) -> None:
    assert nzc.self_test.good
    assert nzc.self_test.magnitude_db < 1e-5  # the digits of the file
    assert not nzc.resampled


def test_what_is_said_of_the_2x_thru(nzc: Split) -> None:
    """Synthetic data are perfect; the fixture is of class A in loss."""
    assert nzc.quality.grades == {"causality": "good", "passivity": "good", "reciprocity": "good"}
    assert nzc.fixture.classes["insertion loss"] == "A"
    assert nzc.fixture.letter in "ABC"


def test_another_grid_is_resampled_and_said(nzc: Split, f_hz) -> None:
    """A sweep that starts at twice its step."""
    split = split_nzc(f_hz[1:], load("two_x_thru.s2p").map(lambda p: p[1:]))
    assert split.resampled
    assert split.left.s21.shape == (len(f_hz) - 1,)


def test_the_orientation_of_the_true_half(f_hz) -> None:
    """Connector first, line second: 50 ps of connector can be told from 25 mm of line over 10 GHz."""
    half, reading = load("true_fixture1.s2p"), load("fixture_dut_fixture.s2p")
    refuse_turned(f_hz, reading, half, "left", "fixture 1")
    found = facing(f_hz, reading.s11, half)
    assert found.as_given < found.turned


@pytest.mark.parametrize(
    ("change", "reason"),
    [
        (lambda t: t.map(lambda p: 1.3 * p), "gives out"),
        (lambda t: TwoPort(t.s11, t.s12, 1e-5 * t.s21, t.s22), "lets through only"),
        (lambda t: t.map(lambda p: p * np.nan), "not a number"),
        (lambda t: t.map(lambda p: 0.5 * np.abs(p) + 0j), "wavelengths longer"),
    ],
)
def test_a_bad_2x_thru_is_refused(change, reason: str, f_hz) -> None:
    with pytest.raises(InvalidMeasurement, match=reason) as caught:
        split_nzc(f_hz, change(load("two_x_thru.s2p")))
    assert caught.value.advice


def test_too_few_points_are_refused(f_hz) -> None:
    with pytest.raises(InvalidMeasurement, match="2x-thru of 10 points"):
        split_nzc(f_hz[:10], load("two_x_thru.s2p").map(lambda p: p[:10]))
