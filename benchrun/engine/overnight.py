"""A night: jobs on several benches side by side, each run in a process of its own, until all are done.

Tasks on the same real bench go one after the other; rehearsals as many at a time as there are workers. What
is done stands in a journal beside the records, so that a night that was broken off goes on where it was; a
run that was broken off is taken up. A job that fails does not stop the others.
"""

from __future__ import annotations

import hashlib
import json
import queue
import signal
import subprocess
import sys
import threading
import time
from collections import deque
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeAlias

from benchrun.engine.journal import Journal, read_journal
from benchrun.engine.plan import bench_for
from benchrun.engine.resume import is_going, journals
from benchrun.engine.stopping import StopSignals
from benchrun.engine.story import read_story
from benchrun.errors import InputError
from benchrun.sequence.files import Loaded
from benchrun.sequence.find import find
from benchrun.sequence.night import Night

__all__ = ["NightResult", "Settings", "Worker", "code_of", "overnight"]

_GRACE_S = 60.0
"""How long a run may take to make its bench safe and write its record when it is told to stop."""
_POLL_S = 0.2
_MOST_ATTEMPTS = 2


@dataclass(frozen=True, slots=True)
class Settings:
    """What the command line says about a night.

    Parameters
    ----------
    records
        Folder of records.
    operator, key
        As of a run.
    progress
        Told of everything that happens, as plain data.
    afresh
        Forget what an earlier night of that name had done.
    """

    records: Path
    operator: str
    key: str = ""
    progress: Callable[[dict[str, Any]], None] = lambda _: None
    afresh: bool = False


@dataclass(slots=True)
class NightResult:
    """What a night came to.

    Parameters
    ----------
    night, title
        Its name.
    answers
        By job, what each run answered, in order of the repeats.
    seconds
        How long it took, breaks not counted.
    """

    night: str
    title: str
    answers: dict[str, list[dict[str, Any]]] = field(default_factory=dict)
    seconds: float = 0.0

    @property
    def exit_code(self) -> int:
        """0 only if everything concluded and conformed; otherwise the greatest of all runs."""
        return max((code_of(answer) for found in self.answers.values() for answer in found), default=0)


def code_of(answer: dict[str, Any]) -> int:
    """Exit code of one run."""
    return int(max([answer.get("code", 0), *(unit["code"] for unit in answer["units"])]))


@dataclass(slots=True)
class Task:
    """One run.

    Parameters
    ----------
    job, lane
        Of which job; what it shares with no other at the same time, empty where it shares nothing.
    order
        What the worker is told.
    attempts
        How often it was given to one.
    """

    job: str
    lane: str
    order: dict[str, Any]
    attempts: int = 0


Said: TypeAlias = "queue.Queue[tuple[Worker, str | None]]"
"""What workers say: a line, or None when one has died."""


class Worker:
    """A process, and the task it is at."""

    def __init__(self, said: Said) -> None:
        own: dict[str, Any] = {"start_new_session": True}  # Ctrl-C is for the night, which tells its workers
        if sys.platform == "win32":
            own = {"creationflags": subprocess.CREATE_NEW_PROCESS_GROUP}
        self.process = subprocess.Popen(
            [sys.executable, "-m", "benchrun.engine.nightworker"],
            stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, **own,
        )  # fmt: skip
        self.task: Task | None = None
        self.begun = 0.0
        self.told_to_stop = 0.0
        threading.Thread(target=self._listen, args=(said,), daemon=True).start()

    def _listen(self, said: Said) -> None:
        assert self.process.stdout is not None
        for line in self.process.stdout:
            said.put((self, line))
        said.put((self, None))

    def give(self, task: Task) -> None:
        """Give it a task."""
        self.task, self.begun, self.told_to_stop = task, time.monotonic(), 0.0
        task.attempts += 1
        assert self.process.stdin is not None
        try:
            self.process.stdin.write(json.dumps(task.order) + "\n")
            self.process.stdin.flush()
        except OSError:
            pass  # it has died, which its silence will tell

    def stop(self) -> None:
        """Tell it to make safe and end; kill it if it does not."""
        now = time.monotonic()
        if not self.told_to_stop:
            self.told_to_stop = now
            self.process.send_signal(getattr(signal, "CTRL_BREAK_EVENT", signal.SIGTERM))
        elif now - self.told_to_stop > _GRACE_S:
            self.process.kill()

    def end(self) -> None:
        """No more tasks."""
        assert self.process.stdin is not None
        self.process.stdin.close()
        self.process.wait(_GRACE_S)


