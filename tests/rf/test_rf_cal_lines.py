"""TRL's lines: which serves where, what is refused, and in what impedance the result stands."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.lines import eigen_of, propagation_of
from benchrun.rf.calibration.method import Options
from benchrun.rf.calibration.trl import ThruReflectLine
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(1e9, 8e9, 71)
QUARTER_S = 1 / (2 * (1e9 + 8e9))
"""A quarter period at the middle of 1 to 8 GHz: 20 to 160 degrees (facts of the trade: 16.655 mm in air)."""
TRL = METHODS["TRL"]


def analyzer(seed: int = 1) -> EightTerms:
    g = np.random.default_rng(seed)

    def disk(radius: float) -> np.ndarray:
        return radius * g.uniform(0, 1, 71) * np.exp(2j * np.pi * g.uniform(size=71))

    one, two = (OnePortTerms(disk(0.2), disk(0.2), 0.8 + disk(0.3)) for _ in (1, 2))
    return EightTerms(one, two, 1.0 + disk(0.3))


def kit_of(*excess_s: float, thru_s: float = 0.0, z0_ohm: float = 50.0, loss: float = 0.0) -> Kit:
    lines = {
        ("line" if k == 0 else f"line-{k + 1}"): Standard("line", Offset(thru_s + x, loss, z0_ohm))
        for k, x in enumerate(excess_s)
    }
    thru = Standard("thru", Offset(thru_s, loss, z0_ohm))
    return Kit("lines", {"short": Standard("short"), "thru": thru, **lines})


def options_of(kit: Kit, beyond: bool = False) -> Options:
    return Options(tuple(n for n in kit.standards if n.startswith("line")), beyond_window=beyond)


def readings_of(boxes: EightTerms, kit: Kit) -> dict[str, TwoPort]:
    zero, readings = np.zeros(71, complex), {}
    for name, truth in define(kit, tuple(kit.standards), F_HZ).items():
        if isinstance(truth, TwoPort):
            readings[Hookup.of(name, 1, 2).text] = boxes.embed(truth)
        else:
            for port in (1, 2):
                readings[Hookup.of(name, port).text] = boxes.embed(TwoPort(truth, zero, zero, truth))
    return readings


def solved(kit: Kit, told: Kit | None = None, beyond: bool = False, seed: int = 1):
    boxes, options = analyzer(seed), options_of(kit, beyond)
    definitions = define(told or kit, TRL.takes(options), F_HZ)
    return TRL.solve((1, 2), definitions, readings_of(boxes, kit), options=options), boxes


DEVICE = TwoPort(
    np.full(71, 0.3 + 0.1j), np.full(71, 0.6 - 0.2j), np.full(71, 0.5 - 0.4j), np.full(71, -0.2 + 0.3j)
)


def test_one_line_covers_eight_to_one() -> None:
    """From 20 to 160 degrees exactly; the report says so, and how errors grow at the edges (2.92)."""
    kit = kit_of(QUARTER_S)
    report = ThruReflectLine.report(
        define(kit, TRL.takes(), F_HZ), readings_of(analyzer(), kit), options=options_of(kit)
    )
    assert_allclose(report.phase_deg[0, [0, -1]], [20.0, 160.0], atol=1e-9)
    assert_allclose(report.magnification[[0, 35, -1]], [2.924, 1.0, 2.924], atol=1e-3)
    assert report.text(F_HZ) == "line: 71 of 71 points, 1000 MHz to 8000 MHz, 20 to 160 degrees"
    assert_allclose(solved(kit)[0].correct(analyzer().embed(DEVICE)).matrix, DEVICE.matrix, atol=1e-10)


def test_beyond_the_window_is_refused_unless_asked_for() -> None:
    kit = kit_of(1.1 * QUARTER_S)
    with pytest.raises(InvalidMeasurement, match=r"At 8 of 71 points no line .* line with 176\.0") as caught:
        solved(kit)
    assert "another length" in caught.value.advice
    terms, boxes = solved(kit, beyond=True)
    assert differ(terms.correct(boxes.embed(DEVICE)), DEVICE) < 1e-10


def test_each_frequency_takes_the_line_nearest_to_ninety_degrees() -> None:
    """A line of 20 degrees at 1 GHz and one of 60: together never closer than 46 degrees to 0 or 180."""
    kit = kit_of(20 / 360e9, 60 / 360e9)
    options = options_of(kit)
    readings = readings_of(analyzer(), kit)
    report = ThruReflectLine.report(define(kit, TRL.takes(options), F_HZ), readings, options=options)
    long_deg = np.degrees(np.abs(np.angle(np.exp(-2j * np.pi * F_HZ * 60 / 360e9))))
    short_deg = np.degrees(np.abs(np.angle(np.exp(-2j * np.pi * F_HZ * 20 / 360e9))))
    assert_allclose(report.phase_deg, [short_deg, long_deg], atol=1e-9)
    nearest = np.minimum(np.abs(long_deg - 90), np.abs(short_deg - 90))
    assert_allclose(np.abs(report.best_deg - 90), nearest, atol=1e-9)
    assert set(report.chosen) == {0, 1}
    assert differ(solved(kit)[0].correct(analyzer().embed(DEVICE)), DEVICE) < 1e-10


def test_a_line_that_serves_nowhere_is_said() -> None:
    kit = kit_of(QUARTER_S, 0.05 * QUARTER_S)
    options = options_of(kit)
    report = ThruReflectLine.report(
        define(kit, TRL.takes(options), F_HZ), readings_of(analyzer(), kit), options=options
    )
    assert report.text(F_HZ).splitlines()[1] == "line-2: not used"


@pytest.mark.parametrize("error", [-0.12, 0.12])
def test_the_length_of_a_line_need_only_be_known_about(error: float) -> None:
    kit = kit_of(QUARTER_S)
    told = kit_of(QUARTER_S * (1 + error))
    assert differ(solved(kit, told)[0].correct(analyzer().embed(DEVICE)), DEVICE) < 1e-10


@pytest.mark.parametrize("seed", range(3))
def test_the_propagation_constant_is_found(seed: int) -> None:
    """Also with loss, and whatever the kit says."""
    kit, told = kit_of(QUARTER_S, loss=20e9), kit_of(QUARTER_S * 1.1)
    readings = readings_of(analyzer(seed), kit_of(QUARTER_S))
    found = ThruReflectLine.propagation(define(told, TRL.takes(), F_HZ), readings)["line"]
    assert_allclose(found, np.exp(-2j * np.pi * F_HZ * QUARTER_S), atol=1e-10)
    lossy = kit.standards["line"].two_port(F_HZ)
    e, g = propagation_of(lossy)
    gamma_l, zc = kit.standards["line"].offset.line(F_HZ)
    assert_allclose(e, np.exp(-gamma_l), atol=1e-9)
    assert_allclose(g, (zc - 50.0) / (zc + 50.0), atol=1e-7)


@pytest.mark.parametrize("z0_ohm", [65.0, 38.0])
@pytest.mark.parametrize("thru_s", [0.0, 15e-12])
def test_lines_of_another_impedance_give_results_in_the_systems(z0_ohm: float, thru_s: float) -> None:
    """Lossy lines of 65 or 38 ohm: what comes out stands in 50 ohm, and scikit-rf says the same."""
    kit = kit_of(QUARTER_S, thru_s=thru_s, z0_ohm=z0_ohm, loss=5e9)
    terms, boxes = solved(kit, beyond=True)  # loss moves the ends of the band by a fraction of a degree
    raw = boxes.embed(DEVICE)
    assert differ(terms.correct(raw), DEVICE) < 1e-8
    theirs = TRL.examiner(F_HZ, (1, 2), kit, readings_of(boxes, kit), options=options_of(kit, True))(raw)
    assert differ(terms.correct(raw), theirs) < 1e-9


def test_lines_told_as_the_systems_impedance_are_the_reference() -> None:
    """Nothing in the readings tells a line's impedance: 65 ohm lines taken for 50 make 65 the reference."""
    kit, told = kit_of(QUARTER_S, z0_ohm=65.0), kit_of(QUARTER_S)
    terms, boxes = solved(kit, told)
    load = np.full(71, (65 - 50) / (65 + 50), complex)
    zero = np.zeros(71, complex)
    assert_allclose(terms.correct(boxes.embed(TwoPort(load, zero, zero, load))).s11, 0.0, atol=1e-9)


