"""Each way of the step ``de-embed``: what was put around a known unit comes off again, and scikit-rf agrees.

The readings are made here with scikit-rf's cascade and circuits, so that neither side is its own examiner.
"""

from __future__ import annotations

from types import SimpleNamespace

import numpy as np
import pytest
import skrf

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.network import Network
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.state import State
from benchrun.evaluate.steps.deembed import DeEmbedArithmetic
from benchrun.rf.touchstone import read, write
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps import DeEmbed

F = np.linspace(10e6, 6e9, 600)
FREQUENCY = skrf.Frequency.from_f(F, unit="hz")
MEDIA = skrf.media.DefinedGammaZ0(FREQUENCY, z0_port=50, z0=50, gamma=1j * 2 * np.pi * F / 3e8 + 0.05)
UNIT = MEDIA.shunt_capacitor(1e-12) ** MEDIA.line(0.02, "m") ** MEDIA.inductor(3e-9)
LEFT = MEDIA.line(0.05, "m") ** MEDIA.shunt_capacitor(0.2e-12) ** MEDIA.line(0.01, "m")
RIGHT = MEDIA.line(0.03, "m") ** MEDIA.inductor(0.3e-9)


def two(network):
    return TwoPort.of(np.asarray(network.s))


def file(network, z0=50.0):
    return read(write(network.f, two(network), "", z0), "file.s2p")


def apply(reading, step, fixtures=None, varied=None, calibrations=None, **network):
    """One step on a network that has all its rows moved by the same little, for the variations."""
    nominal = two(reading) if reading.nports == 2 else reading.s[:, 0, 0]
    state = State(Procedure(None, fixtures={k: file(v) for k, v in (fixtures or {}).items()}))
    if varied is not None:
        varied = two(varied).map(lambda p: np.tile(p, (11, 1)))
    state.networks["in"] = Network(F, nominal, varied, 11, **network)
    state.calibrations.update(calibrations or {})
    DeEmbedArithmetic().apply(DeEmbed.model_validate({"as": "out", "from": "in", **step}), state, {})
    assert state.agreements["out"] < 1e-9
    return state.networks["out"]


def same(network, expected, tolerance=1e-12):
    found = network.matrix
    return np.max(np.abs(found - expected.s)) < tolerance


def test_halves_come_off_the_variations_too():
    other = MEDIA.attenuator(-3)
    out = apply(LEFT ** UNIT ** RIGHT, {"left": "l", "right": "r"}, {"l": LEFT, "r": RIGHT},
                varied=LEFT ** other ** RIGHT)  # fmt: skip
    assert same(out, UNIT)
    assert np.max(np.abs(out.varied.s21 - other.s[:, 1, 0])) < 1e-12


def test_a_half_of_a_one_port():
    antenna = MEDIA.load(0.3 + 0.2j)
    assert same(apply(LEFT**antenna, {"left": "l"}, {"l": LEFT}), antenna)
    assert same(apply(antenna, {"left": "l", "embed": True}, {"l": LEFT}), LEFT**antenna)


def test_a_half_the_wrong_way_round_is_refused():
    line, step = MEDIA.line(0.3, "m"), MEDIA.shunt_capacitor(0.5e-12)
    half = step**line ** MEDIA.shunt_capacitor(0.05e-12)
    with pytest.raises(InvalidMeasurement, match="l is the wrong way round") as caught:
        apply(half**UNIT, {"left": "l"}, {"l": half.flipped()})
    assert "a left half has its port 2 at the unit" in caught.value.advice
    assert same(apply(half**UNIT, {"left": "l"}, {"l": half}), UNIT)


def test_embedding_asks_what_the_unit_would_do_in_a_circuit():
    out = apply(UNIT, {"left": "l", "right": "r", "embed": True}, {"l": LEFT, "r": RIGHT})
    assert same(out, LEFT**UNIT**RIGHT)


