"""Options that several commands share."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any, TypeVar

import click

__all__ = ["common", "operator_or_user"]

F = TypeVar("F", bound=Callable[..., Any])


def common(function: F) -> F:
    """Options of every run."""
    options = [
        click.option("--operator", metavar="NAME", help="Who runs it; your login name by default."),
        click.option(
            "--records",
            metavar="DIR",
            type=click.Path(path_type=Path),
            default=Path("records"),
            show_default=True,
            help="Folder in which the record is put.",
        ),
        click.option(
            "--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else."
        ),
        click.option("--unattended", is_flag=True, help="Ask nobody for anything."),
    ]
    for option in reversed(options):
        function = option(function)
    return function


def operator_or_user(given: str | None) -> str:
    """The operator's name; control characters have no place in it."""
    import getpass

    if given is not None:
        name = given.strip()
        if not name or len(name) > 80 or any(not c.isprintable() for c in name):
            raise click.BadParameter("a name is 1 to 80 printable characters", param_hint="--operator")
        return name
    try:
        return getpass.getuser()
    except (OSError, KeyError, ImportError):  # no login name, as in some containers
        return "unnamed"
