"""Halves out and in, planes moved, adapters found and removed, and which way round a half is."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.deembedding.adapter import adapter_between, without_adapter
from benchrun.rf.deembedding.halves import (
    reflection_behind,
    reflection_within,
    refuse_active,
    within,
    without,
)
from benchrun.rf.deembedding.orientation import facing, refuse_turned
from benchrun.rf.deembedding.plane import Extension, move_planes, move_reflection
from benchrun.rf.terms import OnePortTerms
from benchrun.rf.twoport import TwoPort

POINTS = 401
F_HZ = np.linspace(10e6, 12e9, POINTS)


def line(delay_s: float, z0_ohm: float = 50.0, loss_db: float = 0.0) -> TwoPort:
    """A line with skin-effect loss at 10 GHz, in 50 ohm; the formula is table 4.2 of Pozar (from memory)."""
    g = (z0_ohm - 50) / (z0_ohm + 50)
    e = 10 ** (-loss_db * np.sqrt(F_HZ / 10e9) / 20) * np.exp(-2j * np.pi * F_HZ * delay_s)
    d = 1 - g**2 * e**2
    return TwoPort(g * (1 - e**2) / d, (1 - g**2) * e / d, (1 - g**2) * e / d, g * (1 - e**2) / d)


def shunt_c(farad: float) -> TwoPort:
    y = 2j * np.pi * F_HZ * farad * 50
    s11, s21 = -y / (2 + y), 2 / (2 + y)
    return TwoPort(s11, s21, s21, s11)


LAUNCH = shunt_c(0.15e-12) @ line(120e-12, 53.0, 0.3) @ line(150e-12, 48.0, 0.4)
"""A half that looks unlike from both sides: the connector's capacitance is at port 1."""


def some_unit(seed: int) -> TwoPort:
    g = np.random.default_rng(seed)
    return TwoPort(
        *(g.uniform(0, 0.9, POINTS) * np.exp(2j * np.pi * g.uniform(size=POINTS)) for _ in range(4))
    )


@pytest.mark.parametrize("sides", ["left", "right", "both"])
@pytest.mark.parametrize("seed", range(3))
def test_embedded_and_taken_out_again(seed: int, sides: str) -> None:
    unit = some_unit(seed)
    left = LAUNCH if sides != "right" else None
    right = LAUNCH.flipped() if sides != "left" else None
    whole = within(unit, left, right)
    assert_allclose(without(whole, left, right).matrix, unit.matrix, atol=1e-12)
    if sides == "both":
        frequency = skrf.Frequency.from_f(F_HZ, unit="hz")
        nets = [skrf.Network(frequency=frequency, s=x.matrix) for x in (LAUNCH, unit, LAUNCH.flipped())]
        assert_allclose(whole.matrix, (nets[0] ** nets[1] ** nets[2]).s, atol=1e-12)


def test_a_stop_band_survives_its_fixture() -> None:
    """-240 dB behind a lossy fixture: no transfer matrix could keep that."""
    tiny, unit = np.full(POINTS, 1e-12 + 0j), some_unit(1)
    unit = TwoPort(unit.s11, tiny, tiny, unit.s22)
    back = without(within(unit, LAUNCH, LAUNCH.flipped()), LAUNCH, LAUNCH.flipped())
    assert_allclose(back.s21, tiny, rtol=1e-12)


def test_a_one_port_behind_a_half() -> None:
    unit = some_unit(2).s11
    assert_allclose(reflection_behind(reflection_within(unit, LAUNCH), LAUNCH), unit, atol=1e-13)


def test_an_active_half_is_refused() -> None:
    refuse_active(LAUNCH, "jig-left.s2p")
    gain = LAUNCH.map(lambda p: 1.2 * p)
    with pytest.raises(InvalidMeasurement, match=r"jig-left.s2p gives out 1\.[12]\d\d times") as caught:
        refuse_active(gain, "jig-left.s2p")
    assert "fresh calibration" in caught.value.advice


def test_planes_moved_towards_the_unit_take_a_line_away() -> None:
    """A matched line of 80 ps and 0.5 dB at 10 GHz on port 1, 30 ps on port 2."""
    unit = some_unit(3)
    whole = line(80e-12, loss_db=0.5) @ unit @ line(30e-12)
    one, two = Extension(80e-12, 0.5, 10e9), Extension(30e-12)
    assert_allclose(move_planes(F_HZ, whole, one, two).matrix, unit.matrix, atol=1e-12)
    seen = line(80e-12, loss_db=0.5).terminated(unit.s11)
    assert_allclose(move_reflection(F_HZ, seen, one), unit.s11, atol=1e-12)


def test_one_plane_alone_is_moved() -> None:
    unit = some_unit(3)
    moved = move_planes(F_HZ, unit, other=Extension(-30e-12))
    assert_allclose(moved.matrix, (unit @ line(30e-12)).matrix, atol=1e-12)


