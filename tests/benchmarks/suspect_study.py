"""Suspect connections: calibrations on the simulated bench with one fault of the hands each, and sound ones.

Each fault strikes once, at each connection where it can, in the sweeps of all named sequences, on both
analyzers, with new seeds until there are enough. After each reading the readings so far are doubted, as a
run does it. Caught is a fault if a connection is doubted at any time before a unit would be read, and named
if the first one doubted is the one where it struck. It matters if a judged figure of the sequence's good
unit comes out off by more than its expanded uncertainty, or cannot be had at all; faults that nobody doubted
and that do not matter are counted apart.

Targets: of those that matter 99 % caught and 95 % named; of sound ones 1 % doubted.

Usage: python tests/benchmarks/suspect_study.py [CALIBRATIONS [once]]
"once" leaves out the second sweep of each connection, as a run does that is not asked for it.
"""

from __future__ import annotations

import collections
import datetime
import itertools
import statistics
import sys
import time
from dataclasses import dataclass, field

from benchrun.engine.plan import Plan, bench_for, make_plan
from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.chain import apply, hookups
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.evaluate.readings import Raw
from benchrun.evaluate.state import State
from benchrun.evaluate.steps.calibrate import sure_doubts
from benchrun.hookup import Hookup
from benchrun.rf.calibration.suspicion import Suspicion, unsteady
from benchrun.rf.twoport import TwoPort
from benchrun.sequence.steps import Calibrate
from sim_instruments.bench import load_bench
from sim_instruments.faults import inject

UNITS = {
    "harmonic-filter": "HF-0001",
    "preselector": "PS-0001",
    "whip-antenna": "WA-0001",
    "pad-10db": "PD-0001",
    "jumper-cable": "JC-0001",
}
"""Sequences without a supply, each with a good unit."""
ANALYZERS = "GPIB0::16::INSTR", "GPIB0::17::INSTR"
FAULTS = ("wrong standard", "open for short", "nothing connected", "wrong port", "connected late",
          "loose connection")  # fmt: skip
CONNECTIONS = 7


class Bench:
    """One simulated bench at work on one sequence."""

    def __init__(self, plan: Plan, analyzer: str, seed: int, fault: str = "", after: int = 0) -> None:
        self.plan, self.procedure = plan, plan.procedure
        bench = load_bench(str(plan.bench.model.rehearsal), seed)
        if fault:
            bench = inject(bench, fault, after=after, seed=seed)
            bench.injected[0].once = True
        self.bench, self.world = bench, bench.world
        self.source = bench.instruments[analyzer].readings
        steps = plan.sequence.model.steps
        self.step = next(step for step in steps if isinstance(step, Calibrate))
        self.setup = self.procedure.sequence.sweep_of(self.step)

    def connect(self, hookup: Hookup) -> bool:
        """Have hands connect; gives whether they slipped."""
        before = sum(fault.happened for fault in self.bench.injected)
        self.world.connect([(c.items, c.ports) for c in hookup.connections])
        return sum(fault.happened for fault in self.bench.injected) > before

    def sweep(self) -> TwoPort:
        """Read what is connected."""
        setup, grid = self.setup, self.setup.grid()
        self.world.advance(2.0 * len(grid) * setup.averages * 1.4 / setup.bandwidth)
        return TwoPort.of(self.source.read(grid, setup.bandwidth, setup.power, setup.averages, True))


@dataclass
class Made:
    """A calibration: its readings, where hands slipped, and the first doubt."""

    readings: dict[str, Raw] = field(default_factory=dict)
    struck: str = ""
    first: Suspicion | None = None
    slowest_s: float = 0.0


def calibrate(bench: Bench, twice: bool) -> Made:
    """Read all standards, doubting after each."""
    made = Made()
    for hookup in hookups(bench.step, bench.procedure):
        if bench.connect(hookup):
            made.struck = hookup.text
        once = made.readings[hookup.text] = bench.sweep()
        begun = time.process_time()
        swept = {name: raw for name, raw in made.readings.items() if isinstance(raw, TwoPort)}
        doubts = sure_doubts(bench.step, bench.procedure, swept)
        made.slowest_s = max(made.slowest_s, time.process_time() - begun)
        if twice and (wandering := unsteady(hookup.text, once, bench.sweep())):
            doubts.insert(0, wandering)
        if doubts and made.first is None:
            made.first = doubts[0]
    return made


def judged(bench: Bench, unit: dict[str, dict[str, Raw]], made: Made) -> tuple[JudgedFigure, ...] | None:
    """Figures of a unit under a calibration; None where there are none."""
    state = State(bench.procedure, thorough=False)
    try:
        for step in bench.procedure.sequence.steps:
            apply(step, state, made.readings if step.name == bench.step.name else unit.get(step.name, {}))
    except InvalidMeasurement:
        return None
    return state.figures


