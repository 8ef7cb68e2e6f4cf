"""Suspect connections: good calibrations raise none, and each wrong one is named."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.rf.calibration import define
from benchrun.rf.calibration.doubts import jumps
from benchrun.rf.calibration.plausibility import delay_s, intercept_rad, noisiness, steadiness
from benchrun.rf.calibration.suspicion import SURE, Suspicion, suspect, unsteady
from benchrun.rf.deembedding.halves import within
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.twoport import TwoPort

POINTS = 201
F_HZ = np.linspace(5e6, 1.2e9, POINTS)
KIT = Kit(
    "workshop",
    {
        "short": Standard("short", Offset(17e-12, 1.3e9), inductance=(2e-12, 0, 0, 0)),
        "open": Standard("open", Offset(15e-12, 1.3e9), capacitance=(50e-15, 0, 0, 0)),
        "load": Standard("load", Offset(10e-12), resistance_ohm=50.2),
        "thru": Standard("thru", Offset(40e-12)),
        "line": Standard("line", Offset(240e-12)),
    },
)
TRUTHS = define(KIT, tuple(KIT.standards), F_HZ)
THRU = "thru from port 1 to port 2"
SEEDS = range(25)


def cable(g: np.random.Generator) -> TwoPort:
    """A test port: half a metre or more of cable with a poor connector at each end."""
    delay, loss_db = g.uniform(3e-9, 7e-9), g.uniform(0.3, 1.5)
    e = 10 ** (-loss_db * np.sqrt(F_HZ / 1e9) / 20) * np.exp(-2j * np.pi * F_HZ * delay)
    zero = np.zeros(POINTS, complex)

    def bump() -> TwoPort:
        y = 2j * np.pi * F_HZ * 50 * g.uniform(0.05e-12, 0.6e-12)
        return TwoPort(-y / (2 + y), 2 / (2 + y), 2 / (2 + y), -y / (2 + y))

    return bump() @ TwoPort(zero, e, e, zero) @ bump()


class Bench:
    """Two cables on an analyzer with noise; the free end of a cable radiates like an open."""

    def __init__(self, seed: int) -> None:
        self.random = np.random.default_rng(seed)
        self.left, self.right = cable(self.random), cable(self.random).flipped()
        self.free = np.asarray(Standard("open", capacitance=(80e-15, 0, 0, 0)).reflection(F_HZ)) * 0.98

    def read(self, one: np.ndarray | None = None, two: np.ndarray | None = None) -> TwoPort:
        zero = np.zeros(POINTS, complex)
        here, there = (self.free if s is None else s for s in (one, two))
        return self.noisy(within(TwoPort(here, zero, zero, there), self.left, self.right))

    def join(self, what: TwoPort) -> TwoPort:
        return self.noisy(within(what, self.left, self.right))

    def noisy(self, two: TwoPort) -> TwoPort:
        return TwoPort(
            *(
                p + 3e-5 * (self.random.standard_normal(POINTS) + 1j * self.random.standard_normal(POINTS))
                for p in two.planes
            )
        )

    def on(self, name: str, port: int) -> TwoPort:
        s = np.asarray(TRUTHS[name])
        return self.read(s, None) if port == 1 else self.read(None, s)

    def readings(self) -> dict[str, TwoPort]:
        found = {f"{n} on port {p}": self.on(n, p) for p in (1, 2) for n in ("short", "open", "load")}
        thru, line = TRUTHS["thru"], TRUTHS["line"]
        assert isinstance(thru, TwoPort)
        assert isinstance(line, TwoPort)
        return found | {THRU: self.join(thru), "line from port 1 to port 2": self.join(line)}


def doubts(readings: dict[str, TwoPort]) -> dict[str, Suspicion]:
    return {s.hookup: s for s in suspect(TRUTHS, readings, F_HZ)}


@pytest.mark.parametrize("seed", SEEDS)
def test_a_good_calibration_raises_no_suspicion(seed: int) -> None:
    """Nor does any part of it, while it is being made."""
    readings = Bench(seed).readings()
    assert doubts(readings) == {}
    names = list(readings)
    for count in range(1, len(names)):
        assert doubts({n: readings[n] for n in names[:count]}) == {}


@pytest.mark.parametrize("port", [1, 2])
@pytest.mark.parametrize("pair", [("short", "open"), ("open", "load"), ("short", "load")])
@pytest.mark.parametrize("seed", [0, 1, 2])
def test_exchanged_standards_are_both_named(seed: int, pair: tuple[str, str], port: int) -> None:
    bench = Bench(seed)
    readings = bench.readings()
    one, two = (f"{n} on port {port}" for n in pair)
    readings[one], readings[two] = readings[two], readings[one]
    found = doubts(readings)
    assert found[one].looks_like == pair[1]
    assert found[two].looks_like == pair[0]
    assert min(found[one].confidence, found[two].confidence) > 0.85
    assert f"{pair[1]} on port {3 - port}" not in found


@pytest.mark.parametrize("seed", [0, 1, 2])
def test_an_open_for_a_short_shows_before_the_thru_and_in_the_thru(seed: int) -> None:
    """The thru's sign contradicts it too, even where the ports' own phase cannot (few points)."""
    readings = Bench(seed).readings()
    one, two = "short on port 1", "open on port 1"
    readings[one], readings[two] = readings[two], readings[one]
    assert doubts(readings)[THRU].reason.startswith("Its sign contradicts the standards")
    few = {n: x.map(lambda p: p[::40]) for n, x in readings.items() if "line" not in n}
    found = {s.hookup for s in suspect(define(KIT, tuple(KIT.standards), F_HZ[::40]), few, F_HZ[::40])}
    assert THRU in found


@pytest.mark.parametrize("name", ["short", "load"])
@pytest.mark.parametrize("port", [1, 2])
def test_a_standard_on_the_wrong_port(port: int, name: str) -> None:
    bench = Bench(1)
    readings = bench.readings()
    readings[f"{name} on port {port}"] = bench.on(name, 3 - port)
    found = doubts(readings)[f"{name} on port {port}"]
    assert found.looks_like == name
    assert "wrong port" in found.reason


@pytest.mark.parametrize("name", ["short", "load"])
@pytest.mark.parametrize("port", [1, 2])
def test_nothing_connected(port: int, name: str) -> None:
    bench = Bench(1)
    readings = bench.readings()
    readings[f"{name} on port {port}"] = bench.read()
    found = doubts(readings)[f"{name} on port {port}"]
    assert found.looks_like == "nothing"
    assert found.confidence > 0.9


@pytest.mark.parametrize("name", ["open", "load"])
def test_a_standard_that_was_not_changed(name: str) -> None:
    bench = Bench(2)
    readings = bench.readings()
    readings[f"{name} on port 1"] = bench.on("short", 1)
    found = doubts(readings)[f"{name} on port 1"]
    assert found.looks_like == "short"
    assert "Was the standard changed?" in found.reason


def test_a_line_that_was_not_changed() -> None:
    bench = Bench(2)
    readings = bench.readings()
    readings["line from port 1 to port 2"] = bench.join(TRUTHS["thru"])  # type: ignore[arg-type]
    assert doubts(readings)["line from port 1 to port 2"].looks_like == "thru"


def test_a_thru_that_does_not_join() -> None:
    bench = Bench(3)
    readings = bench.readings()
    readings[THRU] = bench.read()
    found = doubts(readings)[THRU]
    assert found.looks_like == "nothing"
    assert "dB pass" in found.reason


def test_a_thru_with_a_pad_in_it() -> None:
    """3 dB too little passes, which neither port's own standards know of."""
    bench = Bench(3)
    readings = bench.readings()
    thru = TRUTHS["thru"]
    assert isinstance(thru, TwoPort)
    readings[THRU] = bench.join(thru.map(lambda p: p * 10 ** (-3 / 20)))
    assert "3.0 dB less" in doubts(readings)[THRU].reason


