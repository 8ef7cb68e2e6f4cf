"""Figures of level against closed forms: pads, mismatch tables, filters, ripple."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.rf.figures import FIGURES
from benchrun.rf.twoport import TwoPort

F_HZ = np.linspace(1e6, 2e9, 401)
BAND = (100e6, 1e9)

# VSWR, return loss dB, mismatch loss dB (evaluated from the definitions, any transmission-line text).
MISMATCH = [
    (1.01, 46.064, 0.00011), (1.05, 32.256, 0.00258), (1.10, 26.444, 0.00986), (1.20, 20.828, 0.03604),
    (1.50, 13.979, 0.17729), (1.90, 10.163, 0.43982), (2.00, 9.542, 0.51153), (3.00, 6.021, 1.24939),
    (5.00, 3.522, 2.55273), (10.0, 1.743, 4.80725),
]  # fmt: skip
RETURN_LOSS = [
    (3.0, 5.84804, 3.020624), (6.0, 3.00952, 1.256276), (10.0, 1.92495, 0.457575), (14.0, 1.49852, 0.176431),
    (20.0, 1.22222, 0.043648), (26.0, 1.10553, 0.010923), (30.0, 1.06531, 0.004345),
    (46.0, 1.01007, 0.000109),
]  # fmt: skip
# Attenuation dB, tee series and shunt ohm, pi shunt and series ohm, in 50 ohm (any attenuator text).
PADS = [
    (1, 2.8751, 433.3366, 869.5482, 5.7692), (3, 8.5499, 141.9262, 292.4022, 17.6148),
    (6, 16.6139, 66.9310, 150.4760, 37.3519), (10, 25.9747, 35.1364, 96.2475, 71.1512),
    (20, 40.9091, 10.1010, 61.1111, 247.5), (40, 49.0099, 1.0001, 51.0101, 2499.75),
]  # fmt: skip


def flat(s11: complex = 0.0, s21: complex = 1.0) -> TwoPort:
    return TwoPort(*(np.full(F_HZ.shape, v, complex) for v in (s11, s21, s21, s11)))


def tilted(db: np.ndarray) -> TwoPort:
    """|S21| in dB per sample, S12 ten dB lower."""
    zero, s21 = np.zeros(db.shape, complex), 10 ** (db / 20) + 0j
    return TwoPort(zero, s21 / 10**0.5, s21, zero)


def value(name: str, network, side: str = "at most", f_hz=F_HZ, **parameters) -> float:
    return float(FIGURES[name].measure(f_hz, network, side, **parameters).value)


def series(z_ohm: float) -> TwoPort:
    """Series impedance: S11 = z/(z+2), S21 = 2/(z+2), z = Z/Z0 (Pozar, table 4.2, from memory)."""
    z = z_ohm / 50
    return flat(z / (z + 2), 2 / (z + 2))


def shunt(r_ohm: float) -> TwoPort:
    y = 50 / r_ohm
    return flat(-y / (y + 2), 2 / (y + 2))


@pytest.mark.parametrize(("vswr", "return_loss", "mismatch_loss"), MISMATCH)
def test_the_vswr_table(vswr: float, return_loss: float, mismatch_loss: float) -> None:
    """From a reflection of (VSWR - 1)/(VSWR + 1), on either port, from one port or two."""
    gamma = (vswr - 1) / (vswr + 1)
    for network in (flat(gamma * 1j), np.full(F_HZ.shape, -gamma + 0j)):
        for port in (1, 2):
            assert_allclose(value("VSWR", network, over=BAND, port=port), vswr, rtol=1e-12)
            assert_allclose(value("return loss", network, over=BAND, port=port), return_loss, atol=5e-4)
            assert_allclose(value("mismatch loss", network, over=BAND, port=port), mismatch_loss, atol=6e-6)


@pytest.mark.parametrize(("return_loss", "vswr", "mismatch_loss"), RETURN_LOSS)
def test_the_return_loss_table(return_loss: float, vswr: float, mismatch_loss: float) -> None:
    network = flat(10 ** (-return_loss / 20))
    assert_allclose(value("return loss", network, at=5e8, port=1), return_loss, rtol=1e-12)
    assert_allclose(value("VSWR", network, at=5e8, port=1), vswr, atol=6e-6)
    assert_allclose(value("mismatch loss", network, at=5e8, port=1), mismatch_loss, atol=6e-7)


@pytest.mark.parametrize(("db", "tee_series", "tee_shunt", "pi_shunt", "pi_series"), PADS)
def test_the_pad_table(db, tee_series, tee_shunt, pi_shunt, pi_series) -> None:
    """Resistors of the table make the attenuation, matched: both circuits, through the cascade."""
    tee = series(tee_series) @ shunt(tee_shunt) @ series(tee_series)
    pi = shunt(pi_shunt) @ series(pi_series) @ shunt(pi_shunt)
    for pad in (tee, pi):
        assert_allclose(value("insertion loss", pad, over=BAND, trace="S21"), db, atol=2e-3)
        assert_allclose(value("gain", pad, over=BAND, trace="S12"), -db, atol=2e-3)
        assert value("return loss", pad, "at least", over=BAND, port=1) > 75


def test_the_minimum_loss_pad() -> None:
    """75 to 50 ohm: 43.3013 ohm in series, 86.6025 ohm across, 5.7195 dB, matched at both ends.

    Seen from 50 ohm on both sides, port 1 reflects as 75 ohm would (20 % voltage); its transducer loss
    is 5.7195 dB once that mismatch is taken off (any attenuator text).
    """
    pad = series(43.3013) @ shunt(86.6025)
    # Ended in 75 ohm (reflection 0.2 in 50 ohm) on port 1, port 2 shows 50 ohm.
    assert_allclose(pad.flipped().terminated(np.full(F_HZ.shape, 0.2 + 0j)), 0.0, atol=1e-6)
    # Ended in 50 ohm on port 2, port 1 shows 75 ohm.
    assert_allclose(value("VSWR", pad, over=BAND, port=1), 1.5, rtol=1e-5)
    # |S21|^2 (50, 50) = loss (75, 50) times the mismatch 1 - 0.2^2 at port 1.
    total = value("insertion loss", pad, over=BAND, trace="S21")
    assert_allclose(total - value("mismatch loss", pad, over=BAND, port=1), 5.7195, atol=1e-4)


def test_at_most_takes_the_greatest_and_at_least_the_least() -> None:
    """The worst sample of a band decides, and the figure says where it lies."""
    slope = tilted(-3.0 - F_HZ / 1e9)
    worst = FIGURES["insertion loss"].measure(F_HZ, slope, "at most", over=BAND, trace="S21")
    best = FIGURES["insertion loss"].measure(F_HZ, slope, "at least", over=BAND, trace="S21")
    assert_allclose([worst.value, worst.at_hz], [4.0, 1e9], rtol=1e-9)
    assert_allclose([best.value, best.at_hz], [3.1, 100e6], rtol=1e-9)


def test_gain_and_insertion_loss_are_opposite() -> None:
    slope = tilted(np.linspace(10.0, 14.0, 401))
    assert value("gain", slope, over=BAND, trace="S21") == -value(
        "insertion loss", slope, "at least", over=BAND, trace="S21"
    )


def test_the_trace_can_be_the_reverse_one() -> None:
    slope = tilted(np.full(401, -3.0))
    assert_allclose(value("insertion loss", slope, over=BAND, trace="S12"), 13.0, rtol=1e-12)


def test_band_edges_fall_between_samples() -> None:
    """A grid that misses the edges by 40 MHz gives the figure of the edges all the same (linear in dB)."""
    coarse = np.linspace(0.0, 2e9, 26)
    slope = tilted(-coarse / 1e9)
    found = FIGURES["insertion loss"].measure(coarse, slope, "at most", over=(0.13e9, 0.99e9), trace="S21")
    assert_allclose([found.value, found.at_hz], [0.99, 0.99e9], rtol=1e-12)


def test_a_band_between_two_samples() -> None:
    coarse = np.array([1e9, 2e9])
    slope = tilted(-coarse / 1e9)
    assert_allclose(value("insertion loss", slope, f_hz=coarse, over=(1.4e9, 1.6e9), trace="S21"), 1.6)


def test_one_frequency_is_interpolated() -> None:
    coarse = np.array([1e9, 2e9, 3e9])
    slope = tilted(np.array([-1.0, -3.0, -7.0]))
    for where, db in ((1e9, 1.0), (1.25e9, 1.5), (2e9, 3.0), (2.5e9, 5.0), (3e9, 7.0)):
        assert_allclose(value("insertion loss", slope, f_hz=coarse, at=where, trace="S21"), db, rtol=1e-12)


def test_ripple_is_greatest_less_least() -> None:
    """A sine of 0.25 dB amplitude has a ripple of 0.5 dB, whatever loss it rides on."""
    wave = tilted(-6.0 + 0.25 * np.sin(2 * np.pi * F_HZ / 200e6))
    assert_allclose(value("ripple", wave, over=BAND, trace="S21"), 0.5, rtol=2e-3)


def test_ripple_says_where_the_dip_is() -> None:
    dip = np.full(401, -1.0)
    dip[100] = -2.5
    found = FIGURES["ripple"].measure(F_HZ, tilted(dip), "at most", over=BAND, trace="S21")
    assert_allclose([found.value, found.at_hz], [1.5, F_HZ[100]])


def test_chebyshev_ripple_is_its_ripple() -> None:
    """A 0.5 dB Chebyshev response, n = 5: |S21|^2 = 1/(1 + e^2 T5^2), e^2 = 10^0.05 - 1."""
    f_hz = np.linspace(0.001, 1.0, 4001) * 1e9
    t5 = np.cos(5 * np.arccos(f_hz / 1e9))
    response = tilted(-10 * np.log10(1 + (10**0.05 - 1) * t5**2))
    assert_allclose(value("ripple", response, f_hz=f_hz, over=(1e6, 1e9), trace="S21"), 0.5, atol=1e-5)


def chebyshev_db(x: float, n: int, ripple_db: float) -> np.ndarray:
    return 10 * np.log10(1 + (10 ** (ripple_db / 10) - 1) * np.cosh(n * np.arccosh(x)) ** 2)


@pytest.mark.parametrize(("n", "x", "db"), [(3, 2.0, 18.1291), (5, 1.5, 17.6838), (7, 2.0, 42.1445)])
def test_butterworth_rejection(n: int, x: float, db: float) -> None:
    """10 log10(1 + x^2n): printed values from the formula (Matthaei, from memory)."""
    f_hz = np.linspace(0.01e9, 3e9, 2991)
    response = tilted(-10 * np.log10(1 + (f_hz / 1e9) ** (2 * n)))
    assert_allclose(value("rejection", response, f_hz=f_hz, at=x * 1e9, trace="S21"), db, atol=1e-4)


@pytest.mark.parametrize(
    ("n", "ripple", "x", "db"),
    [(3, 0.5, 2.0, 19.2161), (5, 0.5, 2.0, 42.0387), (5, 0.1, 1.5, 19.4988), (7, 0.1, 2.0, 57.7243),
     (3, 3.0, 2.0, 28.2853)],
)  # fmt: skip
def test_chebyshev_rejection(n: int, ripple: float, x: float, db: float) -> None:
    """Stop-band attenuation over a whole band is its least, at the lower edge."""
    f_hz = np.linspace(1.001e9, 3e9, 2000)
    response = tilted(-chebyshev_db(f_hz / 1e9, n, ripple))
    found = FIGURES["rejection"].measure(
        f_hz, response, "at least", over=(x * 1e9, 2.5e9), trace="S21", against=None
    )
    assert_allclose([found.value, found.at_hz], [db, x * 1e9], rtol=1e-5)


def test_rejection_against_the_pass_band() -> None:
    """50 dB down behind a splitter of 13 dB is 37 dB of rejection."""
    loss = np.where(F_HZ < 500e6, 13.0, 50.0)
    loss[:20] = 13.4
    found = value(
        "rejection", tilted(-loss), "at least", over=(600e6, 1e9), trace="S21", against=(50e6, 400e6)
    )
    assert_allclose(found, 37.0, rtol=1e-12)


def test_a_reference_band_outside_the_sweep_is_refused() -> None:
    with pytest.raises(InvalidMeasurement, match=r"reference of rejection is asked from .* only"):
        value("rejection", flat(), "at least", over=BAND, trace="S21", against=(1.9e9, 2.1e9))


def test_reciprocity_is_a_linear_difference() -> None:
    network = TwoPort(*(np.full(F_HZ.shape, v) for v in (0j, 0.5 + 0.1j, 0.5 - 0.1j, 0j)))
    assert_allclose(value("reciprocity", network, over=BAND), 0.2, rtol=1e-12)
    assert value("reciprocity", flat(), over=BAND) == 0.0


def test_nothing_at_all_is_400_db() -> None:
    """A reading of exactly zero must not become infinity or a warning."""
    assert value("insertion loss", flat(0.0, 0.0), over=BAND, trace="S21") == 400.0
    assert value("return loss", flat(0.0), over=BAND, port=1) == 400.0


@pytest.mark.parametrize("gamma", [1.0, 1.02])
def test_a_total_reflection_has_a_vswr_beyond_any_limit(gamma: float) -> None:
    """Noise can lift |S11| of a short above one: the figure stays finite and fails every limit."""
    assert value("VSWR", flat(gamma), over=BAND, port=1) > 1e9
    assert 80 < value("mismatch loss", flat(gamma), over=BAND, port=1) < 1000


@pytest.mark.parametrize("name", ["insertion loss", "gain", "rejection", "ripple"])
def test_one_port_has_no_transmission(name: str) -> None:
    with pytest.raises(TypeError, match="a one-port has no transmission"):
        value(name, np.zeros(401, complex), over=BAND, trace="S21")
