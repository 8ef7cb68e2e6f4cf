"""Joining scattering matrices: the star product, lines and ends, against formulas written here."""

from __future__ import annotations

import numpy as np
import pytest

from sim_instruments.waves import chain, flip, from_abcd, join, line, seen_through, thru, two

F = np.linspace(10e6, 3e9, 101)


def _planes(*values: complex) -> list[np.ndarray]:
    return [np.full(1, v, np.complex128) for v in values]


def test_the_star_product_keeps_minus_200_db_exact() -> None:
    """Series 1/(1 - a22 b11) by hand (Pozar, 4.5, signal flow graphs, from memory); no cancellation."""
    a = two(*_planes(0.3 - 0.2j, 1e-5, 1e-5j, 0.4 + 0.1j))
    b = two(*_planes(-0.5j, 1e-5, -1e-5, 0.2))
    loop = 1 - (0.4 + 0.1j) * (-0.5j)
    whole = join(a, b)
    assert whole[0, 1, 0] == pytest.approx(1e-5j * -1e-5 / loop, rel=1e-15)
    assert abs(whole[0, 1, 0]) == pytest.approx(1e-10 / abs(loop), rel=1e-15)
    assert whole[0, 0, 0] == pytest.approx(0.3 - 0.2j + 1e-5 * -0.5j * 1e-5j / loop, rel=1e-15)


def test_a_deep_pad_is_the_product_of_its_halves() -> None:
    """Two matched 100 dB pads: |S21| = 1e-10 to the last digits, where chain matrices lose everything."""
    pad = two(*_planes(0, 1e-5, 1e-5, 0))
    assert chain(pad, thru(1), pad)[0, 1, 0] == pytest.approx(1e-10, rel=1e-15)


def test_joining_is_associative() -> None:
    """However a chain is bracketed, it is the same chain."""
    a, b, c = line(F, 40e-12, 75.0, 0.3), line(F, 90e-12, 30.0, 0.2), line(F, 70e-12, 50.5, 0.1)
    np.testing.assert_allclose(join(join(a, b), c), join(a, join(b, c)), rtol=0, atol=1e-14)


def test_a_chain_agrees_with_scikit_rf() -> None:
    """The same three lines cascaded by another program's connection algorithm."""
    skrf = pytest.importorskip("skrf")
    parts = [line(F, 40e-12, 75.0, 0.3), line(F, 90e-12, 30.0, 0.2), line(F, 70e-12, 50.5, 0.1)]
    frequency = skrf.Frequency.from_f(F, unit="hz")
    first, *rest = (skrf.Network(frequency=frequency, s=p, z0=50) for p in parts)
    for network in rest:
        first = first**network
    np.testing.assert_allclose(chain(*parts), first.s, rtol=0, atol=1e-12)


def test_turning_a_chain_round_reverses_its_order() -> None:
    """The chain read from the other end."""
    a, b = line(F, 40e-12, 75.0, 0.3), line(F, 90e-12, 30.0, 0.2)
    np.testing.assert_allclose(flip(join(a, b)), join(flip(b), flip(a)), rtol=0, atol=1e-15)


def test_a_quarter_wave_transformer_matches_two_to_one() -> None:
    """Z = sqrt(50 * 100) a quarter wave long turns 100 into 50 ohm (Pozar, 2.5, from memory)."""
    f = np.array([1e9])
    quarter = line(f, 0.25e-9, np.sqrt(50.0 * 100.0))
    end = np.full(1, (100 - 50) / (100 + 50), np.complex128)
    assert abs(seen_through(quarter, end)[0]) < 1e-14


def test_a_matched_lossy_line_only_delays_and_attenuates() -> None:
    """Loss in dB with the root of frequency, phase -2 pi f tau, no reflection."""
    m = line(F, 1e-9, 50.0, 0.8, 1e9)
    np.testing.assert_allclose(-20 * np.log10(abs(m[:, 1, 0])), 0.8 * np.sqrt(F / 1e9), rtol=1e-9)
    np.testing.assert_allclose(m[:, 1, 0] / abs(m[:, 1, 0]), np.exp(-2j * np.pi * F * 1e-9), atol=1e-12)
    np.testing.assert_allclose(m[:, 0, 0], 0, atol=1e-15)


def test_a_lossless_line_is_unitary() -> None:
    """No power is made or lost."""
    m = line(F, 0.3e-9, 82.0)
    product = np.conj(np.swapaxes(m, 1, 2)) @ m
    np.testing.assert_allclose(product, np.broadcast_to(np.eye(2), product.shape), atol=1e-13)


def test_a_series_impedance_by_its_chain_matrix() -> None:
    """Series Z: S11 = Z/(Z + 2 Z0), S21 = 2 Z0/(Z + 2 Z0)."""
    z, one, zero = 30 + 40j, *_planes(1, 0)
    m = from_abcd(one, np.full(1, z), zero, one)[0]
    assert m[0, 0] == pytest.approx(z / (z + 100))
    assert m[1, 0] == pytest.approx(100 / (z + 100))
