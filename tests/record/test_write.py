"""Writing records: whole, or not at all, wherever the disk gives out."""

from __future__ import annotations

import errno
import os
import shutil
import tempfile
import threading
from collections.abc import Callable
from pathlib import Path

import pytest

from benchrun.errors import RecordError, RecordNotWritten
from benchrun.record.draft import Draft
from benchrun.record.keys import KeyStore
from benchrun.record.signer import FileSigner
from benchrun.record.storage import Disk
from benchrun.record.verify import verify
from benchrun.record.write import RecordRescued, rescue, write, write_or_rescue

MakeDraft = Callable[..., Draft]


class FaultyDisk(Disk):
    """A disk whose operation number ``fails_at`` ends in an error; it keeps count and order.

    A write that fails leaves half of the content, as a full disk does.
    """

    def __init__(self, fails_at: int, number: int = errno.ENOSPC) -> None:
        self.fails_at, self.number, self.done = fails_at, number, list[str]()

    def _step(self, what: str, path: Path) -> bool:
        self.done.append(f"{what} {path.name}")
        return len(self.done) - 1 == self.fails_at

    def _fail(self) -> OSError:
        return OSError(self.number, os.strerror(self.number))

    def make_dir(self, path: Path) -> None:
        if self._step("make", path):
            raise self._fail()
        super().make_dir(path)

    def write_file(self, path: Path, content: bytes) -> None:
        if self._step("write", path):
            super().write_file(path, content[: len(content) // 2])
            raise self._fail()
        super().write_file(path, content)

    def sync(self, folder: Path) -> None:
        if self._step("sync", folder):
            raise self._fail()
        super().sync(folder)

    def rename(self, source: Path, target: Path) -> None:
        if self._step("rename", target):
            raise self._fail()
        super().rename(source, target)


class FullDisk(Disk):
    """A disk that takes no file at all."""

    def write_file(self, path: Path, content: bytes) -> None:
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))


def operations(draft: Draft, folder: Path, signer: FileSigner) -> list[str]:
    disk = FaultyDisk(-1)
    write(draft, folder, "HF-0001", signer, disk)
    return disk.done


def test_record_holds_files_envelope_and_public_key(record: Path, rehearsal: FileSigner) -> None:
    """Nothing else, and no trace of the way it was made."""
    found = {path.relative_to(record).as_posix() for path in record.rglob("*") if path.is_file()}
    assert found == {"raw/unit.s2p", "sequence.yaml", "public-key.pem", "envelope.json"}
    assert (record / "public-key.pem").read_bytes() == rehearsal.public_key.pem
    assert [path.name for path in record.parent.iterdir()] == ["HF-0001"]


def test_envelope_is_written_last_and_rename_follows(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner
) -> None:
    """Files, envelope, all folders synced, one rename, the records folder synced."""
    done = operations(draft(), tmp_path / "records", rehearsal)
    writes = [one for one in done if one.startswith("write")]
    assert writes[-1] == "write envelope.json"
    after = [one.split()[0] for one in done[done.index("write envelope.json") + 1 :]]
    assert after == ["sync", "sync", "rename", "sync"]
    assert done[-2:] == ["rename HF-0001", "sync records"]


@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EACCES, errno.EIO])
def test_failure_at_any_operation_leaves_no_trace(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, store: KeyStore, number: int
) -> None:
    """For each operation in turn: a clear error, nothing left, the record before it intact."""
    folder = tmp_path / "records"
    before = write(draft(), folder, "HF-0000", rehearsal)
    count = len(operations(draft(), tmp_path / "count", rehearsal))
    assert count >= 11
    for fails_at in range(count):
        disk = FaultyDisk(fails_at, number)
        with pytest.raises(RecordNotWritten, match=r"was not written into .*: the system said '.+'; .+\."):
            write(draft(), folder, "HF-0001", rehearsal, disk)
        assert [path.name for path in folder.iterdir()] == ["HF-0000"], disk.done[-1]
    assert verify(before, store).record.folder == before