def test_planes_are_shifted_by_delay_and_loss():
    delay = {1: 120e-12, 2: 80e-12}
    lines = [MEDIA.line(0, "m").copy() for _ in delay]  # matched lines, written down here from the definition
    for line, (port, tau) in zip(lines, delay.items(), strict=True):
        loss = 0.1 * port * np.sqrt(F / 2e9)
        s21 = 10 ** (-loss / 20) * np.exp(-2j * np.pi * F * tau)
        line.s = np.array([[0 * s21, s21], [s21, 0 * s21]]).transpose(2, 0, 1)
    reading = lines[0] ** UNIT ** lines[1]
    shift = {
        1: {"delay": "120 ps", "loss": "0.1 dB", "at": "2 GHz"},
        2: {"delay": "80 ps", "loss": "0.2 dB", "at": "2 GHz"},
    }
    assert same(apply(reading, {"shift": shift}), UNIT)
    away = {port: {**one, "away": True} for port, one in shift.items()}
    assert same(apply(UNIT, {"shift": away}), reading)


@pytest.mark.parametrize("first", ["open", "short"])
def test_open_and_short_dummies(first):
    pads = [MEDIA.shunt_capacitor(c) for c in (0.05e-12, 0.07e-12)]
    leads = [MEDIA.inductor(x) for x in (0.1e-9, 0.15e-9)]
    unit, ground, nothing = UNIT, MEDIA.shunt_inductor(1e-18), MEDIA.capacitor(1e-21)

    def seen(inner):
        a, b = (pads, leads) if first == "open" else (leads, pads)
        return a[0] ** b[0] ** inner ** b[1] ** a[1]

    # What joins nothing keeps its pads; what is grounded keeps its leads.
    fixtures = {"o": seen(nothing), "s": seen(ground)}
    out = apply(seen(unit), {"dummies": {"open": "o", "short": "s", "first": first}}, fixtures)
    assert same(out, unit, 1e-6)  # dummies of 1e-18 H and 1e-21 F are no perfect ones


@pytest.mark.parametrize("kind", ["open", "short"])
def test_one_dummy_alone(kind):
    around = MEDIA.shunt_capacitor(0.05e-12) if kind == "open" else MEDIA.inductor(0.1e-9)
    inside = MEDIA.capacitor(1e-21) if kind == "open" else MEDIA.shunt_inductor(1e-18)
    fixtures = {"d": around**inside**around}
    assert same(apply(around**UNIT**around, {"dummies": {kind: "d"}}, fixtures), UNIT, 1e-6)


@pytest.mark.parametrize("circuit", ["pi", "tee"])
def test_a_thru_dummy_is_split(circuit):
    half = MEDIA.shunt_capacitor(0.05e-12) ** MEDIA.inductor(0.1e-9)
    if circuit == "tee":
        half = half.flipped()
    fixtures = {"t": half ** half.flipped()}
    out = apply(half**UNIT ** half.flipped(), {"dummies": {"thru": "t", "circuit": circuit}}, fixtures)
    assert same(out, UNIT, 1e-9)


@pytest.mark.parametrize("port", [1, 2])
def test_an_adapter_that_was_there_while_calibrating(port):
    adapter = LEFT
    # Calibrated behind it, read without: the analyzer believes in the unit without the adapter, once too few.
    seen = adapter.inv**UNIT if port == 1 else UNIT ** adapter.inv.flipped()
    assert same(apply(seen, {"adapter": {"port": port, "file": "a"}}, {"a": adapter}), UNIT)


@pytest.mark.parametrize("port", [1, 2])
def test_an_adapter_found_by_two_calibrations(port):
    from benchrun.rf.terms import Direction, OnePortTerms, TwelveTerms

    box, one = MEDIA.line(0.2, "m") ** MEDIA.shunt_capacitor(0.3e-12), np.ones(len(F)) + 0j

    def calibration(network):
        s = network.s
        terms = OnePortTerms(s[:, 0, 0], s[:, 1, 1], s[:, 1, 0] * s[:, 0, 1])
        way = Direction(terms.directivity, terms.source_match, terms.tracking, 0 * one, one)
        return SimpleNamespace(f_hz=F, terms=TwelveTerms(way, way) if port == 2 else terms)

    seen = LEFT.inv**UNIT if port == 1 else UNIT ** LEFT.inv.flipped()
    step = {"adapter": {"port": port, "without": "bare", "behind": "with", "delay": "200 ps"}}
    found = apply(seen, step, calibrations={"bare": calibration(box), "with": calibration(box**LEFT)})
    assert same(found, UNIT, 1e-10)


