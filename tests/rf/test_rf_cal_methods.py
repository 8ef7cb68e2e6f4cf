"""Every two-port method: the device is found again, and scikit-rf agrees, with noise and without."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InvalidMeasurement
from benchrun.hookup import Hookup
from benchrun.rf.calibration import METHODS, define, differ
from benchrun.rf.calibration.eight_terms import EightTerms
from benchrun.rf.calibration.method import Options
from benchrun.rf.calibration.one_path import turned_round
from benchrun.rf.calibration.switch_terms import SWITCH_READING, SwitchTerms
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import OnePortTerms, TwelveTerms
from benchrun.rf.twoport import TwoPort

POINTS = 13
F_HZ = np.linspace(1e9, 3e9, POINTS)
KIT = Kit(
    "made up",
    {
        "short": Standard("short", Offset(5e-12, 1e9), inductance=(2e-12, 0, 0, 0)),
        "open": Standard("open", Offset(4e-12), capacitance=(20e-15, 0, 0, 0)),
        "load": Standard("load", resistance_ohm=49.0, series_inductance_h=30e-12),
        "thru": Standard("thru", Offset(20e-12, 1e9)),
        "line": Standard("line", Offset(145e-12, 1e9)),
        "line-2": Standard("line", Offset(80e-12, 1e9)),
    },
)
LOADS = "load on port 1 and load on port 2"
BOXES = ["SOLT", "SOLR", "TRL", "multiline TRL", "LRM", "LRRM"]
"""Methods that find error boxes, so that nothing of the device is left wrong."""
OPTIONS = {"TRL": Options(lines=("line", "line-2")), "multiline TRL": Options(lines=("line", "line-2"))}


def options_of(name: str) -> Options:
    return OPTIONS.get(name, Options())


class Bench:
    """An analyzer with random error boxes; ``harsh`` boxes reflect most of what they get and lose 30 dB."""

    def __init__(self, seed: int, harsh: bool = False, leak: float = 0.0) -> None:
        self.random = np.random.default_rng(seed)
        e, m, t = (0.7, 0.7, (0.02, 0.05)) if harsh else (0.2, 0.3, (0.5, 1.2))
        one, two = (OnePortTerms(self.disk(e), self.disk(m), self.ring(*t)) for _ in (1, 2))
        switch = SwitchTerms(self.disk(0.3), self.disk(0.3))
        self.terms = EightTerms(one, two, self.ring(0.5, 1.2), switch, self.disk(leak), self.disk(leak))
        self.device = TwoPort(*(self.disk(0.9) for _ in range(4)))

    def disk(self, radius: float) -> np.ndarray:
        return self.random.uniform(0, radius, POINTS) * np.exp(2j * np.pi * self.random.uniform(size=POINTS))

    def ring(self, low: float, high: float) -> np.ndarray:
        return self.random.uniform(low, high, POINTS) * np.exp(2j * np.pi * self.random.uniform(size=POINTS))

    def read(self, s: TwoPort, noise: float = 0.0, shape: tuple[int, ...] = ()) -> TwoPort:
        def noisy(plane: np.ndarray) -> np.ndarray:
            pair = self.random.standard_normal((2, *shape, POINTS))
            return plane + noise * (pair[0] + 1j * pair[1])

        raw = self.terms.embed(s)
        return raw.map(noisy) if noise else raw

    def readings(self, kit: Kit = KIT, noise: float = 0.0, shape: tuple[int, ...] = ()) -> dict[str, TwoPort]:
        zero, free = np.zeros(POINTS, complex), np.full(POINTS, 0.9 - 0.1j)
        found = {}
        for name, truth in define(kit, tuple(kit.standards), F_HZ).items():
            if isinstance(truth, TwoPort):
                found[Hookup.of(name, 1, 2).text] = self.read(truth, noise, shape)
            else:
                found[Hookup.of(name, 1).text] = self.read(TwoPort(truth, zero, zero, free), noise, shape)
                found[Hookup.of(name, 2).text] = self.read(TwoPort(free, zero, zero, truth), noise, shape)
        load = np.asarray(define(kit, ("load",), F_HZ)["load"])
        found[LOADS] = self.read(TwoPort(load, zero, zero, load), noise, shape)
        found[SWITCH_READING] = self.terms.switch.reading
        return found


def solve(name: str, readings, isolation: bool = False, kit: Kit = KIT) -> TwelveTerms:
    method, options = METHODS[name], options_of(name)
    found = method.solve((1, 2), define(kit, method.takes(options), F_HZ), readings, isolation, options)
    assert isinstance(found, TwelveTerms)
    return found


@pytest.mark.parametrize("name", BOXES)
@pytest.mark.parametrize("seed", range(6))
def test_the_device_is_found_again(name: str, seed: int) -> None:
    bench = Bench(seed)
    found = solve(name, bench.readings()).correct(bench.read(bench.device))
    assert_allclose(found.matrix, bench.device.matrix, atol=1e-11)


@pytest.mark.parametrize("name", BOXES)
@pytest.mark.parametrize("seed", range(6))
def test_the_device_is_found_again_behind_harsh_boxes(name: str, seed: int) -> None:
    """Boxes that lose 30 dB and reflect up to 0.7: conditioning costs digits, not sense."""
    bench = Bench(seed, harsh=True)
    found = solve(name, bench.readings()).correct(bench.read(bench.device))
    assert_allclose(found.matrix, bench.device.matrix, atol=1e-8)


@pytest.mark.parametrize("name", [*BOXES, "response", "one-path"])
@pytest.mark.parametrize("isolation", [False, True])
@pytest.mark.parametrize("noise", [0.0, 1e-4, 3e-3])
def test_scikit_rf_agrees(name: str, isolation: bool, noise: float) -> None:
    """Within the 1e-9 that a run allows, also where noise makes the equations disagree with each other."""
    bench = Bench(7, leak=1e-3 if isolation else 0.0)
    readings, raw = bench.readings(noise=noise), bench.read(bench.device, noise)
    mine = solve(name, readings, isolation).correct(raw)
    theirs = METHODS[name].examiner(F_HZ, (1, 2), KIT, readings, isolation, options_of(name))(raw)
    assert differ(mine, theirs) < 1e-9


@pytest.mark.parametrize("name", BOXES)
def test_isolation_is_taken_out(name: str) -> None:
    bench = Bench(3, leak=1e-3)
    raw, readings = bench.read(bench.device), bench.readings()
    right = solve(name, readings, isolation=True).correct(raw)
    assert_allclose(right.s21, bench.device.s21, atol=1e-10)
    left_in = solve(name, readings).correct(raw)
    assert np.max(np.abs(left_in.s21 - bench.device.s21)) > 1e-4


@pytest.mark.parametrize("name", ["SOLR", "TRL", "LRM", "LRRM"])
def test_without_switch_terms_the_idle_port_stays_in_the_result(name: str) -> None:
    """As the method says of itself: wrong for a part that lets much through, right for one that does not."""
    bench = Bench(5)
    readings = bench.readings()
    del readings[SWITCH_READING]
    terms = solve(name, readings)
    assert differ(terms.correct(bench.read(bench.device)), bench.device) > 1e-2
    assert "matched" in METHODS[name].without_switch_terms
    # Without any switch terms to read, nothing is lost.
    matched = Bench(5)
    matched.terms = EightTerms(matched.terms.one, matched.terms.two, matched.terms.k)
    readings = matched.readings()
    del readings[SWITCH_READING]
    assert differ(solve(name, readings).correct(matched.read(bench.device)), bench.device) < 1e-11


@pytest.mark.parametrize("name", ["SOLT", "SOLR", "TRL", "LRM", "LRRM", "response", "one-path"])
def test_draws_are_solved_at_once(name: str) -> None:
    """Many draws in one call give what each gives alone."""
    bench = Bench(2)
    readings = bench.readings(noise=1e-4, shape=(3,))
    raw = bench.read(bench.device, 1e-4, (3,))
    together = solve(name, readings).correct(raw)
    assert together.s21.shape == (3, POINTS)
    one = {k: two.map(lambda p: p[1] if p.ndim > 1 else p) for k, two in readings.items()}
    alone = solve(name, one).correct(raw.map(lambda p: p[1]))
    assert_allclose(together.matrix[1], alone.matrix, atol=1e-12)


def test_multiline_takes_no_draws() -> None:
    with pytest.raises(TypeError, match="use TRL for many draws"):
        solve("multiline TRL", Bench(2).readings(noise=1e-4, shape=(3,)))


def test_weighted_lines_spread_less_than_the_best_one() -> None:
    """What multiline is for: over ten noisy calibrations the device scatters less than with the best line."""
    kit = KIT.with_standard("line-2", Standard("line", Offset(150e-12, 1e9)))
    kit = kit.with_standard("line-3", Standard("line", Offset(140e-12, 1e9)))
    options = Options(lines=("line", "line-2", "line-3"))
    spread = {}
    for name in ("TRL", "multiline TRL"):
        bench, errors = Bench(1), []
        method, raw = METHODS[name], bench.read(bench.device)
        definitions = define(kit, method.takes(options), F_HZ)
        for _ in range(10):
            terms = method.solve((1, 2), definitions, bench.readings(kit, noise=1e-3), options=options)
            errors.append(terms.correct(raw).s11 - bench.device.s11)
        spread[name] = np.sqrt(np.mean(np.abs(errors) ** 2))
    assert spread["multiline TRL"] < spread["TRL"]


@pytest.mark.parametrize("name", [n for n in METHODS if n != "SOL"])
def test_every_reading_that_holds_no_number_is_named(name: str) -> None:
    bench, method, options = Bench(4), METHODS[name], options_of(name)
    for hookup in method.required((1, 2), options=options):
        readings = bench.readings()
        broken = readings[hookup.text].map(np.copy)
        for plane in broken.planes:
            plane[3] = np.nan
        readings[hookup.text] = broken
        with pytest.raises(InvalidMeasurement, match="not a number") as caught:
            solve(name, readings)
        assert "again" in caught.value.advice


@pytest.mark.parametrize("name", [n for n in METHODS if n != "SOL"])
def test_a_thru_that_was_not_joined_is_refused(name: str) -> None:
    bench = Bench(4)
    readings = bench.readings()
    open_ends = np.full(POINTS, 0.95 + 0j)
    nothing = np.full(POINTS, 1e-7 + 0j)
    readings["thru from port 1 to port 2"] = bench.read(TwoPort(open_ends, nothing, nothing, open_ends))
    with pytest.raises(InvalidMeasurement, match=r"thru lets through only -1[0-9]{2} dB"):
        solve(name, readings)


def test_what_each_method_asks_hands_to_connect() -> None:
    """Single standards port by port, then what joins both; isolation in between, with loads at hand."""
    told = {
        name: [h.text for h in method.required((1, 2), options=options_of(name))]
        for name, method in METHODS.items()
        if name != "SOL"
    }
    thru = "thru from port 1 to port 2"
    assert told["response"] == ["short on port 1", "short on port 2", thru]
    assert told["one-path"] == ["short on port 1", "open on port 1", "load on port 1", thru]
    assert told["SOLR"] == told["SOLT"]
    assert told["LRM"] == [f"{n} on port {p}" for p in (1, 2) for n in ("short", "load")] + [thru]
    assert told["LRRM"] == [
        "short on port 1", "open on port 1", "load on port 1", "short on port 2", "open on port 2", thru,
    ]  # fmt: skip
    assert told["TRL"] == [
        "short on port 1", "short on port 2",
        "line-2 from port 1 to port 2", "line from port 1 to port 2", thru,
    ]  # fmt: skip
    assert told["multiline TRL"] == told["TRL"]


@pytest.mark.parametrize("name", [n for n in METHODS if n != "SOL"])
def test_what_is_required_is_what_is_read(name: str) -> None:
    """Readings of the required hook-ups and no others suffice, with isolation and without."""
    bench, options = Bench(6), options_of(name)
    bench.terms = EightTerms(bench.terms.one, bench.terms.two, bench.terms.k)
    everything = bench.readings()
    for isolation in (False, True):
        wanted = METHODS[name].required((1, 2), isolation, options)
        readings = {h.text: everything[h.text] for h in wanted}
        solve(name, readings, isolation)
        METHODS[name].examiner(F_HZ, (1, 2), KIT, readings, isolation, options)(bench.read(bench.device))


def test_one_path_with_the_unit_turned_round() -> None:
    """The reverse terms of such an analyzer do not exist; its readings of the turned unit stand in."""
    bench, readings = Bench(8), Bench(8).readings()
    way = bench.terms.twelve().forward
    analyzer = TwelveTerms(way, way)
    readings = {k: two for k, two in readings.items() if k != SWITCH_READING}
    terms = solve("one-path", readings)
    forward, turned = analyzer.embed(bench.device), analyzer.embed(bench.device.flipped())
    nothing = np.zeros(POINTS, complex)
    raw = turned_round(
        TwoPort(forward.s11, nothing, forward.s21, nothing), TwoPort(turned.s11, nothing, turned.s21, nothing)
    )
    assert_allclose(terms.correct(raw).matrix, bench.device.matrix, atol=1e-11)
    theirs = METHODS["one-path"].examiner(F_HZ, (1, 2), KIT, readings)(raw)
    assert differ(terms.correct(raw), theirs) < 1e-9


@pytest.mark.parametrize("isolation", [False, True])
@pytest.mark.parametrize("port", [1, 2])
def test_response_of_one_port(port: int, isolation: bool) -> None:
    """Tracking right, match left in: exact where the analyzer's own match is perfect."""
    bench, method = Bench(9), METHODS["response"]
    zero = np.zeros(POINTS, complex)
    floor = bench.disk(0.1) if isolation else zero
    terms = OnePortTerms(floor, zero, bench.ring(0.5, 1.2))
    definitions = define(KIT, ("short", "load", "thru"), F_HZ)
    load = zero if isolation else np.asarray(definitions["load"])

    def read(s: np.ndarray) -> TwoPort:
        m = terms.embed(np.asarray(s))
        return TwoPort(m, zero, zero, zero) if port == 1 else TwoPort(zero, zero, zero, m)

    readings = {
        f"short on port {port}": read(np.asarray(definitions["short"])),
        f"load on port {port}": read(load),
    }
    raw = read(bench.device.s11)
    found = method.solve((port,), definitions, readings, isolation)
    assert isinstance(found, OnePortTerms)
    mine = found.correct(raw.s11 if port == 1 else raw.s22)
    assert_allclose(mine, bench.device.s11, atol=1e-13)
    assert differ(mine, method.examiner(F_HZ, (port,), KIT, readings, isolation)(raw)) < 1e-9
    assert len(method.required((port,), isolation)) == (2 if isolation else 1)
