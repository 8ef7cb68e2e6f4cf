"""The whole chain on real one-port readings: an antenna in the open, with its standards.

Data: shared/data/antenna_oneport. The corrected result there comes from an unrelated C program (difference to
scikit-rf's by its README: 9e-8 at most).
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest

from benchrun.cli.main import _main
from benchrun.rf.touchstone import read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "antenna_oneport"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

SEQUENCE = """
sequence: whip
edition: 1
title: Antenna in the open
unit: {part: antenna, serial: "AN-[0-9]{4}", ports: 1, withstands: {power: 20 dBm}}
sweeps:
  band: {at: [GRID], bandwidth: 1 kHz, power: -10 dBm}
steps:
  - calibrate: {as: plane, sweep: band, method: SOL, kit: kit.yaml}
  - sweep: {as: antenna, with: plane}
  - judge:
      from: antenna
      rule: simple
      limits:
        - {figure: VSWR, at: 75.2 MHz, at most: 1.5}
        - {figure: return loss, over: 60 MHz to 100 MHz, at least: 10 dB}
"""
OFFSET = "offset: {delay: 33 ps, loss: 2.3 Gohm/s, impedance: 50 ohm}"
KIT = f"""
kit: field
edition: 1
title: Standards as the source describes them
frequency: 1 MHz to 1 GHz
standards:
  short: {{kind: short, {OFFSET}}}
  open: {{kind: open, capacitance: {{C0: 0 F}}, {OFFSET}}}
  load: {{kind: load, resistance: 49.8 ohm, {OFFSET}}}
"""
BENCH = """
bench: readings
edition: 1
title: Recorded readings
rehearsal: recorded.yaml
instruments:
  analyzer: {resource: "GPIB0::5::INSTR", dialect: whole-matrix}
"""
RECORDED = """
items:
  short: {kind: standard, standard: short}
  open: {kind: standard, standard: open}
  load: {kind: standard, standard: load}
units:
  antenna:
    serial: "AN-[0-9]{4}"
    design: {kind: antenna, resonance: 84 MHz, q: 4, radiation: 60}
    known: {AN-0001: {says: as read}}
instruments:
  GPIB0::5::INSTR:
    kind: recorded readings
    readings:
      short on port 1: FOLDER/raw_short.s1p
      open on port 1: FOLDER/raw_open.s1p
      load on port 1: FOLDER/raw_match.s1p
      unit on port 1: FOLDER/raw_antenna.s1p
"""


def test_one_port_run_agrees_with_another_program(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("BENCHRUN_HOME", str(tmp_path / "home"))
    raw = read((FOLDER / "raw_antenna.s1p").read_bytes(), "raw_antenna.s1p")
    grid = ", ".join(f"{float(f)!r} Hz" for f in raw.f_hz)
    (tmp_path / "whip.yaml").write_text(SEQUENCE.replace("GRID", grid))
    (tmp_path / "kit.yaml").write_text(KIT)
    (tmp_path / "bench.yaml").write_text(BENCH)
    (tmp_path / "recorded.yaml").write_text(RECORDED.replace("FOLDER", str(FOLDER)))
    code = _main(
        ["rehearse", str(tmp_path / "whip.yaml"), "--bench", str(tmp_path / "bench.yaml"),
         "--records", str(tmp_path / "records"), "--json"]
    )  # fmt: skip
    answer = json.loads(capsys.readouterr().out)
    assert (code, answer["conclusion"]) == (0, "pass"), answer
    record = Path(answer["record"])
    corrected = read((record / "corrected" / "antenna.s1p").read_bytes(), "antenna.s1p")
    outside = read((FOLDER / "other_program_antenna.s1p").read_bytes(), "other_program_antenna.s1p")
    assert np.max(np.abs(corrected.s - outside.s)) < 1.5e-7
    assert np.max(np.abs(raw.s - outside.s)) > 0.1  # uncorrected it is far off
    vswr, return_loss = answer["figures"]
    # The README's table: SWR 1.407 at 75.2 MHz, |S11| minimum of -16.18 dB; the band's worst is at 60 MHz.
    assert vswr["value"] == pytest.approx(1.407, abs=5e-4)
    assert return_loss["value"] > 10
    assert _main(["audit", str(record)]) == 0
