"""Filters scaled and built: published values, the response against scikit-rf, tolerance, masks."""

from __future__ import annotations

import numpy as np
import pytest
import skrf
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose, assert_array_equal
from skrf.media import DefinedGammaZ0

from benchrun.rf.design import (
    Branch,
    Ladder,
    Line,
    Part,
    Stub,
    band_pass,
    band_stop,
    bessel,
    butterworth,
    chebyshev,
    high_pass,
    low_pass,
)
from benchrun.rf.masks import Mask, MaskLine

F_HZ = np.linspace(50e6, 3e9, 60)


def values(ladder: Ladder) -> list[float]:
    return [p.value for p in ladder.parts]


def level(ladder: Ladder, f_hz) -> np.ndarray:
    return 20 * np.log10(np.abs(ladder.response(np.atleast_1d(np.asarray(f_hz, float))).s21))


def test_a_low_pass_of_the_text_book() -> None:
    """Butterworth, n = 5, 2 GHz, 50 ohm: .984 pF, 6.438 nH, 3.183 pF (Pozar, ch. 8, from memory)."""
    found = values(low_pass(butterworth(5), 2e9))
    assert_allclose(found, [0.98363e-12, 6.43795e-9, 3.18310e-12, 6.43795e-9, 0.98363e-12], rtol=1e-5)


def test_a_band_pass_of_the_text_book() -> None:
    """0.5 dB, n = 3, 1 GHz, 10 %: 127.0 nH, .199 pF, .726 nH, 34.91 pF (Pozar, ch. 8, from memory)."""
    low = 1e9 * (np.sqrt(1 + 0.05**2) - 0.05)
    found = values(band_pass(chebyshev(3, 0.5, first="series"), low, low + 0.1e9))
    wanted = [127.028e-9, 0.199407e-12, 0.725614e-9, 34.9088e-12, 127.028e-9, 0.199407e-12]
    assert_allclose(found, wanted, rtol=1e-5)


@pytest.mark.parametrize("prototype", [butterworth(4), chebyshev(5, 0.5), chebyshev(4, 0.1), bessel(3, 3.0)])
def test_the_transforms_put_the_prototype_where_they_should(prototype) -> None:
    """Each frequency of the filter is one of the prototype (definition of the transforms)."""
    f1, f2 = 0.8e9, 1.3e9
    centre = np.sqrt(f1 * f2)
    band = (F_HZ / centre - centre / F_HZ) * centre / (f2 - f1)
    for ladder, w in (
        (low_pass(prototype, 1e9, 75.0), F_HZ / 1e9), (high_pass(prototype, 1e9, 75.0), -1e9 / F_HZ),
        (band_pass(prototype, f1, f2, 75.0), band), (band_stop(prototype, f1, f2, 75.0), -1 / band),
    ):  # fmt: skip
        assert_allclose(ladder.response(F_HZ).s21, prototype.transmission(w), atol=1e-9)
        assert ladder.load_ohm == 75.0 * prototype.load


def test_lossless_filters_are_unitary() -> None:
    s = band_pass(chebyshev(6, 0.2), 0.8e9, 1.3e9).response(F_HZ)
    unit = np.conj(np.swapaxes(s.matrix, -1, -2)) @ s.matrix
    assert_allclose(unit, np.broadcast_to(np.eye(2), unit.shape), atol=1e-9)


