"""Measured parts through simulated errors, calibration and correction: they come back within noise.

Correction is scikit-rf's (12-term SOLT, one-port SOL), so that neither side of this project examines itself.
Data: ../shared/data, each set with its source and licence beside it.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
import pyvisa
import skrf
import yaml
from skrf.calibration import OnePort, TwelveTerm

import sim_instruments
from sim_instruments.bench import load_bench
from sim_instruments.doors.visa import simulated_visa
from sim_instruments.draws import Draws
from sim_instruments.instruments.receivers import Receivers
from sim_instruments.parts.measured import measured, read_file
from sim_instruments.waves import both, thru

DATA = Path(__file__).parents[3] / "shared" / "data"
SPEC: dict[str, Any] = {
    "directivity": "28 dB", "source match": "22 dB", "load match": "24 dB", "isolation": "300 dB",
    "tracking": "0.6 dB", "cable": {"delay": "4.9 ns", "loss": "0.9 dB", "drift": 0}, "noise": "-152 dBm",
    "trace noise": "0.0015 dB",
}  # fmt: skip
BANDWIDTH_HZ, POWER_DBM = 10.0, -10.0
TRACE = (10 ** (0.0015 / 20) - 1) * np.sqrt(BANDWIDTH_HZ / 1e3)
"""Relative noise of one reading, 1.7e-5: what SPEC and the bandwidth make of it."""
TWO_PORTS = ("attenuator_solt/direct_reading_1.s2p", "filter_bandpass/bandpass_915.s2p",
             "ieee370_nzc/true_dut.s2p")  # fmt: skip


def _file(name: str) -> Path:
    path = DATA / name
    if not path.exists():
        pytest.skip(f"open data {name} is not beside the checkout")
    return path


def _network(f_hz: np.ndarray, s: np.ndarray) -> skrf.Network:
    return skrf.Network(f=f_hz, s=s, z0=50.0, f_unit="Hz")


def _reflects(count: int) -> list[np.ndarray]:
    planes = [np.full(count, gamma, np.complex128) for gamma in (-1.0, 1.0, 0.0)]
    return [both(plane, plane) for plane in planes]


@pytest.mark.parametrize("name", TWO_PORTS)
def test_a_measured_two_port_comes_back_within_noise(name: str) -> None:
    """Perfect hands and known standards: what is left is noise of this reading and of the calibration's."""
    f_hz, truth = read_file(_file(name))
    part = measured({"file": str(_file(name))}, Draws(1))
    receivers = Receivers(SPEC, Draws(3))

    def read(device: np.ndarray) -> np.ndarray:
        raw = receivers.raw(f_hz, device, 23.0)
        return receivers.noisy(raw, BANDWIDTH_HZ, POWER_DBM, 1)

    ideal = [*_reflects(len(f_hz)), thru(len(f_hz))]
    calibration = TwelveTerm(
        [_network(f_hz, read(s)) for s in ideal], [_network(f_hz, s) for s in ideal], n_thrus=1
    )
    raw = read(part.matrix(f_hz))
    corrected = calibration.apply_cal(_network(f_hz, raw)).s
    off = abs(corrected - truth)
    # Reflections: noise of a full reading, of the three standards and over the tracking; transmissions in
    # proportion, over a floor of -132 dB that cables and tracking lift by some decibels.
    assert np.max(off[:, [0, 1], [0, 1]]) < 15 * TRACE
    across = off[:, [1, 0], [0, 1]]
    assert np.max(across / (15 * TRACE * abs(truth[:, [1, 0], [0, 1]]) + 1e-5)) < 1
    assert np.sqrt(np.mean(off**2)) < 3 * TRACE
    assert np.max(abs(raw - truth)) > 1000 * TRACE  # the errors were there