@pytest.mark.parametrize("name", ["short", "open"])
def test_noise_only(name: str) -> None:
    bench = Bench(4)
    readings, zero = bench.readings(), np.zeros(POINTS, complex)
    readings[f"{name} on port 2"] = bench.noisy(TwoPort(zero, zero, zero, zero))
    assert doubts(readings)[f"{name} on port 2"].looks_like == "noise"


def test_a_contact_that_opens_during_the_sweep() -> None:
    bench = Bench(5)
    readings = bench.readings()
    loose, whole = bench.read(), readings["short on port 1"]
    gone = (np.arange(POINTS) > 90) & (np.arange(POINTS) < 110)
    readings["short on port 1"] = TwoPort(
        np.where(gone, loose.s11, whole.s11), whole.s12, whole.s21, whole.s22
    )
    found = doubts(readings)["short on port 1"]
    assert found.looks_like == "loose"
    assert found.confidence >= 0.8


def test_a_load_that_reflects_half_of_what_it_gets() -> None:
    """A broken load: no exchange explains it."""
    bench = Bench(6)
    readings = bench.readings()
    readings["load on port 1"] = bench.read(np.full(POINTS, 0.6 + 0j), None)
    assert "load on port 1" in doubts(readings) or THRU in doubts(readings)


def test_before_the_third_standard_a_load_in_a_short_s_place_is_seen() -> None:
    bench = Bench(7)
    readings = {"short on port 1": bench.on("load", 1), "load on port 1": bench.on("short", 1)}
    found = doubts(readings)["load on port 1"]
    assert found.looks_like == "short"
    assert found.confidence >= 0.9


