"""What declared sources come to: against plain perturbation of the readings, the truth, and an audit."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from benchrun.errors import InputError
from benchrun.evaluate.chain import apply
from benchrun.evaluate.propagation.influences import influences
from benchrun.evaluate.propagation.kernel import Kernel
from benchrun.evaluate.propagation.propagate import propagate
from benchrun.evaluate.propagation.quantities import Quantity, near
from benchrun.evaluate.propagation.trail import Basis, Trail, corrected, freed
from benchrun.evaluate.readings import decode
from benchrun.evaluate.state import State
from benchrun.hookup import Connection, Hookup
from benchrun.paths import installed_sequences
from benchrun.record.keys import KeyStore
from benchrun.record.verify import verify
from benchrun.rf.calibration import METHODS, define
from benchrun.rf.figures import FIGURES
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.terms import Direction, TwelveTerms
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.bench import Bench
from benchrun.sequence.files import load_model
from benchrun.uncertainty.montecarlo import Effort
from benchrun.uncertainty.sources import Sources

F_HZ = np.linspace(50e6, 1.5e9, 30)
DOUBTS = {
    "short": {"l0_h": 2e-12, "delay_s": 2e-13},
    "open": {"c0_f": 2e-15},
    "load": {"resistance_ohm": 0.4},
}
KIT = Kit(
    "test",
    {
        "short": Standard("short", Offset(30e-12), inductance=(2e-12, 0, 0, 0), uncertainty=DOUBTS["short"]),
        "open": Standard("open", Offset(30e-12), capacitance=(50e-15, 0, 0, 0), uncertainty=DOUBTS["open"]),
        "load": Standard("load", uncertainty=DOUBTS["load"]),
        "thru": Standard("thru", uncertainty={"delay_s": 2e-13}),
    },
)
CONNECTOR = Sources.from_mapping({"connector": {"repeatability": "60 dB"}})


def line(reach: complex, delay: float) -> np.ndarray:
    return reach * np.exp(-2j * np.pi * F_HZ * delay)


TERMS = TwelveTerms(
    Direction(line(0.05, 1e-9), line(0.1j, 2e-9), line(0.9, 8e-9), line(0.08, 1e-9), line(0.8, 9e-9)),
    Direction(line(0.04j, 2e-9), line(0.07, 1e-9), line(0.8, 9e-9), line(0.09, 2e-9), line(0.7, 9e-9)),
)
HALF = TwoPort(line(0.03, 1e-10), line(0.97, 2e-10), line(0.97, 2e-10), line(0.05j, 2e-10))
UNIT = TwoPort(line(0.2, 3e-10), line(0.5, 4e-10), line(0.6, 4e-10), line(0.3j, 1e-10))


def read(kit: Kit = KIT) -> tuple[Basis, dict[str, TwoPort]]:
    """Readings of a kit's standards through known terms, as SOLT wants them."""
    method, truth = METHODS["SOLT"], define(kit, ("short", "open", "load", "thru"), F_HZ)
    hookups, readings = method.required((1, 2)), {}
    nothing = np.zeros(len(F_HZ), np.complex128)
    for hookup in hookups:
        name = hookup.connections[0].items[0]
        if name == "thru":
            true = truth[name]
        else:
            planes = (truth[name], nothing) if hookup.ports == (1,) else (nothing, truth[name])
            true = TwoPort(planes[0], nothing, nothing, planes[1])
        readings[hookup.text] = TERMS.embed(true)
    return Basis(method, (1, 2), KIT, hookups, readings, (0.0, 0.0)), readings


def trail(fixture: bool = False, noise: tuple[float, float] = (0.0, 0.0), kit: Kit = KIT) -> Trail:
    """A whole measurement without any error but the kit's."""
    basis, readings = read(kit)
    basis = replace(basis, noise=noise)
    definitions = basis.definitions(F_HZ)
    terms = basis.method.solve((1, 2), definitions, readings)
    seen = HALF @ UNIT @ HALF.flipped() if fixture else UNIT
    chain = ("left", "unit", "right") if fixture else ("unit",)
    fixtures = ((HALF, HALF.flipped()),) if fixture else ()
    hookup = Hookup((Connection(chain, (1, 2)),))
    return Trail(F_HZ, basis, terms, TERMS.embed(seen), hookup, noise, fixtures, definitions)


