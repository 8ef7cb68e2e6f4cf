"""What each further unit costs under one calibration, beyond the instrument's own time.

One process, 1601 points, record and signature included. Time spent inside the simulated instruments and
hands is taken out; everything else counts.

Usage: python tests/benchmarks/per_unit.py [UNITS]
"""

from __future__ import annotations

import datetime
import os
import statistics
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from benchrun.engine.events import Event, RecordWritten, RunStarted
from benchrun.engine.plan import make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.run import Job, run
from benchrun.record.keys import KeyStore

SEQUENCES = Path(__file__).parents[2] / "sequences"
TARGET_MS = 30.0


class Meter:
    """Adds up the time spent inside some calls."""

    def __init__(self) -> None:
        self.seconds = 0.0

    def around(self, call: Callable[..., Any]) -> Callable[..., Any]:
        """The call, timed."""

        def timed(*arguments: Any, **named: Any) -> Any:
            start = time.perf_counter()
            try:
                return call(*arguments, **named)
            finally:
                self.seconds += time.perf_counter() - start

        return timed


def main(units: int) -> int:
    """Print the figures; exit code 1 if the median is above the target."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        os.environ["BENCHRUN_HOME"] = str(folder / "home")
        text = (SEQUENCES / "harmonic-filter.yaml").read_text().replace("points: 801", "points: 1601")
        (folder / "sequence.yaml").write_text(text)
        plan = make_plan(str(folder / "sequence.yaml"), "workshop", datetime.date.today())
        rehearsal, store, meter = prepare_rehearsal(plan.bench, 1), KeyStore(), Meter()
        library = rehearsal.library
        library.write, library.read = meter.around(library.write), meter.around(library.read)
        hands = rehearsal.hands
        hands.connect, hands.offer = meter.around(hands.connect), meter.around(hands.offer)  # type: ignore[method-assign]
        marks: list[float] = []

        def watch(event: Event) -> None:
            if isinstance(event, RunStarted | RecordWritten):
                marks.append(time.perf_counter() - meter.seconds)

        run(
            Job(
                plan=plan,
                units=tuple(f"HF-{n:04d}" for n in range(1, units + 2)),
                operator_name="benchmark",
                hands=hands,
                clock=rehearsal.clock,
                records=folder / "records",
                signer=lambda _: store.rehearsal(),
                sink=watch,
                library=library,
                seed=1,
            )
        )
    each = [(end - begin) * 1e3 for begin, end in zip(marks[2::2], marks[3::2], strict=True)]
    middle = statistics.median(each)
    print(f"{len(each)} further units, 1601 points: median {middle:.1f} ms", end="")
    print(f", least {min(each):.1f}, most {max(each):.1f}")
    print(f"target: at most {TARGET_MS:g} ms")
    return int(middle > TARGET_MS)


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 40))
