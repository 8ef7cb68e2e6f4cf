"""Ladders, prototypes and designs against closed forms.

Prototype values: Matthaei, Young and Jones (from memory), computed to the digits shown. Attenuations:
``10 log(1 + w^2n)`` of Butterworth and ``10 log(1 + e^2 Tn(w)^2)`` of Chebyshev filters.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.parts import Part, build
from sim_instruments.parts.base import Surroundings
from sim_instruments.parts.design import matching_elements
from sim_instruments.parts.prototypes import butterworth, chebyshev, scaled

EDGE = 100e6


def _filter(**spec: Any) -> Part:
    return build({"kind": "filter", "passes": "low", "edge": EDGE, "exact": True, **spec}, Draws(1))


def _loss_db(part: Part, f_hz: Any) -> np.ndarray:
    return np.asarray(-20 * np.log10(abs(part.matrix(np.atleast_1d(np.asarray(f_hz, float)))[:, 1, 0])))


@pytest.mark.parametrize(
    ("g", "expected"),
    [
        (butterworth(5), [0.6180, 1.6180, 2.0, 1.6180, 0.6180, 1.0]),
        (butterworth(6), [0.5176, 1.4142, 1.9319, 1.9319, 1.4142, 0.5176, 1.0]),
        (chebyshev(3, 0.1), [1.0316, 1.1474, 1.0316, 1.0]),
        (chebyshev(4, 0.1), [1.1088, 1.3062, 1.7704, 0.8181, 1.3554]),
        (chebyshev(7, 0.5), [1.7373, 1.2582, 2.6383, 1.3443, 2.6383, 1.2582, 1.7373, 1.0]),
        (chebyshev(2, 3.0), [3.1013, 0.5339, 5.8089]),
    ],
)
def test_prototype_tables(g: tuple[float, ...], expected: list[float]) -> None:
    """To the printed digits."""
    np.testing.assert_allclose(g, expected, rtol=0, atol=6e-5)


def test_scaling_gives_ohms_and_hertz() -> None:
    """Butterworth n=3 at 1 GHz: 3.1831 pF, 15.9155 nH; the usual textbook band-pass, n=3, 0.5 dB, 10 %."""
    low = scaled(butterworth(3), "low", 1e9)
    assert [e.get("capacitor", e.get("coil")) for e in low] == pytest.approx(
        [3.1831e-12, 15.9155e-9, 3.1831e-12], rel=1e-5
    )
    band = scaled(chebyshev(3, 0.5), "band", 1e9, 100e6, "series")
    assert [e.get("capacitor", e.get("coil")) for e in band[:4]] == pytest.approx(
        [127.028e-9, 0.199407e-12, 0.725614e-9, 34.9088e-12], rel=1e-5
    )


@pytest.mark.parametrize(
    ("spec", "at", "expected"),
    [
        ({"shape": "butterworth", "order": 3}, 2.0, 18.1291),
        ({"shape": "butterworth", "order": 5}, 1.5, 17.6838),
        ({"shape": "butterworth", "order": 7}, 2.0, 42.1445),
        ({"shape": "butterworth", "order": 9}, 1.0, 3.0103),
        ({"shape": "chebyshev", "order": 3, "ripple": 0.5}, 2.0, 19.2161),
        ({"shape": "chebyshev", "order": 5, "ripple": 0.5}, 2.0, 42.0387),
        ({"shape": "chebyshev", "order": 5, "ripple": 0.1}, 1.5, 19.4988),
        ({"shape": "chebyshev", "order": 7, "ripple": 0.1}, 2.0, 57.7243),
        ({"shape": "chebyshev", "order": 3, "ripple": 3.0}, 2.0, 28.2853),
        ({"shape": "chebyshev", "order": 11, "ripple": 0.1}, 1.0, 0.1),
    ],
)
@pytest.mark.parametrize("first", ["shunt", "series"])
def test_attenuation_of_low_passes(spec: dict[str, Any], at: float, expected: float, first: str) -> None:
    """Whichever way round the ladder begins."""
    assert _loss_db(_filter(first=first, **spec), at * EDGE)[0] == pytest.approx(expected, abs=1e-4)


def test_a_high_pass_is_the_low_pass_mirrored() -> None:
    """Attenuation at f is that of the low-pass at edge^2 / f."""
    f = np.geomspace(20e6, 500e6, 31)
    high = _filter(shape="chebyshev", order=5, ripple=0.5, passes="high")
    low = _filter(shape="chebyshev", order=5, ripple=0.5)
    np.testing.assert_allclose(_loss_db(high, f), _loss_db(low, EDGE**2 / f), rtol=0, atol=1e-9)


def test_a_band_pass_is_the_low_pass_stretched() -> None:
    """Attenuation at f is that of the low-pass at (f/f0 - f0/f) f0/width."""
    f = np.linspace(150e6, 190e6, 41)
    band = build(
        {"kind": "filter", "shape": "butterworth", "order": 3, "passes": "band", "center": 169e6,
         "width": 10e6, "exact": True}, Draws(1),
    )  # fmt: skip
    w = (f / 169e6 - 169e6 / f) * 169e6 / 10e6
    np.testing.assert_allclose(_loss_db(band, f), 10 * np.log10(1 + w**6), rtol=1e-6, atol=1e-6)


@pytest.mark.parametrize("first", ["shunt", "series"])
def test_a_band_stop_is_the_low_pass_turned_inside_out(first: str) -> None:
    """The low-pass loss at ``width f0 / (f0^2/f - f)`` (Pozar 8.4, from memory)."""
    stop = build(
        {"kind": "filter", "shape": "butterworth", "order": 3, "passes": "all but a band", "center": 169e6,
         "width": 20e6, "first": first}, Draws(1))  # fmt: skip
    f = np.array([60e6, 140e6, 160e6, 168e6, 171e6, 180e6, 220e6, 500e6])
    w = 20e6 / (169e6**2 / f - f)
    np.testing.assert_allclose(_loss_db(stop, f), 10 * np.log10(1 + w**6), rtol=1e-6, atol=1e-6)
    assert _loss_db(stop, 169e6)[0] > 150  # lossless elements: hardly anything comes through


def test_a_band_stop_is_as_deep_as_its_coils_are_good() -> None:
    """With Q the notch fills; a broken joint takes its whole branch away."""
    spec = {"kind": "filter", "shape": "chebyshev", "order": 3, "ripple": 0.1, "passes": "all but a band",
            "center": 169e6, "width": 20e6, "coil q": 100, "q at": 169e6}  # fmt: skip
    good, broken = build(spec, Draws(1)), build({**spec, "faults": ["open joint at C1"]}, Draws(1))
    assert 40 < _loss_db(good, 169e6)[0] < 80
    assert _loss_db(broken, 169e6)[0] < _loss_db(good, 169e6)[0] - 10


@pytest.mark.parametrize(
    ("elements", "says"),
    [
        ([{"name": "L1", "place": "shunt", "coil": "10 nH", "joined": "across"}], "joined to none"),
        ([{"name": "C1", "place": "shunt", "capacitor": "1 pF"},
          {"name": "L1", "place": "series", "coil": "10 nH", "joined": "across"}], "joined to none"),
        ([{"name": "L1", "place": "shunt", "coil": "10 nH", "joined": "beside"}], "not 'beside'"),
    ],
)  # fmt: skip
def test_joins_that_make_no_sense_are_refused(elements: list[dict[str, str]], says: str) -> None:
    """An element joins one of its own place, across it or in line."""
    with pytest.raises(ValueError, match=says):
        build({"kind": "ladder", "elements": elements}, Draws(1))


def test_an_even_chebyshev_wants_its_own_load() -> None:
    """Between 50 ohm and 50 g(n+1) ohm an order of four ripples by 0.1 dB and no more."""
    f = np.linspace(1e6, EDGE, 401)
    s = _filter(shape="chebyshev", order=4, ripple=0.1, first="series").matrix(f)
    load = (1.3554 - 1) / (1.3554 + 1)  # after a last shunt element g(n+1) is a resistance
    gain = abs(s[:, 1, 0] / (1 - s[:, 1, 1] * load)) ** 2 * (1 - load**2)
    assert -10 * np.log10(gain).min() == pytest.approx(0.1, abs=2e-3)
    assert 10 * np.log10(gain).max() == pytest.approx(0.0, abs=2e-3)


@pytest.mark.parametrize(
    ("spec", "expected"),
    [
        ({"shape": "butterworth", "order": 3}, 2.0),
        ({"shape": "butterworth", "order": 7}, 4.49396),
        ({"shape": "chebyshev", "order": 5, "ripple": 0.1}, 3.5055),
        ({"shape": "chebyshev", "order": 7, "ripple": 0.5}, 6.3060),
    ],
)
def test_group_delay_at_low_frequency(spec: dict[str, Any], expected: float) -> None:
    """Half the sum of the prototype's values, over the edge."""
    f = np.array([0.9e5, 1.1e5])
    phase = np.unwrap(np.angle(_filter(**spec).matrix(f)[:, 1, 0]))
    delay = -(phase[1] - phase[0]) / (2 * np.pi * (f[1] - f[0]))
    assert delay * 2 * np.pi * EDGE == pytest.approx(expected, rel=1e-4)


