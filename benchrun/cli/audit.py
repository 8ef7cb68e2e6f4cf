"""``benchrun audit``."""

from __future__ import annotations

from pathlib import Path

import click

__all__ = ["command"]


@click.command("audit")
@click.argument("records", nargs=-1, required=True, metavar="RECORD...", type=click.Path(path_type=Path))
def command(records: tuple[Path, ...]) -> int:
    """Check each RECORD (a folder): its signature, every file's digest, and its result.

    The result is computed again from the raw readings in the record. Exit code 0 only if all is as it was
    signed; 5 otherwise, and what is wrong is named.
    """
    from benchrun.errors import RecordError
    from benchrun.record.audit import audit
    from benchrun.record.keys import KeyStore
    from benchrun.record.recompute import recompute

    store, code = KeyStore(), 0
    for record in records:
        try:
            found = audit(record, store, recompute)
        except RecordError as error:
            code = 5
            click.echo(f"{record}: does not stand\n  {error}", err=True)
            continue
        payload = found.record.payload
        click.echo(
            f"{record}: stands. {payload.sequence.name} on {payload.unit.serial}: {payload.conclusion}"
        )
        for finding in found.findings:
            click.echo(f"  {finding}")
    return code
