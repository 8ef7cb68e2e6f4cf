"""``benchrun bench``."""

from __future__ import annotations

import click

__all__ = ["command"]


@click.command("bench")
@click.argument("file")
@click.option("--simulated", is_flag=True, help="Ask the instruments of its simulation instead.")
def command(file: str, simulated: bool) -> int:
    """Ask each instrument of the bench FILE (or name) who it is and how it feels.

    Leaves every source off. Exit code 3 if one does not answer, is another than expected, or reports trouble.
    """
    from benchrun.clock import Clock, SystemClock
    from benchrun.engine.benchtop import Benchtop, ask_health
    from benchrun.engine.plan import load_dialects
    from benchrun.engine.rehearsal import prepare_rehearsal
    from benchrun.instruments.dialect import Dialect
    from benchrun.sequence.bench import Bench
    from benchrun.sequence.files import read
    from benchrun.sequence.find import find

    loaded = read(find("bench", file), Bench)
    dialects = load_dialects(loaded, loaded.model.instruments)
    dialect = dialects.pop("analyzer", None)
    assert dialect is None or isinstance(dialect, Dialect)  # by its role
    library: object = None
    clock: Clock = SystemClock()
    if simulated:
        rehearsal = prepare_rehearsal(loaded, 1)
        library, clock = rehearsal.library, rehearsal.clock
    click.echo(f"{loaded.model.bench}: {loaded.model.title}")
    with Benchtop(loaded.model, dialect, library, clock, dialects) as top:
        troubles = ask_health(
            top, lambda f: click.echo(f"  {f.role} at {f.resource}: {f.identity.text} ({f.identity.origin})")
        )
        left_on = top.make_safe()
    for trouble in (*troubles, *left_on):
        click.echo(f"  reports {trouble}")
    if not troubles and not left_on:
        click.echo("  no errors, no overload, reference locked; source off")
    return 3 if troubles or left_on else 0
