"""Taking runs up again: find their journals, see whether they can go on, sweep leavings of half records."""

from __future__ import annotations

import contextlib
import datetime
import os
import shutil
from pathlib import Path

from benchrun.engine.journal import SUFFIX
from benchrun.engine.oslock import hold
from benchrun.engine.plan import Plan, load_dialects, make_plan
from benchrun.engine.story import Story, read_story
from benchrun.errors import BenchError, InputError
from benchrun.evaluate.building import build
from benchrun.instruments.dialect import Dialect
from benchrun.sequence.bench import Bench
from benchrun.sequence.fields import FileModel
from benchrun.sequence.files import load_model
from benchrun.sequence.models import Sequence

__all__ = ["StillGoing", "is_going", "journals", "sweep", "take_up"]


class StillGoing(BenchError):
    """The run is not broken off: its process lives.

    Parameters
    ----------
    path
        Its journal.
    """

    def __init__(self, path: Path) -> None:
        super().__init__(path)
        self.path = path

    def __str__(self) -> str:
        return f"{self.path} belongs to a run that is still going; end that one first"


def journals(records: Path) -> list[Path]:
    """Journals in a folder of records, the oldest first."""
    return sorted(path for path in records.glob(f".*{SUFFIX}") if path.is_file())


def is_going(path: Path) -> bool:
    """Whether a journal's run lives: then it holds the journal's lock."""
    try:
        handle = os.open(path, os.O_RDWR | getattr(os, "O_BINARY", 0))
    except OSError:  # gone in between: it has just come to its end
        return False
    try:
        return not hold(handle)
    except OSError:  # no locks there: nobody can say, so nothing is taken from anybody
        return False
    finally:
        os.close(handle)


def sweep(records: Path) -> list[Path]:
    """Remove what is left of records that were never finished; nothing while a run in that folder lives.

    Returns
    -------
    list of pathlib.Path
        What was removed.
    """
    if any(is_going(path) for path in journals(records)):
        return []
    removed = []
    for path in sorted([*records.glob(".*.partial"), *records.glob(".probe-*")]):
        with contextlib.suppress(OSError):
            shutil.rmtree(path)
            removed.append(path)
    return removed


def take_up(path: Path, today: datetime.date, close: str = "") -> tuple[Story, Plan]:
    """Read a journal, and find out whether its run can go on.

    Parameters
    ----------
    path
        The journal.
    today
        For dates on which kits are due.
    close
        A reason not to go on.

    Returns
    -------
    Story, Plan
        The story says with ``closing`` why the run can only become an invalid record; the plan is then made
        of the copies in the journal.

    Raises
    ------
    StillGoing
        If its process lives.
    InputError
        If there is nothing to be taken up in it, or the copies make no plan.
    """
    if is_going(path):
        raise StillGoing(path)
    story = read_story(path)
    try:
        plan = make_plan(story.facts["sequence"], story.facts["bench"], today)
    except InputError as error:
        story.closing = f"the run broke off, and its files cannot be used any more: {error.problems[0]}"
    else:
        if plan.digest == story.facts["plan"] and not close:
            return story, plan
        story.closing = close or "the run broke off, and its sequence, bench, kit or masks were changed since"
    return story, _plan_of_copies(story)


def _plan_of_copies(story: Story) -> Plan:
    files = {name: raw for name, (_, raw) in story.inputs.items()}
    sequence = load_model(files["sequence"], "sequence", Sequence, Path(story.facts["sequence"]))
    bench = load_model(files["bench"], "bench", Bench, Path(story.facts["bench"]))
    dialects: dict[str, FileModel] = {}
    with contextlib.suppress(InputError):  # a dialect that is gone: then nothing can be said to the bench
        dialects = load_dialects(bench, sequence.model.roles)
    dialect = dialects.pop("analyzer", None)
    assert dialect is None or isinstance(dialect, Dialect)  # by its role
    return Plan(sequence, bench, dialect, dialects, build(files), story.inputs, story.facts["plan"])
