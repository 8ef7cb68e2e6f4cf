"""A unit whose reading is that of a standard was not connected, and nothing is concluded about it."""

from __future__ import annotations

import datetime
from pathlib import Path

import pytest

from benchrun.engine.job import Job
from benchrun.engine.plan import bench_for, make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.run import run
from benchrun.record.keys import KeyStore


def rehearse(sequence: str, unit: str, folder: Path, *faults: str):
    plan = make_plan(sequence, bench_for(sequence), datetime.date(2026, 12, 1))
    rehearsal, store = prepare_rehearsal(plan.bench, 1, faults), KeyStore(folder / "home")
    job = Job(
        plan=plan,
        units=(unit,),
        operator_name="test",
        hands=rehearsal.hands,
        clock=rehearsal.clock,
        records=folder / "records",
        signer=lambda _: store.rehearsal(),
        sink=lambda _: None,
        library=rehearsal.library,
        seed=1,
    )
    return run(job)[0]


@pytest.mark.parametrize(
    ("sequence", "unit", "fault", "standing"),
    [
        ("whip-antenna", "WA-9001", "connected late@3", "load on port 1"),
        ("whip-antenna", "WA-0001", "connected late@3", "load on port 1"),
        ("harmonic-filter", "HF-9001", "connected late@7", "thru from port 1 to port 2"),
    ],
)
def test_what_is_still_connected_is_named(
    sequence: str, unit: str, fault: str, standing: str, tmp_path: Path
) -> None:
    outcome = rehearse(sequence, unit, tmp_path, fault)
    assert outcome.conclusion.value == "invalid"
    assert outcome.reason == f"The unit reads like {standing!r}, as if that were still connected."


@pytest.mark.parametrize(("sequence", "unit"), [("pad-10db", "PD-0001"), ("jumper-cable", "JC-0001")])
def test_parts_much_like_a_standard_are_not_taken_for_one(sequence: str, unit: str, tmp_path: Path) -> None:
    assert rehearse(sequence, unit, tmp_path).conclusion.value == "pass"
