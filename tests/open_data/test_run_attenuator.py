"""The whole chain on real readings: a 20 dB attenuator behind two cables, from prompts to a signed record.

Data: shared/data/attenuator_solt (its README gives the figures). The reference result there was computed by
scikit-rf 2.2.0 and again by separate code; the truth is the attenuator read straight at the analyzer's ports.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from benchrun.cli.main import _main
from benchrun.rf.figures.band import decibels
from benchrun.rf.touchstone import read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "attenuator_solt"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

SEQUENCE = """
sequence: attenuator
edition: 1
title: Attenuator between two cables
unit: {part: 20 dB attenuator, serial: "AT-[0-9]{4}", withstands: {power: 20 dBm}}
sweeps:
  wide: {from: 45 MHz, to: 20 GHz, points: 201, bandwidth: 1 kHz, power: -10 dBm}
steps:
  - calibrate: {as: plane, sweep: wide, method: SOLT, kit: ideal.yaml}
  - sweep: {as: attenuator, with: plane}
  - judge:
      from: attenuator
      rule: {guard band: 1 U}
      limits:
        - {figure: insertion loss, over: 100 MHz to 5 GHz, at least: 19 dB, at most: 21 dB}
"""
KIT = """
kit: ideal
edition: 1
title: Standards taken as ideal
frequency: 1 MHz to 20 GHz
standards:
  short: {kind: short}
  open: {kind: open, capacitance: {C0: 0 F}}
  load: {kind: load}
  thru: {kind: thru}
"""
BENCH = """
bench: readings
edition: 1
title: Recorded readings
rehearsal: recorded.yaml
instruments:
  analyzer: {resource: "GPIB0::5::INSTR", dialect: whole-matrix, identity: {maker: RECORDED}}
uncertainty:
  residual: {directivity: 35 dB, source match: 30 dB, load match: 30 dB, transmission tracking: 0.1 dB,
             reflection tracking: 0.1 dB}
"""
RECORDED = """
items:
  short: {kind: standard, standard: short}
  open: {kind: standard, standard: open}
  load: {kind: standard, standard: load}
  thru: {kind: standard, standard: thru}
units:
  attenuator: {serial: "AT-[0-9]{4}", design: {kind: pad, loss: 20 dB}, known: {AT-0001: {says: as read}}}
instruments:
  GPIB0::5::INSTR:
    kind: recorded readings
    readings:
      short on port 1: FOLDER/raw_short_port1.s2p
      open on port 1: FOLDER/raw_open_port1.s2p
      load on port 1: FOLDER/raw_match_port1.s2p
      short on port 2: FOLDER/raw_short_port2.s2p
      open on port 2: FOLDER/raw_open_port2.s2p
      load on port 2: FOLDER/raw_match_port2.s2p
      thru from port 1 to port 2: FOLDER/raw_thru.s2p
      unit from port 1 to port 2: FOLDER/dut_raw.s2p
"""


@pytest.fixture
def bench(tmp_path: Path) -> Path:
    (tmp_path / "attenuator.yaml").write_text(SEQUENCE)
    (tmp_path / "ideal.yaml").write_text(KIT)
    (tmp_path / "bench.yaml").write_text(BENCH)
    (tmp_path / "recorded.yaml").write_text(RECORDED.replace("FOLDER", str(FOLDER)))
    return tmp_path


def rehearse(folder: Path, *more: str) -> int:
    return _main(
        ["rehearse", str(folder / "attenuator.yaml"), "--bench", str(folder / "bench.yaml"),
         "--records", str(folder / "records"), "--json", *more]
    )  # fmt: skip


def test_whole_run_on_real_readings(
    bench: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("BENCHRUN_HOME", str(bench / "home"))
    code = rehearse(bench)
    answer = json.loads(capsys.readouterr().out)
    assert (code, answer["conclusion"], answer["simulated"]) == (0, "pass", True), answer
    record = Path(answer["record"])
    corrected = read((record / "corrected" / "attenuator.s2p").read_bytes(), "attenuator.s2p")
    reference = read((FOLDER / "ref_dut_solt.s2p").read_bytes(), "ref_dut_solt.s2p")
    assert np.max(np.abs(corrected.s - reference.s)) < 1e-8
    direct = read((FOLDER / "direct_reading_1.s2p").read_bytes(), "direct_reading_1.s2p")
    raw = read((FOLDER / "dut_raw.s2p").read_bytes(), "dut_raw.s2p")
    inside = (corrected.f_hz >= 0.1e9) & (corrected.f_hz <= 5e9)

    def off(data: np.ndarray[tuple[int, ...], np.dtype[np.complex128]]) -> float:
        return float(np.max(np.abs(decibels(data[inside, 1, 0]) - decibels(direct.s[inside, 1, 0]))))

    assert off(corrected.s) < 0.35
    assert off(raw.s) > 3.0  # the cables are in it: without the correction the test would mean nothing
    assert _main(["audit", str(record)]) == 0
    payload = (record / "envelope.json").read_text()
    assert "recorded" in capsys.readouterr().out
    assert payload


def test_another_grid_than_recorded_is_invalid(
    bench: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("BENCHRUN_HOME", str(bench / "home"))
    (bench / "attenuator.yaml").write_text(SEQUENCE.replace("points: 201", "points: 101"))
    assert rehearse(bench) == 3
    answer = json.loads(capsys.readouterr().out)
    assert answer["conclusion"] == "invalid"
    assert "-221" in answer["reason"]
    assert "recorded was 201 points" in answer["reason"]
