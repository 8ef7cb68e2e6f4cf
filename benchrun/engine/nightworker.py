"""A process of a night: one task after the other, told as lines of JSON, answered as lines of JSON.

Started as ``python -m benchrun.engine.nightworker``. It ends when its input ends; a run that is going then is
stopped as by SIGTERM, so that nothing is left switched on when whoever started it is gone.
"""

from __future__ import annotations

import datetime
import functools
import json
import os
import queue
import signal
import sys
import threading
import time
from pathlib import Path
from typing import Any

from benchrun.clock import SystemClock
from benchrun.engine.job import Job, Orders, Outcome
from benchrun.engine.operators import Nobody
from benchrun.engine.plan import Plan, make_plan
from benchrun.engine.rehearsal import prepare_rehearsal
from benchrun.engine.resume import take_up
from benchrun.engine.run import run
from benchrun.engine.story import NothingDone
from benchrun.errors import BenchError, Stopped
from benchrun.record.keys import KeyStore
from benchrun.record.signer import Signer

__all__ = ["carry_out", "main"]

_FIGURES = (
    "name",
    "value",
    "unit",
    "limit",
    "side",
    "margin",
    "uncertainty",
    "at_hz",
    "conclusion",
    "remark",
)


def carry_out(task: dict[str, Any]) -> dict[str, Any]:
    """One task: a run with all its units; whatever goes wrong is part of the answer."""
    start = time.perf_counter()
    try:
        outcomes = run(_job(task))
        return {
            "label": task["label"],
            "seconds": round(time.perf_counter() - start, 3),
            "units": [_told(outcome) for outcome in outcomes],
        }
    except (BenchError, Stopped, OSError) as error:
        code = getattr(error, "exit_code", 5)
        return _failed(task, start, str(error), code)
    except Exception as error:  # a fault of the program ends this task, not the night
        return _failed(task, start, f"a fault of the program: {type(error).__name__}: {error}", 3)


def _failed(task: dict[str, Any], start: float, trouble: str, code: int) -> dict[str, Any]:
    seconds = round(time.perf_counter() - start, 3)
    return {"label": task["label"], "seconds": seconds, "units": [], "trouble": trouble, "code": code}


def _told(outcome: Outcome) -> dict[str, Any]:
    return {
        "unit": outcome.unit,
        "conclusion": outcome.conclusion.value,
        "reason": outcome.reason,
        "trouble": outcome.trouble,
        "left_on": list(outcome.left_on),
        "record": str(outcome.record) if outcome.record else None,
        "simulated": outcome.origin != "measured",
        "bench_seconds": outcome.bench_s,
        "code": outcome.exit_code,
        "figures": [{key: getattr(figure, key) for key in _FIGURES} for figure in outcome.figures],
    }


@functools.cache
def _plan(sequence: str, bench: str, today: datetime.date) -> Plan:
    return make_plan(sequence, bench, today)


@functools.cache
def _rehearsal_key() -> Signer:
    return KeyStore().rehearsal()


@functools.cache
def _bench_key(name: str) -> Signer:
    return KeyStore().signer(name or None, os.environ.get("BENCHRUN_PASSPHRASE"))


def _job(task: dict[str, Any]) -> Job:
    story, plan = None, _plan(task["sequence"], task["bench"], datetime.date.today())
    if task.get("journal"):
        try:
            story, plan = take_up(Path(task["journal"]), datetime.date.today())
        except NothingDone:
            Path(task["journal"]).unlink()
    common: dict[str, Any] = {
        "plan": plan,
        "operator_name": task["operator"],
        "records": Path(task["records"]),
        "signer": lambda origin: _bench_key(task["key"]) if origin == "measured" else _rehearsal_key(),
        "sink": lambda _: None,
        "orders": Orders(task["key"], (), True, False, task["label"]),
        "story": story,
    }
    if task["seed"] is None:
        return Job(units=tuple(task["units"]), hands=Nobody(), clock=SystemClock(), **common)
    rehearsal = prepare_rehearsal(plan.bench, task["seed"])
    units = tuple(task["units"]) or (rehearsal.unit_for(plan.sequence.model),)
    return Job(
        units=units, hands=rehearsal.hands, clock=rehearsal.clock, library=rehearsal.library,
        seed=task["seed"], **common,
    )  # fmt: skip


def main() -> None:
    """Take tasks from standard input until it ends."""
    tasks: queue.Queue[str | None] = queue.Queue()

    def listen() -> None:
        for line in sys.stdin:
            tasks.put(line)
        tasks.put(None)
        if busy.is_set():
            signal.raise_signal(signal.SIGTERM) if os.name == "nt" else os.kill(os.getpid(), signal.SIGTERM)

    busy = threading.Event()
    threading.Thread(target=listen, daemon=True).start()
    while (line := tasks.get()) is not None:
        busy.set()
        answer = carry_out(json.loads(line))
        busy.clear()
        try:
            sys.stdout.write(json.dumps(answer, ensure_ascii=True) + "\n")
            sys.stdout.flush()
        except OSError:
            return


if __name__ == "__main__":
    main()
