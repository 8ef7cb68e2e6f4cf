"""Values against limits: sides, guard bands, what cannot be resolved, what is missing; masks; slices.

Decision rules: ILAC-G8:09/2019, 4.2.1 to 4.2.3. Expected numbers are worked out by hand beside each case.
"""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest

from benchrun.evaluate.judgement import told
from benchrun.evaluate.network import Network
from benchrun.evaluate.steps.judge import JudgeArithmetic, _near
from benchrun.rf.figures import FIGURES
from benchrun.rf.figures.band import decibels
from benchrun.rf.masks import Mask, MaskLine
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps.judge import Judge
from benchrun.uncertainty.decision import Rule
from benchrun.uncertainty.residual import ResidualTerms
from sim_instruments.bench import load_bench

INF = math.inf
GUARD, NON_BINARY, SIMPLE = Rule("guard band", 1.0), Rule("non-binary", 1.0), Rule()


def verdict(side, value, rule, up, down, limit=10.0):
    found = told("x", value, "dB", limit, side, 1e6, rule, up, down)
    return found.conclusion, found.uncertainty


@pytest.mark.parametrize(
    ("side", "value", "rule", "expected"),
    [
        # U is 1 upwards and 2 downwards: an upper limit is guarded by what is above the value, and so on.
        ("at most", 9.0, GUARD, ("pass", 1.0)),
        ("at most", 9.1, GUARD, ("fail", 1.0)),
        ("at least", 12.0, GUARD, ("pass", 2.0)),
        ("at least", 11.9, GUARD, ("fail", 2.0)),
        ("at most", 10.0, SIMPLE, ("pass", 1.0)),
        ("at most", 9.5, NON_BINARY, ("conditional pass", 1.0)),
        # From outside the limit lies on the other side of the value.
        ("at most", 11.9, NON_BINARY, ("conditional fail", 2.0)),
        ("at most", 12.1, NON_BINARY, ("fail", 2.0)),
        ("at least", 9.1, NON_BINARY, ("conditional fail", 1.0)),
        ("at least", 8.9, NON_BINARY, ("fail", 1.0)),
        ("at most", 10.5, GUARD, ("fail", 2.0)),
        ("at most", 10.5, SIMPLE, ("fail", 2.0)),
    ],
)
def test_each_side_has_its_own_uncertainty(side, value, rule, expected):
    assert verdict(side, value, rule, 1.0, 2.0) == expected


@pytest.mark.parametrize("rule", [GUARD, NON_BINARY, SIMPLE], ids=lambda rule: rule.kind)
@pytest.mark.parametrize(
    ("side", "value", "up", "down", "expected"),
    [
        # Rejection whose magnitude may be nothing: no upper bound. "At least" is not touched by that.
        ("at least", 13.0, INF, 2.0, ("pass", 2.0)),
        # "At most", inside: it may be beyond all bounds.
        ("at most", 5.0, INF, 2.0, ("invalid", None)),
        # Outside by 1.5, and it may be 2 less: nothing is shown. Outside by 2.5: it is outside.
        ("at most", 11.5, INF, 2.0, ("invalid", None)),
        ("at most", 12.5, INF, 2.0, ("fail", None)),
        # The same the other way round: transmission has no lower bound.
        ("at most", 5.0, 2.0, INF, ("pass", 2.0)),
        ("at least", 15.0, 2.0, INF, ("invalid", None)),
        ("at least", 8.5, 2.0, INF, ("invalid", None)),
        ("at least", 7.5, 2.0, INF, ("fail", None)),
        # Neither way, or no number at all.
        ("at most", 50.0, INF, INF, ("invalid", None)),
        ("at least", -50.0, INF, INF, ("invalid", None)),
        ("at most", 5.0, math.nan, math.nan, ("invalid", None)),
    ],
)
def test_what_cannot_be_resolved_proves_nothing(side, value, up, down, expected, rule):
    assert verdict(side, value, rule, up, down) == expected