def matters(bench: Bench, sound: Bench, made: Made, serial: str) -> bool:
    """Whether a good unit's figures are off by more than their uncertainty, against a sound calibration."""
    good = calibrate(sound, twice=False)
    sound.world.offer(serial)
    unit: dict[str, dict[str, Raw]] = {}
    for step in bench.procedure.sequence.steps:
        if step.name != bench.step.name and (needed := hookups(step, bench.procedure)):
            unit[step.name] = {}
            for hookup in needed:
                sound.connect(hookup)
                unit[step.name][hookup.text] = sound.sweep()
    right, wrong = judged(sound, unit, good), judged(bench, unit, made)
    if right is None or wrong is None:
        return True
    return any(_off(a, b) for a, b in zip(wrong, right, strict=True))


def _off(wrong: JudgedFigure, right: JudgedFigure) -> bool:
    """Whether two values of a figure differ by more than its expanded uncertainty."""
    if wrong.value is None or right.value is None or right.uncertainty is None:
        return wrong.value != right.value
    return not abs(wrong.value - right.value) <= right.uncertainty


def faulty(plans: dict[str, Plan], number: int, twice: bool) -> int:
    """Calibrations with a fault each; gives 1 if a target is missed."""
    counts: collections.Counter[str] = collections.Counter()
    escaped: collections.Counter[str] = collections.Counter()
    misnamed: collections.Counter[str] = collections.Counter()
    slowest_s: list[float] = []
    cases = ((seed, *case) for seed in itertools.count(1)
             for case in itertools.product(plans, FAULTS, range(CONNECTIONS)))  # fmt: skip
    for seed, sequence, fault, after in cases:
        if counts["all"] == number:
            break
        plan, analyzer = plans[sequence], ANALYZERS[seed % 2]
        bench = Bench(plan, analyzer, seed, fault, after)
        made = calibrate(bench, twice)
        if not made.struck:
            continue  # no such occasion in this calibration
        counts["all"] += 1
        slowest_s.append(made.slowest_s)
        what = f"{sequence}: {fault} at {made.struck}"
        if made.first is None:
            counts["quiet"] += 1
            if matters(bench, Bench(plan, analyzer, seed), made, UNITS[sequence]):
                counts["escaped"] += 1
                escaped[what] += 1
        elif made.first.hookup == made.struck:
            counts["named"] += 1
        else:
            misnamed[f"{what}, named {made.first.hookup}"] += 1
    caught = counts["all"] - counts["quiet"]
    counted = caught + counts["escaped"]
    harmless = counts["quiet"] - counts["escaped"]
    print(f"with one fault each: {counts['all']}; neither doubted nor harmful: {harmless}")
    print(f"caught, of those doubted or harmful: {caught / counted:.2%} (at least 99 %)")
    print(f"named, of those caught: {counts['named'] / caught:.2%} (at least 95 %)")
    typical_ms, greatest_ms = 1e3 * statistics.median(slowest_s), 1e3 * max(slowest_s)
    print(f"dearest doubt of a calibration: {typical_ms:.1f} ms of processor time in the median (at most 5), "
          f"{greatest_ms:.1f} ms at most")  # fmt: skip
    for title, table in (("escaped", escaped), ("named wrongly", misnamed)):
        for what, times in table.most_common():
            print(f"  {title}, {times} times: {what}")
    return int(caught < 0.99 * counted or counts["named"] < 0.95 * caught)


def sound(plans: dict[str, Plan], number: int, twice: bool) -> int:
    """Calibrations without fault; gives 1 if too many are doubted."""
    doubted: collections.Counter[str] = collections.Counter()
    every = ((seed, *case) for seed in itertools.count(1) for case in itertools.product(ANALYZERS, plans))
    cases = itertools.islice(every, number)
    for seed, analyzer, sequence in cases:
        made = calibrate(Bench(plans[sequence], analyzer, seed), twice)
        if made.first is not None:
            doubted[f"{sequence} seed {seed}: {made.first.hookup}: {made.first.reason}"] += 1
    alarms = sum(doubted.values())
    print(f"sound: {number}; doubted: {alarms / number:.2%} (at most 1 %)")
    for what in doubted:
        print(f"  {what}")
    return int(alarms > 0.01 * number)


def main(number: int, twice: bool) -> int:
    """Print the figures; exit code 1 if one misses its target."""
    plans = {name: make_plan(name, bench_for(name), datetime.date.today()) for name in UNITS}
    print(f"each connection swept {'twice' if twice else 'once'}")
    return max(faulty(plans, number, twice), sound(plans, number, twice))


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 1000, "once" not in sys.argv[2:]))
