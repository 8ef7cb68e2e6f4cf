"""Short, open, load and thru: twelve terms against truth and against scikit-rf."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import TwelveTerms
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(10e6, 6e9, 11)
SOLT = METHODS["SOLT"]
LOADS = "load on port 1 and load on port 2"
THRU = "thru from port 1 to port 2"
REFLECTIONS = {
    "short": Standard("short", Offset(31e-12, 2.1e9), inductance=(2e-12, 0, 0, 0)),
    "open": Standard("open", Offset(29e-12, 2.1e9), capacitance=(50e-15, 0, 0, 0)),
    "load": Standard("load", Offset(30e-12, 2.1e9, 50.1), resistance_ohm=49.8),
}
THRUS = {
    "flush": Standard("thru"),
    "offset": Standard("thru", Offset(87e-12)),
    "lossy": Standard("thru", Offset(87e-12, 2.5e9)),
    "mismatched": Standard("thru", Offset(87e-12, 2.5e9, 53.0)),
}
TERMS = ("directivity", "source_match", "tracking", "load_match", "transmission")


def kit_with(thru: str) -> Kit:
    return Kit("made up", {**REFLECTIONS, "thru": THRUS[thru]})


def readings_of(terms: TwelveTerms, kit: Kit) -> dict[str, TwoPort]:
    """What an analyzer with these terms reads at every hook-up; the free port is open, as on a bench."""
    found = define(kit, SOLT.standards, F_HZ)
    zero, free = np.zeros(11, complex), np.full(11, 0.97 - 0.1j)
    readings = {}
    for name in REFLECTIONS:
        s = np.asarray(found[name])
        readings[Hookup.of(name, 1).text] = terms.embed(TwoPort(s, zero, zero, free))
        readings[Hookup.of(name, 2).text] = terms.embed(TwoPort(free, zero, zero, s))
    load = np.asarray(found["load"])
    readings[LOADS] = terms.embed(TwoPort(load, zero, zero, load))
    thru = found["thru"]
    assert isinstance(thru, TwoPort)
    readings[THRU] = terms.embed(thru)
    return readings


@pytest.mark.parametrize("thru", THRUS)
@pytest.mark.parametrize("seed", range(8))
def test_all_twelve_terms_are_found_again(seed: int, thru: str, random_terms) -> None:
    """A known thru of any length, loss and impedance, not only a flush one."""
    truth, kit = random_terms(seed, isolation=1e-3), kit_with(thru)
    found = SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings_of(truth, kit), isolation=True)
    assert isinstance(found, TwelveTerms)
    for way in ("forward", "reverse"):
        for term in (*TERMS, "isolation"):
            assert_allclose(
                getattr(getattr(found, way), term),
                getattr(getattr(truth, way), term),
                atol=1e-11,
                err_msg=f"{way} {term}",
            )


@pytest.mark.parametrize("thru", THRUS)
@pytest.mark.parametrize("isolation", [False, True])
@pytest.mark.parametrize("seed", range(4))
def test_the_device_is_found_again_and_scikit_rf_agrees(
    seed: int, isolation: bool, thru: str, random_terms, random_device
) -> None:
    """Against truth 1e-11, against scikit-rf's ``TwelveTerm`` within the run's own limit of 1e-9."""
    truth, device = random_terms(seed, isolation=1e-3 if isolation else 0.0), random_device(seed)
    kit = kit_with(thru)
    readings, raw = readings_of(truth, kit), truth.embed(device)
    solved = SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings, isolation)
    assert isinstance(solved, TwelveTerms)
    mine = solved.correct(raw)
    assert_allclose(mine.matrix, device.matrix, atol=1e-11)
    assert differ(mine, SOLT.examiner(F_HZ, (1, 2), kit, readings, isolation)(raw)) < 1e-9


@pytest.mark.parametrize("seed", range(4))
def test_a_thru_that_is_not_the_same_from_both_sides(seed: int, random_terms, random_device) -> None:
    """An adapter as thru: the reverse terms must see it turned round."""
    truth, kit = random_terms(seed), kit_with("flush")
    s21 = np.exp(-2j * np.pi * F_HZ * 40e-12) * 0.97
    adapter = TwoPort(np.full(11, 0.06 - 0.02j), s21, s21, np.full(11, -0.03 + 0.08j))
    readings = {**readings_of(truth, kit), THRU: truth.embed(adapter)}
    definitions = {**define(kit, SOLT.standards, F_HZ), "thru": adapter}
    solved, device = SOLT.solve((1, 2), definitions, readings), random_device(seed)
    assert isinstance(solved, TwelveTerms)
    assert_allclose(solved.correct(truth.embed(device)).matrix, device.matrix, atol=1e-11)


def test_isolation_left_out_stays_in_the_device(random_terms) -> None:
    """Leakage of 1e-3 makes a 100 dB device look like 60 dB; reading it gives the 100 dB back."""
    truth, kit = random_terms(7, isolation=1e-3), kit_with("offset")
    zero, small = np.zeros(11, complex), np.full(11, 1e-5 + 0j)
    raw, readings = truth.embed(TwoPort(zero, small, small, zero)), readings_of(truth, kit)
    definitions = define(kit, SOLT.standards, F_HZ)
    without = SOLT.solve((1, 2), definitions, readings).correct(raw)
    with_it = SOLT.solve((1, 2), definitions, readings, isolation=True).correct(raw)
    assert_allclose(with_it.s21, small, rtol=1e-8)
    leak = np.abs(truth.forward.isolation / truth.forward.transmission)
    assert_allclose(np.abs(without.s21 - small), leak, rtol=0.05, atol=3e-6)


def test_without_isolation_the_term_is_zero(random_terms) -> None:
    truth, kit = random_terms(7, isolation=1e-3), kit_with("flush")
    found = SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings_of(truth, kit))
    assert found.forward.isolation == 0.0
    assert found.reverse.isolation == 0.0


@pytest.mark.parametrize("way", ["s21", "s12"])
def test_a_dead_thru_is_refused(way: str, random_terms) -> None:
    """A thru that was not joined, seen from either side: no conclusion about any unit."""
    kit = kit_with("flush")
    readings = readings_of(random_terms(1), kit)
    planes = {n: getattr(readings[THRU], n) for n in ("s11", "s12", "s21", "s22")}
    planes[way] = planes[way] * 1e-6
    readings[THRU] = TwoPort(**planes)
    with pytest.raises(InvalidMeasurement, match=r"lets through only -1[0-9]{2} dB") as caught:
        SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings)
    assert "tighten both sides" in caught.value.advice


def test_a_thru_that_passes_exactly_nothing_is_refused(random_terms) -> None:
    kit, zero = kit_with("flush"), np.zeros(11, complex)
    readings = readings_of(random_terms(1), kit)
    readings[THRU] = TwoPort(zero, zero, zero, zero)
    with pytest.raises(InvalidMeasurement, match="only -240 dB"):
        SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings)


@pytest.mark.parametrize("plane", ["s11", "s12", "s21", "s22"])
def test_a_missing_number_in_the_thru_is_refused(plane: str, random_terms) -> None:
    kit = kit_with("flush")
    readings = readings_of(random_terms(1), kit)
    planes = {n: getattr(readings[THRU], n).copy() for n in ("s11", "s12", "s21", "s22")}
    planes[plane][5] = np.nan
    readings[THRU] = TwoPort(**planes)
    with pytest.raises(InvalidMeasurement, match="thru holds a value that is not a number"):
        SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings)


@pytest.mark.parametrize("port", [1, 2])
def test_alike_standards_name_their_port(port: int, random_terms) -> None:
    kit = kit_with("flush")
    readings = readings_of(random_terms(1), kit)
    readings[f"open on port {port}"] = readings[f"short on port {port}"]
    with pytest.raises(InvalidMeasurement, match=f"on port {port} differ"):
        SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings)


def test_what_must_be_connected() -> None:
    """Seven hook-ups, eight with isolation; the thru last, when both ports are known to be good."""
    seven = [h.text for h in SOLT.required((1, 2))]
    assert seven == [
        "short on port 1", "open on port 1", "load on port 1",
        "short on port 2", "open on port 2", "load on port 2", THRU,
    ]  # fmt: skip
    eight = [h.text for h in SOLT.required((1, 2), isolation=True)]
    assert sorted(eight) == sorted([*seven, LOADS])


def test_the_order_in_which_ports_are_named_means_nothing(random_terms, random_device) -> None:
    """Forward always drives port 1, whoever wrote "2, 1"."""
    truth, kit = random_terms(5), kit_with("mismatched")
    readings, definitions = readings_of(truth, kit), define(kit, SOLT.standards, F_HZ)
    raw = truth.embed(random_device(5))
    assert SOLT.required((2, 1)) == SOLT.required((1, 2))
    turned = SOLT.solve((2, 1), definitions, readings).correct(raw)
    assert differ(turned, SOLT.solve((1, 2), definitions, readings).correct(raw)) == 0.0
    assert differ(turned, SOLT.examiner(F_HZ, (2, 1), kit, readings)(raw)) < 1e-9


def test_a_deep_stop_band_after_a_whole_calibration(random_terms) -> None:
    """S21 = 1e-10 behind random errors and an offset thru: found again to 1e-10 relative."""
    truth, kit = random_terms(9), kit_with("offset")
    small = np.full(11, 1e-10 + 0j)
    device = TwoPort(np.full(11, 0.9j), small, small, np.full(11, -0.9 + 0j))
    solved = SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ), readings_of(truth, kit))
    assert_allclose(solved.correct(truth.embed(device)).s21, small, rtol=1e-10)


def test_draws_of_definitions_give_draws_of_devices(random_terms, random_device) -> None:
    truth, kit = random_terms(2), kit_with("offset")
    raw, readings = truth.embed(random_device(2)), readings_of(truth, kit)
    deltas = {"open": {"c0_f": np.array([[0.0], [1e-15], [2e-15]])}, "thru": {"delay_s": 1e-13}}
    drawn = SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ, deltas), readings).correct(raw)
    assert drawn.s21.shape == (3, 11)
    deltas = {"open": {"c0_f": 1e-15}, "thru": {"delay_s": 1e-13}}
    alone = SOLT.solve((1, 2), define(kit, SOLT.standards, F_HZ, deltas), readings).correct(raw)
    assert_allclose(drawn.matrix[1], alone.matrix, atol=1e-13)


def test_every_method_names_itself() -> None:
    """The table is keyed by the word that a sequence writes."""
    assert {name: method.name for name, method in METHODS.items()} == {name: name for name in METHODS}
    assert list(METHODS) == [
        "response", "SOL", "one-path", "SOLT", "SOLR", "TRL", "multiline TRL", "LRM", "LRRM",
    ]  # fmt: skip
