"""Calibration standards from their physical parameters, against published numbers and limits."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from numpy.testing import assert_allclose
from skrf.media import DistributedCircuit

from benchrun.rf.calibration import define
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.twoport import TwoPort

F_HZ = np.array([1e9, 6e9, 18e9])

O1 = Standard("open", Offset(30e-12), capacitance=(50e-15, 0.0, 0.0, 0.0))
O2 = Standard("open", Offset(30e-12, 1.3e9), capacitance=(50e-15, -300e-27, 20e-36, 0.1e-45))
S1 = Standard("short", Offset(30e-12, 1.3e9), inductance=(2e-12, -100e-24, 2e-33, -0.01e-42))
S2 = Standard("short", Offset(30e-12, 2.0e9, 50.2))

PUBLISHED = {
    "O1": (O1, [0.917756 - 0.397146j, -0.770159 - 0.637852j, 0.494309 - 0.869286j]),
    "O2": (O2, [0.917795 - 0.396996j, -0.767433 - 0.638747j, 0.474875 - 0.876486j]),
    "S1": (S1, [-0.927597 + 0.369431j, 0.639460 + 0.765502j, -0.869766 + 0.486250j]),
    "S2": (S2, [-0.926150 + 0.370813j, 0.640285 + 0.763053j, -0.867980 + 0.485548j]),
}
"""Evaluated apart from this project by the formulas of scikit-rf's "SOLT Calibration Standards Creation"."""


@pytest.mark.parametrize("name", PUBLISHED)
def test_the_published_standards(name: str) -> None:
    """At 1, 6 and 18 GHz, to the six decimals printed."""
    standard, expected = PUBLISHED[name]
    assert_allclose(standard.reflection(F_HZ), expected, atol=1e-6)


@pytest.mark.parametrize("name", PUBLISHED)
def test_the_input_impedance_form_agrees(name: str) -> None:
    """Zin = Zc (ZT + Zc tanh gl) / (Zc + ZT tanh gl): any line text, another formula for the same thing."""
    standard, _ = PUBLISHED[name]
    w = 2 * np.pi * F_HZ
    c = sum(k * F_HZ**n for n, k in enumerate(standard.capacitance))
    inductance = sum(k * F_HZ**n for n, k in enumerate(standard.inductance))
    zt = 1 / (1j * w * c) if standard.kind == "open" else 1j * w * inductance
    gl, zc = standard.offset.line(F_HZ)
    zin = zc * (zt + zc * np.tanh(gl)) / (zc + zt * np.tanh(gl))
    assert_allclose(standard.reflection(F_HZ), (zin - 50) / (zin + 50), atol=1e-14)


@pytest.mark.parametrize("name", PUBLISHED)
def test_scikit_rfs_exact_line_differs_by_its_known_amount(name: str) -> None:
    """Its distributed R, L, C line is the form without the low-loss approximation: within 2e-5."""
    standard, _ = PUBLISHED[name]
    tau, loss, z0 = standard.offset.delay_s, standard.offset.loss_ohm_per_s, standard.offset.z0_ohm
    r = loss * tau * np.sqrt(F_HZ / 1e9)
    media = DistributedCircuit(
        skrf.Frequency.from_f(F_HZ, unit="hz"),
        z0_port=50,
        C=tau / z0,
        L=tau * z0 + r / (2 * np.pi * F_HZ),
        R=r,
        G=0,
    )
    gl, zc = media.gamma, media.z0_characteristic
    terminated = Standard(standard.kind, Offset(), standard.capacitance, standard.inductance)
    gamma_t = terminated.reflection(F_HZ)
    zt = 50 * (1 + gamma_t) / (1 - gamma_t)
    zin = zc * (zt + zc * np.tanh(gl)) / (zc + zt * np.tanh(gl))
    assert_allclose(standard.reflection(F_HZ), (zin - 50) / (zin + 50), atol=2e-5)


def test_an_ideal_open_short_and_load() -> None:
    """Without offset, capacitance or inductance: +1, -1 and 0 exactly."""
    assert_allclose(Standard("open").reflection(F_HZ), 1.0, atol=0)
    assert_allclose(Standard("short").reflection(F_HZ), -1.0, atol=0)
    assert_allclose(Standard("load").reflection(F_HZ), 0.0, atol=0)


