"""``benchrun rehearse``."""

from __future__ import annotations

from pathlib import Path

import click

from benchrun.cli.options import common, operator_or_user

__all__ = ["command"]


@click.command("rehearse")
@click.argument("sequence")
@click.option(
    "--bench", help="Bench whose simulation is used: name or file; by default the first that will do."
)
@click.option(
    "--unit", "units", multiple=True, metavar="SERIAL", help="Unit to test; may be given several times."
)
@click.option(
    "--seed", type=click.IntRange(0, 2**63 - 1), default=1, show_default=True, help="Seed of the simulation."
)
@click.option(
    "--fault",
    "faults",
    multiple=True,
    metavar="NAME[@N]",
    help="Let something go wrong, after N occasions; a wrong name lists them all.",
)
@common
def command(
    sequence: str,
    bench: str | None,
    units: tuple[str, ...],
    seed: int,
    faults: tuple[str, ...],
    operator: str | None,
    records: Path,
    as_json: bool,
    unattended: bool,
) -> int:
    """Run SEQUENCE against the simulated bench.

    SEQUENCE is a file, or a name found in ./sequences, then among the installed ones. Simulated hands
    connect what a prompt asks; nothing waits, and the bench time shown is what a real bench would take. The
    record is signed with the rehearsal key and can never pass as measured.
    """
    del unattended  # simulated hands never ask; the option is here so that both commands take the same ones
    import datetime

    from benchrun.cli.running import report_run
    from benchrun.engine.job import Job, Orders
    from benchrun.engine.plan import bench_for, make_plan
    from benchrun.engine.rehearsal import prepare_rehearsal
    from benchrun.record.keys import KeyStore

    plan = make_plan(sequence, bench or bench_for(sequence), datetime.date.today())
    rehearsal, store = prepare_rehearsal(plan.bench, seed, faults), KeyStore()
    return report_run(
        lambda sink: Job(
            plan=plan,
            units=units or (rehearsal.unit_for(plan.sequence.model),),
            operator_name=operator_or_user(operator),
            hands=rehearsal.hands,
            clock=rehearsal.clock,
            records=records,
            signer=lambda origin: store.rehearsal() if origin != "measured" else store.signer(),
            sink=sink,
            library=rehearsal.library,
            seed=seed,
            orders=Orders(faults=faults),
        ),
        as_json,
    )