@pytest.mark.parametrize(
    ("spoil", "reason"),
    [
        (lambda p: np.where(np.arange(POINTS) == 7, np.nan, p), "not a number"),
        (lambda p: p[:-1], "200 points where the sweep has 201"),
        (lambda p: np.full(POINTS, p[0]), "stands still"),
    ],
)
def test_readings_that_are_broken_by_themselves(spoil, reason: str) -> None:
    readings = Bench(8).readings()
    readings["open on port 2"] = readings["open on port 2"].map(spoil)
    found = doubts(readings)["open on port 2"]
    assert reason in found.reason
    assert found.confidence > 0.9


def test_an_analyzer_that_leaves_planes_empty_raises_no_suspicion() -> None:
    """One-path: zeros stand where nothing was read."""
    zero = np.zeros(POINTS, complex)
    readings = {
        n: TwoPort(x.s11, zero, x.s21, zero)
        for n, x in Bench(9).readings().items()
        if "port 2" not in n or n == THRU
    }
    assert doubts(readings) == {}


def test_steadiness_of_a_long_line_and_of_noise() -> None:
    g = np.random.default_rng(1)
    assert steadiness(np.exp(-2j * np.pi * F_HZ * 60e-9)) > 0.99
    assert steadiness(g.standard_normal(POINTS) + 1j * g.standard_normal(POINTS)) < 0.3
    assert steadiness(np.zeros(POINTS, complex)) == 0.0


def test_the_phase_at_zero_frequency() -> None:
    """Of a delay nothing, of a sign half a turn; unknown where the phase runs too fast to be followed."""
    delay = np.exp(-2j * np.pi * F_HZ * 20e-9)
    assert abs(intercept_rad(F_HZ, delay)[0]) < 1e-9
    assert abs(abs(intercept_rad(F_HZ, -delay)[0]) - np.pi) < 1e-9
    assert intercept_rad(F_HZ, np.exp(-2j * np.pi * F_HZ * 83e-9))[1] == np.inf


def test_jumps_against_the_typical_bend() -> None:
    smooth = np.exp(-2j * np.pi * F_HZ * 20e-9)
    typical, greatest = noisiness(smooth)
    assert greatest < 1e-9
    smooth[50] += 0.1
    assert noisiness(smooth)[1] == pytest.approx(0.2, rel=0.01)
    assert typical < 1e-9


LOG_HZ = np.geomspace(5e6, 1.2e9, 801)


@pytest.mark.parametrize("delay", [4.9e-9, 12e-9, 60e-9])
def test_a_long_cable_on_a_logarithmic_grid_does_not_jump(delay: float) -> None:
    """Its phase turns by up to half a turn between the last points: a cable, and no loose contact."""
    plane = 0.05 + 0.8 * np.exp(-4j * np.pi * LOG_HZ * delay)
    assert delay_s(plane, LOG_HZ) == pytest.approx(2 * delay, rel=0.02)
    assert not jumps(plane, LOG_HZ, 0.8)


def test_a_single_point_off_jumps_on_a_logarithmic_grid() -> None:
    plane = 0.05 + 0.8 * np.exp(-4j * np.pi * LOG_HZ * 4.9e-9)
    plane[300] *= 0.7
    assert jumps(plane, LOG_HZ, 0.8)


def test_receivers_with_a_phase_of_their_own_raise_no_suspicion() -> None:
    """Half a turn of it looks like short and open exchanged, were phase at zero frequency believed."""
    readings = {n: x.map(lambda p: -p) for n, x in Bench(3).readings().items()}
    assert doubts(readings) == {}


def test_without_the_other_port_a_phase_of_half_a_turn_is_a_hint_only() -> None:
    zero = np.zeros(POINTS, complex)
    one = {n: TwoPort(-x.s11, zero, zero, zero) for n, x in Bench(3).readings().items() if "port 1" in n}
    found = doubts({n: x for n, x in one.items() if n != THRU and "line" not in n})
    assert set(found) == {"short on port 1", "open on port 1"}
    assert all(s.confidence <= 0.5 for s in found.values())