def test_a_reflect_told_as_its_opposite_turns_the_sign() -> None:
    """TRL believes the definition: what it costs to call an open a short. The transmissions stay right."""
    kit = kit_of(QUARTER_S)
    told = kit.with_standard("short", Standard("open"))
    found = solved(kit, told)[0].correct(analyzer().embed(DEVICE))
    assert_allclose(found.s11, -DEVICE.s11, atol=1e-10)
    assert_allclose(found.s21, DEVICE.s21, atol=1e-10)


def test_a_reflect_halfway_between_its_signs_is_refused() -> None:
    kit = kit_of(QUARTER_S)
    told = kit.with_standard("short", Standard("short", Offset(QUARTER_S / 2)))
    with pytest.raises(InvalidMeasurement, match="short comes out 90 degrees away") as caught:
        solved(kit, told)
    assert "offset delay" in caught.value.advice


@pytest.mark.parametrize("twice", ["thru", "line"])
def test_a_line_read_twice_is_refused(twice: str) -> None:
    kit = kit_of(QUARTER_S, 0.5 * QUARTER_S)
    options, readings = options_of(kit), readings_of(analyzer(), kit)
    readings[Hookup.of("line-2", 1, 2).text] = readings[Hookup.of(twice, 1, 2).text]
    with pytest.raises(InvalidMeasurement, match=f"{twice} and line-2 have the same phase") as caught:
        TRL.solve((1, 2), define(kit, TRL.takes(options), F_HZ), readings, options=options)
    assert caught.value.advice.startswith("Connect line-2")


def test_lines_of_unlike_impedance_are_refused() -> None:
    kit = kit_of(QUARTER_S, 0.5 * QUARTER_S)
    kit = kit.with_standard("line-2", Standard("line", Offset(0.5 * QUARTER_S, 0.0, 55.0)))
    with pytest.raises(InvalidMeasurement, match="line and line-2 are defined with different impedances"):
        solved(kit)


def test_eigenvectors_of_a_port_that_reflects_more_than_it_passes() -> None:
    """The usual form of the roots cancels here; the other one takes over."""
    box = OnePortTerms(*(np.array([x], complex) for x in (0.9, -0.999, 1e-3)))
    boxes = EightTerms(box, box, np.ones(1, complex))
    zero, one, e = np.zeros(1, complex), np.ones(1, complex), np.array([-1j])
    found = eigen_of(boxes.embed(TwoPort(zero, one, one, zero)), boxes.embed(TwoPort(zero, e, e, zero)), e)
    assert_allclose(found.propagation, e, atol=1e-9)
    assert_allclose(found.match, 0.9, atol=1e-9)
