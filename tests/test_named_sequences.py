"""The named sequences prove what they are for: good units pass, bad units do not, on any simulated bench."""

from __future__ import annotations

import datetime
from pathlib import Path

import pytest

from benchrun.engine.plan import bench_for, make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.run import Job, Outcome, run
from benchrun.record.keys import KeyStore
from benchrun.sequence.find import named

DATE = datetime.date(2026, 12, 1)
UNITS = {
    "driver-amplifier": (["DA-0001"], ["DA-8001"], ["DA-9001"]),
    "driver-amplifier-drive": (["DA-0001"], ["DA-8001"], ["DA-9001", "DA-9002"]),
    "harmonic-filter": (["HF-0001", "HF-0002"], ["HF-8001"], ["HF-9001", "HF-9002", "HF-9003", "HF-9004"]),
    "harmonic-filter-design": (["HF-0001", "HF-0002"], [], ["HF-8001", "HF-9001", "HF-9002", "HF-9003"]),
    "jumper-cable": (["JC-0001", "JC-0002"], ["JC-8001"], ["JC-9001", "JC-9002", "JC-9003"]),
    "pad-10db": (["PD-0001", "PD-0002"], ["PD-8001"], ["PD-9001", "PD-9002"]),
    "preselector": (["PS-0001", "PS-0002"], ["PS-8001"], ["PS-9001", "PS-9002"]),
    "whip-antenna": (["WA-0001", "WA-0002"], ["WA-8001"], ["WA-9001", "WA-9002"]),
}
"""Good, marginal and bad units of each sequence, as the simulated workshop has them."""


def rehearse(
    sequence: str, units: list[str], seed: int, folder: Path, bench: str | None = None
) -> dict[str, Outcome]:
    plan = make_plan(sequence, bench or bench_for(sequence), DATE)
    rehearsal, store = prepare_rehearsal(plan.bench, seed), KeyStore(folder / "home")
    outcomes = run(
        Job(
            plan=plan,
            units=tuple(units),
            operator_name="test",
            hands=rehearsal.hands,
            clock=rehearsal.clock,
            records=folder / "records",
            signer=lambda _: store.rehearsal(),
            sink=lambda _: None,
            library=rehearsal.library,
            seed=seed,
        )
    )
    return {outcome.unit: outcome for outcome in outcomes}


def test_every_named_sequence_is_in_the_table() -> None:
    assert {name for name, _ in named("sequence")} == set(UNITS)


@pytest.mark.parametrize("seed", [1, 2, 3])
@pytest.mark.parametrize("sequence", UNITS)
def test_good_units_pass_and_bad_units_fail(sequence: str, seed: int, tmp_path: Path) -> None:
    good, marginal, bad = UNITS[sequence]
    found = rehearse(sequence, [*good, *marginal, *bad], seed, tmp_path)
    concluded = {unit: outcome.conclusion.value for unit, outcome in found.items()}
    assert {unit: concluded[unit] for unit in good} == dict.fromkeys(good, "pass")
    assert {unit: concluded[unit] for unit in bad} == dict.fromkeys(bad, "fail")


@pytest.mark.parametrize("sequence", UNITS)
def test_marginal_units_lie_within_a_few_uncertainties_of_a_limit(sequence: str, tmp_path: Path) -> None:
    units = UNITS[sequence][1]
    for outcome in rehearse(sequence, units, 1, tmp_path).values():
        judged = [f for f in outcome.figures if f.margin is not None and f.uncertainty]
        assert min(abs(f.margin) / f.uncertainty for f in judged) < 3  # type: ignore[operator, type-var]


def test_the_second_bench_concludes_the_same(tmp_path: Path) -> None:
    found = rehearse("harmonic-filter", ["HF-0001", "HF-9001"], 1, tmp_path, "workshop-second")
    assert [o.conclusion.value for o in found.values()] == ["pass", "fail"]
