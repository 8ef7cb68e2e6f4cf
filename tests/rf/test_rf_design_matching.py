"""Matching networks: published examples, every choice matches, bandwidth and yield in closed form."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from benchrun.rf.design import (
    SERIES,
    Branch,
    Ladder,
    Part,
    input_vswr,
    l_sections,
    load_over,
    matched_band,
    matched_yield,
    nearest,
    neighbours,
    node_q,
    pi_sections,
    stubs,
    tee_sections,
)

F0 = 169.4e6


def vswr(ladder: Ladder, load: complex, at_hz: float = F0) -> float:
    return float(input_vswr(ladder, np.array([at_hz]), np.array([load]))[0])


def found(load: complex, at_hz: float, source: float) -> dict[str, list[float]]:
    return {x.name: [p.value for p in x.parts] for x in l_sections(load, at_hz, source)}


def test_an_l_section_of_the_text_book() -> None:
    """200 - j100 to 100 ohm at 500 MHz: .92 pF and 38.8 nH, or 46.1 nH and 2.61 pF.

    Pozar, ex. 5.1, from memory; it rounds x to 1.22, hence 0.6 %.
    """
    sections = found(200 - 100j, 500e6, 100.0)
    assert set(sections) == {"series coil, shunt capacitor", "series capacitor, shunt coil"}
    assert_allclose(sections["series coil, shunt capacitor"], [38.9848e-9, 0.922774e-12], rtol=2e-6)
    assert_allclose(sections["series coil, shunt capacitor"], [38.8e-9, 0.92e-12], rtol=6e-3)
    assert_allclose(sections["series capacitor, shunt coil"], [2.59899e-12, 46.1387e-9], rtol=2e-6)
    assert_allclose(sections["series capacitor, shunt coil"], [2.61e-12, 46.1e-9], rtol=6e-3)


def test_an_l_section_up_from_a_low_resistance() -> None:
    """25 to 50 ohm at 1 GHz: 3.97887 nH with 3.18310 pF, or 6.36620 pF with 7.95775 nH (by the formulas)."""
    sections = found(25 + 0j, 1e9, 50.0)
    assert_allclose(sections["shunt capacitor, series coil"], [3.18310e-12, 3.97887e-9], rtol=2e-6)
    assert_allclose(sections["shunt coil, series capacitor"], [7.95775e-9, 6.36620e-12], rtol=2e-6)
    assert len(sections) == 2


LOADS = st.builds(complex, st.floats(0.5, 4000.0), st.floats(-2000.0, 2000.0))


@settings(derandomize=True, max_examples=60, deadline=None)
@given(load=LOADS, source=st.floats(5.0, 300.0), q=st.floats(0.05, 8.0))
def test_every_choice_matches(load: complex, source: float, q: float) -> None:
    """VSWR 1 by the chain of the parts themselves, which knows nothing of the formulas."""
    assume(abs(load - source) > 0.01 * source)
    choices = [*l_sections(load, F0, source), *stubs(load, F0, source)]
    parallel = abs(load) ** 2 / load.real
    for sections, other in ((pi_sections, parallel), (tee_sections, load.real)):
        least = np.sqrt(max(source, other) / min(source, other) - 1)
        choices += sections(load, F0, float(least + q), source)
    assert 1 + 8 + 1 + 1 <= len(choices) <= 4 + 8 + 4 + 4
    for choice in choices:
        assert vswr(choice, load) < 1 + 1e-6
        assert choice.source_ohm == source


@settings(derandomize=True, max_examples=30, deadline=None)
@given(load=LOADS)
def test_there_are_as_many_l_sections_as_the_load_allows(load: complex) -> None:
    """Two with the shunt at the load where its conductance is below the source's, two where R is below."""
    conductance = load.real / abs(load) ** 2
    assume(abs(load.real - 50) > 1e-3 and abs(conductance * 50 - 1) > 1e-3)
    assert len(l_sections(load, F0)) == 2 * (conductance < 1 / 50) + 2 * (load.real < 50)


