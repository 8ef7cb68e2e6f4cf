"""What ``run`` and ``rehearse`` share: the screen, the JSON document, the exit code."""

from __future__ import annotations

import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    from benchrun.engine.events import Sink
    from benchrun.engine.job import Job, Outcome
    from benchrun.engine.plan import Plan
    from benchrun.engine.story import Story
    from benchrun.report.screen import Screen

__all__ = ["ask", "job_for", "report_jobs", "report_run"]


def ask(request: str) -> str:
    """Show a request on standard error and wait for a line.

    Raises
    ------
    EOFError
        If the input has ended.
    """
    click.echo(f"  {request}, then Enter (or: stop) ", nl=False, err=True)
    line = sys.stdin.readline() if sys.stdin is not None else ""
    if not line:
        raise EOFError
    return line


def report_run(job: Callable[[Sink], Job], as_json: bool) -> int:
    """Run a job, show it, and give the exit code.

    Parameters
    ----------
    job
        Makes the job from the sink that shows it.
    as_json
        The document on standard output and nothing else there.
    """
    return report_jobs([job], as_json)


def report_jobs(jobs: Sequence[Callable[[Sink], Job]], as_json: bool) -> int:
    """Run jobs one after the other, show them, and give the exit code: the greatest of all units.

    Parameters
    ----------
    jobs
        Each makes its job from the sink that shows it.
    as_json
        One document on standard output and nothing else there.
    """
    from benchrun.engine.run import run
    from benchrun.report.document import document
    from benchrun.report.screen import Screen

    screen = Screen(sys.stderr if as_json else sys.stdout, quiet=as_json)
    outcomes, unsaid = list["Outcome"](), list["Outcome"]()
    for make in jobs:
        job = make(screen.show)
        if job.orders.batch and (job.story is None or not job.story.closing):
            outcomes += _batch(job, screen, as_json)
        else:
            unsaid += run(job)
    outcomes += unsaid
    if as_json:
        click.echo(document(outcomes) if outcomes else '{"conclusion": null, "units": []}')
    for outcome in unsaid:
        screen.finish(outcome)
    return max((outcome.exit_code for outcome in outcomes), default=0)


def _batch(job: Job, screen: Screen, as_json: bool) -> tuple[Outcome, ...]:
    """Run a batch: each unit's conclusion at once, its record when it stands, a summary at the end."""
    from dataclasses import replace

    from benchrun.engine.batch import BatchDesk
    from benchrun.engine.run import run
    from benchrun.engine.tally import tally
    from benchrun.report.summary import summary
    from benchrun.sequence.checks import check_serial

    def tell(text: str) -> None:
        click.echo(text, err=True)

    model, past = job.plan.sequence.model, job.story.units if job.story is not None else []
    desk = BatchDesk(ask, tell, lambda serial: check_serial(serial, model), [u.serial for u in past])

    def concluded(outcome: Outcome) -> None:
        desk.concluded(outcome)
        screen.finish(outcome)

    def kept(outcome: Outcome) -> None:
        tell(outcome.trouble or f"{outcome.unit}: record {outcome.record}")

    outcomes = run(replace(job, desk=desk, concluded=concluded, kept=kept))
    for line in summary(tally(outcomes), desk.skipped):
        click.echo(line, err=as_json)
    return outcomes


def job_for(
    story: Story, plan: Plan, records: Path, key: str | None, unattended: bool
) -> Callable[[Sink], Job]:
    """The job that takes a run up again, as the run itself was started.

    Parameters
    ----------
    story, plan
        What was done, and what was planned.
    records
        Folder of records.
    key, unattended
        Override how it was started.
    """
    from benchrun.cli.run import signer_of
    from benchrun.clock import Clock, SystemClock
    from benchrun.engine.batch import BatchPerson
    from benchrun.engine.job import Job
    from benchrun.engine.operators import Nobody, Operator, Person
    from benchrun.engine.rehearsal import prepare_rehearsal
    from benchrun.record.keys import KeyStore

    store, orders = KeyStore(), story.orders
    alone = unattended or orders.unattended
    clock: Clock = SystemClock()
    person = BatchPerson(ask) if orders.batch else Person(ask)
    hands: Operator = Nobody() if alone or story.closing else person
    library: object = None
    if story.rehearsal:
        library = object()  # nothing is opened where a run is only closed: its world is gone
        if not story.closing:
            rehearsal = prepare_rehearsal(plan.bench, story.facts["seed"], orders.faults)
            clock, hands, library = rehearsal.clock, rehearsal.hands, rehearsal.library
    return lambda sink: Job(
        plan=plan,
        units=story.serials,
        operator_name=story.facts["operator"],
        hands=hands,
        clock=clock,
        records=records,
        signer=lambda origin: (
            signer_of(store, key or orders.key or None, alone) if origin == "measured" else store.rehearsal()
        ),
        sink=sink,
        library=library,
        seed=story.facts["seed"],
        orders=orders,
        story=story,
    )
