"""Decision rules: ILAC-G8:09/2019 4.2.1 to 4.2.3, risks after JCGM 106:2012 (clauses from memory)."""

from __future__ import annotations

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchrun.uncertainty.decision import COVERAGE_FACTOR, Conclusion, Rule, conclude, worst

C = Conclusion
SIMPLE = Rule()
GUARD = Rule("guard band", 1.0)
NON_BINARY = Rule("non-binary", 1.0)
# Limit 10, U 0.5, so that every sum below is exact in binary.
LIMIT, U = 10.0, 0.5


def mirrored(value: float, limit: float, expanded: float | None, rule: Rule):
    """A lower limit is the mirror image of an upper one; both must say the same."""
    upper = conclude(value, limit, "at most", expanded, rule)
    lower = conclude(-value, -limit, "at least", expanded, rule)
    assert upper == lower
    return upper


@pytest.mark.parametrize(("value", "expected"), [(9.0, C.PASS), (10.0, C.PASS), (10.0625, C.FAIL)])
@pytest.mark.parametrize("expanded", [None, 0.0, 0.5, 50.0])
def test_simple_acceptance(value: float, expected: Conclusion, expanded: float | None) -> None:
    """4.2.1: w = 0, the uncertainty moves nothing; a value at the limit conforms (our choice)."""
    found = mirrored(value, LIMIT, expanded, SIMPLE)
    assert found.conclusion is expected
    assert found.guard_band == 0.0
    assert found.margin == LIMIT - value


@pytest.mark.parametrize(
    ("value", "expected"), [(9.0, C.PASS), (9.5, C.PASS), (9.5625, C.FAIL), (10.0, C.FAIL), (11.0, C.FAIL)]
)
def test_guarded_acceptance(value: float, expected: Conclusion) -> None:
    """4.2.2: the acceptance limit lies w = U inside; a value exactly there is accepted."""
    found = mirrored(value, LIMIT, U, GUARD)
    assert found.conclusion is expected
    assert found.guard_band == U


@pytest.mark.parametrize(
    ("value", "expected"), [(10.0, C.PASS), (10.5, C.PASS), (10.5625, C.FAIL), (9.0, C.PASS)]
)
def test_guarded_rejection(value: float, expected: Conclusion) -> None:
    """A negative factor protects the producer: rejected only beyond TL + U (JCGM 106, 8.3.3)."""
    assert mirrored(value, LIMIT, U, Rule("guard band", -1.0)).conclusion is expected


@pytest.mark.parametrize(
    ("value", "expected"),
    [
        (9.0, C.PASS),
        (9.5, C.PASS),  # y <= TL - w
        (9.5625, C.CONDITIONAL_PASS),
        (10.0, C.CONDITIONAL_PASS),  # y <= TL
        (10.0625, C.CONDITIONAL_FAIL),
        (10.5, C.CONDITIONAL_FAIL),  # y <= TL + w
        (10.5625, C.FAIL),
        (12.0, C.FAIL),
    ],
)
def test_the_four_conclusions(value: float, expected: Conclusion) -> None:
    """4.2.3, upper limit, each boundary belonging to the better side."""
    assert mirrored(value, LIMIT, U, NON_BINARY).conclusion is expected


@pytest.mark.parametrize("factor", [0.5, 0.83, 1.0, 1.5, 3.0])
def test_the_factor_scales_the_guard_band(factor: float) -> None:
    found = mirrored(9.0, LIMIT, U, Rule("guard band", factor))
    assert found.guard_band == factor * U


def test_conformance_probability_one_sided() -> None:
    """JCGM 106, clause 7: TU = 10, y = 9.9, u = 0.05 gives pC = 0.977250; accepted, so risk = 1 - pC."""
    assert mirrored(9.9, 10.0, 2 * 0.05, SIMPLE).risk == pytest.approx(1 - 0.977250, abs=5e-7)


