"""``benchrun resume``."""

from __future__ import annotations

from pathlib import Path

import click

__all__ = ["command"]


@click.command("resume")
@click.argument("records", type=click.Path(path_type=Path), default=Path("records"))
@click.option("--close", is_flag=True, help="Do not go on: close each as an invalid record.")
@click.option("--key", metavar="NAME", help="Key that signs; the one the run was started with by default.")
@click.option("--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else.")
@click.option("--unattended", is_flag=True, help="Ask nobody for anything.")
def command(records: Path, close: bool, key: str | None, as_json: bool, unattended: bool) -> int:
    """Take up the runs in the folder RECORDS that broke off: a crash, a power cut, a full disk.

    Each goes on from its first unfinished step if its files, its bench and the age of its calibration still
    hold, and says what it repeats and why; otherwise the readings taken so far become a signed record with
    conclusion invalid. What is left of half-written records is removed.
    """
    import datetime

    from benchrun.cli.running import job_for, report_jobs
    from benchrun.engine.resume import StillGoing, journals, sweep, take_up
    from benchrun.engine.story import NothingDone
    from benchrun.errors import InputError

    if not records.is_dir():
        raise InputError(f"there is no folder of records {records}")
    code, jobs = 0, []
    for path in journals(records):
        reason = "the run broke off, and it was decided not to go on" if close else ""
        try:
            story, plan = take_up(path, datetime.date.today(), reason)
        except StillGoing as error:
            click.echo(f"{error}", err=True)
            code = max(code, error.exit_code)
            continue
        except NothingDone as error:
            click.echo(f"{error}; it is removed", err=True)
            path.unlink()
            continue
        jobs.append(job_for(story, plan, records, key, unattended))
    for folder in sweep(records):
        click.echo(f"removed {folder}, left of a record that was never finished", err=True)
    if not jobs and not as_json:
        click.echo(f"nothing to take up in {records}", err=True)
    return max(code, report_jobs(jobs, as_json))
