"""A disk that fails at each single operation of a run: always a clear end, and nothing earlier harmed.

First an undisturbed run counts the operations (of the journal and of the record). Then for each of them a run
in which that one fails, and all after it (a full disk) or it alone (a hiccup). Each must end with exit code
and a sentence, leave the earlier record as it was and the source off, and lose nothing: the record stands,
stands elsewhere, or comes from the journal by taking the run up when there is room again.

Usage: python tests/benchmarks/disk_study.py [EVERY]    (1: each operation; 5: every fifth)
"""

from __future__ import annotations

import collections
import datetime
import errno
import hashlib
import sys
import tempfile
from pathlib import Path
from typing import Any

from benchrun.engine.job import Job
from benchrun.engine.journal import Appended
from benchrun.engine.plan import Plan, make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.resume import journals, take_up
from benchrun.engine.run import run
from benchrun.engine.story import Story
from benchrun.errors import RecordNotWritten
from benchrun.record.audit import audit
from benchrun.record.keys import KeyStore
from benchrun.record.recompute import recompute
from benchrun.record.storage import Disk

SEQUENCES = Path(__file__).parents[2] / "sequences"
TODAY = datetime.date.today()


class Medium:
    """Counts operations, and lets some fail."""

    def __init__(self, fails: int, stays: bool) -> None:
        self.count, self.fails, self.stays = 0, fails, stays

    def touch(self) -> None:
        """One operation."""
        self.count += 1
        if self.count == self.fails or (self.stays and self.count > self.fails):
            raise OSError(errno.ENOSPC, "No space left on device")


class FailingDisk(Disk):
    """Of records."""

    def __init__(self, medium: Medium) -> None:
        self._medium = medium

    def make_dir(self, path: Path) -> None:
        """Make a folder."""
        self._medium.touch()
        super().make_dir(path)

    def write_file(self, path: Path, content: bytes) -> None:
        """Write a file; a part of it gets through."""
        try:
            self._medium.touch()
        except OSError:
            path.write_bytes(content[: len(content) // 2])
            raise
        super().write_file(path, content)

    def sync(self, folder: Path) -> None:
        """Sync."""
        self._medium.touch()
        super().sync(folder)

    def rename(self, source: Path, target: Path) -> None:
        """Rename."""
        self._medium.touch()
        super().rename(source, target)


def failing(medium: Medium) -> Any:
    """The journal's file on that medium."""

    class File(Appended):
        def __init__(self, path: Path, keep: int | None) -> None:
            medium.touch()
            super().__init__(path, keep)

        def write(self, data: bytes) -> None:
            try:
                medium.touch()
            except OSError:
                super().write(data[: len(data) // 2])
                raise
            super().write(data)

        def sync(self) -> None:
            medium.touch()
            super().sync()

    return File


def job(plan: Plan, folder: Path, medium: Medium, story: Story | None = None) -> tuple[Job, Any]:
    """One run on that medium, and the analyzer."""
    rehearsal, store = prepare_rehearsal(plan.bench, 1), KeyStore(folder / "home")
    made = Job(
        plan=plan, units=("HF-0001",), operator_name="study", hands=rehearsal.hands, clock=rehearsal.clock,
        records=folder / "records", signer=lambda _: store.rehearsal(), sink=lambda _: None,
        library=rehearsal.library, seed=1, storage=FailingDisk(medium), opener=failing(medium), story=story,
    )  # fmt: skip
    return made, rehearsal.bench.instruments["GPIB0::16::INSTR"]


def digest(folder: Path) -> str:
    """Of all files below."""
    found = hashlib.sha256()
    for path in sorted(folder.rglob("*")):
        found.update(str(path).encode() + (path.read_bytes() if path.is_file() else b""))
    return found.hexdigest()


def one(plan: Plan, folder: Path, fails: int, stays: bool) -> str:
    """What became of a run whose disk failed at one place."""
    quiet = Medium(0, False)
    (earlier,) = run(job(plan, folder, quiet)[0])
    assert earlier.record is not None
    before = digest(earlier.record)
    made, analyzer = job(plan, folder, Medium(fails, stays))
    try:
        (outcome,) = run(made)
    except RecordNotWritten as error:
        if "full" not in str(error):
            raise
        return "refused before anything was measured"
    finally:
        assert not analyzer.output
        assert digest(earlier.record) == before, "an earlier record was harmed"
    visible = [path for path in made.records.iterdir() if not path.name.startswith(".")]
    for path in visible:
        audit(path, KeyStore(folder / "home"), recompute)
    if not outcome.trouble:
        assert outcome.record in visible
        return "the record stands"
    assert outcome.exit_code == 5
    if outcome.record is not None:
        audit(outcome.record, KeyStore(folder / "home"), recompute)
        return "the record stands elsewhere, and it is said where"
    (path,) = journals(made.records)
    story, again = take_up(path, TODAY)
    (late,) = run(job(again, folder, Medium(0, False), story)[0])
    assert (late.conclusion.value, late.trouble) == ("pass", ""), late
    audit(late.record, KeyStore(folder / "home"), recompute)  # type: ignore[arg-type]
    return "taken up from the journal when there was room"


def main(every: int) -> int:
    """Print the table; an assertion that fails ends it."""
    with tempfile.TemporaryDirectory() as name:
        text = (SEQUENCES / "harmonic-filter.yaml").read_text().replace("points: 801", "points: 201")
        file = Path(name) / "sequence.yaml"
        file.write_text(text.replace("aperture: 4 MHz", "aperture: 6 MHz"))
        plan, count = make_plan(str(file), "workshop", TODAY), Medium(0, False)
        run(job(plan, Path(name) / "count", count)[0])
        print(f"{count.count} operations in a run")
        for stays in (False, True):
            found: collections.Counter[str] = collections.Counter()
            for fails in range(1, count.count + 1, every):
                with tempfile.TemporaryDirectory() as place:
                    tempfile.tempdir = place  # where records are rescued to
                    try:
                        found[one(plan, Path(place), fails, stays)] += 1
                    finally:
                        tempfile.tempdir = None
            print("from that one on all fail:" if stays else "that one fails alone:")
            for what, times in found.most_common():
                print(f"  {what:<60}{times:>4}")
    return 0


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 1))
