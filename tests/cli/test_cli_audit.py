"""``benchrun audit`` on a real rehearsed record, whole and spoiled; and ``keys`` beside it."""

from __future__ import annotations

import base64
import json
import shutil
from pathlib import Path

import pytest

from benchrun.record.envelope import Envelope, sign
from benchrun.record.keys import KeyStore

FILES = (
    "corrected/in-jig.s2p", "de-embedded/filter.s2p", "envelope.json", "environment.json",
    "inputs/bench.yaml",
    "inputs/fixture-jig-left.s2p", "inputs/fixture-jig-right.s2p", "inputs/kit-n50-workshop.yaml",
    "inputs/sequence.yaml", "journal.jsonl", "public-key.pem", "raw/01-plane-short-on-port-1.s2p",
    "raw/02-plane-open-on-port-1.s2p", "raw/03-plane-load-on-port-1.s2p", "raw/04-plane-short-on-port-2.s2p",
    "raw/05-plane-open-on-port-2.s2p", "raw/06-plane-load-on-port-2.s2p",
    "raw/07-plane-thru-from-port-1-to-port-2.s2p",
    "raw/08-in-jig-jig-left-unit-jig-right-from-port-1-to-port-2.s2p", "transcript.jsonl",
)  # fmt: skip


@pytest.fixture
def record(cli) -> Path:
    return Path(cli("rehearse", "filter.yaml", "--json").document["record"])


def test_record_stands(cli, record):
    assert sorted(str(p.relative_to(record)) for p in record.rglob("*") if p.is_file()) == sorted(FILES)
    answer = cli("audit", str(record))
    assert (answer.code, answer.err) == (0, "")
    lines = answer.out.splitlines()
    assert lines[0] == f"{record}: stands. small-filter on HF-0001: pass"
    for words in ("signed by rehearsal key of this place", "securesystemslib accepts the envelope too",
                  f"{len(FILES) - 1} files are the ones that were signed", "origin: simulated",
                  "conclusion pass, 3 figures, 2 result files, all as recorded"):  # fmt: skip
        assert any(words in line for line in lines), words


def test_one_byte_of_any_file_is_enough(cli, record):
    for name in FILES:
        path = record / name
        before = path.read_bytes()
        for place in (0, len(before) // 2, len(before) - 1):
            spoiled = bytearray(before)
            spoiled[place] ^= 0x01
            path.write_bytes(bytes(spoiled))
            answer = cli("audit", str(record))
            assert (answer.code, answer.out) == (5, ""), (name, place)
            assert answer.err.startswith(f"{record}: does not stand\n")
            assert Path(name).name in answer.err, (name, answer.err)
        path.write_bytes(before)
    assert cli("audit", str(record)).code == 0


@pytest.mark.parametrize("name", FILES)
def test_a_file_that_is_gone(cli, record, name):
    (record / name).unlink()
    answer = cli("audit", str(record))
    assert answer.code == 5
    assert Path(name).name in answer.err


def test_a_file_too_many(cli, record):
    (record / "raw" / "09-more.s2p").write_text("x")
    answer = cli("audit", str(record))
    assert answer.code == 5
    assert "09-more.s2p" in answer.err


def test_several_records_are_all_checked(cli, record, tmp_path):
    other = tmp_path / "other"
    shutil.copytree(record, other)
    (other / "journal.jsonl").write_text("")
    answer = cli("audit", "nowhere", str(other), str(record))
    assert answer.code == 5
    assert "nowhere is no folder, so it is no record" in answer.err
    assert "journal.jsonl" in answer.err
    assert answer.out.startswith(f"{record}: stands.")


def test_a_key_that_is_not_trusted_here(cli, record, monkeypatch, tmp_path):
    pem = cli("keys", "export", "rehearsal").out
    monkeypatch.setenv("BENCHRUN_HOME", str(tmp_path / "elsewhere"))
    answer = cli("audit", str(record))
    assert answer.code == 5
    assert "trust" in answer.err
    (tmp_path / "key.pem").write_text(pem)
    assert cli("keys", "trust", "key.pem", "--label", "the workshop", "--rehearsal").code == 0
    assert "signed by the workshop (rehearsal key" in cli("audit", str(record)).out
    listed = cli("keys", "list").out
    assert "the workshop" in listed
    key = next(line.split()[-4] for line in listed.splitlines() if "the workshop" in line)
    assert cli("keys", "distrust", key).code == 0
    assert cli("audit", str(record)).code == 5


def test_a_rehearsal_cannot_pass_as_measured(cli, record):
    """Somebody with a bench key signs the rehearsal's payload anew with another origin."""
    assert cli("keys", "make", "mine").code == 0
    signer = KeyStore().signer("mine")
    body = json.loads((record / "envelope.json").read_text())
    payload = base64.b64decode(body["payload"])
    for forged in (payload, payload.replace(b'"origin":"simulated"', b'"origin":"measured"')):
        envelope = sign(forged, [signer])
        assert isinstance(envelope, Envelope)
        (record / "envelope.json").write_bytes(envelope.to_json())
        (record / "public-key.pem").write_bytes(signer.public_key.pem)
        answer = cli("audit", str(record))
        assert answer.code == 5, answer.out


def test_keys_are_made_and_listed(cli):
    assert "none; the rehearsal key is made on first use" in cli("keys", "list").out
    made = cli("keys", "make", "bench-1")
    assert (made.code, made.err) == (0, "")
    assert "made key bench-1, id " in made.out
    again = cli("keys", "make", "bench-1")
    assert again.code == 2
    assert "there is a key 'bench-1' already; choose another name" in again.err
    listed = cli("keys", "list").out
    assert "bench-1" in listed
    assert "signs bench runs" in listed


def test_a_protected_key(cli, monkeypatch):
    monkeypatch.setenv("BENCHRUN_PASSPHRASE", "correct horse")
    assert cli("keys", "make", "safe", "--protect").code == 0
    assert "with passphrase" in cli("keys", "list").out
