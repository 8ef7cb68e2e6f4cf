"""``benchrun run``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from benchrun.cli.options import common, operator_or_user

if TYPE_CHECKING:
    from benchrun.record.keys import KeyStore
    from benchrun.record.signer import Signer

__all__ = ["command", "signer_of"]


@click.command("run")
@click.argument("sequence")
@click.option("--bench", required=True, metavar="FILE", help="Bench: file or name.")
@click.option(
    "--unit",
    "units",
    multiple=True,
    metavar="SERIAL",
    help="Unit; may be given several times.",
)
@click.option("--batch", is_flag=True, help="Ask for unit after unit until there are no more.")
@click.option("--key", metavar="NAME", help="Key that signs; needed only if there are several.")
@common
def command(
    sequence: str,
    bench: str,
    units: tuple[str, ...],
    batch: bool,
    key: str | None,
    operator: str | None,
    records: Path,
    as_json: bool,
    unattended: bool,
) -> int:
    """Run SEQUENCE at the instruments of a bench file.

    SEQUENCE is a file, or a name found in ./sequences, then among the installed ones. You are asked for each
    connection; Enter goes on, "stop" ends the run. Several units share one calibration. With --batch you are
    asked for one serial number after the other, and each record is finished while you connect the next unit.
    The record is signed with your key (benchrun keys make NAME); its passphrase comes from
    BENCHRUN_PASSPHRASE or is asked. A run that breaks off is taken up again by benchrun resume.
    """
    import datetime

    if not units and not batch:
        raise click.UsageError("Missing option '--unit': name the unit, or be asked for each with --batch")
    if batch and unattended:
        raise click.UsageError("--batch asks for serial numbers, and --unattended asks nobody: choose one")

    from benchrun.cli.running import ask, report_run
    from benchrun.clock import SystemClock
    from benchrun.engine.batch import BatchPerson
    from benchrun.engine.job import Job, Orders
    from benchrun.engine.operators import Nobody, Person
    from benchrun.engine.plan import make_plan
    from benchrun.record.keys import KeyStore

    plan, store = make_plan(sequence, bench, datetime.date.today()), KeyStore()
    return report_run(
        lambda sink: Job(
            plan=plan,
            units=units,
            operator_name=operator_or_user(operator),
            hands=Nobody() if unattended else BatchPerson(ask) if batch else Person(ask),
            clock=SystemClock(),
            records=records,
            signer=lambda origin: (
                signer_of(store, key, unattended) if origin == "measured" else store.rehearsal()
            ),
            sink=sink,
            orders=Orders(key=key or "", unattended=unattended, batch=batch),
        ),
        as_json,
    )


def signer_of(store: KeyStore, name: str | None, unattended: bool) -> Signer:
    """The key of a run at real instruments; its passphrase is asked for where somebody is there."""
    import os
    import sys

    passphrase = os.environ.get("BENCHRUN_PASSPHRASE")
    wanted = [info for info in store.list() if info.purpose == "bench" and name in (None, info.name)]
    if (
        passphrase is None
        and len(wanted) == 1
        and wanted[0].protected
        and not unattended
        and sys.stdin.isatty()
    ):
        passphrase = click.prompt(f"Passphrase of key {wanted[0].name}", hide_input=True, err=True)
    return store.signer(name, passphrase)