def kernel(of: Trail, sources: Sources) -> Kernel:
    return Kernel(of, influences(of, sources))


def moved_by(found: Kernel, column: int) -> TwoPort:
    """Change of the result by one standard uncertainty of one axis."""
    rows = np.zeros((2, found.axes))
    rows[1, column] = 1.0
    out = found.run(rows, None)
    return out.map(lambda p: p[1] - p[0])


@pytest.mark.parametrize("fixture", [False, True])
def test_without_draws_the_truth_comes_out(fixture):
    found = kernel(trail(fixture), CONNECTOR).run(np.zeros((1, kernel(trail(fixture), CONNECTOR).axes)), None)
    for ours, true in zip(found.planes, UNIT.planes, strict=True):
        np.testing.assert_allclose(ours[0], true, atol=1e-13)


@pytest.mark.parametrize(
    ("name", "parameter", "size"), [(n, p, s) for n, d in DOUBTS.items() for p, s in d.items()]
)
def test_a_standard_off_its_definition_does_what_measuring_it_would(name, parameter, size):
    # Reading what another standard truly gives, and solving with the kit's definition, to first order.
    changes = {
        "l0_h": {"inductance": (2e-12 + size, 0.0, 0.0, 0.0)},
        "c0_f": {"capacitance": (50e-15 + size, 0.0, 0.0, 0.0)},
        "resistance_ohm": {"resistance_ohm": 50.0 + size},
        "delay_s": {"offset": Offset(30e-12 + size)},
    }
    other = KIT.with_standard(name, replace(KIT.standards[name], **changes[parameter]))
    seen = trail(kit=other)
    expected = [a - b for a, b in zip(corrected(seen.terms, seen.unit, 1).planes, UNIT.planes, strict=True)]
    only = {
        n: replace(s, uncertainty={parameter: size} if n == name else {}) for n, s in KIT.standards.items()
    }
    plain = trail()
    alone = replace(plain, basis=replace(plain.basis, kit=replace(KIT, standards=only)))
    found = kernel(alone, Sources())
    assert found.axes == 1
    for ours, theirs in zip(moved_by(found, 0).planes, expected, strict=True):
        np.testing.assert_allclose(ours, theirs, atol=0.02 * max(np.abs(p).max() for p in expected))


def test_a_joint_at_the_unit_does_what_a_small_step_there_would():
    sources = Sources.from_mapping({"connector": {"floor": "50 dB"}})
    size = sources.connector_floor / np.sqrt(2.0)
    step = np.full(len(F_HZ), size, np.complex128)
    with_joint = TwoPort(step, np.ones_like(step), np.ones_like(step), -step) @ UNIT
    plain = trail()
    kit = replace(KIT, standards={n: replace(s, uncertainty={}) for n, s in KIT.standards.items()})
    found = kernel(replace(plain, basis=replace(plain.basis, kit=kit)), sources)
    # One joint for each of six reflections, two at the thru, two at the unit, two axes each.
    assert found.axes == 2 * (6 + 2 + 2)
    first_at_unit = 2 * (6 + 2)
    for ours, new, old in zip(
        moved_by(found, first_at_unit).planes, with_joint.planes, UNIT.planes, strict=True
    ):
        np.testing.assert_allclose(ours, new - old, atol=2e-2 * size)


def test_the_fixture_has_joints_of_its_own_inside():
    assert kernel(trail(True), CONNECTOR).axes == kernel(trail(False), CONNECTOR).axes + 2 * 2


