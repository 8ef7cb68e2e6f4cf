"""A record is verified by openssl alone, with the very lines that the README shows."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
from pathlib import Path

import pytest

from benchrun.record.openssl_lines import LINES
from benchrun.record.signer import FileSigner


def _missing() -> str:
    if missing := [tool for tool in ("sh", "openssl", "sed", "xargs", "diff") if not shutil.which(tool)]:
        return f"{', '.join(missing)} is not installed"
    said = subprocess.run(["openssl", "version"], capture_output=True, text=True, check=False).stdout
    found = re.match(r"OpenSSL (\d+)\.", said)
    return "" if found and int(found[1]) >= 3 else f"needs openssl 3.0 or later, found {said.strip()!r}"


pytestmark = pytest.mark.skipif(bool(_missing()), reason=_missing() or "never")


def run_lines(record: Path, tmp_path: Path) -> subprocess.CompletedProcess[str]:
    work = tmp_path / "work"
    work.mkdir(exist_ok=True)
    env = {"PATH": os.environ["PATH"], "RECORD": str(record), "TMPDIR": str(work)}
    return subprocess.run(["sh", "-c", LINES], env=env, capture_output=True, text=True, check=False)


def test_good_record_is_verified(record: Path, tmp_path: Path, rehearsal: FileSigner) -> None:
    """Signature, key id and all files; the record itself is left as it is."""
    before = sorted(record.rglob("*"))
    done = run_lines(record, tmp_path)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines() == [
        "Signature Verified Successfully",
        f"{rehearsal.key_id} *stdin",
        "All files fit",
    ]
    assert sorted(record.rglob("*")) == before


def test_changed_payload_is_found(record: Path, tmp_path: Path) -> None:
    """One letter of the signed text."""
    path = record / "envelope.json"
    path.write_text(path.read_text().replace('"payload": "ewog', '"payload": "ewoh'))
    done = run_lines(record, tmp_path)
    assert "Signature Verified Successfully" not in done.stdout
    assert "Signature Verification Failure" in done.stdout + done.stderr


def test_changed_file_is_found(record: Path, tmp_path: Path) -> None:
    """One byte of a reading."""
    (record / "raw/unit.s2p").write_bytes(b"#" + (record / "raw/unit.s2p").read_bytes()[1:-1] + b" ")
    done = run_lines(record, tmp_path)
    assert done.returncode != 0
    assert "All files fit" not in done.stdout
    assert "raw/unit.s2p" in done.stdout