def test_conformance_probability_two_sided() -> None:
    """Two limits are judged one by one: pC = 1 - both risks. 9.8..10.2, y = 10.05, u = 0.1: 0.926983."""
    upper = conclude(10.05, 10.2, "at most", 0.2, SIMPLE).risk
    lower = conclude(10.05, 9.8, "at least", 0.2, SIMPLE).risk
    assert upper is not None
    assert lower is not None
    assert 1 - upper - lower == pytest.approx(0.926983, abs=5e-7)


@pytest.mark.parametrize(
    ("factor", "percent", "digits"),
    [(0.83, 4.846, 5e-4), (1.0, 2.275, 1e-3), (1.5, 0.1350, 5e-5), (3.0, 1e-7, 2e-9)],
)
def test_the_false_accept_probability_at_the_acceptance_limit(
    factor: float, percent: float, digits: float
) -> None:
    """PFA = 1 - Phi(k r) with k = 2, at y = AL exactly (computed from the formula)."""
    assert COVERAGE_FACTOR == 2.0
    expanded = 0.5
    found = conclude(
        10.0 - factor * expanded, 10.0, "at most", expanded, Rule("guard band", factor * (1 - 1e-12))
    )
    assert found.conclusion is C.PASS
    assert found.risk is not None
    assert found.risk * 100 == pytest.approx(percent, abs=digits)


def test_a_six_sigma_risk_keeps_its_digits() -> None:
    """1 - Phi(6) = 9.865876e-10 (standard normal tables), not the rounding of one minus almost one."""
    assert conclude(8.5, 10.0, "at most", 0.5, SIMPLE).risk == pytest.approx(9.865876450377e-10, rel=1e-10)


def test_simple_acceptance_risks_up_to_a_half() -> None:
    """At the limit itself accepting or rejecting is a coin."""
    assert mirrored(10.0, 10.0, 0.5, SIMPLE).risk == 0.5


def test_a_rejected_units_risk_is_that_it_conforms() -> None:
    """Producer's risk: y beyond TL by u gives 1 - Phi(1) = 0.158655."""
    assert mirrored(10.25, 10.0, 0.5, SIMPLE).risk == pytest.approx(0.1586552539, rel=1e-9)
    assert mirrored(10.25, 10.0, 0.5, NON_BINARY).risk == pytest.approx(0.1586552539, rel=1e-9)
    # Guarded rejection of a unit inside its limit: most likely it conforms.
    assert mirrored(9.75, 10.0, 0.5, GUARD).risk == pytest.approx(1 - 0.1586552539, rel=1e-9)


@pytest.mark.parametrize(
    ("value", "rule", "risk"),
    [(9.9, SIMPLE, 0.0), (10.1, SIMPLE, 0.0), (10.0, SIMPLE, 0.0)],
)
def test_without_doubt_there_is_no_risk(value: float, rule: Rule, risk: float) -> None:
    """U = 0: the value is known, so accepting or rejecting it is right."""
    assert mirrored(value, 10.0, 0.0, rule).risk == risk


def test_without_an_uncertainty_no_risk_is_stated() -> None:
    assert mirrored(9.9, 10.0, None, SIMPLE).risk is None


@pytest.mark.parametrize("rule", [GUARD, NON_BINARY, Rule("guard band", -1.0)])
def test_a_guard_band_without_an_uncertainty_concludes_nothing(rule: Rule) -> None:
    found = conclude(9.0, 10.0, "at most", None, rule)
    assert found.conclusion is C.INVALID
    assert math.isnan(found.guard_band)
    assert found.risk is None


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
@pytest.mark.parametrize("rule", [SIMPLE, GUARD, NON_BINARY])
def test_a_value_that_is_no_number_concludes_nothing(value: float, rule: Rule) -> None:
    """Neither a pass nor a fail: the unit was not measured."""
    for side in ("at most", "at least"):
        assert conclude(value, 10.0, side, 0.5, rule).conclusion is C.INVALID


