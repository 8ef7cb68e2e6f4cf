"""``benchrun sequences``."""

from __future__ import annotations

import click

__all__ = ["command"]


@click.command("sequences")
def command() -> int:
    """List what can be called by name: sequences, benches, kits, masks and fixtures.

    Names are found in ./sequences first, then among the installed ones.
    """
    from benchrun.errors import InputError
    from benchrun.sequence.files import KINDS, read
    from benchrun.sequence.find import named

    for kind, plural in (("sequence", "sequences"), ("bench", "benches"), ("kit", "kits"), ("mask", "masks")):
        click.echo(plural)
        for name, path in named(kind):
            try:
                title = getattr(read(path, KINDS[kind]).model, "title", "")
            except InputError as error:
                title = f"cannot be used: {error.problems[0]}"
            click.echo(f"  {name:<28} {title}")
    click.echo("fixtures")
    for name, _ in named("fixture"):
        click.echo(f"  {name}")
    return 0
