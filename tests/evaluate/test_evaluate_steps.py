"""Single steps of the arithmetic: one port behind a fixture half, halves on other grids, a wrong examiner."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.chain import apply, evaluate
from benchrun.evaluate.state import AGREEMENT
from benchrun.evaluate.steps.removing import on_grid
from benchrun.rf.touchstone import read
from benchrun.rf.twoport import TwoPort
from sim_instruments.bench import load_bench

ANTENNA = """\
sequence: whip
edition: 1
title: Whip antenna behind the left half of the jig
unit:
  part: whip antenna
  serial: "WA-[0-9]{4}"
  ports: 1
  withstands: {power: 30 dBm}
  fixture: {left: jig-left}
cautions: [RF power]
sweeps:
  near: {from: 150 MHz, to: 190 MHz, points: 41, bandwidth: 1 kHz, power: -10 dBm}
steps:
  - calibrate: {as: plane, sweep: near, method: SOL, ports: [1], kit: n50-workshop}
  - sweep: {as: in-jig, with: plane}
  - de-embed: {as: whip, from: in-jig, left: jig-left.s2p}
  - judge:
      from: whip
      rule: {guard band: 1 U}
      limits: [{figure: return loss, port: 1, over: 168.5 MHz to 170.5 MHz, at least: 8 dB}]
"""


def state_of(w):
    """The chain once more on what a run has kept."""
    (record,) = w.records
    files = [read(path.read_bytes(), "raw.s2p").two_port for path in sorted((record / "raw").iterdir())]
    taken = [event for event in w.events if event.name == "reading"]
    kept: dict = {}
    for event, raw in zip(taken, files, strict=True):
        kept.setdefault(event.step, {})[event.hookup] = raw
    return evaluate(w.job.plan.procedure, kept), kept


@pytest.mark.parametrize("seed", [1, 2, 3, 5])
def test_one_port_behind_a_fixture_half(workplace, seed):
    w = workplace(ANTENNA, units=("WA-0001",), seed=seed)
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (0, "pass")
    assert w.audit(answer.document["record"]).code == 0
    state, _ = state_of(w)
    whip, in_jig = state.networks["whip"], state.networks["in-jig"]
    assert (whip.ports, in_jig.ports) == (1, 1)
    true = w.rehearsal.bench.world.truth(whip.f_hz)[:, 0, 0]
    expanded = whip.expanded("S11")
    assert np.all(np.abs(whip.nominal - true) <= expanded)
    assert np.max(np.abs(in_jig.nominal - true) / expanded) > 5
    assert set(state.agreements) == {"plane", "in-jig", "whip"}
    with pytest.raises(KeyError):
        whip.expanded("S21")


def test_a_bad_antenna_fails(workplace):
    answer = workplace(ANTENNA, units=("WA-9001",)).run()
    assert (answer.code, answer.document["conclusion"]) == (1, "fail")


def test_halves_are_filled_in_between_their_points(workplace):
    w = workplace()
    w.run()
    state, _ = state_of(w)
    grid = state.networks["filter"].f_hz
    for name in ("jig-left", "jig-right"):
        half = state.halves[f"filter {name}.s2p"]
        nominal = load_bench("workshop", 1).fixtures[name].matrix(grid)  # in closed form, at any frequency
        assert np.max(np.abs(half.matrix - nominal)) < 1e-5
        data = w.job.plan.procedure.fixtures[f"{name}.s2p"]
        assert not np.array_equal(data.f_hz, grid)


def test_a_half_on_the_grid_itself_is_taken_as_it_is(workplace):
    fixture = workplace().job.plan.procedure.fixtures["jig-left.s2p"]
    same = on_grid(fixture, fixture.f_hz)
    for ours, theirs in zip(same.planes, fixture.two_port.planes, strict=True):
        np.testing.assert_array_equal(ours, theirs)
    with pytest.raises(InvalidMeasurement, match="does not reach over the sweep"):
        on_grid(fixture, np.array([1e6, 2e9]))


@pytest.mark.parametrize(
    ("off", "words"), [(1e-6, "differs from scikit-rf's by 1.00e-06"), (np.nan, "by nan")]
)
def test_another_opinion_than_scikit_rf_is_invalid(workplace, off, words):
    w = workplace()
    w.run()
    state, kept = state_of(w)
    honest = state.calibrations["plane"].examiner

    def falsified(raw):
        found = honest(raw)
        return TwoPort(found.s11, found.s12, found.s21 + off, found.s22)

    state.calibrations["plane"] = replace(state.calibrations["plane"], examiner=falsified)
    before = dict(state.agreements)
    sweep = next(s for s in w.job.plan.sequence.model.steps if s.name == "in-jig")
    with pytest.raises(InvalidMeasurement, match=words) as caught:
        apply(sweep, state, kept["in-jig"])
    assert f"at most {AGREEMENT:.0e} is allowed" in str(caught.value)
    assert "keep the record and report it" in caught.value.advice
    assert all(np.isfinite(value) for value in state.agreements.values()), "or no record could hold it"
    assert state.agreements["in-jig"] == pytest.approx(
        off if np.isfinite(off) else before["in-jig"], rel=1e-6
    )


def test_a_reading_that_is_missing_is_a_key_error(workplace):
    w = workplace()
    w.run()
    state, kept = state_of(w)
    del kept["in-jig"]
    with pytest.raises(KeyError, match="jig-left, unit, jig-right"):
        evaluate(w.job.plan.procedure, kept)
    assert state.conclusion.value == "pass"
