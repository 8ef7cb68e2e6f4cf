"""``benchrun check``."""

from __future__ import annotations

from pathlib import Path

import click

__all__ = ["command"]

_KINDS = ("sequence", "bench", "kit", "mask")


@click.command("check")
@click.argument("files", nargs=-1, type=click.Path(path_type=Path))
@click.option(
    "--schema",
    "schema_of",
    is_flag=False,
    flag_value="sequence",
    type=click.Choice(_KINDS),
    help="Print the JSON Schema of a kind of file (sequence by default), for an editor to complete with.",
)
def command(files: tuple[Path, ...], schema_of: str | None) -> int:
    """Read FILES and report every problem at file:line:column, without touching an instrument.

    Each is a sequence, bench, kit or mask, or a Touchstone file. What a sequence names is read and checked
    with it.
    """
    if schema_of is not None:
        import json

        from benchrun.sequence.files import KINDS
        from benchrun.sequence.schema import schema

        click.echo(json.dumps(schema(KINDS[schema_of]), indent=2, ensure_ascii=False))
        if not files:
            return 0
    elif not files:
        raise click.UsageError("name at least one file, or --schema")
    problems = [problem for file in files for problem in _check(file)]
    for problem in problems:
        click.echo(str(problem), err=True)
    wrong = sum(problem.severity == "error" for problem in problems)
    noun = "file" if len(files) == 1 else "files"
    said = f"{wrong} problem{'s' if wrong != 1 else ''}" if wrong else "no problems"
    click.echo(f"{len(files)} {noun} checked, {said}", err=bool(wrong) or schema_of is not None)
    return 2 if wrong else 0


def _check(file: Path):  # type: ignore[no-untyped-def]  # its type would import what help must not
    import datetime

    from benchrun.engine.plan import FIXTURE_BYTES, check_file
    from benchrun.errors import InputError

    if file.suffix.lower() not in (".s1p", ".s2p", ".ts"):
        return check_file(file, datetime.date.today())
    from benchrun.rf.touchstone import read
    from benchrun.sequence.loading import read_bytes

    try:
        read(read_bytes(file, FIXTURE_BYTES), str(file))
    except InputError as error:
        return list(error.problems)
    return []
