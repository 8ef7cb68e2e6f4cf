"""What ``run`` and ``rehearse`` share: the screen, the JSON document, the exit code."""

from __future__ import annotations

import sys
from collections.abc import Callable
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    from benchrun.engine.events import Sink
    from benchrun.engine.run import Job

__all__ = ["ask", "report_run"]


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
    from benchrun.engine.run import run
    from benchrun.report.document import document
    from benchrun.report.screen import Screen

    screen = Screen(sys.stderr if as_json else sys.stdout, quiet=as_json)
    outcomes = run(job(screen.show))
    if as_json:
        click.echo(document(outcomes))
    for outcome in outcomes:
        screen.finish(outcome)
    return max(outcome.exit_code for outcome in outcomes)