def test_a_lossless_ladder_is_unitary_and_reciprocal() -> None:
    """No power is made or lost, and both ways are alike."""
    f = np.geomspace(1e6, 1e9, 101)
    m = _filter(shape="chebyshev", order=6, ripple=0.5).matrix(f)
    product = np.conj(np.swapaxes(m, 1, 2)) @ m
    np.testing.assert_allclose(product, np.broadcast_to(np.eye(2), product.shape), atol=1e-9)
    np.testing.assert_array_equal(m[:, 0, 1], m[:, 1, 0])


def test_loss_at_mid_band_follows_from_q() -> None:
    """Cohn's rule: 4.343 f0/(width Q) times the sum of g, for dissipation that is small (from memory)."""
    band = build(
        {"kind": "filter", "shape": "butterworth", "order": 3, "passes": "band", "center": 169e6,
         "width": 17e6, "coil q": 400, "capacitor q": 400, "q at": 169e6, "exact": True}, Draws(1),
    )  # fmt: skip
    expected = 4.343 * 169 / 17 / 200 * 4.0  # coil and capacitor in one resonator: half the Q
    assert _loss_db(band, 169e6)[0] == pytest.approx(expected, rel=0.03)


def test_coupled_resonators_make_the_band_asked_for() -> None:
    """Three of them, 0.1 dB, 5 % wide: centre, 3 dB width 1.389 times the ripple's, and skirts."""
    part = build(
        {"kind": "coupled resonators", "shape": "chebyshev", "order": 3, "ripple": 0.1, "center": 169e6,
         "width": 8e6, "coil": 20e-9, "exact": True}, Draws(1),
    )  # fmt: skip
    f = np.linspace(140e6, 200e6, 6001)
    loss = _loss_db(part, f)
    inside = f[loss < 3.0]
    assert np.sqrt(inside[0] * inside[-1]) == pytest.approx(169e6, rel=0.01)
    assert inside[-1] - inside[0] == pytest.approx(1.389 * 8e6, rel=0.08)
    assert loss.min() < 0.01
    assert loss[0] > 40


