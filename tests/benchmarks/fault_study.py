"""What becomes of a run when something goes wrong: every fault of the simulated bench on good and bad units.

Each fault by name strikes at several occasions, with several seeds, in every sequence. The table says how
often it struck, what was then concluded about a good and a bad unit, and what operators were told. Runs in
which it found no occasion are left out of the table and counted. No fault may let a bad unit pass.

Usage: python tests/benchmarks/fault_study.py [SEEDS [SEQUENCE ...]]
"""

from __future__ import annotations

import collections
import concurrent.futures
import dataclasses
import datetime
import re
import sys
import tempfile
import time
from pathlib import Path

from benchrun.engine.events import Event, Noted
from benchrun.engine.plan import Plan, bench_for, make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.run import Job, Outcome, run
from benchrun.record.keys import KeyStore
from sim_instruments.faults import FAULTS

UNITS = {
    "harmonic-filter": ("HF-0001", "HF-9001"),
    "preselector": ("PS-0001", "PS-9001"),
    "whip-antenna": ("WA-0001", "WA-9001"),
    "pad-10db": ("PD-0001", "PD-9001"),
    "jumper-cable": ("JC-0001", "JC-9001"),
    "driver-amplifier": ("DA-0001", "DA-9001"),
    "driver-amplifier-drive": ("DA-0001", "DA-9002"),
}
"""A good and a bad unit of each sequence."""
OCCASIONS = {"hands": (0, 1, 2, 3, 5, 7), "instrument": (0, 1, 5, 9, 20, 40), "room": (0, 4, 7)}
GOOD, BAD = 0, 1


@dataclasses.dataclass
class Row:
    """What one fault did, over all sequences."""

    found: tuple[collections.Counter[str], collections.Counter[str]] = dataclasses.field(
        default_factory=lambda: (collections.Counter(), collections.Counter())
    )
    told: collections.Counter[str] = dataclasses.field(default_factory=collections.Counter)
    idle: int = 0
    quiet: collections.Counter[str] = dataclasses.field(default_factory=collections.Counter)
    """Sequences in which it struck and a good unit passed with nothing said: harmless, or not noticed."""

    def add(self, other: Row) -> None:
        """Count in what it did elsewhere."""
        for mine, more in zip(self.found, other.found, strict=True):
            mine.update(more)
        self.told.update(other.told)
        self.quiet.update(other.quiet)
        self.idle += other.idle


def rehearse(
    plan: Plan, fault: str, unit: str, seed: int, folder: Path
) -> tuple[Outcome, bool, tuple[str, ...]]:
    """One run with one fault, whether it struck, and what the operator was told of trouble."""
    told: list[str] = []

    def listen(event: Event) -> None:
        if isinstance(event, Noted) and event.weight == "warning":
            told.append(event.text)

    rehearsal, store = prepare_rehearsal(plan.bench, seed, [fault]), KeyStore(folder / "home")
    outcome = run(
        Job(
            plan=plan,
            units=(unit,),
            operator_name="study",
            hands=rehearsal.hands,
            clock=rehearsal.clock,
            records=folder / "records",
            signer=lambda _: store.rehearsal(),
            sink=listen,
            library=rehearsal.library,
            seed=seed,
        )
    )[0]
    told += [outcome.reason] if outcome.reason else []
    return outcome, any(when.happened for when in rehearsal.bench.injected), tuple(told)


def counted(found: collections.Counter[str]) -> str:
    """``pass 3, invalid 2``."""
    return ", ".join(f"{what} {count}" for what, count in sorted(found.items())) or "-"


def gist(reason: str) -> str:
    """A reason without what differs from run to run, so that the same ones can be counted."""
    words = re.sub(
        r"^(swept again: )?GPIB0::\d+::INSTR( after '[^']*')?", r"\1the instrument", reason.split(". ")[0]
    )
    words = re.sub(r"'[^']*'", "'...'", words)
    words = re.sub(r"[-+]?\d+\.?\d*(e[-+]?\d+)?", "#", words)
    return words.replace("|", "/").strip()


def study(sequence: str, seeds: int) -> tuple[dict[str, Row], list[str], int]:
    """All faults on one sequence; gives what each did, bad units that passed, and the number of runs."""
    plan, runs = make_plan(sequence, bench_for(sequence), datetime.date.today()), 0
    rows, escapes = {fault: Row() for fault in FAULTS}, list[str]()
    with tempfile.TemporaryDirectory() as name:
        for fault, what in FAULTS.items():
            row = rows[fault]
            for seed in range(1, seeds + 1):
                for after in OCCASIONS[what.where]:
                    for which, unit in enumerate(UNITS[sequence]):
                        outcome, struck, told = rehearse(plan, f"{fault}@{after}", unit, seed, Path(name))
                        conclusion, runs = outcome.conclusion.value, runs + 1
                        if which == BAD and conclusion in ("pass", "conditional pass"):
                            escapes.append(f"{sequence} {unit} seed {seed} {fault}@{after}: {conclusion}")
                        if not struck:
                            row.idle += 1
                            continue
                        row.found[which][conclusion] += 1
                        row.told.update({gist(text) for text in told})
                        if which == GOOD and conclusion == "pass" and not told:
                            row.quiet[sequence] += 1
    return rows, escapes, runs


def main(seeds: int, sequences: list[str]) -> int:
    """Print the table; exit code 1 if a bad unit passed or a fault never struck."""
    rows, escapes, runs, start = {fault: Row() for fault in FAULTS}, list[str](), 0, time.perf_counter()
    with concurrent.futures.ProcessPoolExecutor() as workers:
        for sequence, done in {s: workers.submit(study, s, seeds) for s in sequences}.items():
            more, passed, count = done.result()
            for fault, row in more.items():
                rows[fault].add(row)
            escapes, runs = escapes + passed, runs + count
            print(
                f"{sequence}: {count} runs, {time.perf_counter() - start:.0f} s", file=sys.stderr, flush=True
            )
    print("| what went wrong | good units | bad units | what the operator was told, most often |")
    print("|---|---|---|---|")
    for fault, row in rows.items():
        told = "; ".join(f"{text} ({count})" for text, count in row.told.most_common(2))
        print(f"| {fault} | {counted(row.found[GOOD])} | {counted(row.found[BAD])} | {told or '-'} |")
    print("\nStruck, and a good unit passed with nothing said (harmless there, or not noticed):\n")
    for fault, row in rows.items():
        if row.quiet:
            print(f"- {fault}: {counted(row.quiet)}")
    never = [fault for fault, row in rows.items() if not sum(map(sum, (f.values() for f in row.found)))]
    print(f"\nNever struck: {', '.join(never) or 'none'}; "
          f"runs without occasion: {sum(row.idle for row in rows.values())}")  # fmt: skip
    print(f"{runs} runs in {time.perf_counter() - start:.0f} s; bad units that passed: {len(escapes)}")
    print("\n".join(escapes))
    return int(bool(escapes or never))


if __name__ == "__main__":
    chosen = sys.argv[2:] or list(UNITS)
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 1, chosen))
