"""Every calibration method in a whole rehearsal: the result is the simulated truth, and the audit stands."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.errors import InputError
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


def test_a_sweep_that_no_line_serves_is_refused_before_anything_is_connected(workplace):
    text = PAD.replace("METHOD", "TRL").replace("from: 115 MHz", "from: 50 MHz")
    with pytest.raises(InputError, match="no line is 20 to 160 degrees longer than the thru") as caught:
        workplace(text)
    assert "at 4 of 52 points between 50 MHz and 98.82 MHz" in str(caught.value)
    assert "line with 9.1 degrees at 50 MHz" in str(caught.value)


def test_the_record_says_what_the_calibration_depends_on(workplace):
    w = workplace(PAD.replace("METHOD", "SOLT"), units=("PD-0001", "PD-0002"))
    assert w.run().code == 0
    first, second = (verify(record, KeyStore()).record.payload for record in w.records)
    (one,), (two,) = first.calibrations, second.calibrations
    assert (one.method, one.kit, one.kit_serial) == ("SOLT", "n50-workshop", "KN-014")
    assert one.kit_due == "2031-06-30"
    assert (one.from_hz, one.to_hz, one.points, one.spacing) == (115e6, 880e6, 52, "linear")
    assert (one.bandwidth_hz, one.power_dbm, one.averages, one.ports) == (1e3, -10.0, 1, (1, 2))
    assert one.analyzer == first.instruments[0].identity
    assert one.cables == ("phase-stable cable 1 on port 1", "phase-stable cable 2 on port 2")
    assert (one.operator, one.overruled) == ("tester", "")
    # The second unit was read under the same calibration, made before its own run began.
    assert one.made_s > 0 > two.made_s