@pytest.mark.parametrize(
    ("shape", "load"),
    [("L", 200 - 100j), ("L", 12 + 20j), ("L", 50 + 80j), ("pi", 18 - 30j), ("pi", 180 + 40j),
     ("tee", 18 - 30j), ("tee", 120 + 10j)],
)  # fmt: skip
def test_matching_networks_match(shape: str, load: complex) -> None:
    """At their frequency no reflection is left."""
    f = np.array([169e6])
    part = build(
        {"kind": "matching", "shape": shape, "at": 169e6, "load": [load.real, load.imag], "q": 4}, Draws(1)
    )
    gamma = (load - 50) / (load + 50)
    s = part.matrix(f)[0]
    assert abs(s[0, 0] + s[0, 1] * gamma * s[1, 0] / (1 - s[1, 1] * gamma)) < 1e-12


def test_a_quarter_step_by_l_section() -> None:
    """25 to 50 ohm at 1 GHz: series 3.97887 nH beside the load, shunt 3.18310 pF; here the other solution."""
    elements = matching_elements("L", 1e9, 25 + 0j)
    assert [e.get("coil", e.get("capacitor")) for e in elements] == pytest.approx(
        [3.18310e-12, 3.97887e-9], rel=1e-5
    )


@pytest.mark.parametrize(
    ("fault", "least_db"),
    [("L2 +15 %", 0.5), ("C3 = 39 pF", 0.3), ("open joint at C1", 0.1), ("solder bridge across L2", 0.5),
     ("connector loose", 0.2)],
)  # fmt: skip
def test_faults_show(fault: str, least_db: float) -> None:
    """Each moves the transmission somewhere up to twice the edge, and is said in words."""
    spec = {"kind": "filter", "shape": "butterworth", "order": 3, "edge": EDGE, "exact": True}
    f = np.linspace(10e6, 2 * EDGE, 101)
    spoiled = build({**spec, "faults": [fault]}, Draws(1))
    assert np.max(abs(_loss_db(spoiled, f) - _loss_db(build(spec, Draws(1)), f))) > least_db
    assert spoiled.says == fault