@pytest.mark.parametrize("standard", [O1, Standard("short", Offset(30e-12), inductance=(2e-12, 0, 0, 0))])
def test_without_loss_everything_comes_back(standard: Standard) -> None:
    assert_allclose(np.abs(standard.reflection(F_HZ)), 1.0, rtol=1e-14)


@pytest.mark.parametrize("standard", [O2, S1, S2])
def test_loss_only_takes(standard: Standard) -> None:
    """A passive standard reflects at most everything, at every frequency of its use."""
    f_hz = np.linspace(1e6, 18e9, 1001)
    assert np.all(np.abs(standard.reflection(f_hz)) < 1.0)


def test_the_angle_of_an_offset_short_falls_by_720_degrees_a_turn() -> None:
    """d(angle)/df = -720 deg times the one-way delay: twice through the line."""
    f_hz = np.linspace(1e9, 3e9, 201)
    angle = np.unwrap(np.angle(Standard("short", Offset(30e-12)).reflection(f_hz)))
    assert_allclose(np.degrees(angle[-1] - angle[0]) / 2e9, -720 * 30e-12, rtol=1e-12)


def test_a_fringing_capacitance_alone() -> None:
    """Gamma = (1 - jwCZ) / (1 + jwCZ): angle -2 atan(wCZ)."""
    plain = Standard("open", capacitance=(50e-15, 0, 0, 0)).reflection(F_HZ)
    assert_allclose(np.angle(plain), -2 * np.arctan(2 * np.pi * F_HZ * 50e-15 * 50), rtol=1e-13)


def test_a_load_off_by_a_little() -> None:
    """(51 - 50) / (51 + 50), and a series inductance turns it inductive."""
    assert_allclose(Standard("load", resistance_ohm=51.0).reflection(F_HZ), 1 / 101, rtol=1e-13)
    inductive = Standard("load", series_inductance_h=10e-12).reflection(F_HZ)
    assert np.all(inductive.imag > 0)


def test_a_75_ohm_load_in_a_75_ohm_system() -> None:
    assert_allclose(Standard("load", resistance_ohm=75.0).reflection(F_HZ, 75.0), 0.0, atol=0)


def test_an_offset_of_the_wrong_impedance_mismatches_a_perfect_load() -> None:
    """A 50.5 ohm line in front of 50 ohm: |Gamma| up to 2 |G1|, G1 = 0.5/100.5 (any line text)."""
    f_hz = np.linspace(1e8, 18e9, 2001)
    seen = np.abs(Standard("load", Offset(30e-12, 0.0, 50.5)).reflection(f_hz))
    assert_allclose(seen.max(), 2 * 0.5 / 100.5, rtol=1e-3)


def test_a_thru_of_the_system_impedance_only_delays() -> None:
    thru = Standard("thru", Offset(100e-12)).two_port(F_HZ)
    assert_allclose(thru.s11, 0.0, atol=0)
    assert_allclose(thru.s21, np.exp(-2j * np.pi * F_HZ * 100e-12), atol=1e-14)


def test_a_mismatched_thru_is_scikit_rfs_line() -> None:
    """55 ohm without loss, against scikit-rf's line between two 50 ohm ports."""
    thru = Standard("thru", Offset(60e-12, 0.0, 55.0)).two_port(F_HZ)
    frequency = skrf.Frequency.from_f(F_HZ, unit="hz")
    media = skrf.media.DefinedGammaZ0(frequency, z0_port=50, z0=55.0, gamma=2j * np.pi * F_HZ / 3e8)
    theirs = media.line(60e-12 * 3e8, "m")
    assert_allclose(thru.matrix, theirs.s, atol=1e-12)


def test_a_lossless_thru_is_unitary() -> None:
    """|S11|^2 + |S21|^2 = 1: energy is kept."""
    thru = Standard("thru", Offset(60e-12, 0.0, 75.0)).two_port(F_HZ)
    assert_allclose(np.abs(thru.s11) ** 2 + np.abs(thru.s21) ** 2, 1.0, rtol=1e-14)


