"""What tests of whole runs share: a folder to work in, the command line, and a line that misbehaves."""

from __future__ import annotations

import datetime
import json
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import pytest
from pyvisa.constants import StatusCode

from benchrun.cli.main import _main
from benchrun.cli.running import report_run
from benchrun.engine.plan import make_plan
from benchrun.engine.rehearsal import Rehearsal, prepare_rehearsal
from benchrun.engine.run import Job
from benchrun.record.keys import KeyStore

FILTER = """\
sequence: small-filter
edition: 1
title: Harmonic low-pass filter, few points
unit:
  part: transmitter harmonic filter, 169 MHz
  serial: "HF-[0-9]{4}"
  withstands: {power: 30 dBm}
  fixture: {left: jig-left, right: jig-right}
sweeps:
  wide: {from: 5 MHz, to: 1.2 GHz, points: 61, spacing: log, bandwidth: 10 kHz, power: -10 dBm}
steps:
  - calibrate: {as: plane, sweep: wide, method: SOLT, kit: n50-workshop, keep: 8 h}
  - sweep: {as: in-jig, with: plane}
  - de-embed: {as: filter, from: in-jig, left: jig-left.s2p, right: jig-right.s2p}
  - judge:
      from: filter
      rule: {guard band: 1 U}
      limits:
        - {figure: insertion loss, over: 160 MHz to 175 MHz, at most: 0.6 dB}
        - {figure: rejection, over: 338 MHz to 352 MHz, at least: 45 dB}
        - {figure: return loss, port: 1, over: 160 MHz to 175 MHz, at least: 14 dB}
"""
"""The installed sequence with few points, so that a run takes little time."""


@pytest.fixture(autouse=True)
def home(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A place for keys that is nobody's; no test sees or touches the user's own."""
    folder = tmp_path / "home"
    monkeypatch.setenv("BENCHRUN_HOME", str(folder))
    monkeypatch.delenv("BENCHRUN_PASSPHRASE", raising=False)
    return folder


@dataclass(frozen=True)
class Answer:
    """What a command came to."""

    code: int
    out: str
    err: str

    @property
    def document(self) -> dict[str, Any]:
        """The JSON document; there must be nothing else on standard output."""
        found: dict[str, Any] = json.loads(self.out)
        return found


@pytest.fixture
def cli(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> Callable[..., Answer]:
    """The command line, in a folder of its own where ``filter.yaml`` lies."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "filter.yaml").write_text(FILTER)

    def call(*arguments: str) -> Answer:
        capsys.readouterr()
        code = _main(list(arguments))
        said = capsys.readouterr()
        return Answer(code, said.out, said.err)

    return call


class Mishaps:
    """A wrapper around the simulated VISA library: from a given request on, something goes wrong.

    Parameters
    ----------
    rehearsal
        Its library is the one that is wrapped.
    """

    def __init__(self, rehearsal: Rehearsal) -> None:
        self.library = rehearsal.library
        self.requests: list[str] = []
        self._plans: list[tuple[str, int, Callable[[], None]]] = []
        self._canned: bytes | None = None
        self._write, self._read, self._clear = self.library.write, self.library.read, self.library.clear
        self.library.write, self.library.read, self.library.clear = self.write, self.read, self.clear

    def at(self, words: str, number: int, happens: Callable[[], None]) -> None:
        """Let something happen right after the request number ``number`` that holds ``words`` was sent."""
        self._plans.append((words, number, happens))

    def answer(self, words: str, number: int, data: bytes) -> None:
        """Answer that request with other bytes; with none, never."""
        self.at(words, number, lambda: setattr(self, "_canned", data))

    def twice(self, words: str, number: int, data: bytes) -> None:
        """Answer that request so, and the next one too: then reading again does not help."""
        self.answer(words, number, data)
        self.answer(words, number + 1, data)

    def write(self, session: Any, data: bytes) -> Any:
        """Send, and let happen what is planned."""
        self._canned = None
        text = bytes(data).decode()
        self.requests.append(text)
        sent = self._write(session, data)
        for words, number, happens in self._plans:
            if words in text and sum(words in one for one in self.requests) == number:
                happens()
        if self._canned is not None:  # what the instrument itself had to say is gone
            line = self.library.sessions[session].line
            line.proceed()
            line.take(1 << 30)
        return sent

    def read(self, session: Any, count: int) -> Any:
        """Read what the instrument answers, or what was planned."""
        if self._canned is None:
            return self._read(session, count)
        if not self._canned:
            return b"", self.library.handle_return_value(session, StatusCode.error_timeout)
        piece, self._canned = self._canned[:count], self._canned[count:]
        status = StatusCode.success_max_count_read if self._canned else StatusCode.success
        return piece, self.library.handle_return_value(session, status)

    def clear(self, session: Any) -> Any:
        """Device clear."""
        self._canned = None
        return self._clear(session)


@dataclass
class Workplace:
    """A folder with a sequence, a rehearsal bench, and everything that a job needs."""

    folder: Path
    capsys: pytest.CaptureFixture[str]
    rehearsal: Rehearsal
    job: Job
    mishaps: Mishaps
    events: list[Any] = field(default_factory=list)

    @property
    def analyzer(self) -> Any:
        """The simulated analyzer that the bench file names."""
        return self.rehearsal.bench.instruments[self.job.plan.bench.model.analyzer.resource]

    @property
    def records(self) -> list[Path]:
        """All records, hidden leavings included."""
        return sorted(self.job.records.iterdir())

    def run(self, **changes: Any) -> Answer:
        """Run the job as the commands do, told as a JSON document."""
        self.capsys.readouterr()

        def make(sink: Callable[[Any], None]) -> Job:
            def both(event: Any) -> None:
                self.events.append(event)
                sink(event)

            return replace(self.job, sink=both, **changes)

        code = report_run(make, as_json=True)
        said = self.capsys.readouterr()
        return Answer(code, said.out, said.err)

    def audit(self, record: str | Path) -> Answer:
        """Audit a record by the command."""
        self.capsys.readouterr()
        code = _main(["audit", str(record)])
        said = self.capsys.readouterr()
        return Answer(code, said.out, said.err)


@pytest.fixture
def small_filter() -> str:
    """Text of the sequence that a :class:`Workplace` runs."""
    return FILTER


@pytest.fixture
def workplace(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> Callable[..., Workplace]:
    """Makes a :class:`Workplace`."""

    def make(
        sequence: str = FILTER, bench: str = "workshop", units: tuple[str, ...] = ("HF-0001",), seed: int = 1
    ) -> Workplace:
        path = tmp_path / "sequence.yaml"
        path.write_text(sequence)
        plan = make_plan(str(path), bench, datetime.date(2026, 12, 1))
        rehearsal = prepare_rehearsal(plan.bench, seed)
        job = Job(
            plan, units, "tester", rehearsal.hands, rehearsal.clock, tmp_path / "records",
            lambda _: KeyStore().rehearsal(), lambda _: None, rehearsal.library, seed,
        )  # fmt: skip
        return Workplace(tmp_path, capsys, rehearsal, job, Mishaps(rehearsal))

    return make