@pytest.mark.parametrize("fault", ["L9 +15 %", "gremlins", "L2 15", "C3 = soup"])
def test_faults_that_make_no_sense_are_refused(fault: str) -> None:
    """With the words that were given."""
    with pytest.raises(ValueError, match=r"makes no sense here|no value"):
        _filter(shape="butterworth", order=3, faults=[fault])


def test_tolerances_by_their_law() -> None:
    """Normal: cut at the tolerance; uniform: flat up to it. Seeded by the part's own draws."""

    def values(spread: str) -> np.ndarray:
        out = []
        for seed in range(300):
            element = {"name": "R1", "place": "series", "resistor": 100, "tolerance": "5 %", "spread": spread}
            s11 = build({"kind": "ladder", "elements": [element]}, Draws(seed)).matrix(np.array([1e6]))[
                0, 0, 0
            ]
            out.append((2 * s11.real * 50 / (1 - s11.real)) / 100 - 1)
        return np.array(out)

    normal, uniform = values("normal"), values("uniform")
    assert np.max(abs(normal)) <= 0.05 + 1e-9
    assert np.std(normal) == pytest.approx(0.024, rel=0.15)
    assert np.max(abs(uniform)) <= 0.05 + 1e-9
    assert np.std(uniform) == pytest.approx(0.05 / np.sqrt(3), rel=0.1)


def test_parts_follow_the_room() -> None:
    """100 ppm/K on both elements of a resonator moves it by 100 ppm for a kelvin."""
    element = {"place": "shunt", "drift": 100}
    part = build(
        {"kind": "ladder", "elements": [{"name": "L1", "coil": "10 nH", **element},
                                        {"name": "C1", "capacitor": "100 pF", **element}]}, Draws(1),
    )  # fmt: skip
    f = np.linspace(155e6, 163e6, 80001)
    peak = [f[np.argmin(abs(part.matrix(f, Surroundings(t))[:, 0, 0]))] for t in (23.0, 33.0)]
    assert peak[1] / peak[0] - 1 == pytest.approx(-1e-3, rel=0.05)
