"""Records that were written by earlier versions stay readable and verifiable, byte for byte."""

from __future__ import annotations

from pathlib import Path

import pytest

from benchrun.record.keys import KeyStore
from benchrun.record.verify import verify

FROZEN = Path(__file__).parent / "frozen"
RECORDS = sorted(path.name for path in FROZEN.glob("run-v*"))


@pytest.mark.parametrize("name", RECORDS)
def test_frozen_record_is_verified(store: KeyStore, name: str) -> None:
    """Its key is trusted for this test as an auditor would trust it."""
    key = store.trust((FROZEN / name / "public-key.pem").read_bytes(), "RFC 8032, test 1", "rehearsal")
    assert verify(FROZEN / name, store).keys == (key,)


def test_version_1_says_what_it_said(store: KeyStore) -> None:
    """Each part of the payload, as the script beside it wrote it."""
    store.trust((FROZEN / "run-v1" / "public-key.pem").read_bytes(), "RFC 8032, test 1", "rehearsal")
    payload = verify(FROZEN / "run-v1", store).record.payload
    assert (payload.sequence.name, payload.unit.serial) == ("harmonic-filter", "HF-0001")
    assert (payload.conclusion, payload.origin, payload.seed) == ("pass", "simulated", 7)
    assert (payload.figures[0].value, payload.figures[0].at_hz, payload.figures[0].risk) == (
        0.31,
        171e6,
        1.5e-6,
    )
    assert (payload.readings[0].file, payload.readings[0].taken_s) == ("raw/unit.s2p", 3.0)
    assert (payload.results[0].kind, payload.agreements[0].difference) == ("corrected", 2.5e-15)
    assert payload.residual_seed == 11
    assert payload.files == ("inputs/sequence.yaml", "raw/unit.s2p", "results/raw.s2p")
