"""Runs killed at a random instant, taken up again, compared with runs that nobody disturbed.

Two thirds are rehearsals, killed together with their simulated world: they must come out byte for byte as
an undisturbed run with the same seed. One third talks over a socket to a simulated bench that lives on, as a
real one would: what had finished must stand in the record, nothing finished may be read again, and the bench
must be left with its source off. Every third run is killed a second time, while it is being taken up.

Usage: python tests/benchmarks/kill_study.py [RUNS]
"""

from __future__ import annotations

import collections
import contextlib
import datetime
import json
import os
import random
import signal
import socket
import sys
import tempfile
import threading
import time
from collections.abc import Callable
from pathlib import Path

from benchrun.clock import SystemClock
from benchrun.engine.job import Job
from benchrun.engine.plan import Plan, make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.resume import journals, sweep, take_up
from benchrun.engine.run import run
from benchrun.engine.story import NothingDone, Story
from benchrun.errors import Stopped
from benchrun.hookup import Hookup
from benchrun.record.audit import audit
from benchrun.record.keys import KeyStore
from benchrun.record.recompute import recompute
from benchrun.record.verify import read
from sim_instruments.bench import SimulatedBench, load_bench
from sim_instruments.doors.socket import SocketDoor

SEQUENCES = Path(__file__).parents[2] / "sequences"
UNITS = ("HF-0001", "HF-0002")
TODAY = datetime.date.today()


class FarHands:
    """Hands at a bench in another process: each request is a line, each answer too."""

    def __init__(self, port: int) -> None:
        self._line = socket.create_connection(("127.0.0.1", port)).makefile("rw")

    def check(self, hookups: tuple[Hookup, ...]) -> None:
        """They can do anything."""

    def offer(self, serial: str) -> None:
        """Lay a unit on the bench."""
        self._ask({"offer": serial})

    def connect(self, hookup: Hookup) -> None:
        """Connect."""
        self._ask({"connect": [[list(c.items), list(c.ports)] for c in hookup.connections]})

    def _ask(self, what: dict[str, object]) -> None:
        self._line.write(json.dumps(what) + "\n")
        self._line.flush()
        if not self._line.readline():
            raise Stopped("the hands are gone")


class Lasting:
    """A simulated bench that outlives the processes that use it."""

    def __init__(self, seed: int, folder: Path) -> None:
        self.bench: SimulatedBench = load_bench("workshop", seed)
        self.analyzer = self.bench.instruments["GPIB0::16::INSTR"]
        self.door = SocketDoor(self.analyzer).__enter__()
        self._hands = socket.create_server(("127.0.0.1", 0))
        self.port = self._hands.getsockname()[1]
        threading.Thread(target=self._serve, daemon=True).start()
        text = (SEQUENCES / "benches" / "workshop.yaml").read_text()
        text = text.replace("GPIB0::16::INSTR", self.door.resource)
        self.file = folder / "bench.yaml"
        self.file.write_text(text.replace("dialect:", 'library: "@py"\n    dialect:', 1))

    def _serve(self) -> None:
        while True:
            try:
                line, _ = self._hands.accept()
            except OSError:
                return
            threading.Thread(target=self._attend, args=(line,), daemon=True).start()

    def _attend(self, line: socket.socket) -> None:
        with contextlib.suppress(OSError), line, line.makefile("rw") as talk:  # whoever asked was killed
            for request in talk:
                asked = json.loads(request)
                if "offer" in asked:
                    self.bench.world.offer(asked["offer"])
                else:
                    self.bench.world.connect(asked["connect"])
                talk.write("done\n")
                talk.flush()

    def close(self) -> None:
        """Gone."""
        self._hands.close()
        self.door.__exit__(None, None, None)


def job(
    plan: Plan, seed: int, records: Path, home: Path, port: int | None, story: Story | None = None
) -> Job:
    """The run, or its continuation."""
    store = KeyStore(home)
    common = {
        "plan": plan, "units": UNITS, "operator_name": "study", "records": records,
        "signer": lambda _: store.rehearsal(), "sink": lambda _: None, "story": story,
    }  # fmt: skip
    if port is not None:
        return Job(hands=FarHands(port), clock=SystemClock(), **common)  # type: ignore[arg-type]
    rehearsal = prepare_rehearsal(plan.bench, seed)
    return Job(hands=rehearsal.hands, clock=rehearsal.clock, library=rehearsal.library, seed=seed, **common)  # type: ignore[arg-type]


def killed(work: Callable[[], object], after_s: float | None) -> bool:
    """Do something in a process of its own, and kill it after a while; tells whether that was in time."""
    child = os.fork()
    if child == 0:
        try:
            work()
            os._exit(0)
        except BaseException as error:
            print(f"the child ended with {type(error).__name__}: {error}", file=sys.stderr, flush=True)
            os._exit(9)
    if after_s is not None:
        time.sleep(after_s)
        os.kill(child, signal.SIGKILL)
    _, status = os.waitpid(child, 0)
    if os.WIFEXITED(status) and os.WEXITSTATUS(status):
        raise AssertionError("a process went wrong by itself")
    return os.WIFSIGNALED(status)