@pytest.mark.parametrize(
    ("number", "advice"),
    [
        (errno.ENOSPC, "the disk is full: free some space"),
        (errno.EACCES, "you may not write there"),
        (errno.EROFS, "can only be read"),
        (errno.EIO, "have it checked"),
        (errno.EMFILE, "see to it"),
    ],
)
def test_error_says_what_to_do(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, number: int, advice: str
) -> None:
    """Which folder, what the system said, what to do about it; with the exit code of records."""
    with pytest.raises(RecordNotWritten, match=advice) as caught:
        write(draft(), tmp_path / "records", "HF-0001", rehearsal, FaultyDisk(4, number))
    assert str(tmp_path / "records") in str(caught.value)
    assert os.strerror(number) in str(caught.value)
    assert caught.value.exit_code == 5


def test_records_folder_that_is_a_file_is_said(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner
) -> None:
    """And the file is left alone."""
    (tmp_path / "records").write_text("mine")
    with pytest.raises(RecordNotWritten, match="a file stands where a folder is needed"):
        write(draft(), tmp_path / "records", "HF-0001", rehearsal)
    assert (tmp_path / "records").read_text() == "mine"


def test_what_cannot_be_removed_is_named(tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner) -> None:
    """A remainder stays hidden, and the error says where it is."""

    class Stuck(FaultyDisk):
        def remove_tree(self, path: Path) -> None:
            raise OSError(errno.EIO, "Input/output error")

    disk = Stuck(-1)
    write(draft(), tmp_path / "count", "x", rehearsal, disk)
    with pytest.raises(RecordNotWritten, match=r"\.partial could not be removed \(Input/output error\)"):
        write(draft(), tmp_path / "records", "HF-0001", rehearsal, Stuck(len(disk.done) - 1))
    assert all(path.name.startswith(".") for path in (tmp_path / "records").iterdir())


def test_stop_while_writing_leaves_no_trace(tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner) -> None:
    """Ctrl-C passes through, and nothing half-written stays."""

    class Interrupted(Disk):
        def sync(self, folder: Path) -> None:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        write(draft(), tmp_path / "records", "HF-0001", rehearsal, Interrupted())
    assert list((tmp_path / "records").iterdir()) == []


def test_taken_names_are_counted_on(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, store: KeyStore
) -> None:
    """Records, files and empty folders of that name are left as they are."""
    folder = tmp_path / "records"
    (folder / "HF-0001-2").mkdir(parents=True)
    (folder / "HF-0001-3").write_text("mine")
    names = [write(draft(), folder, "HF-0001", rehearsal).name for _ in range(3)]
    assert names == ["HF-0001", "HF-0001-4", "HF-0001-5"]
    assert list((folder / "HF-0001-2").iterdir()) == []
    assert verify(folder / "HF-0001-5", store).record.payload == draft().payload


def test_name_taken_between_looking_and_renaming(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner
) -> None:
    """Another writer was quicker: the next name is used, and its record stays."""

    class Overtaken(Disk):
        def rename(self, source: Path, target: Path) -> None:
            if target.name == "HF-0001":
                target.mkdir()
                (target / "envelope.json").write_text("theirs")
            super().rename(source, target)

    written = write(draft(), tmp_path / "records", "HF-0001", rehearsal, Overtaken())
    assert written.name == "HF-0001-2"
    assert (tmp_path / "records" / "HF-0001" / "envelope.json").read_text() == "theirs"


