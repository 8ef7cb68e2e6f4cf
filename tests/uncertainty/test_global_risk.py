"""Risks over a population, capability, and the look ahead: numbers of JCGM 106 and ILAC-G8."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchrun.uncertainty.decision import Conclusion, Rule, conclude
from benchrun.uncertainty.global_risk import Population, capability, global_risk, posterior
from benchrun.uncertainty.outlook import look_ahead

RESISTORS = Population(1500.0, 0.12)
RATIOS = [
    (1, 1.8012, 12.9572), (2, 1.3373, 4.1775), (3, 1.0485, 2.2936), (4, 0.8583, 1.5537), (10, 0.4060, 0.5162),
]  # fmt: skip


@pytest.mark.parametrize(
    ("guard_band", "consumer", "producer"),
    # JCGM 106:2012, 9.5 (formulas from memory), integrals computed with scipy beforehand, in per cent.
    [
        (0.0, 1.8942, 3.7208),
        (0.02, 0.98783, 6.90265),
        (0.04, 0.4334, 11.4657),
        (0.08, 0.0469, 24.767),
        (0.12, 0.0022, 43.153),
        (-0.04, 4.4898, 0.7097),
    ],
)
def test_jcgm_106_binary_rule_for_a_normal_population(guard_band, consumer, producer):
    found = global_risk(RESISTORS, 0.04, 1499.8, 1500.2, guard_band)
    assert 100 * found.consumer == pytest.approx(consumer, abs=6e-5)
    assert 100 * found.producer == pytest.approx(producer, abs=6e-4)


@pytest.mark.parametrize(("ratio", "consumer", "producer"), RATIOS)
def test_risks_fall_with_the_test_uncertainty_ratio(ratio, consumer, producer):
    # Tolerance +-1, 95 % of the population within, u = 1 / (2 TUR): computed with scipy beforehand.
    found = global_risk(Population(0.0, 1 / 1.959964), 1 / (2 * ratio), -1.0, 1.0)
    assert (100 * found.consumer, 100 * found.producer) == pytest.approx((consumer, producer), abs=6e-5)


def test_the_integral_agrees_with_counting():
    generator = np.random.default_rng(8)
    true = 3.0 + 0.5 * generator.standard_normal(400_000)
    read = true + 0.2 * generator.standard_normal(400_000)
    found = global_risk(Population(3.0, 0.5), 0.2, high=3.6, guard_band=0.1)
    assert found.consumer == pytest.approx(np.mean((true > 3.6) & (read <= 3.5)), abs=6e-4)
    assert found.producer == pytest.approx(np.mean((true <= 3.6) & (read > 3.5)), abs=2e-3)
    assert found.rejected == pytest.approx(np.mean(read > 3.5), abs=3e-3)


def test_a_very_good_measurement_makes_no_mistakes():
    found = global_risk(RESISTORS, 1e-6, 1499.8, 1500.2)
    assert found.consumer < 1e-5
    assert found.producer < 1e-5
    assert found.rejected == pytest.approx(math.erfc(0.2 / 0.12 / math.sqrt(2)), rel=1e-3)


def test_guard_bands_that_meet_accept_nothing():
    found = global_risk(RESISTORS, 0.04, 1499.8, 1500.2, 0.25)
    assert (found.consumer, found.rejected) == (0.0, 1.0)


def test_spreads_that_are_none_are_refused():
    with pytest.raises(ValueError, match="spreads must be above zero"):
        global_risk(Population(0.0, 0.0), 1.0, -1.0, 1.0)


def test_posterior_of_a_normal_population():
    # JCGM 106, normal prior and normal measurement: weights are inverse variances.
    found = posterior(Population(10.0, 3.0), 14.0, 1.0)
    assert found.mean == pytest.approx((10 / 9 + 14) / (1 / 9 + 1))
    assert found.deviation == pytest.approx((1 / 9 + 1) ** -0.5)


def test_capability_index():
    assert capability(-1.0, 1.0, 0.25) == 4.0
    assert capability(-1.0, 1.0, 0.0) == math.inf


@pytest.mark.parametrize(
    ("factor", "stated"),
    # ILAC-G8:09/2019, table 1 (as a training text repeats it): guard band and greatest specific risk. At
    # k = 2 the risk at the acceptance limit is 1 - Phi(2 r).
    [(3.0, 1e-6), (1.5, 0.0016), (1.0, 0.025), (0.83, 0.05), (0.0, 0.5)],
)
def test_ilac_g8_specific_risks_at_the_acceptance_limit(factor, stated):
    rule = Rule("guard band", factor) if factor else Rule()
    verdict = conclude(10.0 - factor * 0.25 - 1e-12, 10.0, "at most", 0.25, rule)
    assert verdict.conclusion is Conclusion.PASS
    assert verdict.risk == pytest.approx(0.5 * math.erfc(2 * factor / math.sqrt(2)))
    assert verdict.risk <= stated


def test_a_hopeless_limit_is_told():
    found = look_ahead(Rule("guard band", 1.0), 0.3, 9.75, 10.25, "dB")
    assert found.warning.startswith("the guard bands of 0.3 dB at both limits meet: no unit can ever pass")
    assert found.capability == pytest.approx(0.5 / 0.6)


def test_what_a_guard_band_costs_is_told():
    found = look_ahead(Rule("guard band", 1.0), 0.08, 1499.8, 1500.2, "ohm", RESISTORS)
    alone, simple = (global_risk(RESISTORS, 0.04, 1499.8, 1500.2, w).producer for w in (0.08, 0.0))
    conforming = 1 - math.erfc(0.2 / 0.12 / math.sqrt(2))
    assert found.yield_cost == pytest.approx((alone - simple) / conforming)
    assert "rejects 23 % of the good units" in found.warning
    assert "take 40 % of the tolerance" in look_ahead(Rule("guard band", 1.0), 0.2, 9.0, 10.0).warning


@pytest.mark.parametrize("rule", [Rule(), Rule("guard band", -1.0), Rule("guard band", 1.0)])
def test_an_easy_limit_needs_no_word(rule):
    assert look_ahead(rule, 0.01, at_most=0.6, unit="dB").warning == ""


@pytest.mark.parametrize(("expanded", "limits"), [(0.1, {}), (0.0, {"at_most": 1.0})])
def test_nothing_to_weigh_is_refused(expanded, limits):
    with pytest.raises(ValueError, match=r"no limit to weigh|above zero"):
        look_ahead(Rule(), expanded, **limits)
