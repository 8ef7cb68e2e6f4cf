"""What the methods refuse, with a sentence that tells the technician what to do; and measured standards."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.kit import Kit, Measured, Offset, Standard
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import TwoPort

POINTS = 21
F_HZ = np.linspace(0.5e9, 3e9, POINTS)
KIT = Kit(
    "made up",
    {
        "short": Standard("short"),
        "open": Standard("open", capacitance=(30e-15, 0, 0, 0)),
        "load": Standard("load", series_inductance_h=20e-12),
        "thru": Standard("thru", Offset(30e-12)),
    },
)
THRU = "thru from port 1 to port 2"


def analyzer() -> EightTerms:
    w = F_HZ / 3e9
    one = OnePortTerms(0.1 * np.exp(-2j * w), 0.15 * np.exp(1j * w), 0.9 * np.exp(-8j * w))
    two = OnePortTerms(0.05 * np.exp(-5j * w), 0.1 * np.exp(2j * w), 0.8 * np.exp(-6j * w))
    return EightTerms(one, two, 1.05 * np.exp(-1j * w))


def readings_of(kit: Kit, thru: TwoPort | None = None) -> dict[str, TwoPort]:
    zero, found, boxes = np.zeros(POINTS, complex), {}, analyzer()
    for name, truth in define(kit, tuple(kit.standards), F_HZ).items():
        if isinstance(truth, TwoPort):
            found[Hookup.of(name, 1, 2).text] = boxes.embed(thru or truth)
        else:
            for port in (1, 2):
                found[Hookup.of(name, port).text] = boxes.embed(TwoPort(truth, zero, zero, truth))
    return found


def solve(name: str, readings: dict[str, TwoPort], kit: Kit = KIT):
    method = METHODS[name]
    return method.solve((1, 2), define(kit, method.takes(), F_HZ), readings)


def line(delay_s: float) -> TwoPort:
    return Standard("thru", Offset(delay_s)).two_port(F_HZ)


def test_an_unknown_thru_may_be_anything_reciprocal() -> None:
    """An unequal, mismatched, lossy adapter of about the told delay."""
    e = line(45e-12).s21 * 0.8
    thru = TwoPort(np.full(POINTS, 0.3 + 0.1j), e, e, np.full(POINTS, -0.2j))
    device = TwoPort(*(np.full(POINTS, x, complex) for x in (0.3, 0.5j, -0.6, 0.1)))
    found = solve("SOLR", readings_of(KIT, thru)).correct(analyzer().embed(device))
    assert_allclose(found.matrix, device.matrix, atol=1e-12)


def test_an_unknown_thru_whose_delay_is_told_wrong() -> None:
    with pytest.raises(InvalidMeasurement, match=r"phase is \d+ degrees away .* beyond 60 degrees") as caught:
        solve("SOLR", readings_of(KIT, line(120e-12)))
    assert "delay of the thru in the kit file" in caught.value.advice


def test_an_unknown_thru_that_amplifies_one_way() -> None:
    e = line(30e-12).s21
    with pytest.raises(InvalidMeasurement, match="passes 26 dB more one way than the other") as caught:
        solve("SOLR", readings_of(KIT, TwoPort(0 * e, 0.05 * e, e, 0 * e)))
    assert "passive thru" in caught.value.advice


@pytest.mark.parametrize("port", [1, 2])
def test_lrm_with_the_reflect_left_on_as_match(port: int) -> None:
    readings = readings_of(KIT)
    readings[f"load on port {port}"] = readings[f"short on port {port}"]
    with pytest.raises(InvalidMeasurement, match=f"short and load on port {port} differ by only"):
        solve("LRM", readings)


def test_lrm_with_an_open_for_a_short() -> None:
    """Defined as a short, but it is something a quarter turn away: the sign is not sure."""
    kit = KIT.with_standard("short", Standard("short", Offset(70e-12)))
    with pytest.raises(InvalidMeasurement, match="short comes out"):
        solve("LRM", readings_of(kit))


def test_lrrm_needs_a_thru_alike_from_both_sides() -> None:
    e = line(30e-12).s21
    uneven = Measured("thru", F_HZ, TwoPort(0.1 * e, e, e, 0 * e))
    with pytest.raises(InvalidMeasurement, match="unlike reflections at its ends") as caught:
        solve("LRRM", readings_of(KIT), KIT.with_standard("thru", uneven))
    assert "LRM" in caught.value.advice


def test_lrrm_with_one_reflect_read_twice() -> None:
    readings = readings_of(KIT)
    readings["open on port 1"] = readings["short on port 1"]
    with pytest.raises(InvalidMeasurement, match="short and open on port 1 differ by only"):
        solve("LRRM", readings)


def test_lrrm_with_an_open_for_the_match() -> None:
    readings = readings_of(KIT)
    readings["load on port 1"] = readings["open on port 1"]
    with pytest.raises(InvalidMeasurement) as caught:
        solve("LRRM", readings)
    assert "again" in caught.value.advice or "connected" in caught.value.advice


@pytest.mark.parametrize("inductance_h", [-80e-12, 0.0, 150e-12])
def test_lrrm_finds_the_inductance_of_the_match(inductance_h: float) -> None:
    """Told as a plain 50 ohm, the match may have an inductance that nobody knew."""
    kit = KIT.with_standard("load", Standard("load", series_inductance_h=inductance_h))
    told = KIT.with_standard("load", Standard("load"))
    device = TwoPort(*(np.full(POINTS, x, complex) for x in (0.3, 0.5j, -0.6, 0.1)))
    found = solve("LRRM", readings_of(kit), told).correct(analyzer().embed(device))
    assert_allclose(found.matrix, device.matrix, atol=1e-10)


def test_lrrm_without_frequencies_is_a_mistake_of_the_caller() -> None:
    method = METHODS["LRRM"]
    plain = dict(define(KIT, method.takes(), F_HZ))
    with pytest.raises(TypeError, match=r"define\(\)"):
        method.solve((1, 2), plain, readings_of(KIT))


def test_a_response_with_nothing_on_the_port() -> None:
    readings = readings_of(KIT)
    zero = np.full(POINTS, 1e-6 + 0j)
    readings["short on port 2"] = TwoPort(zero, zero, zero, zero)
    with pytest.raises(InvalidMeasurement, match="short on port 2 gives back only"):
        solve("response", readings)


def measured(standard: Standard, grid: np.ndarray) -> Measured:
    data = standard.two_port(grid) if standard.joins else standard.reflection(grid)
    return Measured(standard.kind, grid, data)


@pytest.mark.parametrize("name", ["SOLT", "SOLR", "LRM", "LRRM"])
def test_measured_standards_serve_as_models_do(name: str) -> None:
    """The same kit as measured data on another grid: one result within what interpolation leaves."""
    grid = np.linspace(0.4e9, 3.1e9, 541)
    kit = Kit("measured", {n: measured(s, grid) for n, s in KIT.standards.items()})  # type: ignore[arg-type]
    readings = readings_of(KIT)
    raw = analyzer().embed(TwoPort(*(np.full(POINTS, x, complex) for x in (0.3, 0.5j, -0.6, 0.1))))
    mine = solve(name, readings, kit).correct(raw)
    assert differ(mine, solve(name, readings).correct(raw)) < 1e-8
    assert differ(mine, METHODS[name].examiner(F_HZ, (1, 2), kit, readings)(raw)) < 1e-9


def test_a_measured_standard_beyond_its_range_is_refused() -> None:
    short = measured(Standard("short"), np.linspace(1e9, 2e9, 11))
    with pytest.raises(
        InvalidMeasurement, match="measured from 1000 MHz to 2000 MHz; the sweep goes"
    ) as caught:
        short.reflection(F_HZ)
    assert "Narrow the sweep" in caught.value.advice


def test_a_measured_standard_is_what_it_is() -> None:
    grid = np.linspace(0.4e9, 3.1e9, 11)
    with pytest.raises(ValueError, match="thru has no single reflection"):
        measured(Standard("thru"), grid).reflection(F_HZ)
    with pytest.raises(ValueError, match="short does not join two ports"):
        measured(Standard("short"), grid).two_port(F_HZ)
    with pytest.raises(ValueError, match="measured in 50 ohm, asked for in 75 ohm"):
        measured(Standard("short"), grid).reflection(F_HZ, 75.0)


def test_a_measured_standard_moves_by_draws() -> None:
    short = measured(Standard("short"), np.linspace(0.4e9, 3.1e9, 11))
    moved = short.reflection(F_HZ, deltas={"reflection": np.array([[0.0], [0.01]])})
    assert_allclose(moved, np.array([[-1.0], [-0.99]]) * np.ones(POINTS), atol=1e-12)
