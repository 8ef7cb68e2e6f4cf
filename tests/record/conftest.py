"""What the tests of records share: a small run, a key store, a record made of both."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from benchrun.evaluate.judgement import JudgedFigure
from benchrun.record.draft import Draft
from benchrun.record.keys import KeyStore
from benchrun.record.payload import (
    InstrumentEntry,
    Payload,
    ReadingEntry,
    ResultEntry,
    SequenceEntry,
    UnitEntry,
)
from benchrun.record.signer import FileSigner
from benchrun.record.write import write

FIGURE = JudgedFigure(
    name="insertion loss, 160 MHz to 175 MHz",
    value=0.31,
    unit="dB",
    limit=0.45,
    side="at most",
    margin=0.14,
    uncertainty=0.06,
    at_hz=171e6,
    conclusion="pass",
    rule="guard band 1 U (ILAC-G8:09/2019, 4.2.2)",
    risk=1e-6,
)
FILES = {"raw/unit.s2p": b"# Hz S RI R 50\n1e8 0 0 1 0 1 0 0 0\n", "sequence.yaml": b"sequence: filter\n"}


@pytest.fixture
def draft() -> Callable[..., Draft]:
    """Makes a draft of a rehearsed run with one figure; keywords replace fields of the payload."""

    def make(files: dict[str, bytes] | None = None, **changes: Any) -> Draft:
        origin = changes.get("origin", "simulated")
        about: dict[str, Any] = {
            "sequence": SequenceEntry(name="filter", title="Filter, final test", edition=1),
            "unit": UnitEntry(serial="HF-0001", part="harmonic filter"),
            "conclusion": "pass",
            "figures": (replace(FIGURE),),
            "origin": origin,
            "seed": 7,
            "operator": "rehearsal",
            "bench": "workshop",
            "started_utc": "2026-03-01T12:00:00.000Z",
            "ended_utc": "2026-03-01T12:00:01.500Z",
            "bench_seconds": 93.5,
            "wall_seconds": 1.5,
            "instruments": (
                InstrumentEntry(role="analyzer", resource="SIM", identity="a,b,c,d", origin=origin),
            ),
            "inputs": {"sequence": "sequence.yaml"},
            "readings": (ReadingEntry(step="raw", hookup="unit", file="raw/unit.s2p", taken_s=3.0),),
            "software": {"benchrun": "0.1.0"},
            "plan": "0123",
        }
        return Draft(Payload(**{**about, **changes}), dict(FILES if files is None else files))

    return make


@pytest.fixture
def figure() -> JudgedFigure:
    """The figure of the draft."""
    return replace(FIGURE)


@pytest.fixture
def result_entry() -> ResultEntry:
    """A corrected result."""
    return ResultEntry(step="raw", kind="corrected", file="results/raw.s2p")


@pytest.fixture
def store(tmp_path: Path) -> KeyStore:
    """A key store that is still empty."""
    return KeyStore(tmp_path / "home")


@pytest.fixture
def rehearsal(store: KeyStore) -> FileSigner:
    """The store's rehearsal key."""
    return store.rehearsal()


@pytest.fixture
def record(tmp_path: Path, draft: Callable[..., Draft], rehearsal: FileSigner) -> Path:
    """The folder of a good record."""
    return write(draft(), tmp_path / "records", "HF-0001", rehearsal)