def test_scikit_rf_predicts_the_same() -> None:
    """Another program's lumped parts, line and stub, cascaded and renormalised to 75 ohm at port 2."""
    ladder = Ladder(
        "mixed",
        (
            Branch("series", (Part("coil", 5e-9),)),
            Branch("shunt", (Part("capacitor", 2e-12),)),
            Line(60.0, 0.11, 1e9),
            Branch("series", (Part("resistor", 12.0),)),
            Stub("shunt", "open", Line(80.0, 0.07, 1e9)),
            Stub("shunt", "short", Line(35.0, 0.2, 1e9)),
        ),
        50.0,
        75.0,
    )
    frequency = skrf.Frequency.from_f(F_HZ, unit="hz")

    def line(z: float) -> DefinedGammaZ0:
        return DefinedGammaZ0(frequency, z0_port=50, z0=z, gamma=2j * np.pi * F_HZ / 3e8)

    m = DefinedGammaZ0(frequency, z0=50, gamma=2j * np.pi * F_HZ / 3e8)
    theirs = (
        m.inductor(5e-9)
        ** m.shunt_capacitor(2e-12)
        ** line(60).line(0.11 * 0.3, "m")
        ** m.resistor(12.0)
        ** m.shunt(line(80).line(0.07 * 0.3, "m") ** m.open())
        ** m.shunt(line(35).line(0.2 * 0.3, "m") ** m.short())
    )
    theirs.renormalize([50, 75])
    assert_allclose(ladder.response(F_HZ).matrix, theirs.s, atol=1e-9)


@pytest.mark.parametrize(("kind", "value"), [("coil", 100e-9), ("capacitor", 10e-12)])
def test_q_is_what_it_says_at_its_frequency(kind: str, value: float) -> None:
    """|X| / R at q_hz; a coil's Q then grows with the root of frequency, a capacitor's falls with it."""
    part = Part(kind, value, q=80.0, q_hz=100e6)
    z = part.impedance(np.array([100e6, 400e6]), np.ones(()))
    assert_allclose(np.abs(z.imag) / z.real, [80.0, 160.0 if kind == "coil" else 20.0], rtol=1e-12)


def test_loss_of_a_low_pass_in_its_band() -> None:
    """About 4.343 w / Q * sum(g) dB at low loss, both kinds of parts alike (Cohn 1959, from memory)."""
    prototype, q = butterworth(5), 200.0
    lossy = low_pass(prototype, 1e9).with_parts(lambda p: Part(p.kind, p.value, q=q, q_hz=0.3e9))
    loss = level(low_pass(prototype, 1e9), 0.3e9) - level(lossy, 0.3e9)
    assert_allclose(loss, 4.343 * 0.3 / q * sum(prototype.g), rtol=0.06)


def test_parts_that_can_be_bought() -> None:
    ladder = low_pass(butterworth(3), 1e9).real("E12", "E24", coil_q=(60.0, 1e9))
    assert_allclose(values(ladder), [3.3e-12, 15e-9, 3.3e-12])
    assert [p.tolerance for p in ladder.parts] == [0.05, 0.1, 0.05]
    assert [p.q for p in ladder.parts] == [np.inf, 60.0, np.inf]
    assert ladder.real(tolerance=0.02).parts[0].tolerance == 0.02
    assert ladder.real(tolerance=0.02).parts[1].q == 60.0


def test_the_same_seed_builds_the_same_pieces() -> None:
    ladder = low_pass(butterworth(3), 1e9).real(tolerance=0.05)
    one, again, other = (ladder.draws(F_HZ, 20, seed).s21 for seed in (3, 3, 4))
    assert_array_equal(one, again)
    assert not np.array_equal(one, other)
    assert one.shape == (20, 60)
    factors = ladder.factors(4000, 1)
    assert 0.95 <= factors.min() < 0.951
    assert_allclose(factors.std(0), 0.05 / np.sqrt(3), rtol=0.05)  # rectangular, JCGM 101:2008 6.4.2
    assert_array_equal(ladder.response(F_HZ, factors[:3]).s11[1], ladder.response(F_HZ, factors[1]).s11)


def test_the_mask_holds_for_the_pieces_it_was_drawn_from() -> None:
    ladder = low_pass(chebyshev(5, 0.2), 200e6).real(coil_q=(50.0, 170e6))
    f = np.geomspace(10e6, 1e9, 60)
    mask = ladder.expected(f, draws=200, seed=5)
    assert [x.side for x in mask.lines] == ["at least", "at most"]
    assert ladder.fraction_within(f, {"S21": mask}, 200, 5) == 1.0
    assert ladder.fraction_within(f, {"S21": mask}, 200, 6) > 0.5
    wider = ladder.expected(f, draws=200, seed=5, guard_db=0.5)
    assert_allclose(wider.lines[0].level_db, mask.lines[0].level_db - 0.5)
    assert_allclose(wider.lines[1].level_db, mask.lines[1].level_db + 0.5)
    with pytest.raises(ValueError, match="a guard of -1 dB would close the corridor"):
        ladder.expected(f, guard_db=-1.0)