def test_many_writers_at_once_each_get_a_name(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner
) -> None:
    """Eight threads, one name: eight records."""
    start, names = threading.Barrier(8), list[str]()

    def one() -> None:
        start.wait()
        names.append(write(draft(), tmp_path / "records", "HF-0001", rehearsal).name)

    threads = [threading.Thread(target=one) for _ in range(8)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(names) == ["HF-0001", *(f"HF-0001-{n}" for n in range(2, 9))]
    assert len(list((tmp_path / "records").iterdir())) == 8


@pytest.mark.parametrize(
    "name", ["", ".", "..", "../x", "a/b", "a\\b", "C:x", "a b", ".x", "x.", "nul", "x\n", "ü"]
)
def test_names_that_could_lead_elsewhere_are_refused(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, name: str
) -> None:
    """As the record's name, and as a file's; nothing is written."""
    with pytest.raises(RecordError, match="the record was not written"):
        write(draft(), tmp_path / "records", name, rehearsal)
    files = {**draft().files, f"raw/{name}" if "/" not in name else f"../{name}": b""}
    with pytest.raises(RecordError, match="is no path of a record"):
        write(draft(files), tmp_path / "records", "HF-0001", rehearsal)
    assert not (tmp_path / "records").exists()


@pytest.mark.parametrize(
    "name", ["SEQUENCE.yaml", "envelope.json", "Envelope.JSON", "public-key.pem", "PUBLIC-KEY.pem"]
)
def test_files_that_would_be_one_on_some_systems_are_refused(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, name: str
) -> None:
    """Names that differ in case only, and the record's own two files."""
    with pytest.raises(RecordError, match="the record was not written"):
        write(draft({**draft().files, name: b""}), tmp_path / "records", "HF-0001", rehearsal)


def test_file_that_the_payload_names_must_be_there(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner
) -> None:
    """No record refers to a reading that it does not hold."""
    with pytest.raises(RecordError, match=r"names 'raw/unit\.s2p', which is not there"):
        write(draft({"sequence.yaml": b""}), tmp_path / "records", "HF-0001", rehearsal)


def test_rehearsal_key_signs_no_measured_run(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, store: KeyStore
) -> None:
    """Nor a bench key a simulated or replayed one."""
    with pytest.raises(RecordError, match="measured is signed by a bench key, not by the rehearsal key"):
        write(draft(origin="measured"), tmp_path / "records", "HF-0001", rehearsal)
    store.make("bench-1")
    for origin in ("simulated", "recorded"):
        with pytest.raises(RecordError, match=f"{origin} is signed by a rehearsal key, not by the bench key"):
            write(draft(origin=origin), tmp_path / "records", "HF-0001", store.signer())
    assert not (tmp_path / "records").exists()


def test_rescued_record_stands_in_the_temporary_folder(
    tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, store: KeyStore
) -> None:
    """Signed and whole, for the user alone, and the error says where."""
    place = tmp_path / "temporary"
    place.mkdir()
    (tmp_path / "records").write_text("a file")
    with pytest.raises(RecordRescued, match="Nothing is lost: the record stands in") as caught:
        write_or_rescue(draft(), tmp_path / "records", "HF-0001", rehearsal, place=place)
    assert caught.value.folder.is_relative_to(place)
    assert str(caught.value.folder) in str(caught.value)
    assert verify(caught.value.folder, store).record.payload == draft().payload
    assert os.name == "nt" or caught.value.folder.parent.stat().st_mode & 0o077 == 0


def test_system_has_a_temporary_folder(draft: MakeDraft, rehearsal: FileSigner, store: KeyStore) -> None:
    """Without another place named, the system's is used."""
    rescued = rescue(draft(), "HF-0001", rehearsal)
    assert rescued is not None
    try:
        assert rescued.is_relative_to(tempfile.gettempdir())
        assert verify(rescued, store).record.payload == draft().payload
    finally:
        shutil.rmtree(rescued.parent)


def test_nowhere_to_write_is_the_first_error(tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner) -> None:
    """If even the temporary folder refuses, the error is that of the records folder; no trace anywhere."""
    place = tmp_path / "temporary"
    place.mkdir()
    with pytest.raises(RecordNotWritten, match="records: the system said") as caught:
        write_or_rescue(draft(), tmp_path / "records", "HF-0001", rehearsal, FullDisk(), place)
    assert not isinstance(caught.value, RecordRescued)
    assert list(place.iterdir()) == []
    assert rescue(draft(), "HF-0001", rehearsal, place=tmp_path / "missing") is None
