"""Keeping what was measured when the disk does not want it; names, seeds, and what a record tells."""

from __future__ import annotations

import base64
import errno
import json
import re
import shutil
import tempfile
from datetime import UTC, datetime
from pathlib import Path

import pytest

from benchrun.clock import FunctionClock
from benchrun.errors import InputError, RecordNotWritten
from benchrun.record.keys import KeyStore
from benchrun.record.storage import Disk


class FullDisk(Disk):
    """A disk with no room below some folders."""

    def __init__(self, *full: Path, error: int = errno.ENOSPC, spare: int = 0) -> None:
        self.full, self.error, self.spare = full, error, spare

    def write_file(self, path: Path, content: bytes) -> None:
        if any(folder in path.parents for folder in self.full):
            if self.spare <= 0:
                raise OSError(self.error, "No space left on device", str(path))
            self.spare -= 1
        super().write_file(path, content)


@pytest.fixture
def elsewhere(tmp_path, monkeypatch):
    """The system's temporary folder, for this test."""
    folder = tmp_path / "temporary"
    folder.mkdir()
    monkeypatch.setattr(tempfile, "tempdir", str(folder))
    return folder


def payload(record: Path) -> dict:
    text = json.loads((record / "envelope.json").read_text())["payload"]
    found: dict = json.loads(base64.b64decode(text))["predicate"]
    return found


@pytest.mark.parametrize("spare", [0, 1, 9, 14])
def test_a_full_disk_sends_the_record_elsewhere(workplace, elsewhere, spare):
    w = workplace()
    answer = w.run(storage=FullDisk(w.job.records, spare=spare))
    found = answer.document
    assert (answer.code, found["conclusion"]) == (5, "pass")
    record = Path(found["record"])
    assert record.parents[1] == elsewhere
    assert w.audit(record).code == 0
    assert w.records == [], "nothing half-written stays behind"
    for words in (
        "the disk is full: free some space",
        str(w.job.records),
        str(record),
        "move it to its place",
    ):
        assert words in found["trouble"]
        assert words in answer.err
    assert w.analyzer.output is False


def test_a_disk_that_is_full_everywhere_is_told(workplace, elsewhere, tmp_path):
    w = workplace()
    answer = w.run(storage=FullDisk(tmp_path))
    found = answer.document
    assert (answer.code, found["conclusion"], found["record"]) == (5, "pass", None)
    assert len(found["figures"]) == 3
    assert "the record was not written into" in found["trouble"]
    assert "the disk is full" in answer.err
    assert list(elsewhere.iterdir()) == []
    assert [path.suffix for path in w.records] == [".journal"], "from which the record can still be made"


def test_a_folder_that_went_away_during_the_run(workplace, elsewhere):
    w = workplace()

    def spoil():
        shutil.rmtree(w.job.records)
        w.job.records.write_text("a file now")

    w.mishaps.at("INIT;*OPC?", 8, spoil)
    answer = w.run()
    found = answer.document
    assert answer.code == 5
    assert "a file stands where a folder is needed: give another folder with --records" in found["trouble"]
    assert w.audit(found["record"]).code == 0
    assert Path(found["record"]).is_relative_to(elsewhere)


def test_one_unit_elsewhere_does_not_keep_the_next_from_its_place(workplace, elsewhere):
    w = workplace(units=("HF-0001", "HF-0002"))
    disk = FullDisk(w.job.records)
    w.mishaps.at("INIT;*OPC?", 9, lambda: setattr(disk, "full", ()))
    answer = w.run(storage=disk)
    first, second = answer.document["units"]
    assert answer.code == 5
    assert Path(first["record"]).is_relative_to(elsewhere)
    assert [Path(second["record"])] == [path for path in w.records if path.suffix != ".journal"]
    assert "trouble" not in second
    for one in (first, second):
        assert w.audit(one["record"]).code == 0


def test_records_that_cannot_be_kept_are_found_out_before_anything_is_sent(workplace):
    w = workplace()
    w.job.records.write_text("a file")
    with pytest.raises(RecordNotWritten, match=r"a file stands where a folder is needed") as caught:
        w.run()
    assert caught.value.exit_code == 5
    assert w.mishaps.requests == []


def test_a_key_of_the_wrong_kind_is_told_and_nothing_is_signed_with_it(workplace):
    KeyStore().make("bench-key")
    w = workplace()
    answer = w.run(signer=lambda _: KeyStore().signer("bench-key"))
    assert (answer.code, answer.document["record"]) == (5, None)
    assert "a run that is simulated is signed by a rehearsal key" in answer.document["trouble"]
    assert f"when that is mended: benchrun resume {w.job.records}" in answer.err
    assert [path.suffix for path in w.records] == [".journal"]