def test_reference_impedances_by_port_and_kind_of_wave():
    for wave, theirs in (("power", "power"), ("pseudo", "pseudo"), ("travelling", "traveling")):
        z = [73 + 42.5j, 30 - 5j]
        expected = skrf.Network(frequency=FREQUENCY, s=UNIT.s, z0=50, s_def=theirs)
        expected.renormalize(z, s_def=theirs)
        out = apply(UNIT, {"renormalise": ["73 + 42.5j ohm", "30 - 5j ohm"], "waves": wave})
        assert same(out, expected)
        assert (out.impedance(1), out.impedance(2)) == tuple(z)
        back = apply(
            expected, {"renormalise": "50 ohm", "waves": wave}, ports_ohm=(complex(z[0]), complex(z[1]))
        )
        assert same(back, UNIT)
        assert (back.z0_ohm, back.ports_ohm) == (50.0, None)


LONG = skrf.Frequency(10, 20_000, 2000, "mhz")


@pytest.fixture(scope="module")
def thru():
    """A 2x-thru whose halves are mirror images, evenly sampled from its step on."""
    gamma = 0.4 * np.sqrt(LONG.f / 1e9) + 1j * (2 * np.pi * LONG.f / 2e8 + 0.4 * np.sqrt(LONG.f / 1e9))
    media = skrf.media.DefinedGammaZ0(LONG, z0_port=50, z0=50, gamma=gamma)
    half = media.line(0.03, "m") ** media.shunt_capacitor(0.02e-12) ** media.line(0.03, "m")
    return media, half, half ** half.flipped()


def test_halves_of_a_2x_thru(thru):
    media, half, whole = thru
    unit = media.attenuator(-3) ** media.line(0.02, "m")
    reading = half**unit ** half.flipped()
    state = State(Procedure(None, fixtures={"t": file(whole)}))
    state.networks["in"] = Network(LONG.f, two(reading))
    step = {"as": "out", "from": "in", "2x-thru": {"file": "t", "class": "B", "quality": "acceptable"}}
    DeEmbedArithmetic().apply(DeEmbed.model_validate(step), state, {})
    off = np.abs(state.networks["out"].matrix - unit.s)
    assert np.max(off[: len(off) // 2]) < 0.02
    assert state.agreements["out"] < 1e-9
    assert set(state.halves) == {"out left", "out right"}, "split once for all units"


@pytest.mark.parametrize(
    ("wanted", "spoiled", "expected"),
    [
        ({"class": "A"}, "reflecting", "is of class B after IEEE 370; the sequence asks for A"),
        ({"quality": "good"}, "one way", "after IEEE 370; the sequence asks for good"),
    ],
)
def test_a_2x_thru_that_is_too_poor_is_refused(thru, wanted, spoiled, expected):
    _, _, whole = thru
    bad = whole.copy()
    if spoiled == "reflecting":
        bad.s[:, 0, 0] += 0.15 * np.exp(-2j * np.pi * LONG.f * 20e-12)
        bad.s *= 0.8
    else:
        bad.s[:, 0, 1] *= 0.9
    state = State(Procedure(None, fixtures={"t": file(bad)}))
    state.networks["in"] = Network(LONG.f, two(bad))
    step = DeEmbed.model_validate({"as": "out", "from": "in", "2x-thru": {"file": "t", **wanted}})
    with pytest.raises(InvalidMeasurement, match=expected) as caught:
        DeEmbedArithmetic().apply(step, state, {})
    assert "causality" in caught.value.reason


@pytest.mark.parametrize("part", [MEDIA.line(0, "m"), MEDIA.open(), MEDIA.short(), MEDIA.match()])
def test_a_part_without_impedance_matrix_is_renormalised_too(part):
    # A thru has neither Z nor Y, an open end no Z: an examiner that goes by way of them would be off by 1e-8.
    out = apply(part, {"renormalise": "75 ohm"})
    g = (50.0 - 75.0) / (50.0 + 75.0)
    if part.nports == 2:
        assert np.allclose(out.nominal.s11, 0.0, atol=1e-15)
        assert np.allclose(out.nominal.s21, 1.0, atol=1e-15)
    else:
        s = part.s[:, 0, 0]
        assert np.allclose(out.nominal, (s + g) / (1.0 + g * s), atol=1e-15)