def test_a_thru_ended_in_a_short_is_an_offset_short() -> None:
    """Two roads to one standard: the two-port ended, and the one-port formula."""
    offset = Offset(45e-12, 1.5e9, 51.0)
    ended = Standard("thru", offset).two_port(F_HZ).terminated(np.full(3, -1.0 + 0j))
    assert_allclose(ended, Standard("short", offset).reflection(F_HZ), atol=1e-14)


def test_a_thru_has_no_single_reflection() -> None:
    with pytest.raises(ValueError, match="a thru has no single reflection"):
        Standard("thru").reflection(F_HZ)


@pytest.mark.parametrize(
    ("standard", "parameter", "size", "moved"),
    [
        (O2, "c0_f", 1e-15, Standard("open", O2.offset, capacitance=(51e-15, *O2.capacitance[1:]))),
        (S1, "l0_h", 1e-12, Standard("short", S1.offset, inductance=(3e-12, *S1.inductance[1:]))),
        (S2, "delay_s", 1e-12, Standard("short", Offset(31e-12, 2.0e9, 50.2))),
        (Standard("load"), "resistance_ohm", 0.5, Standard("load", resistance_ohm=50.5)),
        (Standard("load"), "series_inductance_h", 1e-12, Standard("load", series_inductance_h=1e-12)),
    ],
)
def test_a_departure_is_another_standard(
    standard: Standard, parameter: str, size: float, moved: Standard
) -> None:
    """Moving a parameter by ``deltas`` is building the standard with it, for one value or for draws."""
    assert_allclose(standard.reflection(F_HZ, deltas={parameter: size}), moved.reflection(F_HZ), atol=1e-15)
    drawn = standard.reflection(F_HZ, deltas={parameter: np.array([[0.0], [size]])})
    assert drawn.shape == (2, 3)
    assert_allclose(drawn[0], standard.reflection(F_HZ), atol=1e-15)
    assert_allclose(drawn[1], moved.reflection(F_HZ), atol=1e-15)


def test_a_departure_of_the_thru_delay() -> None:
    drawn = Standard("thru", Offset(50e-12)).two_port(F_HZ, deltas={"delay_s": np.array([[0.0], [1e-12]])})
    assert_allclose(drawn.s21[1], Standard("thru", Offset(51e-12)).two_port(F_HZ).s21, atol=1e-14)


def test_a_kit_defines_what_is_wanted() -> None:
    kit = Kit("k", {"short": S1, "open": O2, "load": Standard("load"), "thru": Standard("thru")})
    found = define(kit, ("short", "thru"), F_HZ)
    assert list(found) == ["short", "thru"]
    assert isinstance(found["thru"], TwoPort)
    assert_allclose(found["short"], S1.reflection(F_HZ), atol=0)


def test_a_kit_moves_only_the_standard_named() -> None:
    kit = Kit("k", {"short": S1, "open": O2})
    found = define(kit, ("short", "open"), F_HZ, {"open": {"c0_f": np.array([[1e-15], [2e-15]])}})
    assert np.shape(found["short"]) == (3,)
    assert np.shape(found["open"]) == (2, 3)


def test_a_standard_that_the_kit_lacks() -> None:
    with pytest.raises(KeyError, match="load"):
        define(Kit("k", {"short": S1}), ("load",), F_HZ)


def test_a_kit_with_one_standard_replaced() -> None:
    """The old one stays as it was: kits are values."""
    kit = Kit("k", {"short": S1, "open": O2}, serial="7")
    other = kit.with_standard("open", O1)
    assert other.standards["open"] is O1
    assert kit.standards["open"] is O2
    assert other.serial == "7"


def test_a_kit_works_in_its_own_impedance() -> None:
    """A 75 ohm kit's 75 ohm load is perfect."""
    kit = Kit("k", {"load": Standard("load", Offset(z0_ohm=75.0), resistance_ohm=75.0)}, z0_ohm=75.0)
    assert_allclose(define(kit, ("load",), F_HZ)["load"], 0.0, atol=0)