def test_loss_that_does_not_grow() -> None:
    assert_allclose(np.abs(Extension(dc_loss_db=6.0).transmission(F_HZ)), 10 ** (-0.3), rtol=1e-12)


def boxes(seed: int) -> EightTerms:
    g = np.random.default_rng(seed)

    def disk(radius: float) -> np.ndarray:
        return radius * g.uniform(size=POINTS) * np.exp(2j * np.pi * g.uniform(size=POINTS))

    one, two = (OnePortTerms(disk(0.2), disk(0.3), 0.8 + disk(0.3)) for _ in (1, 2))
    return EightTerms(one, two, 1 + disk(0.3), SwitchTerms(disk(0.2), disk(0.2)))


def behind(port: OnePortTerms, adapter: TwoPort) -> tuple[OnePortTerms, np.ndarray]:
    """Error box and adapter in cascade, by the star product; and the change of its transmission."""
    whole = TwoPort(port.directivity, port.tracking, np.ones(POINTS, complex), port.source_match) @ adapter
    return OnePortTerms(whole.s11, whole.s22, whole.s12 * whole.s21), whole.s21


def test_an_adapter_is_found_between_two_calibrations() -> None:
    outer = boxes(1).one
    inner, _ = behind(outer, LAUNCH)
    found = adapter_between(F_HZ, outer, inner, 275e-12)
    assert_allclose(found.matrix, LAUNCH.matrix, atol=1e-12)


def test_an_adapter_whose_delay_is_told_wrong_is_refused() -> None:
    outer = boxes(1).one
    inner, _ = behind(outer, LAUNCH)
    with pytest.raises(InvalidMeasurement, match=r"that of a delay of 315 ps; beyond 60 degrees"):
        adapter_between(F_HZ, outer, inner, 315e-12)


def test_an_adapter_that_gains_is_refused() -> None:
    outer = boxes(1).one
    inner, _ = behind(outer, LAUNCH.map(lambda p: 1.3 * p))
    with pytest.raises(InvalidMeasurement, match=r"gain of \+[12]\.\d dB; it can only lose") as caught:
        adapter_between(F_HZ, outer, inner, 275e-12)
    assert "without touching anything but the adapter" in caught.value.advice


@pytest.mark.parametrize("port", [1, 2])
def test_an_adapter_is_taken_out_of_a_calibration(port: int) -> None:
    """Calibrated with the adapter on, measured without it: the unit is found again."""
    bare, unit = boxes(2), some_unit(4)
    changed, gain = behind(bare.one if port == 1 else bare.two, LAUNCH)
    if port == 1:
        through = EightTerms(changed, bare.two, bare.k * gain, bare.switch)
        told = through.embed(unit)
        assert_allclose(told.matrix, bare.embed(LAUNCH @ unit).matrix, atol=1e-12)
    else:
        through = EightTerms(bare.one, changed, bare.k / gain, bare.switch)
        told = through.embed(unit)
        assert_allclose(told.matrix, bare.embed(unit @ LAUNCH.flipped()).matrix, atol=1e-12)
    found = without_adapter(through.twelve(), LAUNCH, port).correct(bare.embed(unit))
    assert_allclose(found.matrix, unit.matrix, atol=1e-11)


UNIT = shunt_c(1e-12) @ line(200e-12, 75.0) @ shunt_c(2e-12)


@pytest.mark.parametrize("side", ["left", "right"])
def test_a_half_the_wrong_way_round_is_refused(side: str) -> None:
    reading = LAUNCH @ UNIT @ LAUNCH.flipped()
    right_way = LAUNCH if side == "left" else LAUNCH.flipped()
    refuse_turned(F_HZ, reading, right_way, side, "jig.s2p")
    inner = 2 if side == "left" else 1
    with pytest.raises(
        InvalidMeasurement, match=f"jig.s2p is the wrong way round: .* on the {side} "
    ) as caught:
        refuse_turned(F_HZ, reading, right_way.flipped(), side, "jig.s2p")
    assert f"port {inner} at the unit" in caught.value.advice


def test_a_half_alike_from_both_sides_cannot_tell() -> None:
    even = line(270e-12, 53.0)
    assert facing(F_HZ, (even @ UNIT).s11, even).right_way is None


def test_a_half_too_short_for_the_span_cannot_tell() -> None:
    short = shunt_c(0.15e-12) @ line(40e-12, 53.0)
    found = facing(F_HZ, (short @ UNIT).s11, short)
    assert found.cells < 3
    assert found.right_way is None


def test_a_matched_half_without_reflections_cannot_tell() -> None:
    assert facing(F_HZ, (line(270e-12) @ UNIT).s11, line(270e-12)).right_way is None
