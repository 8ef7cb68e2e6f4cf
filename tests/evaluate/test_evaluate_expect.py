"""Step ``expect``: what was measured less what was designed, against the corridor of the parts' tolerance."""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import skrf

from benchrun.evaluate.network import Network
from benchrun.evaluate.steps.expect import ExpectArithmetic
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps import Expect

F = np.linspace(10e6, 400e6, 79)
MEDIA = skrf.media.DefinedGammaZ0(skrf.Frequency.from_f(F, unit="hz"), z0_port=50, z0=50)
DESIGN = {"elements": [{"shunt": "20 pF"}, {"series": "80 nH"}, {"shunt": "20 pF"}], "tolerance": 0.05}


def filter_of(c1, coil, c2):
    """The circuit by scikit-rf, not by the design's own formulas."""
    return MEDIA.shunt_capacitor(c1) ** MEDIA.inductor(coil) ** MEDIA.shunt_capacitor(c2)


def expected(network, spread=None, **step):
    nominal = TwoPort.of(np.asarray(network.s))
    varied = None if spread is None else nominal.map(lambda p: p * (1.0 + spread * np.ones((1, len(F)))))
    state = SimpleNamespace(
        networks={"x": Network(F, nominal, varied, 1)}, trails={}, judged={}, procedure=None
    )
    model = Expect.model_validate({"from": "x", "over": "20 MHz to 390 MHz", "design": DESIGN, **step})
    ExpectArithmetic().apply(model, state, {})
    return state.judged["expectation"]


@pytest.mark.parametrize("trace", ["S11", "S21"])
def test_a_unit_as_drawn_has_no_difference(trace):
    for figure in expected(filter_of(20e-12, 80e-9, 20e-12), trace=trace):
        assert figure.value == pytest.approx(0.0, abs=1e-9)
        assert figure.conclusion == "pass"
        assert f"{trace} less its design, {figure.side}" == figure.name


@pytest.mark.parametrize(
    ("off", "conclusion"), [(1.04, "pass"), (0.96, "pass"), (1.15, "fail"), (0.85, "fail")]
)
def test_parts_within_tolerance_pass_and_others_do_not(off, conclusion):
    low, high = expected(filter_of(20e-12 * off, 80e-9 * off, 20e-12 * off))
    assert {low.conclusion, high.conclusion} == ({"pass"} if conclusion == "pass" else {"pass", "fail"})
    # All parts greater: the corner falls, and so does the level in the stop band.
    worst = low if off > 1 else high
    assert worst.conclusion == conclusion
    assert (worst.value < 0) == (off > 1)


def test_what_the_design_does_not_know_is_allowed_beside():
    bad = filter_of(20e-12, 80e-9, 20e-12) ** MEDIA.attenuator(-0.8)
    assert [f.conclusion for f in expected(bad)] == ["fail", "pass"]
    low, high = expected(bad, within="1 dB")
    assert (low.conclusion, high.conclusion) == ("pass", "pass")
    assert low.limit < -1.0
    assert high.limit > 1.0


def test_the_decision_rule_guards_with_the_uncertainty():
    near = filter_of(20e-12, 80e-9, 20e-12) ** MEDIA.attenuator(-0.95)
    rule = {"guard band": "1 U"}
    low, _ = expected(near, within="1 dB", spread=0.001, rule=rule)
    assert low.uncertainty == pytest.approx(0.0174, abs=2e-4)  # twice 0.1 %
    assert low.conclusion == "pass"
    low, _ = expected(near, within="1 dB", spread=0.02, rule=rule)
    assert low.conclusion == "fail"


def test_the_corridor_is_the_same_every_time():
    unit = filter_of(20.5e-12, 81e-9, 20e-12)
    assert expected(unit) == expected(unit)
