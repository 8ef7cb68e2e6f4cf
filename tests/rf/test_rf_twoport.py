"""Two-port algebra in the S-domain: cascades, their inverses, and what small transmission does to them."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose, assert_array_equal

from benchrun.rf.twoport import TwoPort


def network(two: TwoPort) -> skrf.Network:
    points = two.s11.shape[-1]
    return skrf.Network(frequency=skrf.Frequency(1, 2, points, "GHz"), s=two.matrix, z0=50)


def attenuator(db: float, points: int = 3) -> TwoPort:
    """A matched pad: S21 = 10^(-A/20) exactly."""
    zero, s21 = np.zeros(points, complex), np.full(points, 10 ** (-db / 20), complex)
    return TwoPort(zero, s21, s21, zero)


def line(theta_rad: float, points: int = 3) -> TwoPort:
    """A matched line without loss."""
    zero, s21 = np.zeros(points, complex), np.full(points, np.exp(-1j * theta_rad))
    return TwoPort(zero, s21, s21, zero)


def shunt(y: complex, points: int = 3) -> TwoPort:
    """A shunt admittance ``y = Y Z0``: S11 = -y/(2+y), S21 = 2/(2+y) (Pozar, table 4.2, from memory)."""
    s11, s21 = np.full(points, -y / (2 + y), complex), np.full(points, 2 / (2 + y), complex)
    return TwoPort(s11, s21, s21, s11)


def test_of_and_matrix_are_inverse() -> None:
    """Row index = outgoing port: s21 stands in row 2, column 1."""
    m = np.arange(24).reshape(6, 2, 2) + 0.5j
    two = TwoPort.of(m)
    assert two.s21[0] == m[0, 1, 0]
    assert two.s12[0] == m[0, 0, 1]
    assert_array_equal(two.matrix, m)


@pytest.mark.parametrize("shape", [(2, 2), (5, 3, 3), (5, 2), (5, 1, 1)])
def test_of_refuses_another_shape(shape) -> None:
    with pytest.raises(ValueError, match=r"expected shape \(\.\.\., f, 2, 2\), got"):
        TwoPort.of(np.zeros(shape, complex))


def test_parameters_go_by_their_trade_names() -> None:
    two = TwoPort.of(np.array([[[11.0, 12.0], [21.0, 22.0]]]))
    assert [two.parameter(n)[0].real for n in ("S11", "S12", "S21", "S22")] == [11, 12, 21, 22]
    with pytest.raises(KeyError, match="S31"):
        two.parameter("S31")


def test_flipped_twice_is_the_same(random_device) -> None:
    two = random_device(1)
    assert_array_equal(two.flipped().flipped().matrix, two.matrix)
    assert_array_equal(two.flipped().s21, two.s12)


@pytest.mark.parametrize("seed", range(10))
def test_the_cascade_is_scikit_rfs(seed: int, random_device) -> None:
    """Against scikit-rf's connection of networks, an independent formula."""
    a, b = random_device(seed), random_device(seed + 100)
    assert_allclose((a @ b).matrix, (network(a) ** network(b)).s, atol=1e-13)


def test_the_cascade_associates(random_device) -> None:
    a, b, c = (random_device(k) for k in (1, 2, 3))
    assert_allclose(((a @ b) @ c).matrix, (a @ (b @ c)).matrix, atol=1e-12)


def test_a_thru_changes_nothing(random_device) -> None:
    two = random_device(4)
    through = TwoPort.through(11)
    assert_array_equal((two @ through).matrix, two.matrix)
    assert_array_equal((through @ two).matrix, two.matrix)


def test_pads_add_in_decibels() -> None:
    """3 dB + 10 dB + 20 dB of matched pads are 33 dB: common practice."""
    total = attenuator(3) @ attenuator(10) @ attenuator(20)
    assert_allclose(20 * np.log10(np.abs(total.s21)), -33.0, rtol=1e-13)