def test_without_uncertainty_only_simple_acceptance_concludes():
    assert verdict("at most", 9.0, SIMPLE, None, None) == ("pass", None)
    assert verdict("at most", 11.0, SIMPLE, None, None) == ("fail", None)
    for rule in (GUARD, NON_BINARY):
        for value in (0.0, 9.0, 11.0):
            assert verdict("at most", value, rule, None, None) == ("invalid", None)
    assert told("x", 1.0, "dB", 2.0, "at most", 1e6, GUARD, None, None).remark == "no uncertainty is declared"


F = np.linspace(100e6, 200e6, 11)


def judge(network, masks=None, **limit):
    """All judged figures of one limit."""
    step = Judge.model_validate({"from": "x", "rule": limit.pop("rule", "simple"), "limits": [limit]})
    state = SimpleNamespace(
        networks={"x": network}, procedure=SimpleNamespace(masks=masks or {}), judged={}, trails={}
    )
    JudgeArithmetic().apply(step, state, {})
    return state.judged["judgement"]


def two(s21_db, f_hz=F):
    s21 = 10 ** (np.asarray(s21_db) / 20) * np.ones(len(f_hz)) + 0j
    return TwoPort(0 * s21 + 0.1, s21, s21, 0 * s21 + 0.1)


def network(s21_db, terms=None):
    nominal = two(s21_db)
    if terms is None:
        return Network(F, nominal)
    draws = np.zeros((1, len(F)), complex)
    varied = terms.vary(nominal, TwoPort(draws, draws, draws, draws))
    return Network(F, nominal, varied, terms.steps)


def test_limits_on_both_sides_are_two_figures():
    low, high = judge(network(-3.0), figure="insertion loss", over="120 MHz to 180 MHz",
                      **{"at least": "2 dB", "at most": "2.5 dB"})  # fmt: skip
    assert (low.name, low.side, low.conclusion) == (
        "insertion loss, 120 MHz to 180 MHz, at least", "at least", "pass",
    )  # fmt: skip
    assert (high.side, high.conclusion) == ("at most", "fail")
    assert high.margin == pytest.approx(-0.5)


@pytest.mark.parametrize(
    ("bounds", "expected"),
    [({"at most": "150 MHz"}, "invalid"), ({"at least": "150 MHz"}, "invalid"),
     ({"at least": "120 MHz", "at most": "150 MHz"}, "fail")],
)  # fmt: skip
def test_a_corner_that_the_sweep_does_not_have(bounds, expected):
    """With limits on both sides within the sweep, no corner in it is outside for certain."""
    for found in judge(network(-1.0), figure="corner frequency", drop="3 dB", **bounds):
        assert (found.value, found.margin, found.uncertainty, found.at_hz) == (None, None, None, None)
        assert found.conclusion == expected
        assert found.remark.startswith("not found: ")


def test_uncertainty_of_a_level_by_hand():
    # Transmission tracking of 0.1 dB alone: half-width 1.0116 - 1, over root two on each axis; only the axis
    # along S21 moves its magnitude (to first order), so U = 2 * 0.011579 / root 2 of the magnitude, in dB.
    terms = ResidualTerms.from_mapping({"transmission tracking": "0.1 dB"})
    (found,) = judge(network(-3.0, terms), figure="insertion loss", at="150 MHz", rule={"guard band": "1 U"},
                     **{"at most": "4 dB"})  # fmt: skip
    relative = 2 * (10 ** (0.1 / 20) - 1) / math.sqrt(2)
    # Insertion loss grows as the magnitude shrinks.
    assert found.uncertainty == pytest.approx(-20 * math.log10(1 - relative), rel=5e-3)
    assert found.value == pytest.approx(3.0)


def line(side, *points, spacing="linear"):
    f, level = zip(*points, strict=True)
    return MaskLine(side, np.array(f), np.array(level), spacing)


