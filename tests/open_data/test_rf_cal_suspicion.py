"""Suspect connections on measured calibrations, as they are and with connections made wrong.

Data: shared/data/attenuator_solt and splitter_onepath. The attenuator's cables are long against the step of
its grid and the splitter's analyzer reads raw, so neither is easy.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchrun.rf.calibration import define
from benchrun.rf.calibration.suspicion import Suspicion, suspect
from benchrun.rf.kit import Kit, Offset, Standard
from benchrun.rf.touchstone import read
from benchrun.rf.twoport import TwoPort

FOLDER = Path(__file__).parents[3] / "shared" / "data"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

NAMES = ("short", "open", "load", "thru")
KIT = Kit("ideal", {n: Standard(n) for n in NAMES})
THRU = "thru from port 1 to port 2"


def load(name: str) -> tuple[np.ndarray, TwoPort]:
    data = read((FOLDER / name).read_bytes(), name)
    return data.f_hz, data.two_port


@pytest.fixture(scope="module")
def attenuator() -> tuple[np.ndarray, dict[str, TwoPort]]:
    files = {"short": "short", "open": "open", "load": "match"}
    readings = {
        f"{n} on port {p}": load(f"attenuator_solt/raw_{file}_port{p}.s2p")[1]
        for p in (1, 2)
        for n, file in files.items()
    }
    f_hz, readings[THRU] = load("attenuator_solt/raw_thru.s2p")
    return f_hz, readings


@pytest.fixture(scope="module")
def splitter() -> tuple[np.ndarray, dict[str, TwoPort]]:
    files = {"short": "short", "open": "open", "load": "match"}
    readings = {f"{n} on port 1": load(f"splitter_onepath/raw_{file}.s2p")[1] for n, file in files.items()}
    f_hz, readings[THRU] = load("splitter_onepath/raw_thru.s2p")
    return f_hz, readings


def doubts(case: tuple[np.ndarray, dict[str, TwoPort]], **swap: str) -> dict[str, Suspicion]:
    f_hz, readings = case
    changed = readings | {one.replace("_", " "): readings[two] for one, two in swap.items()}
    return {s.hookup: s for s in suspect(define(KIT, NAMES, f_hz), changed, f_hz)}


def test_good_calibrations_raise_no_suspicion(attenuator, splitter) -> None:
    assert doubts(attenuator) == {}
    assert doubts(splitter) == {}


@pytest.mark.parametrize("port", [1, 2])
def test_load_and_open_exchanged(attenuator, port: int) -> None:
    swap = {f"load_on_port_{port}": f"open on port {port}", f"open_on_port_{port}": f"load on port {port}"}
    found = doubts(attenuator, **swap)
    assert found[f"load on port {port}"].looks_like == "open"
    assert found[f"open on port {port}"].looks_like == "load"


@pytest.mark.parametrize("port", [1, 2])
def test_short_and_open_exchanged_behind_long_cables(attenuator, port: int) -> None:
    """The port's own phase cannot be followed over 100 MHz steps; the thru tells."""
    swap = {f"short_on_port_{port}": f"open on port {port}", f"open_on_port_{port}": f"short on port {port}"}
    assert "short and open look exchanged" in doubts(attenuator, **swap)[THRU].reason


def test_short_and_open_exchanged_on_raw_readings(splitter) -> None:
    found = doubts(splitter, short_on_port_1="open on port 1", open_on_port_1="short on port 1")
    assert found["short on port 1"].looks_like == "open"
    assert found["open on port 1"].looks_like == "short"


def test_a_short_on_the_wrong_port(attenuator) -> None:
    found = doubts(attenuator, short_on_port_1="short on port 2")["short on port 1"]
    assert "wrong port" in found.reason


def test_a_measured_one_port_calibration_raises_no_sure_suspicion() -> None:
    """Its receiver has a phase of its own, so that a hint is all that may come."""
    offset = Offset(33e-12, 2.3e9)
    kit = Kit(
        "field",
        {
            "short": Standard("short", offset),
            "open": Standard("open", offset),
            "load": Standard("load", offset, resistance_ohm=49.8),
        },
    )
    files, readings = {"short": "short", "open": "open", "load": "match"}, {}
    for name, file in files.items():
        path = f"antenna_oneport/raw_{file}.s1p"
        data = read((FOLDER / path).read_bytes(), path)
        plane, zero = data.s[:, 0, 0], np.zeros(len(data.f_hz), complex)
        readings[f"{name} on port 1"] = TwoPort(plane, zero, zero, zero)
    found = suspect(define(kit, tuple(files), data.f_hz), readings, data.f_hz)
    assert all(s.confidence <= 0.5 for s in found)
