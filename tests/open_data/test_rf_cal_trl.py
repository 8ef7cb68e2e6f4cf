"""TRL on measured data at 75 to 110 GHz, and what happens to it if switch terms are taken out twice.

Data: shared/data/trl_wband. Its readings are free of the switch terms that lie beside them; the second test
shows it by physics alone.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.calibration.switch_terms import SWITCH_READING, SwitchTerms
from benchrun.rf.calibration.trl import ThruReflectLine
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.touchstone import read
from benchrun.rf.twoport import TwoPort

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "trl_wband"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

KIT = Kit(
    "guide", {"short": Standard("short"), "thru": Standard("thru"), "line": Standard("line", Offset(2.2e-12))}
)
"""The line is told only about: 71 degrees at 90 GHz."""
TRL = METHODS["TRL"]


def load(name: str) -> TwoPort:
    return read((FOLDER / name).read_bytes(), name).two_port


@pytest.fixture(scope="module")
def f_hz() -> np.ndarray:
    return read((FOLDER / "thru.s2p").read_bytes(), "thru.s2p").f_hz


@pytest.fixture(scope="module")
def readings() -> dict[str, TwoPort]:
    reflect = load("reflect.s2p")
    return {
        "short on port 1": reflect,
        "short on port 2": reflect,
        "thru from port 1 to port 2": load("thru.s2p"),
        "line from port 1 to port 2": load("line.s2p"),
    }


@pytest.fixture(scope="module")
def with_switch(readings) -> dict[str, TwoPort]:
    forward, reverse = (
        read((FOLDER / f"switch_{way}.s1p").read_bytes(), f"switch_{way}.s1p").s[:, 0, 0]
        for way in ("forward", "reverse")
    )
    return readings | {SWITCH_READING: SwitchTerms(forward, reverse).reading}


def corrected(f_hz, readings) -> TwoPort:
    terms = TRL.solve((1, 2), define(KIT, TRL.takes(), f_hz), readings)
    found = terms.correct(load("mismatched_line.s2p"))
    assert isinstance(found, TwoPort)
    return found


@pytest.mark.parametrize(("case", "reference"), [("readings", "no_switch"), ("with_switch", "with_switch")])
def test_the_reference_results_are_reproduced(case: str, reference: str, f_hz, request) -> None:
    """To 0.015: a reading that is not quite reciprocal gives TRL one equation too many (README)."""
    mine = corrected(f_hz, request.getfixturevalue(case))
    assert differ(mine, load(f"ref_mismatched_line_{reference}.s2p")) < 0.015
    theirs = load(f"ref_mismatched_line_{reference}.s2p")
    assert np.median(np.abs(mine.matrix - theirs.matrix)) < 2e-3


def test_the_readings_are_right_without_their_switch_terms(f_hz, readings, with_switch) -> None:
    """The device is a passive, reciprocal, symmetric line: only without them does it come out as one."""
    without, twice = corrected(f_hz, readings), corrected(f_hz, with_switch)

    def most_power(two: TwoPort) -> float:
        return float(np.max(np.abs(two.s11) ** 2 + np.abs(two.s21) ** 2))

    assert most_power(without) < 1.02
    assert most_power(twice) > 1.15
    assert np.median(np.abs(without.s21 - without.s12)) < 0.006
    assert np.median(np.abs(twice.s21 - twice.s12)) > 0.03
    assert np.median(np.abs(without.s11 - without.s22)) < 0.006
    assert np.median(np.abs(twice.s11 - twice.s22)) > 0.05


def test_scikit_rf_agrees(f_hz, readings) -> None:
    """The run's own examination, by its multiline TRL with one line: within 1e-9."""
    raw = load("mismatched_line.s2p")
    assert differ(corrected(f_hz, readings), TRL.examiner(f_hz, (1, 2), KIT, readings)(raw)) < 1e-9


def test_the_line_serves_the_whole_band(f_hz, readings) -> None:
    """48 to 98 degrees, as the README prints."""
    report = ThruReflectLine.report(define(KIT, TRL.takes(), f_hz), readings)
    assert report.within.all()
    assert_allclose([report.phase_deg.min(), report.phase_deg.max()], [48.4, 97.7], atol=0.3)


def test_the_reflect_comes_out_as_a_short(f_hz, readings) -> None:
    terms = TRL.solve((1, 2), define(KIT, TRL.takes(), f_hz), readings)
    for plane in (terms.forward.port.correct(readings["short on port 1"].s11),
                  terms.reverse.port.correct(readings["short on port 2"].s22)):  # fmt: skip
        assert_allclose(np.abs(plane), 1.0, atol=0.005)
        assert np.all(plane.real < -0.9)


def test_the_error_boxes_supplied_with_the_data(f_hz, readings) -> None:
    """Cascaded boxes A and B around the corrected device give the reading back, within 0.02."""
    a, b = load("error_box_a.s2p"), load("error_box_b.s2p")
    again = a @ corrected(f_hz, readings) @ b
    assert differ(again, load("mismatched_line.s2p")) < 0.02
