"""Cables, lines, antennas, amplifiers and measured files."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sim_instruments.draws import Draws
from sim_instruments.parts import KINDS, build
from sim_instruments.parts.base import Surroundings
from sim_instruments.world import World

F = np.linspace(50e6, 1e9, 96)
CABLE = {"kind": "cable", "delay": "5 ns", "loss": "0.9 dB", "dielectric loss": "0.1 dB", "bend": 3}
STAGE = {"kind": "amplifier", "gain": "16 dB", "at": "169 MHz", "corner": "900 MHz", "input": "15 dB",
         "output": "12 dB", "reverse": "30 dB", "P1dB": "20 dBm", "IP3": "32 dBm", "noise figure": "3 dB",
         "supply": "5 V", "current": "80 mA"}  # fmt: skip
WHIP = {"kind": "antenna", "resonance": "169 MHz", "q": 9, "radiation": 36, "loss": 3}


def _part(spec: dict[str, Any], *faults: str) -> Any:
    return build({**spec, "faults": list(faults)} if faults else spec, Draws(1))


def _db(x: Any) -> Any:
    return 20 * np.log10(abs(x))


def test_a_cable_loses_by_skin_and_dielectric() -> None:
    """0.9 sqrt(f) + 0.1 f in dB at f in GHz; delay from the phase."""
    m = _part(CABLE).matrix(F)
    np.testing.assert_allclose(-_db(m[:, 1, 0]), 0.9 * np.sqrt(F / 1e9) + 0.1 * F / 1e9, rtol=1e-9)
    phase = np.unwrap(np.angle(m[:, 1, 0]))
    assert -(phase[-1] - phase[0]) / (2 * np.pi * (F[-1] - F[0])) == pytest.approx(5e-9, rel=1e-9)


def test_a_bend_turns_the_phase_and_nothing_else() -> None:
    """Three degrees at 1 GHz, in proportion to frequency."""
    part = _part(CABLE)
    ratio = part.matrix(F, Surroundings(bend=1.0))[:, 1, 0] / part.matrix(F)[:, 1, 0]
    np.testing.assert_allclose(np.angle(ratio, deg=True), -3 * F / 1e9, rtol=1e-6)
    np.testing.assert_allclose(abs(ratio), 1, rtol=1e-12)


def test_water_makes_a_cable_lossy_slow_and_mismatched() -> None:
    """More than a decibel more at 1 GHz, several percent more delay, a reflection."""
    good, wet = _part(CABLE).matrix(F), _part(CABLE, "water in the cable").matrix(F)
    assert _db(good[-1, 1, 0]) - _db(wet[-1, 1, 0]) > 1.0
    assert np.max(abs(wet[:, 0, 0])) > 0.03 > np.max(abs(good[:, 0, 0]))
    assert wet.shape == good.shape


def test_a_crushed_cable_reflects_from_where_it_is_crushed() -> None:
    """The reflection's phase runs with twice the delay up to there."""
    m = build({"kind": "cable", "delay": "5 ns", "faults": ["crushed at 40 %"]}, Draws(1)).matrix(F)
    phase = np.unwrap(np.angle(m[:, 0, 0]))
    slope = -(phase[-1] - phase[0]) / (2 * np.pi * (F[-1] - F[0]))
    assert slope == pytest.approx(2 * 2e-9 + 40e-12, rel=0.05)


def test_a_dispersive_line_slows_down() -> None:
    """The delay goes from its low value to the root of `slow` times it, half of the way about the corner."""
    f = np.array([1e6, 1e9, 1e12])
    part = build(
        {"kind": "line", "sections": [{"delay": "0.1 ps", "slow": 1.21, "corner": "1 GHz"}]}, Draws(1)
    )
    delay = -np.angle(part.matrix(f)[:, 1, 0]) / (2 * np.pi * f)
    np.testing.assert_allclose(delay, np.array([1, np.sqrt(1.105), 1.1]) * 1e-13, rtol=1e-5)


def test_a_step_of_impedance_reflects() -> None:
    """A half-wave of 100 ohm is not seen, a quarter-wave shows 200 ohm."""
    part = build({"kind": "line", "sections": [{"delay": "0.5 ns", "impedance": 100}]}, Draws(1))
    quarter, half = part.matrix(np.array([0.5e9, 1e9]))[:, 0, 0]
    assert abs(half) < 1e-12
    assert quarter == pytest.approx((200 - 50) / (200 + 50))


def test_an_antenna_at_resonance_shows_its_resistance() -> None:
    """39 ohm of radiation and loss; the hand lowers the resonance and takes power."""
    free, held = _part(WHIP), _part(WHIP, "hand nearby")
    f = np.linspace(140e6, 200e6, 6001)
    g_free, g_held = free.matrix(f)[:, 0, 0], held.matrix(f)[:, 0, 0]
    at = np.argmin(abs(f - 169e6))
    assert g_free[at] == pytest.approx((39 - 50) / (39 + 50), abs=1e-3)
    assert f[np.argmin(abs(g_held))] < 0.97 * 169e6
    assert abs(g_held[at]) > 2 * abs(g_free[at])


def test_a_matched_antenna_is_seen_through_its_network() -> None:
    """39 ohm stepped up by an L section: matched at resonance, and its faults are the network's."""
    w, q = 2 * np.pi * 169e6, np.sqrt(50 / 39 - 1)
    match = [
        {"name": "C1", "place": "shunt", "capacitor": q / (w * 50)},
        {"name": "L2", "place": "series", "coil": 39 * q / w},
    ]
    f = np.array([169e6])
    assert abs(_part({**WHIP, "match": match}).matrix(f)[0, 0, 0]) < 1e-12
    assert abs(_part({**WHIP, "match": match}, "open joint at L2").matrix(f)[0, 0, 0]) > 0.9


