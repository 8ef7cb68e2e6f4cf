"""Every calibration method in a whole rehearsal: the result is the simulated truth, and the audit stands."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.evaluate.chain import evaluate
from benchrun.evaluate.readings import decode
from benchrun.record.keys import KeyStore
from benchrun.record.verify import verify
from benchrun.rf.calibration import METHODS

PAD = """\
sequence: pad
edition: 1
title: Pad by one method
unit:
  part: pad
  serial: "[A-Z]{2}-[0-9]{4}"
  withstands: {power: 24 dBm}
sweeps:
  near: {from: 115 MHz, to: 880 MHz, points: 52, bandwidth: 1 kHz, power: -10 dBm}
steps:
  - calibrate: {as: plane, sweep: near, method: METHOD, kit: n50-workshop}
  - sweep: {as: unit, with: plane}
  - judge:
      from: unit
      limits:
        - {figure: return loss, port: 1, over: 150 MHz to 850 MHz, at least: 0 dB}
"""
"""115 MHz to 880 MHz is where the kit's line is between 20 and 160 degrees long."""
NORMALIZED = {False: 0.15, True: 0.02}
"""What a normalization leaves, without and with isolation: it corrects no match."""


def again(w):
    """The chain on the readings kept in the record, for the uncertainty that goes with the result."""
    record = verify(w.records[-1], KeyStore()).record
    kept = {}
    for entry in record.payload.readings:
        raw = decode(record.content(entry.file), entry.file)
        kept.setdefault(entry.step, {})[entry.hookup] = raw
    return evaluate(w.job.plan.procedure, kept)


CASES = [(method, False, 1) for method in METHODS]
CASES += [(method, True, 4) for method in METHODS if METHODS[method].two_port]


@pytest.mark.parametrize(("method", "isolation", "seed"), CASES)
def test_each_method_finds_the_truth_and_its_audit_stands(workplace, method, isolation, seed):
    text = PAD.replace("METHOD", f"{method}, isolation: true" if isolation else method)
    ports = 2 if METHODS[method].two_port else 1
    if ports == 1:
        text = text.replace("unit:\n", "unit:\n  ports: 1\n", 1)
    w = workplace(text, units=("PD-0001" if ports == 2 else "WA-0001",), seed=seed)
    answer = w.run()
    assert answer.code == 0, answer.document
    assert answer.err == "", "nothing that scikit-rf has to say on the way reaches people"
    assert w.audit(w.records[-1]).code == 0
    state = again(w)
    assert max(state.agreements.values()) < 1e-9
    network = state.networks["unit"]
    truth = w.rehearsal.bench.world.truth(network.f_hz)[:, :ports, :ports]
    off = np.abs(network.matrix - truth)
    if method == "response":
        assert network.varied is None
        assert np.max(off) < NORMALIZED[isolation]
        return
    for row in range(ports):
        for column in range(ports):
            expanded = network.expanded(f"S{row + 1}{column + 1}")
            assert np.all(off[:, row, column] <= expanded), np.max(off[:, row, column] / expanded)


def test_nothing_is_concluded_where_no_line_is_long_enough(workplace):
    text = PAD.replace("METHOD", "TRL").replace("from: 115 MHz", "from: 50 MHz")
    answer = workplace(text, units=("PD-0001",)).run()
    assert answer.code == 3
    assert "between 20 and 160 degrees longer than the thru" in answer.document["reason"]