def overnight(
    night: Loaded[Night], settings: Settings, worker: Callable[[Said], Worker] | None = None
) -> NightResult:
    """Run a night to its end.

    Parameters
    ----------
    night
        The file.
    settings
        Where and who.
    worker
        Makes a worker that puts what it says into a queue; a process of its own by default.

    Raises
    ------
    InputError
        For names that mean nothing; if the file was changed since the night was begun.
    OSError
        If its journal cannot be written.
    """
    settings.records.mkdir(parents=True, exist_ok=True)
    tasks = _tasks(night, settings)
    journal, done = _journal(night, settings)
    shift = _Shift(night.model, settings, journal, tasks, done, worker or Worker)
    try:
        result = shift.work()
    except BaseException:
        journal.close()
        raise
    if shift.broken_off:
        journal.close()
    else:
        journal.remove()
    return result


def _tasks(night: Loaded[Night], settings: Settings) -> list[Task]:
    found = []
    for job in night.model.jobs:
        sequence = find("sequence", job.sequence, night.folder)
        bench = job.bench or bench_for(str(sequence))
        bench = str(find("bench", bench, night.folder).resolve())
        for repeat in range(job.repeats):
            label = f"{night.model.night}/{job.job}/{repeat + 1}"
            order = {
                "label": label, "sequence": str(sequence.resolve()), "bench": bench,
                "units": list(job.serials), "records": str(settings.records), "key": settings.key,
                "seed": None if job.rehearsal is None else job.rehearsal.seed + repeat,
                "operator": settings.operator,
            }  # fmt: skip
            found.append(Task(job.job, bench if job.rehearsal is None else "", order))
    return found


def _journal(night: Loaded[Night], settings: Settings) -> tuple[Journal, dict[str, dict[str, Any]]]:
    path = settings.records / f".{night.model.night}.night"
    digest = hashlib.sha256(night.document.raw).hexdigest()
    if settings.afresh:
        path.unlink(missing_ok=True)
    if path.exists():
        if is_going(path):
            raise InputError(f"the night {night.model.night} is still going in {settings.records}")
        contents = read_journal(path.read_bytes())
        entries = contents.entries
        if entries and entries[0].facts["digest"] != digest:
            raise InputError(
                night.document.problem(
                    "the file was changed since this night was begun", ("night",),
                    "Put it back to go on, or begin anew with --afresh.",
                )
            )  # fmt: skip
        if entries:
            done = {e.facts["label"]: json.loads(e.content) for e in entries if e.what == "done"}
            return Journal(path, keep=contents.good, last=contents.last), done
        path.unlink()
    journal = Journal(path)
    journal.line("begun", digest=digest)
    journal.sync()
    return journal, {}