@pytest.mark.parametrize("expanded", [math.nan, math.inf])
@pytest.mark.parametrize("rule", [SIMPLE, GUARD, NON_BINARY])
def test_an_uncertainty_that_could_not_be_worked_out_concludes_nothing(expanded: float, rule: Rule) -> None:
    assert conclude(9.0, 10.0, "at most", expanded, rule).conclusion is C.INVALID


@settings(deadline=None, max_examples=100)
@given(
    st.floats(-100, 100),
    st.floats(-100, 100),
    st.floats(0, 10),
    st.sampled_from([SIMPLE, GUARD, NON_BINARY, Rule("guard band", 0.83), Rule("non-binary", 1.5)]),
)
def test_better_values_never_fare_worse(first: float, second: float, expanded: float, rule: Rule) -> None:
    """Monotone: less of what is limited is never judged more severely."""
    low, high = sorted((first, second))
    better = mirrored(low, 10.0, expanded, rule)
    poorer = mirrored(high, 10.0, expanded, rule)
    assert better.conclusion.severity <= poorer.conclusion.severity
    assert 0.0 <= (better.risk or 0.0) <= 1.0


@settings(deadline=None, max_examples=100)
@given(st.floats(-100, 100), st.floats(0, 10))
def test_binary_and_non_binary_accept_the_same_units(value: float, expanded: float) -> None:
    """A plain pass of 4.2.3 is exactly a pass of 4.2.2; conditional pass or better one of 4.2.1."""
    four = conclude(value, 10.0, "at most", expanded, NON_BINARY).conclusion
    guarded = conclude(value, 10.0, "at most", expanded, GUARD).conclusion
    simple = conclude(value, 10.0, "at most", expanded, SIMPLE).conclusion
    assert (four is C.PASS) == (guarded is C.PASS)
    assert (four in (C.PASS, C.CONDITIONAL_PASS)) == (simple is C.PASS)


@pytest.mark.parametrize(
    ("several", "expected"),
    [
        ([C.PASS, C.PASS], C.PASS),
        ([C.PASS, C.CONDITIONAL_PASS], C.CONDITIONAL_PASS),
        ([C.CONDITIONAL_FAIL, C.CONDITIONAL_PASS], C.CONDITIONAL_FAIL),
        ([C.CONDITIONAL_FAIL, C.FAIL, C.PASS], C.FAIL),
        ([C.FAIL, C.INVALID], C.INVALID),
        ([C.STOPPED, C.INVALID], C.STOPPED),
        ([], C.INVALID),
    ],
)
def test_the_worst_decides(several: list[Conclusion], expected: Conclusion) -> None:
    """Invalid outweighs fail: with a bad measurement nothing is known about the unit."""
    assert worst(several) is expected
    assert worst(iter(reversed(several))) is expected


def test_exit_codes() -> None:
    """0 pass or conditional pass, 1 fail or conditional fail, 3 invalid, 4 stopped."""
    assert {c.value: c.exit_code for c in C} == {
        "pass": 0, "conditional pass": 0, "conditional fail": 1, "fail": 1, "invalid": 3, "stopped": 4,
    }  # fmt: skip


@pytest.mark.parametrize(
    ("rule", "text"),
    [
        (SIMPLE, "simple acceptance (ILAC-G8:09/2019, 4.2.1)"),
        (GUARD, "guard band, w = 1 U, k = 2 (ILAC-G8:09/2019, 4.2.2)"),
        (Rule("non-binary", 0.83), "non-binary, w = 0.83 U, k = 2 (ILAC-G8:09/2019, 4.2.3)"),
    ],
)
def test_a_rule_names_its_clause_and_its_k(rule: Rule, text: str) -> None:
    """A report must say which rule was used (ISO/IEC 17025:2017, 7.8.6.2, wording from memory)."""
    assert rule.text == text
