"""What comes out of the chain agrees with the simulated truth, and an audit finds the very same numbers."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchrun.evaluate.chain import evaluate
from benchrun.record.keys import KeyStore
from benchrun.record.recompute import recompute
from benchrun.record.verify import verify
from benchrun.rf.touchstone import read

NAMES = ("S11", "S21", "S12", "S22")


def parameter(matrix, name):
    return matrix[:, int(name[1]) - 1, int(name[2]) - 1]


def again(w, record: Path):
    """The chain on the readings kept in a record."""
    readings = {}
    for event in w.events:
        if event.name == "reading":
            readings.setdefault(event.step, []).append(event.hookup)
    kept = {}
    files = iter(sorted((record / "raw").iterdir()))
    for step, hookups in readings.items():
        kept[step] = {hookup: read(next(files).read_bytes(), "raw.s2p").two_port for hookup in hookups}
    return evaluate(w.job.plan.procedure, kept)


@pytest.mark.parametrize("bench", ["workshop", "workshop-second"])
@pytest.mark.parametrize("seed", [1, 2, 3, 5, 8, 13])
def test_the_result_agrees_with_the_truth_within_its_uncertainty(workplace, small_filter, bench, seed):
    # The declared noise floor is that of the installed sequence's bandwidth.
    w = workplace(small_filter.replace("bandwidth: 10 kHz", "bandwidth: 1 kHz"), bench=bench, seed=seed)
    assert w.run().code == 0
    state = again(w, w.records[-1])
    filter_, in_jig = state.networks["filter"], state.networks["in-jig"]
    truth = w.rehearsal.bench.world.truth(filter_.f_hz)
    (unit,) = [file for file in (w.records[-1] / "raw").iterdir() if "in-jig" in file.name]
    raw = read(unit.read_bytes(), unit.name).s
    for name in NAMES:
        true = parameter(truth, name)
        expanded = filter_.expanded(name)
        off = np.abs(filter_.plane(name)[0] - true)
        assert np.all(off <= expanded), (name, float(np.max(off / expanded)))
        # The uncertainty is an estimate, not an excuse: a tenth of it would not do.
        assert np.any(off > expanded / 20)
        assert np.max(np.abs(parameter(raw, name) - true) / expanded) > 10
        assert np.max(np.abs(in_jig.plane(name)[0] - true) / in_jig.expanded(name)) > 2, "the jig is in it"


def test_an_audit_finds_the_same_numbers_to_the_last_bit(workplace):
    w = workplace(units=("HF-0001", "HF-9001"))
    w.run()
    for record in w.records:
        verified = verify(record, KeyStore()).record
        found = recompute(verified)
        assert found.conclusion == verified.payload.conclusion
        assert found.figures == verified.payload.figures
        assert {path: verified.content(path) for path in found.results} == dict(found.results)
        assert len(found.results) == 2
