"""What a step ``expect`` may say: ladders part by part or from a prototype, and where they hold."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.errors import InputError
from benchrun.sequence.checks import check_sequence
from benchrun.sequence.fixtures import check_fixtures
from benchrun.sequence.steps import Expect
from benchrun.sequence.steps.design import Design

ELEMENTS = "elements: [{shunt: 20 pF}, {series: [80 nH, 5 pF], joined: parallel}, {shunt: 20 pF}]"
SHAPE = "prototype: {shape: chebyshev, order: 5, ripple: 0.1 dB, corner: 200 MHz}"


def step_of(good, design, more="over: 20 MHz to 300 MHz"):
    return f"{good}  - expect: {{from: filter, {more}, design: {{{design}, tolerance: 0.02}}}}\n"


def design_of(load_text, good, design):
    return next(s for s in load_text(step_of(good, design)).model.steps if isinstance(s, Expect)).design


def test_a_ladder_part_by_part(load_text, good):
    design = design_of(load_text, good, f"{ELEMENTS}, coil q: 100, q at: 100 MHz")
    parts = [(p.kind, p.value, p.tolerance, p.q) for p in design.ladder.parts]
    assert parts == [
        ("capacitor", 20e-12, 0.02, np.inf),
        ("coil", 80e-9, 0.02, 100.0),
        ("capacitor", 5e-12, 0.02, np.inf),
        ("capacitor", 20e-12, 0.02, np.inf),
    ]


@pytest.mark.parametrize(
    ("shape", "at_hz", "db"),
    [
        # The definitions of the shapes: half the power at a corner, or the ripple.
        ("{shape: butterworth, order: 3, corner: 200 MHz}", 200e6, -3.0103),
        ("{shape: butterworth, order: 3, filter: high-pass, corner: 200 MHz}", 200e6, -3.0103),
        ("{shape: chebyshev, order: 5, ripple: 0.1 dB, corner: 200 MHz}", 200e6, -0.1),
        ("{shape: bessel, order: 4, corner: 200 MHz}", 200e6, -3.0103),
        ("{shape: butterworth, order: 2, filter: band-pass, band: 100 MHz to 150 MHz}", 150e6, -3.0103),
        ("{shape: butterworth, order: 2, filter: band-stop, band: 100 MHz to 150 MHz}", 150e6, -3.0103),
    ],
)
def test_a_ladder_from_a_prototype(load_text, good, shape, at_hz, db):
    ladder = design_of(load_text, good, f"prototype: {shape}").ladder
    assert 20 * np.log10(abs(ladder.response(np.array([at_hz])).s21[0])) == pytest.approx(db, abs=1e-3)


def test_parts_of_preferred_values_on_request(load_text, good):
    plain = design_of(load_text, good, SHAPE).ladder.parts
    bought = design_of(load_text, good, f"{SHAPE}, capacitors: E12").ladder.parts
    assert [p.value for p in bought if p.kind == "coil"] == [p.value for p in plain if p.kind == "coil"]
    assert [p.value for p in bought if p.kind == "capacitor"] == pytest.approx([18e-12, 33e-12, 18e-12])


@pytest.mark.parametrize(
    ("design", "expected"),
    [
        ("coils: E24", "has `elements` and a `prototype` both or not at all"),
        (f"{ELEMENTS}, {SHAPE}", "has `elements` and a `prototype` both or not at all"),
        ("elements: [{shunt: 20}]", "20 is no part; write a coil as in 43 nH"),
        ("elements: [{shunt: -20 pF}]", "a capacitor has a value above 0"),
        ("elements: [{shunt: 20 pF, series: 80 nH}]", "stands in `series` or in `shunt`"),
        ("elements: []", "elements"),
        (f"{ELEMENTS}, coil q: 100", "`q at` belongs to"),
        ("prototype: {shape: chebyshev, order: 5, corner: 200 MHz}", "a chebyshev needs one"),
        ("prototype: {shape: butterworth, order: 5}", "a low-pass needs `corner`"),
        (
            "prototype: {shape: butterworth, order: 5, filter: band-pass, corner: 1 MHz}",
            "a band-pass needs `band`",
        ),
        ("prototype: {shape: bessel, order: 40, corner: 1 MHz}", "order"),
        ("prototype: {shape: butterwort, order: 5, corner: 1 MHz}", "Did you mean 'butterworth'?"),
    ],
)
def test_a_design_that_cannot_be_built_is_refused_at_its_place(load_text, good, design, expected):
    with pytest.raises(InputError) as caught:
        load_text(step_of(good, design))
    assert expected in str(caught.value)
    assert "f.yaml:19:" in str(caught.value)


@pytest.mark.parametrize(
    ("old", "new", "more", "expected"),
    [
        ("", "", "over: 20 MHz to 300 MHz", ""),
        ("", "", "over: 20 MHz to 3 GHz", "is expected over 20 MHz to 3 GHz, but the sweep"),
        ("", "", "over: 20 MHz to 20.1 MHz", "fewer than two points"),
        ("unit:\n", "unit:\n  ports: 1\n", "over: 20 MHz to 300 MHz", "a ladder has two ports, but"),
        ("", "", "over: 20 MHz to 300 MHz, trace: S31", None),
    ],
)  # fmt: skip
def test_where_a_design_can_be_expected(load_text, good, old, new, more, expected):
    text = step_of(good.replace(old, new) if old else good, ELEMENTS, more)
    if expected is None:
        with pytest.raises(InputError, match="trace: 'S31' is not"):
            load_text(text)
        return
    found = [str(p) for p in check_sequence(load_text(text)) if "ladder" in str(p) or "design" in str(p)
             or "two points" in str(p)]  # fmt: skip
    assert [expected in problem for problem in found] == ([True] if expected else [])


def test_a_design_is_compared_between_its_own_terminations(load_text, good):
    (found,) = check_fixtures(load_text(step_of(good, f"{ELEMENTS}, load: 75 ohm")), {}, 50.0)
    assert "the design has a load of 75 ohm, but filter is given for 50 ohm" in str(found)
    between = "  - de-embed: {as: r, from: filter, renormalise: [50 ohm, 75 ohm]}\n"
    text = step_of(good + between, f"{ELEMENTS}, load: 75 ohm").replace(
        "expect: {from: filter", "expect: {from: r"
    )
    assert check_fixtures(load_text(text), {}, 50.0) == []


def test_a_sequence_that_only_expects_concludes_too(load_text, good):
    only = good[: good.index("  - judge")]
    assert check_sequence(load_text(step_of(only, ELEMENTS))) == []


def test_the_model_needs_a_tolerance():
    with pytest.raises(ValueError, match="tolerance"):
        Design.model_validate({"elements": [{"shunt": "1 pF"}]})