def test_a_corner_of_a_mask_between_two_samples_counts():
    # The tip of the line at 155 MHz, between the samples at 150 and 160, is the only place that is too low.
    tip = line("at most", (100e6, 0.0), (155e6, -31.0), (200e6, 0.0))
    (found,) = judge(network(-30.0), {"m": Mask("m", (tip,))}, mask="m", trace="S21")
    assert (found.conclusion, found.at_hz) == ("fail", 155e6)
    assert found.margin == pytest.approx(-1.0)
    assert found.limit == pytest.approx(-31.0)


def test_each_line_of_a_mask_is_a_figure_of_its_own():
    upper = line("at most", (100e6, -20.0), (140e6, -20.0))
    lower = line("at least", (150e6, -40.0), (200e6, -25.0))
    found = judge(network(-30.0), {"m": Mask("m", (upper, lower))}, mask="m", trace="S21")
    assert [(f.name, f.side, f.conclusion) for f in found] == [
        ("mask m on S21, line 1", "at most", "pass"),
        ("mask m on S21, line 2", "at least", "fail"),
    ]
    assert found[1].at_hz == 200e6


def test_the_tightest_point_of_a_mask_is_that_after_its_guard_band():
    # 10 dB down at 100 MHz with 1 dB of room, 60 dB down at 200 MHz with 2 dB: but there the noise is felt.
    level = np.linspace(-10.0, -60.0, len(F))
    terms = ResidualTerms.from_mapping({"isolation": "60 dB"})
    mask = Mask("m", (line("at most", (100e6, -9.0), (200e6, -58.0)),))
    (guarded,) = judge(network(level, terms), {"m": mask}, mask="m", trace="S21", rule={"guard band": "1 U"})
    (simple,) = judge(network(level, terms), {"m": mask}, mask="m", trace="S21")
    assert (simple.at_hz, simple.conclusion) == (100e6, "pass")
    assert (guarded.at_hz, guarded.conclusion) == (200e6, "fail")
    assert guarded.uncertainty > guarded.margin > 0


def test_a_mask_below_what_can_be_resolved_is_invalid():
    terms = ResidualTerms.from_mapping({"isolation": "50 dB"})
    mask = Mask("m", (line("at least", (100e6, -70.0), (200e6, -70.0)),))
    (found,) = judge(network(-60.0, terms), {"m": mask}, mask="m", trace="S21", rule={"guard band": "1 U"})
    assert (found.conclusion, found.uncertainty) == ("invalid", None)
    assert "not resolvable" in found.remark


VALUES = {"RATIO": 3.0, "FREQUENCY": 4e6, "IMPEDANCE": 50.0, "LENGTH": 1.0, "NUMBER": 0.7}


def given(kind, band):
    """Parameters of any figure over a band, by their form."""
    found = {}
    for key, parameter in kind.parameters.items():
        if key == "over":
            found[key] = band
        elif parameter.default is not None:
            found[key] = parameter.default
        elif not parameter.optional:
            found[key] = band if parameter.form == "range" else VALUES[parameter.dimension.name]
    return found


LOCAL = sorted(name for name, kind in FIGURES.items() if kind.local and "over" in kind.parameters)
WIDE = np.geomspace(5e6, 1.2e9, 801)


@pytest.fixture(scope="module")
def filter_variations():
    world = load_bench("workshop", 1).world
    world.offer("HF-0001")
    nominal = TwoPort.of(world.truth(WIDE))
    draws = [np.random.default_rng(i).normal(size=(3, len(WIDE), 2)) @ [1, 1j] for i in range(4)]
    declared = {"directivity": "42 dB", "source match": "38 dB", "load match": "40 dB"}
    terms = ResidualTerms.from_mapping(
        {**declared, "transmission tracking": "0.04 dB", "noise floor": "100 dB"}
    )
    return terms.vary(nominal, TwoPort(*draws))


