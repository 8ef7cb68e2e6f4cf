"""What becomes of a run when something goes wrong: every fault of the simulated bench on good and bad units.

For each fault by name the table says what was concluded about a good and a bad unit, over several occasions
at which it may strike and several seeds, and what the operator was told first. No fault may let a bad unit
pass.

Usage: python tests/benchmarks/fault_study.py [SEEDS [SEQUENCE ...]]
"""

from __future__ import annotations

import collections
import datetime
import sys
import tempfile
import time
from pathlib import Path

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


def rehearse(plan: Plan, fault: str, unit: str, seed: int, folder: Path) -> Outcome:
    """One run with one fault."""
    rehearsal, store = prepare_rehearsal(plan.bench, seed, [fault]), KeyStore(folder / "home")
    return run(
        Job(
            plan=plan,
            units=(unit,),
            operator_name="study",
            hands=rehearsal.hands,
            clock=rehearsal.clock,
            records=folder / "records",
            signer=lambda _: store.rehearsal(),
            sink=lambda _: None,
            library=rehearsal.library,
            seed=seed,
        )
    )[0]


def counted(found: collections.Counter[str]) -> str:
    """``pass 3, invalid 2``."""
    return ", ".join(f"{what} {count}" for what, count in sorted(found.items()))


def main(seeds: int, sequences: list[str]) -> int:
    """Print the tables; exit code 1 if a bad unit passed."""
    escapes, runs, start = 0, 0, time.perf_counter()
    for sequence in sequences:
        plan = make_plan(sequence, bench_for(sequence), datetime.date.today())
        good, bad = UNITS[sequence]
        print(f"\n### {sequence}\n\n| fault | good unit {good} | bad unit {bad} | the operator was told |")
        print("|---|---|---|---|")
        with tempfile.TemporaryDirectory() as name:
            for fault, what in FAULTS.items():
                found = {unit: collections.Counter[str]() for unit in (good, bad)}
                told = ""
                for seed in range(1, seeds + 1):
                    for after in OCCASIONS[what.where]:
                        for unit in (good, bad):
                            outcome = rehearse(plan, f"{fault}@{after}", unit, seed, Path(name))
                            found[unit][outcome.conclusion.value] += 1
                            told = told or outcome.reason
                            runs += 1
                escapes += found[bad]["pass"] + found[bad]["conditional pass"]
                print(
                    f"| {fault} | {counted(found[good])} | {counted(found[bad])} | {told[:110]} |", flush=True
                )
    print(f"\n{runs} runs in {time.perf_counter() - start:.0f} s; bad units that passed: {escapes}")
    return int(escapes > 0)


if __name__ == "__main__":
    chosen = sys.argv[2:] or list(UNITS)
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 1, chosen))