def test_a_matched_load_needs_nothing() -> None:
    assert [x.name for x in l_sections(50 + 0j, F0)] == ["a wire"]
    assert stubs(50 + 0j, F0) == ()


def test_a_reactive_load_of_the_right_resistance_needs_one_part() -> None:
    """50 + j100: a series capacitor of 100 ohm is one of the choices."""
    one = next(x for x in l_sections(50 + 100j, F0) if len(x.parts) == 1)
    assert one.name == "series capacitor"
    assert_allclose(one.parts[0].value, 1 / (2 * np.pi * F0 * 100), rtol=1e-9)


def test_single_stubs_of_the_text_book() -> None:
    """60 - j80 ohm, 50 ohm, shunt short stub: d = 0.110, l = 0.095, or d = 0.260, l = 0.405 wavelengths.

    Pozar, ex. 5.2, from memory; read from a chart, hence 0.002.
    """
    pairs = sorted(
        (x.elements[1].wavelengths, x.elements[0].line.wavelengths)
        for x in stubs(60 - 80j, 2e9)
        if x.name == "shunt stub, short"
    )
    assert_allclose(pairs, [(0.110, 0.095), (0.260, 0.405)], atol=2e-3)


def test_stub_lengths_are_below_half_a_wavelength() -> None:
    for load in (5 + 300j, 800 - 20j, 49 + 1j):
        for x in stubs(load, F0):
            stub, way = x.elements
            assert 0 <= stub.line.wavelengths <= 0.5
            assert 0 <= way.wavelengths <= 0.5


@pytest.mark.parametrize("high", [100.0, 450.0, 2000.0])
def test_the_q_of_an_l_section(high: float) -> None:
    """sqrt(R_high / R_low - 1) (any text)."""
    for x in l_sections(high + 0j, F0):
        assert_allclose(node_q(x, F0, high + 0j), np.sqrt(high / 50 - 1), rtol=1e-9)


@pytest.mark.parametrize("q", [3.5, 6.0])
def test_pi_and_tee_have_the_q_that_was_chosen(q: float) -> None:
    for sections in (pi_sections, tee_sections):
        for x in sections(200 + 0j, F0, q):
            assert_allclose(node_q(x, F0, 200 + 0j), q, rtol=1e-9)


@pytest.mark.parametrize("limit", [1.2, 1.5, 2.0, 3.0])
def test_the_band_of_a_single_tuned_circuit(limit: float) -> None:
    """f0 / Q (s - 1) / sqrt(s) for a series circuit with R = Z0 (any antenna text, from |G| of 1 + jx)."""
    q = 12.0
    henry = q * 50 / (2 * np.pi * F0)
    tuned = Ladder(
        "tuned",
        (Branch("series", (Part("coil", henry), Part("capacitor", 1 / ((2 * np.pi * F0) ** 2 * henry)))),),
    )
    f = np.linspace(100e6, 300e6, 8001)
    low, high = matched_band(tuned, f, np.full(len(f), 50 + 0j), F0, limit)
    assert_allclose(high - low, F0 / q * (limit - 1) / np.sqrt(limit), rtol=1e-5)
    assert_allclose(np.sqrt(low * high), F0, rtol=1e-6)


def test_a_band_that_does_not_end_is_nan() -> None:
    f = np.linspace(160e6, 180e6, 201)
    wire, load = Ladder("wire", ()), np.full(201, 50 + 0j)
    assert np.all(np.isnan(matched_band(wire, f, load, F0)))
    up = np.where(f > 175e6, 500, 50) + 0j
    low, high = matched_band(wire, f, up, F0)
    assert np.isnan(low)
    assert 174.9e6 < high < 175.2e6
    assert np.all(np.isnan(matched_band(wire, f, load * 10, F0)))  # not matched at all
    with pytest.raises(ValueError, match="lies outside the frequencies given"):
        matched_band(wire, f, load, 1e9)
    with pytest.raises(ValueError, match="it must be above 1"):
        matched_band(wire, f, load, F0, 1.0)