def test_two_shunts_a_quarter_wave_apart() -> None:
    """The classical pair: input admittance y + 1/(1 + y), so S11 follows by hand (any line text)."""
    y = 0.5j
    pair = shunt(y) @ line(np.pi / 2) @ shunt(y)
    admittance = y + 1 / (1 + y)
    assert_allclose(pair.s11, (1 - admittance) / (1 + admittance), atol=1e-15)


def test_reflection_through_a_pad() -> None:
    """A short behind a 10 dB pad has 20 dB return loss: common practice."""
    seen = attenuator(10).terminated(np.full(3, -1.0 + 0j))
    assert_allclose(20 * np.log10(np.abs(seen)), -20.0, rtol=1e-13)


@pytest.mark.parametrize("seed", range(20))
def test_de_embedding_finds_the_device_again(seed: int, random_device) -> None:
    left, right = shunt(0.3 + 0.4j, 11) @ line(1.1, 11), line(0.7, 11) @ shunt(0.2 - 0.6j, 11)
    device = random_device(seed)
    seen = left @ device @ right
    assert_allclose(seen.without_left(left).without_right(right).matrix, device.matrix, atol=1e-12)
    assert_allclose(seen.without_right(right).without_left(left).matrix, device.matrix, atol=1e-12)


def test_de_embedding_is_scikit_rfs(random_device) -> None:
    left, right, seen = random_device(5), random_device(6), random_device(7)
    other = network(left).inv ** network(seen) ** network(right).inv
    assert_allclose(seen.without_left(left).without_right(right).matrix, other.s, rtol=1e-6, atol=1e-6)


@pytest.mark.parametrize("db", [100, 200, 300])
def test_deep_stop_bands_keep_every_digit(db: int) -> None:
    """A device of 1e-5, 1e-10 and 1e-15 between mismatched jigs, to 1e-13 relative.

    Transfer matrices lose eps/|S21| here; the star product and its inverse lose nothing, since the
    exact S21 of the cascade is a product of factors near one (any cascade text: multiple reflections).
    """
    jig = shunt(0.3 + 0.4j) @ line(1.1)
    device = TwoPort(np.full(3, 0.6 + 0.3j), *(attenuator(db).planes[1:3]), np.full(3, -0.2 + 0.7j))
    seen = jig @ device @ jig.flipped()
    # With no transmission in the device both ends are seen alone, exactly to order |S21|^2 <= 1e-10.
    expected = jig.s21 * device.s21 * jig.s12
    expected = expected / ((1 - jig.s22 * device.s11) * (1 - jig.s22 * device.s22))
    assert_allclose(seen.s21, expected, rtol=2 * 10 ** (-db / 10) + 1e-14)
    back = seen.without_left(jig).without_right(jig.flipped())
    assert_allclose(back.s21, device.s21, rtol=1e-13)
    assert_allclose(back.s11, device.s11, rtol=1e-13)
    assert_allclose(back.s22, device.s22, rtol=1e-13)


def test_a_device_that_passes_nothing_is_exact() -> None:
    """|S21| = 0: a one-port pair between jigs comes back, and passes exactly nothing."""
    jig, nothing = shunt(0.5j), np.zeros(3, complex)
    device = TwoPort(np.full(3, 0.9j), nothing, nothing, np.full(3, -0.9 + 0j))
    back = (jig @ device @ jig).without_left(jig).without_right(jig)
    assert_array_equal(back.s21, 0)
    assert_allclose(back.s11, device.s11, atol=1e-15)


def test_draws_broadcast(random_device) -> None:
    """One device against 50 draws of a jig gives 50 cascades, each the one that stands alone."""
    device = random_device(1)
    jigs = TwoPort(*(np.stack([random_device(k).planes[i] for k in range(50)]) for i in range(4)))
    both = jigs @ device
    assert both.s11.shape == (50, 11)
    assert_array_equal(both.s21[7], (random_device(7) @ device).s21)
    assert both.matrix.shape == (50, 11, 2, 2)


def test_map_acts_on_every_plane(random_device) -> None:
    two = random_device(1)
    assert_array_equal(two.map(np.conj).matrix, two.matrix.conj())