def resume(records: Path, seed: int, home: Path, port: int | None) -> None:
    """As the command does it."""
    for path in journals(records):
        try:
            story, plan = take_up(path, TODAY)
        except NothingDone:
            path.unlink()
            continue
        assert not story.closing, story.closing
        run(job(plan, seed, records, home, port, story))
    sweep(records)


def found(records: Path) -> dict[str, tuple[object, dict[str, bytes]]]:
    """Result and raw bytes by unit; every record must stand up to an audit."""
    results = {}
    for folder in sorted(records.iterdir()):
        payload = audit(folder, KeyStore(records.parent / "home"), recompute).record.payload
        raw = {path.name: path.read_bytes() for path in sorted((folder / "raw").iterdir())}
        assert payload.unit.serial not in results, "two records of one unit"
        results[payload.unit.serial] = ((payload.conclusion, payload.figures), raw)
    return results


def steps_again(records: Path, stood: dict[str, set[int]]) -> int:
    """How many steps began once more although they had finished before the break."""
    again = 0
    for folder in records.iterdir():
        finished, taken_up, count = stood.get(read(folder).payload.unit.serial, set()), False, 0
        for line in (folder / "journal.jsonl").read_text().splitlines():
            event = json.loads(line)
            if "taken up after a break" in event.get("text", ""):  # the last break is the one that counts
                taken_up, count = True, 0
            count += taken_up and event["event"] == "step started" and event["number"] in finished
        again += count
    return again


def one(number: int, folder: Path, undisturbed: dict[int, object], tally: collections.Counter[str]) -> None:
    """One run, killed and taken up."""
    draw, seed = random.Random(number), 1 + number % 5
    home, records = folder / "home", folder / "records"
    lasting = Lasting(seed, folder) if number % 3 == 2 else None
    port = lasting.port if lasting else None
    text = (SEQUENCES / "harmonic-filter.yaml").read_text().replace("points: 801", "points: 401")
    (folder / "sequence.yaml").write_text(text)
    plan = make_plan(str(folder / "sequence.yaml"), str(lasting.file) if lasting else "workshop", TODAY)
    KeyStore(home).rehearsal()
    if "length" not in tally:
        start = time.perf_counter()
        killed(lambda: run(job(plan, seed, folder / "first", home, port)), None)
        tally["length"] = int(1e6 * (time.perf_counter() - start))
    if lasting is None and seed not in undisturbed:
        calm = folder / "calm"
        killed(lambda: run(job(plan, seed, calm, home, None)), None)
        undisturbed[seed] = found(calm)
    length = 1e-6 * tally["length"] * (1.6 if lasting else 1.0)
    cut = killed(lambda: run(job(plan, seed, records, home, port)), draw.uniform(0, length))
    stood: dict[str, set[int]] = {}
    for round_ in range(2 if draw.random() < 1 / 3 else 1):
        if round_:
            killed(lambda: resume(records, seed, home, port), draw.uniform(0, length))
            tally["killed twice"] += 1
        for path in journals(records) if records.is_dir() else []:
            tally["found with the source on"] += bool(lasting and lasting.analyzer.output)
            try:
                story, _ = take_up(path, TODAY)
            except NothingDone:
                continue
            # Of units whose record stands nothing is done any more, whatever the journal still says of them.
            whole = {read(f).payload.unit.serial for f in records.iterdir() if not f.name.startswith(".")}
            stood = {u.serial: u.finished for u in story.units if u.serial not in whole}
    if records.is_dir():
        for path in records.iterdir():  # whatever shows under a name is whole
            if not path.name.startswith("."):
                audit(path, KeyStore(home), recompute)
    killed(lambda: resume(records, seed, home, port) if records.is_dir() else None, None)
    tally["killed in time"] += cut
    tally["over a socket"] += lasting is not None
    if lasting:
        tally["output left on"] += bool(lasting.analyzer.output)
        lasting.close()
    if not records.is_dir() or not list(records.iterdir()):
        tally["nothing had begun"] += 1
        return
    results = found(records)
    tally["steps that had finished"] += sum(len(steps) for steps in stood.values())
    tally["finished steps repeated"] += steps_again(records, stood)
    tally["units without record"] += len(set(UNITS) - set(results))
    if lasting is None:
        tally["other than undisturbed"] += results != undisturbed[seed]
    else:
        tally["other conclusion"] += [r[0][0] for r in results.values()] != ["pass"] * len(results)  # type: ignore[index]


def main(runs: int) -> int:
    """Print the table; exit code 1 if anything is not as it should be."""
    tally: collections.Counter[str] = collections.Counter()
    undisturbed: dict[int, object] = {}
    start = time.perf_counter()
    for number in range(runs):
        with tempfile.TemporaryDirectory() as name:
            os.environ["BENCHRUN_HOME"] = str(Path(name) / "home")
            try:
                one(number, Path(name), undisturbed, tally)
            except Exception as error:
                tally["went wrong"] += 1
                print(f"run {number}: {type(error).__name__}: {error}", flush=True)
    del tally["length"]
    bad = ("output left on", "finished steps repeated", "units without record", "other than undisturbed",
           "other conclusion", "went wrong")  # fmt: skip
    print(f"{runs} runs in {time.perf_counter() - start:.0f} s")
    for what, count in sorted(tally.items()):
        print(f"  {what:<28}{count:>6}{'  (must be 0)' if what in bad else ''}")
    return int(any(tally[what] for what in bad))


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 300))
