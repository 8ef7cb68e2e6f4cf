"""Open, short and thru dummies: circuits found again, and scikit-rf."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose
from skrf.calibration import deembedding as theirs

from benchrun.errors import InvalidMeasurement
from benchrun.rf.deembedding.dummies import (
    from_admittance,
    from_impedance,
    halves_of_thru,
    to_admittance,
    to_impedance,
    without_open,
    without_open_then_short,
    without_short,
    without_short_then_open,
    without_thru,
)
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(0.1e9, 10e9, 23)
W = 2j * np.pi * F_HZ
PAD = TwoPort(W * 60e-15 * 50, -W * 5e-15 * 50, -W * 5e-15 * 50, W * 50e-15 * 50)
"""Shunt capacitances of the pads and what couples across, over the reference admittance."""
LEAD = TwoPort(
    (0.4 + W * 50e-12) / 50, (0.1 + W * 5e-12) / 50, (0.1 + W * 5e-12) / 50, (0.5 + W * 60e-12) / 50
)
"""Series impedances of the leads and the common one, over the reference impedance."""


def unit() -> TwoPort:
    g = np.random.default_rng(1)
    return TwoPort(*(g.uniform(0, 0.7, 23) * np.exp(2j * np.pi * g.uniform(size=23)) for _ in range(4)))


def plus(a: TwoPort, b: TwoPort) -> TwoPort:
    return TwoPort(*(x + y for x, y in zip(a.planes, b.planes, strict=True)))


def network(two: TwoPort) -> skrf.Network:
    return skrf.Network(frequency=skrf.Frequency.from_f(F_HZ, unit="hz"), s=two.matrix)


def test_conversions_as_scikit_rf_does_them() -> None:
    s = unit()
    assert_allclose(to_admittance(s).matrix, network(s).y * 50, atol=1e-11)
    assert_allclose(to_impedance(s).matrix, network(s).z / 50, atol=1e-11)
    assert_allclose(from_admittance(to_admittance(s)).matrix, s.matrix, atol=1e-13)
    assert_allclose(from_impedance(to_impedance(s)).matrix, s.matrix, atol=1e-13)


def test_pads_outside_and_leads_inside_are_taken_out() -> None:
    inner = from_impedance(plus(to_impedance(unit()), LEAD))
    reading = from_admittance(plus(to_admittance(inner), PAD))
    opened, short = from_admittance(PAD), from_admittance(plus(to_admittance(from_impedance(LEAD)), PAD))
    found = without_open_then_short(reading, opened, short)
    assert_allclose(found.matrix, unit().matrix, atol=1e-12)
    same = theirs.OpenShort(network(opened), network(short)).deembed(network(reading))
    assert_allclose(found.matrix, same.s, atol=1e-9)


def test_leads_outside_and_pads_inside_are_taken_out() -> None:
    inner = from_admittance(plus(to_admittance(unit()), PAD))
    reading = from_impedance(plus(to_impedance(inner), LEAD))
    short, opened = from_impedance(LEAD), from_impedance(plus(to_impedance(from_admittance(PAD)), LEAD))
    found = without_short_then_open(reading, opened, short)
    assert_allclose(found.matrix, unit().matrix, atol=1e-11)
    same = theirs.ShortOpen(network(short), network(opened)).deembed(network(reading))
    assert_allclose(found.matrix, same.s, atol=1e-9)


def test_one_dummy_alone() -> None:
    reading, opened, short = unit(), from_admittance(PAD), from_impedance(LEAD)
    assert_allclose(
        without_open(reading, opened).matrix,
        theirs.Open(network(opened)).deembed(network(reading)).s,
        atol=1e-9,
    )
    assert_allclose(
        without_short(reading, short).matrix,
        theirs.Short(network(short)).deembed(network(reading)).s,
        atol=1e-9,
    )


@pytest.mark.parametrize(("circuit", "class_"), [("pi", theirs.SplitPi), ("tee", theirs.SplitTee)])
def test_a_thru_split_in_halves(circuit, class_) -> None:
    """Halves of a symmetric circuit join to the thru again; scikit-rf takes the same out."""
    y = W * 40e-15 * 50
    z = (0.5 + W * 80e-12) / 50
    if circuit == "pi":
        thru = from_admittance(TwoPort(y + 1 / z, -1 / z, -1 / z, y + 1 / z))
    else:
        thru = from_impedance(TwoPort(z + 1 / y, 1 / y, 1 / y, z + 1 / y))
    left, right = halves_of_thru(thru, circuit)
    assert_allclose((left @ right).matrix, thru.matrix, atol=1e-12)
    reading = left @ unit() @ right
    found = without_thru(reading, thru, circuit)
    assert_allclose(found.matrix, unit().matrix, atol=1e-11)
    assert_allclose(found.matrix, class_(network(thru)).deembed(network(reading)).s, atol=1e-9)


def test_a_thru_in_place_of_the_open_dummy_is_refused() -> None:
    with pytest.raises(InvalidMeasurement, match=r"open dummy lets through at least [-+]?0\.0 dB") as caught:
        without_open(unit(), TwoPort.through(23))
    assert "not the thru" in caught.value.advice


@pytest.mark.parametrize("way", [without_open_then_short, without_short_then_open])
def test_exchanged_dummies_are_refused(way) -> None:
    opened, short = from_admittance(PAD), from_impedance(LEAD)
    with pytest.raises(InvalidMeasurement, match="they are exchanged"):
        way(unit(), short, opened)