def test_first_order_and_trials_agree_where_all_is_small():
    sources = replace(CONNECTOR, noise_trace=1e-4)
    seen = trail(True, noise=(1e-6, 1e-4))
    kind = FIGURES["insertion loss"]
    parameters = {"at": 600e6, "trace": "S21"}
    value = float(kind.measure(F_HZ, UNIT, "at most", **parameters).value)
    one = Quantity("loss", kind, "at most", parameters, value, near(F_HZ, kind, parameters))
    found = propagate(seen, sources, [one], Effort(trials=4000), seed=3)
    figure = found.figures[0]
    assert figure.spread.standard == pytest.approx(figure.first_order, rel=0.06)
    assert figure.departure(-1) == pytest.approx(figure.spread.standard * np.log(10) / 20, rel=0.05)
    assert sum(figure.budget.values()) == pytest.approx(1.0)
    assert set(figure.budget) >= {"connector repeatability", "noise", "kit: load"}
    assert len(found.f_hz) < len(F_HZ), "only the points that the figure needs"


def test_covariance_of_noise_is_what_was_put_in():
    bare = replace(KIT, standards={n: replace(s, uncertainty={}) for n, s in KIT.standards.items()})
    seen = trail(noise=(0.0, 0.0))
    seen = replace(seen, noise=(1e-4, 0.0), basis=replace(seen.basis, kit=bare))
    found = propagate(seen, Sources(), [], Effort(trials=4000), seed=4, everywhere=True)
    # Noise on the unit's reading alone: through reflection tracking it comes out as sigma / |eR| and more.
    covariance = found.moments.covariance("S11")
    assert covariance.shape == (len(F_HZ), 2, 2)
    total = np.sqrt(covariance[:, 0, 0] + covariance[:, 1, 1])
    one = TERMS.forward.source_match
    slope = np.abs((1 - one * UNIT.s11) ** 2 / TERMS.forward.tracking)
    np.testing.assert_allclose(total, 1e-4 * slope, rtol=0.25)
    np.testing.assert_allclose(covariance[:, 0, 1], covariance[:, 1, 0])


def test_the_same_seed_gives_the_same_numbers_on_any_number_of_processors(monkeypatch):
    from benchrun.evaluate.propagation import trials

    kind, parameters = FIGURES["ripple"], {"over": (100e6, 1e9), "trace": "S21"}
    one = Quantity("ripple", kind, "at most", parameters, 0.0, near(F_HZ, kind, parameters))
    seen, results = trail(noise=(1e-6, 1e-4)), []
    for workers in (1, 3):
        monkeypatch.setattr(trials, "_WORKERS", workers)
        results.append(propagate(seen, CONNECTOR, [one], Effort(trials=2500), seed=9).figures[0].draws)
    assert np.array_equal(*results)
    again = propagate(seen, CONNECTOR, [one], Effort(trials=2500), seed=10).figures[0].draws
    assert not np.array_equal(results[0], again)


def test_a_figure_that_draws_do_not_have_is_not_resolvable():
    kind, parameters = FIGURES["corner frequency"], {"drop": 20.0, "edge": "upper", "trace": "S21"}
    one = Quantity("corner", kind, "at most", parameters, 1e9, near(F_HZ, kind, parameters))
    figure = propagate(trail(noise=(1e-6, 1e-4)), CONNECTOR, [one], Effort(trials=50), seed=1).figures[0]
    assert figure.spread is None
    assert figure.departure() == np.inf


def test_taking_fixtures_out_undoes_putting_them_round():
    from benchrun.evaluate.propagation.seen import wrapped

    fixtures = ((HALF, HALF.flipped()), (HALF.flipped(), None))
    again = freed(wrapped(UNIT, fixtures), fixtures)
    for ours, true in zip(again.planes, UNIT.planes, strict=True):
        np.testing.assert_allclose(ours, true, atol=1e-13)


# -- whole runs ----------------------------------------------------------------------------------------------

SOURCES = """\
uncertainty:
  trials: {number: 400}
  sources:
    noise: {floor: -152 dBm, trace: 0.0015 dB}
    drift: {per hour: 0.002 dB, over: 15 min}
    connector: {repeatability: 68 dB}
    fixture: {delay: 0.05 ps, impedance: 0.03 ohm, launch: 2 fF}
"""