def test_gain_match_and_isolation_of_a_stage() -> None:
    """As described, at its frequency."""
    m = _part(STAGE).matrix(np.array([169e6]))[0]
    assert _db(m[1, 0]) == pytest.approx(16.0, abs=1e-9)
    assert _db(m[0, 0]) == pytest.approx(-15.0, abs=1e-9)
    assert _db(m[1, 1]) == pytest.approx(-12.0, abs=1e-9)
    assert _db(m[0, 1]) == pytest.approx(-30.0, abs=1e-9)


def test_a_stage_compresses_by_one_decibel_at_its_p1db() -> None:
    """At -1 dB the output is 20 dBm; 20 dB below nothing is seen; far above the output stands still."""
    part, f = _part(STAGE), np.array([169e6])

    def gain(level: float) -> float:
        return float(_db(part.driven(f, Surroundings(), np.array([level]))[0, 1, 0]))

    assert gain(5.0) == pytest.approx(15.0, abs=1e-6)
    assert gain(-15.0) == pytest.approx(16.0, abs=1e-3)
    assert gain(30.0) + 30.0 == pytest.approx(gain(20.0) + 20.0, abs=0.2)


def test_third_order_products_meet_the_carrier_at_the_intercept() -> None:
    """3 P - 2 IP3: equal at IP3, two decibels closer for each decibel."""
    stage = _part(STAGE).stage
    assert stage.third_order_dbm(32.0) == pytest.approx(32.0)
    assert stage.third_order_dbm(10.0) == pytest.approx(-34.0)


def test_the_intercept_follows_from_p1db_if_not_given() -> None:
    """10.6 dB above it, as a cubic nonlinearity has it."""
    spec = {k: v for k, v in STAGE.items() if k != "IP3"}
    assert _part(spec).stage.ip3_dbm == pytest.approx(30.6)


def test_noise_at_the_output_of_a_stage() -> None:
    """-173.975 + NF + G in 1 Hz."""
    assert _part(STAGE).stage.noise_dbm_hz() == pytest.approx(-173.975 + 3 + 16)


def test_a_starved_stage_loses_gain_and_current() -> None:
    """Off: no gain; at 4 V: less gain; at its voltage: its current."""
    part, f = _part(STAGE), np.array([169e6])
    full, low, off = (_db(part.matrix(f, Surroundings(supply_v=v))[0, 1, 0]) for v in (5.0, 4.0, 0.0))
    assert full == pytest.approx(16.0)
    assert 13.0 < low < 15.5
    assert off < -30
    assert part.stage.current_a(5.0) == pytest.approx(0.08)
    assert part.stage.current_a(0.0) == 0.0


@pytest.mark.parametrize(
    ("fault", "what", "by"),
    [
        ("gain -3 dB", "gain_db", -3),
        ("P1dB -4 dB", "p1db_dbm", -4),
        ("noise figure +3 dB", "noise_figure_db", 3),
    ],
)
def test_faults_of_a_stage(fault: str, what: str, by: float) -> None:
    """Each changes what it names."""
    assert getattr(_part(STAGE, fault).stage, what) - getattr(_part(STAGE).stage, what) == pytest.approx(by)


def test_the_source_level_reaches_a_stage_through_what_stands_before_it() -> None:
    """A 10 dB pad ahead: 10 dB more source for the same compression; nothing seen from behind."""
    draws = Draws(1)
    items = {"amp": build(STAGE, draws), "pad": build({"kind": "pad", "loss": "10 dB"}, draws)}
    world, f = World(1, items), np.array([169e6])
    world.connect([(["pad", "amp"], [1, 2])])
    low, at, above = (_db(world.between_ports(f, p, 1)[0, 1, 0]) for p in (-30.0, 15.0, 25.0))
    assert low - at == pytest.approx(1.0, abs=0.02)
    assert low - above > 6
    assert _db(world.between_ports(f, 15.0, 2)[0, 1, 0]) == pytest.approx(low, abs=1e-3)
    assert world.has_active


def test_a_loose_connector_on_one_port() -> None:
    """Contact resistance in line with the part: a load of 50 ohm reads 54 at low frequency."""
    spec = {"kind": "antenna", "resonance": "1 MHz", "q": 0, "radiation": 50, "faults": ["connector loose"]}
    load = build(spec, Draws(1))
    assert load.matrix(np.array([1e3]))[0, 0, 0] == pytest.approx(4 / 104, abs=1e-5)


def test_a_measured_file_comes_back_and_between_its_points(tmp_path: Path) -> None:
    """On its grid exactly, half way half way."""
    file = tmp_path / "part.s1p"
    file.write_text("# MHz S RI R 50\n100 0.1 0.2\n200 0.3 0.4\n", encoding="ascii")
    part = build({"kind": "measured", "file": str(file)}, Draws(1))
    seen = part.matrix(np.array([100e6, 150e6, 200e6]))[:, 0, 0]
    np.testing.assert_allclose(seen, [0.1 + 0.2j, 0.2 + 0.3j, 0.3 + 0.4j], atol=1e-12)


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_every_kind_refuses_what_it_does_not_know(kind: str) -> None:
    """A slip of the pen is no default."""
    with pytest.raises((ValueError, KeyError)):
        build({"kind": kind, "colour": "red"}, Draws(1))
