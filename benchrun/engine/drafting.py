"""The draft of a unit's record: everything that a run knows, put into a payload and files."""

from __future__ import annotations

import functools
import json
import platform
import sys
from dataclasses import dataclass
from datetime import datetime
from typing import TYPE_CHECKING

import benchrun
from benchrun.evaluate.results import result_files
from benchrun.record.draft import Draft
from benchrun.record.payload import (
    Agreement,
    InstrumentEntry,
    Payload,
    ResultEntry,
    SequenceEntry,
    UnitEntry,
    utc_text,
)
from benchrun.uncertainty.decision import Conclusion

if TYPE_CHECKING:
    from benchrun.engine.unit import UnitRun

__all__ = ["Ending", "draft_of"]

_LIBRARIES = ("numpy", "scikit-rf", "pyvisa", "pyvisa-py", "pyvisa-sim", "pydantic", "cryptography")


@dataclass(frozen=True, slots=True)
class Ending:
    """How a run ended."""

    conclusion: Conclusion
    reason: str = ""
    advice: str = ""


@functools.cache
def software() -> dict[str, str]:
    """Versions of what computed the result."""
    from importlib.metadata import PackageNotFoundError, version

    found = {"benchrun": benchrun.__version__, "python": platform.python_version()}
    for name in _LIBRARIES:
        try:
            found[name] = version(name)
        except PackageNotFoundError:  # a source tree without metadata
            found[name] = "unknown"
    return found


@functools.cache
def _environment() -> bytes:
    facts = {
        "system": platform.system(),
        "release": platform.release(),
        "machine": platform.machine(),
        "computer": platform.node(),
        "python": sys.version,
        "software": software(),
    }
    return (json.dumps(facts, indent=1) + "\n").encode()


def draft_of(unit: UnitRun, ending: Ending, started: datetime, wall_s: float) -> Draft:
    """Put a record together.

    Parameters
    ----------
    unit
        The run.
    ending
        How it ended.
    started
        UTC.
    wall_s
        Duration by the machine.
    """
    job, state, plan = unit.job, unit.state, unit.job.plan
    sequence = plan.sequence.model
    entries, files = unit.kept.files(unit.emit.start_s)
    results = result_files(state)
    for path, contents in (*plan.inputs.values(), *results.values()):
        files[path] = contents
    files["transcript.jsonl"] = unit.transcript
    files["journal.jsonl"] = unit.emit.as_json_lines()
    files["environment.json"] = _environment()
    if unit.fault:
        files["fault.txt"] = unit.fault.encode()
    payload = Payload(
        sequence=SequenceEntry(name=sequence.sequence, title=sequence.title, edition=sequence.edition),
        unit=UnitEntry(serial=unit.serial, part=sequence.unit.part),
        conclusion=ending.conclusion.value,
        reason=ending.reason,
        advice=ending.advice,
        figures=state.figures,
        origin=unit.origin,  # type: ignore[arg-type]  # one of the three words
        seed=job.seed,
        operator=job.operator_name,
        bench=plan.bench.model.bench,
        started_utc=utc_text(started),
        ended_utc=utc_text(job.clock.utc()),
        bench_seconds=unit.bench_s,
        wall_seconds=round(wall_s, 6),
        instruments=tuple(
            InstrumentEntry(
                role=found.role,
                resource=found.resource,
                identity=found.identity.text,
                origin=found.identity.origin,  # type: ignore[arg-type]  # one of the three words
            )
            for found in unit.top.found
        ),
        inputs={name: path for name, (path, _) in plan.inputs.items()},
        readings=tuple(entries),
        results=tuple(
            ResultEntry(step=step, kind=kind, file=path)  # type: ignore[arg-type]  # one of the two words
            for (step, kind), (path, _) in results.items()
        ),
        agreements=tuple(Agreement(step=s, difference=d) for s, d in state.agreements.items()),
        software=software(),
        plan=plan.digest,
        residual_seed=plan.procedure.noise_seed,
        left_on=unit.left_on,
        repeated=unit.repeats,
        resumed=tuple(unit.past.notes) if unit.past is not None else (),
        retest=unit.retest,
    )
    stored = unit.shared.stored
    twins = {
        path: stored[path][1]
        for path, contents in files.items()
        if path in stored and stored[path][0] == contents
    }
    return Draft(payload, files, twins)