def test_without_a_key_nothing_is_set(workplace):
    w = workplace()

    def none(origin):
        raise InputError(f"no key for {origin} runs")

    with pytest.raises(InputError, match="no key for simulated runs"):
        w.run(signer=none)
    assert not any("*RST" in one or "OUTP ON" in one for one in w.mishaps.requests)
    assert w.records == []
    assert w.analyzer.output is False


def test_longest_names_make_a_record(workplace, small_filter):
    text = small_filter.replace("small-filter", "s" * 63).replace("HF-[0-9]{4}", "HF-[0-9a-z]+")
    serial = "HF-" + "a" * 61
    w = workplace(text, units=(serial,))
    # The bench knows no unit of such a name; the record is what matters here.
    w.rehearsal.bench.world.units = lambda _, known=w.rehearsal.bench.world.units: known("HF-0001")
    answer = w.run()
    assert answer.code == 0, answer.err
    (record,) = w.records
    assert len(record.name) <= 120
    assert record.name.endswith(serial)
    assert w.audit(record).code == 0


def test_a_record_tells_what_was_done(workplace):
    w = workplace(seed=7)
    answer = w.run(operator_name="Ada Ö")
    (record,) = w.records
    assert re.fullmatch(r"\d{8}T\d{6}Z-small-filter-HF-0001", record.name)
    found = payload(record)
    assert (found["origin"], found["seed"], found["operator"]) == ("simulated", 7, "Ada Ö")
    assert found["bench"] == "workshop"
    assert found["plan"] == w.job.plan.digest
    assert found["instruments"] == [
        {
            "role": "analyzer",
            "resource": "GPIB0::16::INSTR",
            "identity": "SIMULATED,NA-2,S0016,1.0",
            "origin": "simulated",
        }
    ]
    assert [(one["step"], one["hookup"]) for one in found["readings"]][-1] == (
        "in-jig",
        "jig-left, unit, jig-right from port 1 to port 2",
    )
    assert [one["kind"] for one in found["results"]] == ["corrected", "de-embedded"]
    assert {one["step"] for one in found["agreements"]} == {"plane", "in-jig", "filter"}
    assert all(one["difference"] < 1e-12 for one in found["agreements"])
    assert 300 < found["bench_seconds"] < 600  # nine or so connections of 25 seconds each, and two with a jig
    assert found["wall_seconds"] < 60
    assert [f["name"] for f in found["figures"]] == [f["name"] for f in answer.document["figures"]]
    assert set(found["software"]) >= {"benchrun", "python", "numpy", "scikit-rf", "pyvisa"}
    environment = json.loads((record / "environment.json").read_text())
    assert environment["software"] == found["software"]
    for name, path in found["inputs"].items():
        assert (record / path).is_file(), name


def test_two_runs_within_a_second_get_two_names(workplace):
    w = workplace()
    w.run()
    w.run()
    first, second = w.records
    assert first.name != second.name


def test_a_fault_while_keeping_is_told_and_spares_the_next_unit(workplace):
    w = workplace(units=("HF-0001", "HF-0002"))
    faults = [0, 1, 0, 0]

    def utc():
        if faults.pop(0):
            raise ValueError("no date")
        return datetime(2026, 12, 1, tzinfo=UTC)

    world = w.rehearsal.bench.world
    answer = w.run(clock=FunctionClock(lambda: world.time_s, world.advance, utc))
    first, second = answer.document["units"]
    assert answer.code == 5
    assert first["record"] is None
    said = "the record was not written, by a fault of the program: ValueError: no date."
    assert first["trouble"].startswith(f"{said} All readings are in the journal")
    assert len(first["figures"]) == 3
    assert [Path(second["record"])] == [path for path in w.records if path.suffix != ".journal"]
    assert w.analyzer.output is False


def test_a_fault_of_the_program_keeps_what_was_read(workplace):
    w = workplace()
    w.mishaps.at("INIT;*OPC?", 5, lambda: 1 / 0)
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert answer.document["reason"] == "a fault of the program: ZeroDivisionError: division by zero"
    assert "fault.txt" in answer.document["advice"]
    (record,) = w.records
    assert "ZeroDivisionError" in (record / "fault.txt").read_text()
    assert len(list((record / "raw").iterdir())) == 4
    assert w.analyzer.output is False
    assert w.audit(record).code == 0
    assert "Traceback" not in answer.err + answer.out