@pytest.mark.parametrize("name", LOCAL)
def test_a_slice_of_the_band_gives_what_the_whole_trace_gives(filter_variations, name):
    kind = FIGURES[name]
    tiny = 1e-21 if kind.dimension.unit == "s" else 1e-12
    bands = [(160e6, 175e6), (float(WIDE[400]), float(WIDE[420])), (161e6, 161.1e6), (20e6, 900e6),
             (float(WIDE[3]), float(WIDE[9])), (8e6, 1.19e9)]  # fmt: skip
    for band in bands:
        parameters = given(kind, band)
        low, high = kind.band(parameters)
        if low < WIDE[0] or high > WIDE[-1]:  # an aperture that reaches beyond the sweep
            continue
        near = _near(
            WIDE, SimpleNamespace(kind=kind, parameters=parameters, against=parameters.get("against"))
        )
        assert near.stop - near.start < len(WIDE) or band[1] > 1e9
        sliced = filter_variations.map(lambda plane, near=near: plane[..., near])
        for side in ("at most", "at least"):
            part = kind.measure(WIDE[near], sliced, side, **parameters)
            whole = kind.measure(WIDE, filter_variations, side, **parameters)
            np.testing.assert_allclose(part.value, whole.value, rtol=1e-12, atol=tiny)
            np.testing.assert_array_equal(part.at_hz, whole.at_hz)


def test_decibels_of_nothing_are_a_number():
    assert decibels(np.array([0j]))[0] == -400.0


@pytest.mark.parametrize(
    ("relative", "reference", "limit_db", "expected"),
    [
        # The trace falls straight from -10 dB to -30 dB; at 150 MHz it is -20 dB.
        ("peak", None, -15.0, -20.0),
        ("figure", {"figure": "insertion loss", "at": "150 MHz"}, -5.0, -10.0),
    ],
)
def test_a_relative_line_counts_from_what_was_measured(relative, reference, limit_db, expected):
    line_ = MaskLine("at least", np.array([100e6, 200e6]), np.full(2, limit_db), relative_to=relative)
    more = {"reference": reference} if reference else {}
    falls = network(np.linspace(-10.0, -30.0, 11))
    (found,) = judge(falls, {"m": Mask("m", (line_,))}, mask="m", trace="S21", **more)
    assert found.value == pytest.approx(expected, abs=0.2)
    assert found.margin == pytest.approx(found.value - limit_db)
    assert found.conclusion == "fail"
    assert f"relative to {'the peak' if relative == 'peak' else 'insertion loss, at 150 MHz'}" in found.name


def test_what_trace_and_reference_have_in_common_drops_out_of_the_uncertainty():
    terms = ResidualTerms.from_mapping({"transmission tracking": "0.5 dB"})
    near = MaskLine("at most", np.array([100e6, 101e6]), np.full(2, 3.0), relative_to="figure")
    absolute = MaskLine("at most", np.array([100e6, 101e6]), np.full(2, 3.0))
    from_here = {"reference": {"figure": "insertion loss", "at": "100 MHz"}}
    masks = {"m": Mask("m", (near,)), "a": Mask("a", (absolute,))}
    (one,) = judge(network(-30.0, terms), masks, mask="m", trace="S21", **from_here)
    (two,) = judge(network(-30.0, terms), masks, mask="a", trace="S21")
    assert two.uncertainty > 0.5
    assert one.uncertainty < 0.01 * two.uncertainty


def test_an_impedance_figure_is_told_in_the_impedance_of_its_result():
    same = network(-30.0)
    other = Network(same.f_hz, same.nominal, z0_ohm=75.0)
    limit = {"figure": "resistance", "port": 1, "at": "150 MHz", "at least": "1 ohm"}
    (in_50,), (in_75,), (given,) = (
        judge(same, **limit), judge(other, **limit), judge(other, **limit, reference="50 ohm")
    )  # fmt: skip
    assert in_75.value == pytest.approx(1.5 * in_50.value)
    assert given.value == in_50.value
