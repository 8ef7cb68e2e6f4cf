"""The program ``benchrun``: its commands, and how what goes wrong is said."""

from __future__ import annotations

import contextlib
import importlib
import os
import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any, TextIO

import click

import benchrun
from benchrun.errors import BenchError, Stopped

__all__ = ["Patient", "main", "program"]

_COMMANDS = {
    "audit": ("benchrun.cli.audit", "Check records: signature, files, and the result from its raw readings."),
    "bench": ("benchrun.cli.bench", "Ask each instrument of a bench who it is and how it feels."),
    "check": ("benchrun.cli.check", "Read sequences, benches, kits and masks, and report every problem."),
    "keys": ("benchrun.cli.keys", "Make, list and trust the keys that sign records."),
    "match": ("benchrun.cli.match", "Match an impedance with parts that can be bought."),
    "overnight": ("benchrun.cli.overnight", "Run many sequences by themselves, benches side by side."),
    "rehearse": ("benchrun.cli.rehearse", "Run a sequence against the simulated bench."),
    "resume": ("benchrun.cli.resume", "Take up runs that broke off, or close them as invalid records."),
    "run": ("benchrun.cli.run", "Run a sequence at real instruments."),
    "sequences": ("benchrun.cli.sequences", "List what can be called by name."),
}


class _Program(click.Group):
    """Commands are imported when they are called, so that help answers at once."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """All names."""
        return list(_COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """One command; None if there is none of that name."""
        if cmd_name not in _COMMANDS:
            return None
        module = importlib.import_module(_COMMANDS[cmd_name][0])
        command: click.Command = module.command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """The list in the help, without importing the commands."""
        with formatter.section("Commands"):
            formatter.write_dl([(name, says) for name, (_, says) in _COMMANDS.items()])

    def resolve_command(self, ctx: click.Context, args: list[str]) -> Any:
        """Say which command was probably meant."""
        try:
            return super().resolve_command(ctx, args)
        except click.UsageError as error:
            import difflib

            close = difflib.get_close_matches(args[0], _COMMANDS, 1, 0.5)
            hint = f" Did you mean {close[0]!r}?" if close else f" There are {', '.join(_COMMANDS)}."
            raise click.UsageError(f"there is no command {args[0]!r}.{hint}", ctx) from error


@click.command(
    cls=_Program, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100}
)
@click.version_option(benchrun.__version__, prog_name="benchrun", message="%(prog)s %(version)s")
def program() -> None:
    """Prove that two-port RF parts meet their specification.

    One sequence file says how to calibrate, sweep, de-embed and judge; it runs unchanged at the bench,
    overnight and in rehearsal, and every run leaves a signed record.

    Exit codes: 0 pass or conditional pass, 1 fail or conditional fail, 2 bad input, 3 invalid (nothing can
    be concluded), 4 stopped, 5 a record could not be written or checked.
    """


def main(arguments: list[str] | None = None) -> None:
    """Run the program and leave with its exit code; nothing a user can do wrong ends in a traceback."""
    for name in ("stdin", "stdout", "stderr"):
        stream = getattr(sys, name)
        if hasattr(stream, "reconfigure"):  # a console that cannot show a sign shows a question mark
            stream.reconfigure(errors="replace")
        if name != "stdin":
            nowhere = Path(os.devnull).open("w") if stream is None else stream  # noqa: SIM115 - to the end
            setattr(sys, name, Patient(nowhere))
    sys.exit(_main(arguments))


class Patient:
    """A stream whose reader may go away: what is written then is lost, and nothing else happens.

    Whoever shuts the pipe of a running program (``| head``) must neither end a run nor turn its exit code.

    Parameters
    ----------
    stream
        The stream itself; everything but writing and flushing is its own.
    """

    def __init__(self, stream: TextIO) -> None:
        self._stream = stream

    def __getattr__(self, name: str) -> Any:
        return getattr(self._stream, name)

    def write(self, text: str) -> int:
        """Write, if anybody still reads."""
        with self._shut():
            self._stream.write(text)
        return len(text)

    def flush(self) -> None:
        """Flush, if anybody still reads."""
        with self._shut():
            self._stream.flush()

    @contextlib.contextmanager
    def _shut(self) -> Iterator[None]:
        try:
            yield
        except BrokenPipeError:
            # From now on into nowhere, also when the interpreter flushes at its end.
            nowhere = os.open(os.devnull, os.O_WRONLY)
            os.dup2(nowhere, self._stream.fileno())
            os.close(nowhere)


def _main(arguments: list[str] | None) -> int:
    try:
        result = program.main(args=arguments, prog_name="benchrun", standalone_mode=False)
        sys.stdout.flush()
        return int(result or 0)
    except click.exceptions.Abort:
        click.echo("stopped", err=True)
        return 4
    except click.ClickException as error:
        error.show()
        return 2
    except BenchError as error:
        click.echo(f"benchrun: {error}", err=True)
        return error.exit_code
    except Stopped as stopped:
        click.echo(f"benchrun: {stopped.reason}", err=True)
        return 4
    except KeyboardInterrupt:
        click.echo("benchrun: stopped", err=True)
        return 4
    except OSError as error:
        where = f" {error.filename}" if error.filename else ""
        click.echo(f"benchrun: the system said {error.strerror or error}{where}", err=True)
        return 5


if __name__ == "__main__":
    main()
