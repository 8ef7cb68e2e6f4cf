"""A record's result once more, from its own copies of everything and its raw readings alone."""

from __future__ import annotations

from benchrun.errors import CouldNotCheck, InvalidMeasurement
from benchrun.evaluate.building import build
from benchrun.evaluate.chain import apply
from benchrun.evaluate.readings import Raw, decode
from benchrun.evaluate.results import result_files
from benchrun.evaluate.state import State
from benchrun.record.audit import Recomputed
from benchrun.record.verify import Record

__all__ = ["recompute"]


def recompute(record: Record) -> Recomputed:
    """Calibrate, correct, de-embed and judge again.

    A run that ended early has readings for its first steps only: what they give is computed, and the
    conclusion of such a run (invalid or stopped) is one of the run, which no reading can show.

    Parameters
    ----------
    record
        A record, verified.

    Raises
    ------
    CouldNotCheck
        If a reading or a file is missing.
    """
    payload = record.payload
    procedure = build(
        {name: record.content(file) for name, file in payload.inputs.items()}, payload.residual_seed
    )
    readings: dict[str, dict[str, Raw]] = {}
    for entry in payload.readings:
        raw = decode(record.content(entry.file), entry.file)
        readings.setdefault(entry.step, {})[entry.hookup] = raw
    state, cut_short = State(procedure), payload.conclusion in ("invalid", "stopped")
    try:
        for step in procedure.sequence.steps:
            apply(step, state, readings.get(step.name, {}))
    except (KeyError, InvalidMeasurement) as error:
        if not cut_short:
            raise CouldNotCheck(f"{record.folder}: step {step.name!r} cannot be repeated: {error}") from error
    figures, results = state.figures, dict(result_files(state).values())
    if cut_short:
        # The run may have ended between a step's arithmetic and the keeping of its result.
        kept = {entry.file for entry in payload.results}
        return Recomputed(
            payload.conclusion,
            figures[: len(payload.figures)],
            {p: r for p, r in results.items() if p in kept},
        )
    return Recomputed(state.conclusion.value, figures, results)
