"""What is installed with the package fits together."""

from __future__ import annotations

import datetime
from pathlib import Path

import numpy as np
import pytest

from benchrun.engine.plan import check_file
from benchrun.paths import installed_sequences
from benchrun.rf.touchstone import read, write
from benchrun.rf.twoport import TwoPort
from sim_instruments.bench import load_bench

FOLDER = installed_sequences()
FILES = sorted(FOLDER.rglob("*.yaml"))
GRID = np.concatenate([[1e6], np.arange(5e6, 1.5e9 + 1, 5e6)])


@pytest.mark.parametrize("path", FILES, ids=[str(p.relative_to(FOLDER)) for p in FILES])
def test_installed_files_have_no_problem(path: Path) -> None:
    assert check_file(path, datetime.date(2026, 12, 1)) == []


def test_all_kinds_are_installed() -> None:
    assert {p.parent.name for p in FILES} >= {"kits", "masks", "benches"}
    assert (FOLDER / "harmonic-filter.yaml").is_file()


@pytest.mark.parametrize("name", ["jig-left", "jig-right"])
def test_fixture_files_are_the_nominal_jig(name: str) -> None:
    data = read((FOLDER / "fixtures" / f"{name}.s2p").read_bytes(), f"{name}.s2p")
    nominal = load_bench("workshop", 1).fixtures[name].matrix(GRID)
    np.testing.assert_allclose(data.f_hz, GRID, rtol=1e-12)
    np.testing.assert_allclose(data.s, nominal, rtol=0, atol=1e-12)
    assert read(write(GRID, TwoPort.of(nominal)), f"{name}.s2p").s.shape == data.s.shape


def test_this_specimen_of_the_jig_differs_from_its_file() -> None:
    bench = load_bench("workshop", 1)
    true, nominal = bench.world.items["jig-left"].matrix(GRID), bench.fixtures["jig-left"].matrix(GRID)
    assert 1e-5 < np.max(np.abs(true - nominal)) < 2e-3