@pytest.fixture
def sourced(tmp_path: Path) -> str:
    """The workshop's bench with sources in place of residual terms."""
    text = (installed_sequences() / "benches" / "workshop.yaml").read_text()
    path = tmp_path / "sourced.yaml"
    path.write_text(text[: text.index("uncertainty:")] + SOURCES)
    return str(path)


def test_a_run_takes_its_uncertainty_from_the_sources_and_an_audit_finds_it_again(workplace, sourced):
    w = workplace(bench=sourced)
    answer = w.run()
    assert answer.code == 0, answer.err
    for figure in answer.document["figures"]:
        assert 0 < figure["uncertainty"] < 2.0, figure
    audited = w.audit(w.records[-1])
    assert audited.code == 0, audited.err


def test_a_provisional_judgement_comes_from_first_order_alone(workplace, sourced):
    w = workplace(bench=sourced)
    w.run()
    kept: list[State] = []
    procedure, readings = w.job.plan.procedure, {}
    record = verify(w.records[-1], KeyStore()).record
    for entry in record.payload.readings:
        readings.setdefault(entry.step, {})[entry.hookup] = decode(record.content(entry.file), entry.file)
    for provisional in (True, False):
        state = State(procedure, provisional=provisional)
        for step in procedure.sequence.steps:
            apply(step, state, readings.get(step.name, {}))
        kept.append(state)
    early, final = kept
    assert not early.propagated
    assert set(final.propagated) == {"judgement"}
    for before, after in zip(early.figures, final.figures, strict=True):
        assert before.value == after.value
        assert before.uncertainty == pytest.approx(after.uncertainty, rel=0.35)


def test_noise_that_decides_an_extreme_is_told():
    kind, parameters = FIGURES["ripple"], {"over": (100e6, 1e9), "trace": "S21"}
    flat = TwoPort(*(np.full(len(F_HZ), x, np.complex128) for x in (0.0, 0.5, 0.5, 0.0)))
    noise = (0.0, 1e-3)
    seen = replace(trail(noise=noise), unit=TERMS.embed(flat))
    chance = np.random.default_rng(5)
    read = seen.unit.map(lambda p: p * (1 + 7e-4 * chance.standard_normal(len(p))))
    value = float(kind.measure(F_HZ, corrected(seen.terms, read, 1), "at most", **parameters).value)
    one = Quantity("ripple", kind, "at most", parameters, value, near(F_HZ, kind, parameters))
    loud = propagate(replace(seen, unit=read), Sources(), [one], Effort(trials=300), seed=2).figures[0]
    assert loud.noise_bias > 0
    assert loud.noisy
    assert loud.departure() > value / 2, "the truth, no ripple at all, lies within U"
    calm = trail(noise=(0.0, 1e-6))
    kind, parameters = FIGURES["insertion loss"], {"at": 600e6, "trace": "S21"}
    value = float(kind.measure(F_HZ, UNIT, "at most", **parameters).value)
    at = Quantity("loss", kind, "at most", parameters, value, near(F_HZ, kind, parameters))
    assert not propagate(calm, CONNECTOR, [at], Effort(trials=300), seed=2).figures[0].noisy


@pytest.mark.parametrize(
    ("sources", "said"),
    [
        ("{weather: {wind: 3 dB}}", "'weather' is no source; known are noise"),
        ("{noise: 3 dB}", "noise: '3 dB' is no list of sizes; it takes floor, trace"),
        ("{noise: {floor: 3 dB}}", "'3 dB' is not in dBm"),
        ("{connector: {repeatability: 60 dB, distribution: bell}}", "'bell' is no distribution"),
    ],
)
def test_a_bench_file_that_says_nonsense_about_sources_is_refused_at_its_line(sources, said):
    text = (installed_sequences() / "benches" / "workshop.yaml").read_text()
    text = f"{text[: text.index('uncertainty:')]}uncertainty:\n  sources: {sources}\n"
    with pytest.raises(InputError) as caught:
        load_model(text.encode(), "bench.yaml", Bench)
    (problem,) = caught.value.problems
    assert said in problem.message
    assert problem.line == text.count("\n")
