"""``benchrun rehearse``."""

from __future__ import annotations

from pathlib import Path

import click

from benchrun.cli.options import common, operator_or_user

__all__ = ["command"]


@click.command("rehearse")
@click.argument("sequence", required=False)
@click.option("--all", "every", is_flag=True, help="Every sequence that can be called by name.")
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
    sequence: str | None,
    every: bool,
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
    record is signed with the rehearsal key and can never pass as measured. --all runs every named sequence,
    as a project's build server should, and leaves a test report beside the records.
    """
    del unattended  # simulated hands never ask; the option is here so that both commands take the same ones
    if every:
        if sequence or bench or units or faults:
            raise click.UsageError("--all rehearses every sequence as it is; give it nothing to choose")
        return _all(seed, operator, records, as_json)
    if sequence is None:
        raise click.UsageError("Missing argument 'SEQUENCE' (or: --all).")
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


def _all(seed: int, operator: str | None, records: Path, as_json: bool) -> int:
    """Every named sequence on its first unit, each in a process of its own; one test report."""
    import json
    import os
    from typing import Any

    from benchrun.cli.overnight import write_reports
    from benchrun.engine.overnight import Settings, overnight
    from benchrun.report.night import night_document
    from benchrun.sequence.files import load_model
    from benchrun.sequence.find import named
    from benchrun.sequence.night import Night

    def progress(event: dict[str, Any]) -> None:
        why = f": {event['reason']}" if event["reason"] else ""
        what = f"{event['unit']}: {event['conclusion']}" if event["unit"] else "nothing concluded"
        click.echo(f"{event['job']} {what}, {event['seconds']:.1f} s{why}", err=as_json)

    jobs = [
        {"job": name, "sequence": str(path.resolve()), "rehearsal": {"seed": seed}}
        for name, path in named("sequence")
    ]
    title = "Every sequence that can be called by name"
    night = {"night": "every-sequence", "edition": 1, "title": title, "workers": os.cpu_count() or 1}
    raw = json.dumps({**night, "jobs": jobs}).encode()  # JSON is YAML
    settings = Settings(records, operator_or_user(operator), progress=progress, afresh=True)
    result = overnight(load_model(raw, "every named sequence", Night, Path("night.yaml")), settings)
    report, _ = write_reports(result, records)
    if as_json:
        click.echo(json.dumps(night_document(result), ensure_ascii=False))
    click.echo(f"test report {report}", err=as_json)
    return result.exit_code