def test_a_measured_antenna_comes_back_within_noise() -> None:
    """One port, short, open and load."""
    f_hz, truth = read_file(_file("antenna_oneport/ref_antenna.s1p"))
    part = measured({"file": str(_file("antenna_oneport/ref_antenna.s1p"))}, Draws(1))
    receivers = Receivers(SPEC, Draws(3))
    free = np.zeros(len(f_hz), np.complex128)

    def read(gamma: np.ndarray) -> np.ndarray:
        raw = receivers.raw(f_hz, both(gamma, free), 23.0)
        return receivers.noisy(raw, BANDWIDTH_HZ, POWER_DBM, 1)[:, :1, :1]

    ideal = [s[:, :1, :1] for s in _reflects(len(f_hz))]
    calibration = OnePort(
        [_network(f_hz, read(s[:, 0, 0])) for s in ideal], [_network(f_hz, s) for s in ideal]
    )
    raw = read(part.matrix(f_hz)[:, 0, 0])
    off = abs(calibration.apply_cal(_network(f_hz, raw)).s - truth)
    assert np.max(off) < 15 * TRACE
    assert np.max(abs(raw - truth)) > 1000 * TRACE


@pytest.mark.slow
def test_a_measured_attenuator_comes_back_over_the_whole_bench(tmp_path: Path) -> None:
    """A bench file, hands that connect anew each time, SCPI over PyVISA: within what connections repeat."""
    path = _file("attenuator_solt/direct_reading_1.s2p")
    folder = Path(sim_instruments.__file__).parent / "benches"
    spec = yaml.safe_load((folder / "workshop.yaml").read_text(encoding="utf-8"))
    spec["units"] = {"attenuator": {"serial": "AT-1", "design": {"kind": "measured", "file": str(path)}}}
    (tmp_path / "measured.yaml").write_text(yaml.safe_dump(spec), encoding="utf-8")
    bench = load_bench(str(tmp_path / "measured.yaml"), 1)
    bench.world.offer("AT-1")
    f_hz, truth = read_file(path)
    f_hz, truth = f_hz[f_hz < 6e9], truth[f_hz < 6e9]
    manager = pyvisa.ResourceManager(simulated_visa(bench.world, bench.instruments))
    session: Any = manager.open_resource("GPIB0::16::INSTR", read_termination="\n", write_termination="\n")
    session.write(f"*RST;:FORM REAL,64;:OUTP ON;:BAND 10;:LIST:FREQ {','.join(map(repr, f_hz.tolist()))}")
    session.write("FREQ:MODE LIST")

    def read(*links: tuple[list[str], list[int]]) -> np.ndarray:
        bench.world.connect(links)
        session.query("INIT;*OPC?")
        flat = session.query_binary_values("TRAC? MATRIX", "d", is_big_endian=True, container=np.array)
        pairs = flat.reshape(len(f_hz), 4, 2)
        rows = pairs[..., 0] + 1j * pairs[..., 1]  # S11 S21 S12 S22
        return np.asarray(rows.reshape(len(f_hz), 2, 2).transpose(0, 2, 1))

    seen, ideal = [], []
    for name in ("short", "open", "load"):
        seen.append(_network(f_hz, read(([name], [1]), ([name], [2]))))
        gamma = bench.world.part(name).matrix(f_hz)[:, 0, 0]
        ideal.append(_network(f_hz, both(gamma, gamma)))
    seen.append(_network(f_hz, read((["thru"], [1, 2]))))
    ideal.append(_network(f_hz, bench.world.part("thru").matrix(f_hz)))
    calibration = TwelveTerm(seen, ideal, n_thrus=1)
    off = abs(calibration.apply_cal(_network(f_hz, read((["unit"], [1, 2])))).s - truth)
    assert session.query("SYST:ERR?").startswith("0,")
    ghz = f_hz / 1e9
    # Five or six joints of 4e-4 times GHz each, cut at two sigma, and drift of cables over minutes.
    assert np.max(np.max(off[:, [0, 1], [0, 1]], axis=1) / (1e-3 + 5e-3 * ghz)) < 1
    assert np.max(off[:, 1, 0] / (abs(truth[:, 1, 0]) * (1e-3 + 5e-3 * ghz))) < 1
    assert np.max(abs(seen[-1].s[:, 1, 0] - ideal[-1].s[:, 1, 0])) > 0.3  # cables and errors were there