def test_a_load_left_on_a_port_at_rest_is_no_fault() -> None:
    """Whoever serves port 2 may leave the load of port 1 where it is."""
    bench = Bench(4)
    readings = bench.readings()
    load = np.asarray(TRUTHS["load"])
    for name in ("short", "open", "load"):
        readings[f"{name} on port 2"] = bench.read(load, np.asarray(TRUTHS[name]))
    assert doubts(readings) == {}


def test_the_open_on_the_wrong_port_of_a_one_port_calibration() -> None:
    """Nothing but the other port, which nobody should have touched, tells."""
    bench = Bench(2)
    open_ = np.asarray(TRUTHS["open"])
    readings = {f"{n} on port 1": bench.on(n, 1) for n in ("short", "open", "load")}
    assert doubts(readings) == {}
    readings["open on port 1"] = bench.read(None, open_)
    found = doubts(readings)["open on port 1"]
    assert "wrong port" in found.reason
    assert found.confidence > SURE


def test_a_short_on_the_wrong_port_shows_with_the_second_standard() -> None:
    bench = Bench(2)
    readings = {
        "short on port 1": bench.read(None, np.asarray(TRUTHS["short"])),
        "open on port 1": bench.on("open", 1),
    }
    found = doubts(readings)["short on port 1"]
    assert found.confidence > SURE
    assert "nearly like the open" in found.reason


def test_two_alike_are_both_doubted_the_later_one_more() -> None:
    bench = Bench(2)
    readings = {"short on port 1": bench.on("open", 1), "open on port 1": bench.on("open", 1)}
    found = doubts(readings)
    assert found["open on port 1"].confidence > found["short on port 1"].confidence > SURE


def test_a_port_at_rest_says_which_of_two_that_are_alike_is_wrong() -> None:
    bench = Bench(2)
    readings = bench.readings()
    readings["short on port 2"] = bench.on("open", 2)
    found = doubts(readings)
    assert found["short on port 2"].looks_like == "open"
    assert "open on port 2" not in found


@pytest.mark.parametrize(("name", "share"), [("short", 0.9), ("thru", 0.93)])
def test_a_lossy_contact_shows_in_the_thru(name: str, share: float) -> None:
    """Half a decibel and more: a short that gives back too little, or a thru that passes too little."""
    bench = Bench(3)
    readings = bench.readings()
    thru = TRUTHS["thru"]
    assert isinstance(thru, TwoPort)
    if name == "thru":
        readings[THRU] = bench.join(thru.map(lambda p: p * share))
        text = THRU
    else:
        readings["short on port 2"] = bench.read(None, share**2 * np.asarray(TRUTHS["short"]))
        text = "short on port 2"
    first = suspect(TRUTHS, {n: x for n, x in readings.items() if "line" not in n}, F_HZ)[0]
    assert first.hookup == text
    assert first.confidence > SURE


@pytest.mark.parametrize("text", ["load on port 1", THRU])
def test_two_sweeps_of_one_connection_agree_or_it_is_loose(text: str) -> None:
    """A tenth of an ohm more in the contact reflects 0.1 % more; noise of the same size means nothing."""
    bench = Bench(5)
    truth = TRUTHS["load"]

    def sweep(more: float) -> TwoPort:
        if text == THRU:
            thru = TRUTHS["thru"]
            assert isinstance(thru, TwoPort)
            return bench.join(thru.map(lambda p: p * (1 - more)))
        return bench.read(np.asarray(truth) + more, None)

    assert unsteady(text, sweep(0.0), sweep(0.0)) is None
    found = unsteady(text, sweep(0.0), sweep(2e-3))
    assert found is not None
    assert found.looks_like == "loose"
    assert found.hookup == text


def test_noise_is_no_loose_contact() -> None:
    bench = Bench(6)
    pair = [
        bench.on("load", 1).map(lambda p: p + 1e-3 * bench.random.standard_normal(POINTS)) for _ in range(2)
    ]
    assert unsteady("load on port 1", *pair) is None


def test_where_nothing_at_all_is_read_no_connection_is_to_blame() -> None:
    zero = np.zeros(POINTS, complex)
    nothing = TwoPort(zero, zero, zero, zero)
    assert doubts({"short on port 1": nothing, "open on port 1": nothing, THRU: nothing}) == {}