def test_a_load_goes_on_as_a_coil_or_a_capacitor() -> None:
    f = np.array([F0 / 2, F0, 2 * F0])
    assert_allclose(load_over(f, 20 + 30j, F0), [20 + 15j, 20 + 30j, 20 + 60j])
    assert_allclose(load_over(f, 20 - 30j, F0), [20 - 60j, 20 - 30j, 20 - 15j])


def test_the_yield_of_a_match_in_closed_form() -> None:
    """One series resistor of 50 ohm +-20 % before a short: VSWR <= 1.1 keeps 45.45 to 55 ohm of 40 to 60."""
    one = Ladder("one", (Branch("series", (Part("resistor", 50.0, 0.2),)),))
    short = np.full(2, 1e-9 + 0j)
    share = matched_yield(one, np.array([1e8, 2e8]), short, 1.1, 20000, 3)
    assert_allclose(share, (55 - 50 / 1.1) / 20, atol=0.01)
    assert share == matched_yield(one, np.array([1e8, 2e8]), short, 1.1, 20000, 3)


def test_tighter_parts_yield_more() -> None:
    section = l_sections(12 - 35j, F0)[0]
    f = np.array([168e6, F0, 171e6])
    load = load_over(f, 12 - 35j, F0)
    shares = [
        matched_yield(section.with_parts(lambda p, t=t: Part(p.kind, p.value, t)), f, load, 1.5, 500, 1)
        for t in (0.2, 0.05, 0.01, 0.0)
    ]
    assert shares == sorted(shares)
    assert shares[-1] == 1.0


@pytest.mark.parametrize(
    ("make", "said"),
    [
        (lambda: l_sections(0 + 50j, F0), r"a load of 0 \+50j ohm takes no power"),
        (lambda: l_sections(-5 + 0j, F0), "needs a resistance above 0"),
        (lambda: stubs(20 + 0j, 0.0), "both must be above 0"),
        (lambda: pi_sections(450 + 0j, F0, 2.0), "a Q of 2 cannot be had .* allowed are 2.828 and more"),
        (lambda: tee_sections(450 + 0j, F0, -1.0), "a Q of -1 cannot be had"),
    ],
)
def test_what_cannot_be_matched_is_refused(make, said: str) -> None:
    with pytest.raises(ValueError, match=said):
        make()


def test_the_series_of_preferred_values() -> None:
    """IEC 60063: counts, some members, the rule for three digits, its one exception (from memory)."""
    assert {name: len(v) for name, v in SERIES.items()} == {f"E{n}": n for n in (3, 6, 12, 24, 48, 96, 192)}
    assert SERIES["E3"] == (1.0, 2.2, 4.7)
    assert SERIES["E6"] == (1.0, 1.5, 2.2, 3.3, 4.7, 6.8)
    assert SERIES["E12"] == (1.0, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2)
    assert 9.2 in SERIES["E192"]
    assert 9.19 not in SERIES["E192"]
    assert set(SERIES["E48"]) <= set(SERIES["E96"]) <= set(SERIES["E192"])
    assert SERIES["E96"][1:4] == (1.02, 1.05, 1.07)


@settings(derandomize=True, max_examples=60, deadline=None)
@given(value=st.floats(1e-15, 1e9), series=st.sampled_from(sorted(SERIES)))
def test_the_nearest_value_is_one_of_the_neighbours(value: float, series: str) -> None:
    below, above = neighbours(value, series)
    assert below <= value * (1 + 1e-8)
    assert above >= value * (1 - 1e-8)
    chosen = nearest(value, series)
    assert chosen in (below, above)
    assert max(chosen / value, value / chosen) <= min(value / below, above / value) * (1 + 1e-8)
    assert nearest(chosen, series) == chosen


@pytest.mark.parametrize("value", [0.0, -1.0, np.nan, np.inf])
def test_no_part_has_such_a_value(value: float) -> None:
    with pytest.raises(ValueError, match="it must be positive"):
        nearest(value, "E12")
    with pytest.raises(ValueError, match="'E13' is no series"):
        nearest(1.0, "E13")
