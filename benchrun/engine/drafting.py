"""The draft of a unit's record: everything that a run knows, put into a payload and files."""

from __future__ import annotations

import functools
import json
import platform
import sys
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import TYPE_CHECKING

import benchrun
from benchrun.evaluate.results import result_files
from benchrun.record.draft import Draft
from benchrun.record.payload import (
    Agreement,
    CalibrationEntry,
    InstrumentEntry,
    Payload,
    ReadingEntry,
    ResultEntry,
    SequenceEntry,
    UnitEntry,
    utc_text,
)
from benchrun.sequence.files import load_model
from benchrun.sequence.kit import KitFile
from benchrun.sequence.steps import Calibrate
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
        calibrations=_calibrations(unit, entries, started),
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


@functools.lru_cache(8)
def _kit(raw: bytes) -> KitFile:
    return load_model(raw, "kit", KitFile).model


def _calibrations(
    unit: UnitRun, readings: Iterable[ReadingEntry], started: datetime
) -> tuple[CalibrationEntry, ...]:
    """What each calibration depends on: the files say it, and the readings when."""
    plan, found = unit.job.plan, []
    identities = {one.role: one.identity.text for one in unit.top.found}
    cables = tuple(f"{cable.name} on port {cable.port}" for cable in plan.bench.model.cables)
    taken = {entry.step: entry.taken_s for entry in readings}  # of each step the last
    for step in plan.sequence.model.steps:
        if not isinstance(step, Calibrate) or step.name not in unit.state.calibrations:
            continue
        kit, setup = _kit(plan.inputs[f"kit:{step.kit}"][1]), plan.sequence.model.sweeps[step.sweep]
        grid, made_s = setup.grid(), taken[step.name]
        found.append(
            CalibrationEntry(
                step=step.name,
                method=step.method,
                kit=kit.kit,
                kit_serial=kit.serial,
                kit_due=kit.due.isoformat() if kit.due else "",
                overruled=step.overrule or "",
                ports=step.used_ports,
                from_hz=float(grid[0]),
                to_hz=float(grid[-1]),
                points=len(grid),
                spacing="list" if setup.at is not None else setup.spacing,
                bandwidth_hz=setup.bandwidth,
                power_dbm=setup.power,
                averages=setup.averages,
                analyzer=identities.get("analyzer", ""),
                cables=cables,
                operator=unit.job.operator_name,
                made_utc=utc_text(started + timedelta(seconds=made_s)),
                made_s=made_s,
            )
        )
    return tuple(found)
