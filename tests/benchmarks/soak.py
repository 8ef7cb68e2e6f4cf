"""A batch that does not end: memory, open files and the time of a unit must stay what they were.

Usage: python tests/benchmarks/soak.py [UNITS]
"""

from __future__ import annotations

import datetime
import itertools
import os
import shutil
import statistics
import sys
import tempfile
import time
from pathlib import Path

from benchrun.engine.job import Job, Outcome, Turn
from benchrun.engine.plan import make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.run import run
from benchrun.record.keys import KeyStore

SEQUENCES = Path(__file__).parents[2] / "sequences"
MEMORY, TIME = 1.05, 1.10


def resident_mb() -> float:
    """Memory that the process holds, in MB (Linux)."""
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE") / 1e6


class Desk:
    """Gives units, and looks at the process before each."""

    def __init__(self, units: int) -> None:
        self.left, self.rows = units, list[tuple[float, float, int]]()

    def next(self) -> Turn | None:
        """The next unit."""
        self.rows.append((time.process_time(), resident_mb(), len(list(Path("/proc/self/fd").iterdir()))))
        self.left -= 1
        return Turn(f"HF-{self.left % 9000 + 1:04d}") if self.left >= 0 else None


def main(units: int) -> int:
    """Print the table; exit code 1 if something grew."""
    with tempfile.TemporaryDirectory() as name:
        folder, desk = Path(name), Desk(units)
        os.environ["BENCHRUN_HOME"] = str(folder / "home")
        text = (SEQUENCES / "harmonic-filter.yaml").read_text().replace("points: 801", "points: 201")
        (folder / "sequence.yaml").write_text(text.replace("aperture: 4 MHz", "aperture: 6 MHz"))
        plan = make_plan(str(folder / "sequence.yaml"), "workshop", datetime.date.today())
        rehearsal, store = prepare_rehearsal(plan.bench, 1), KeyStore()
        kept: list[str] = []

        def away(outcome: Outcome) -> None:
            """Records are taken away as they come; all but the first, whose files the others share."""
            assert outcome.record is not None, outcome.trouble
            if kept:
                shutil.rmtree(outcome.record)
            kept.append(outcome.conclusion.value)

        run(
            Job(
                plan=plan, units=(), operator_name="study", hands=rehearsal.hands, clock=rehearsal.clock,
                records=folder / "records", signer=lambda _: store.rehearsal(), sink=lambda _: None,
                library=rehearsal.library, seed=1, desk=desk, kept=away,
            )
        )  # fmt: skip
    tenth = max(units // 10, 1)
    print(f"{'units':>12}{'CPU a unit, ms':>16}{'memory, MB':>12}{'open files':>12}")
    table = []
    for at in range(0, units - tenth + 1, tenth):
        part = desk.rows[at : at + tenth + 1]
        each = [1e3 * (b[0] - a[0]) for a, b in itertools.pairwise(part)]
        row = statistics.median(each), statistics.median(r[1] for r in part), max(r[2] for r in part)
        table.append(row)
        print(f"{at + 1:>6} -{at + tenth:>4}{row[0]:>16.1f}{row[1]:>12.1f}{row[2]:>12}")
    first, last = table[1], table[-1]  # the first tenth warms up
    print(f"memory {last[1] / first[1]:.3f} of the second tenth's, at most {MEMORY}")
    print(f"time {last[0] / first[0]:.3f} of the second tenth's, at most {TIME}; {len(kept)} records")
    return int(last[1] > MEMORY * first[1] or last[0] > TIME * first[0] or last[2] > first[2])


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 2000))