class _Shift:
    """The work of one night."""

    def __init__(
        self, night: Night, settings: Settings, journal: Journal, tasks: list[Task],
        done: dict[str, dict[str, Any]], worker: Callable[[Said], Worker],
    ) -> None:  # fmt: skip
        self.night, self.settings, self.journal = night, settings, journal
        self.order = [(task.job, str(task.order["label"])) for task in tasks]
        self.done = done
        self.waiting = deque(task for task in tasks if task.order["label"] not in done)
        self.said: Said = queue.Queue()
        self._new = worker
        self.workers: list[Worker] = []
        self.in_a_row: dict[str, int] = {}
        self.broken_off = False
        self.started = time.monotonic()

    def work(self) -> NightResult:
        """Until everything is done, or it is time to give up."""
        self._take_up_journals()
        try:
            with StopSignals() as stop:
                while True:
                    late = self.night.limits.time is not None and self._age() > self.night.limits.time
                    if stop.asked or late:
                        self._give_up("the night was stopped" if stop.asked else "the night's time was over")
                        self.broken_off = self.broken_off or stop.asked
                    self._hand_out()
                    if not self.waiting and not any(worker.task for worker in self.workers):
                        break
                    self._listen()
        finally:
            for worker in self.workers:
                worker.end()
        result = NightResult(self.night.night, self.night.title, seconds=self._age())
        for job, label in self.order:
            result.answers.setdefault(job, []).append(self.done[label])
        return result

    def _age(self) -> float:
        return time.monotonic() - self.started

    def _take_up_journals(self) -> None:
        """Runs of this night that broke off with it are taken up by their tasks."""
        by_label = {task.order["label"]: task for task in self.waiting}
        for path in journals(self.settings.records):
            try:
                label = read_story(path).orders.label
            except (InputError, OSError):
                continue
            if label in by_label:
                by_label[label].order["journal"] = str(path)

    def _hand_out(self) -> None:
        busy = {worker.task.lane for worker in self.workers if worker.task and worker.task.lane}
        for task in list(self.waiting):
            if task.lane in busy:
                continue
            worker = next((w for w in self.workers if w.task is None), None)
            if worker is None:
                if len(self.workers) >= self.night.workers:
                    return
                self.workers.append(worker := self._new(self.said))
            self.waiting.remove(task)
            worker.give(task)
            if task.lane:
                busy.add(task.lane)

    def _listen(self) -> None:
        limit = self.night.limits.run
        for worker in self.workers:
            if worker.task and limit is not None and time.monotonic() - worker.begun > limit:
                worker.stop()
        try:
            worker, line = self.said.get(timeout=_POLL_S)
        except queue.Empty:
            return
        task, worker.task = worker.task, None
        if line is not None and task is not None:
            self._finished(task, json.loads(line))
        elif line is None:
            self.workers.remove(worker)
            code = worker.process.wait()
            if task is not None:
                self._died(task, code)

    def _died(self, task: Task, code: int) -> None:
        """A process ended in the middle: what it had begun is taken up once by another."""
        if task.attempts < _MOST_ATTEMPTS:
            self.waiting.appendleft(task)
            self._take_up_journals()
            return
        self._finished(task, _not_run(task, f"its process ended by itself with code {code}, twice", 3))

    def _finished(self, task: Task, answer: dict[str, Any]) -> None:
        label = task.order["label"]
        self.done[label] = answer
        self.journal.line("done", json.dumps(answer).encode(), label=label)
        self.journal.sync()
        failed = code_of(answer) != 0
        self.in_a_row[task.job] = self.in_a_row.get(task.job, 0) + 1 if failed else 0
        for unit in answer["units"] or [{"unit": None, "conclusion": None, "record": None}]:
            self.settings.progress(
                {
                    "event": "run", "job": task.job, "label": label, "unit": unit["unit"],
                    "conclusion": unit["conclusion"], "record": unit["record"],
                    "reason": unit.get("reason") or answer.get("trouble", ""),
                    "seconds": answer["seconds"], "done": len(self.done), "of": len(self.order),
                }
            )  # fmt: skip
        most = self.night.limits.failures_in_a_row
        if most is not None and self.in_a_row[task.job] >= most:
            self._skip(lambda t: t.job == task.job, f"{most} failures in a row")

    def _give_up(self, why: str) -> None:
        self._skip(lambda _: True, why)
        for worker in self.workers:
            if worker.task:
                worker.stop()

    def _skip(self, which: Callable[[Task], bool], why: str) -> None:
        for task in [task for task in self.waiting if which(task)]:
            self.waiting.remove(task)
            self.done[task.order["label"]] = _not_run(task, f"not run: {why}", 4)


def _not_run(task: Task, why: str, code: int) -> dict[str, Any]:
    return {"label": task.order["label"], "seconds": 0.0, "units": [], "trouble": why, "code": code}