def test_a_wrong_part_falls_out_of_the_mask() -> None:
    """One capacitor of twice its value is no piece of this design."""
    ladder = low_pass(chebyshev(5, 0.2), 200e6).real(tolerance=0.02)
    f = np.geomspace(10e6, 1e9, 60)
    mask = ladder.expected(f, guard_db=0.3)
    wrong = ladder.response(f, np.array([1.0, 1.0, 2.0, 1.0, 1.0]))
    found = 20 * np.log10(np.abs(wrong.s21))
    assert np.any((found < mask.lines[0].level_db) | (found > mask.lines[1].level_db))


def test_the_yield_of_one_part_in_closed_form() -> None:
    """A series 100 ohm +-10 % in 50 ohm: |S21| = 100 / (100 + R) <= 0.49 asks R >= 104.08: 29.6 %."""
    ladder = Ladder("half", (Branch("series", (Part("resistor", 100.0, 0.1),)),))
    f = np.array([1e8, 2e8])
    top = 20 * np.log10(0.49)
    mask = Mask("m", (MaskLine("at most", f, np.array([top, top])),))
    found = ladder.fraction_within(f, {"S21": mask}, 20000, 2)
    assert_allclose(found, (110 - (100 / 0.49 - 100)) / 20, atol=0.01)


@settings(derandomize=True, max_examples=20, deadline=None)
@given(tolerances=st.lists(st.floats(0.0, 0.3), min_size=2, max_size=4), seed=st.integers(0, 1000))
def test_wider_tolerances_widen_the_mask(tolerances, seed: int) -> None:
    """Monotone: the same draws stretched farther enclose the narrower corridor of a single part."""
    f, widths = np.array([1e8, 2e8]), []
    for spread in sorted(tolerances):
        ladder = Ladder("one", (Branch("series", (Part("coil", 50e-9, spread),)),))
        lower, upper = ladder.expected(f, draws=50, seed=seed).lines
        widths.append(float((upper.level_db - lower.level_db).sum()))
    assert widths == sorted(widths)


@pytest.mark.parametrize(
    ("make", "said"),
    [
        (lambda: Part("valve", 1.0), "'valve' is no part; known are coil, capacitor, resistor"),
        (lambda: Part("coil", 0.0), "a coil of 0 cannot be had"),
        (lambda: Part("coil", 1e-9, 1.5), "a tolerance of 1.5 is out of range"),
        (lambda: Part("coil", 1e-9, q=50.0), "say at which frequency"),
        (lambda: low_pass(butterworth(3), 0.0), "a filter at 0 Hz cannot be built"),
        (lambda: low_pass(butterworth(3), 1e9, -50.0), "a filter at -50 ohm"),
        (lambda: band_pass(butterworth(3), 2e9, 1e9), "does not increase from above 0"),
    ],
)
def test_what_cannot_be_built_is_refused(make, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        make()


def test_a_resonance_is_no_division_by_nothing() -> None:
    """Lossless tanks exactly at their resonance: full stop, full pass."""
    trap = Ladder("trap", (Branch("shunt", (Part("coil", 1.0), Part("capacitor", 1.0))),))
    f = np.array([1 / (2 * np.pi)])
    assert np.abs(trap.response(f).s21[0]) < 1e-9
    wave = Ladder("tank", (Branch("series", (Part("coil", 1.0), Part("capacitor", 1.0)), "parallel"),))
    assert np.abs(wave.response(f).s21[0]) < 1e-9
    stub = Ladder("stub", (Stub("shunt", "open", Line(50.0, 0.25, 1e9)),))
    assert np.abs(stub.response(np.array([1e9])).s21[0]) < 1e-9
