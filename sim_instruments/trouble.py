"""What is wrong with a bench file, said with the place."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from typing import Any

__all__ = ["BadBench", "at", "table"]


class BadBench(ValueError):
    """A simulated bench's file makes no sense."""


@contextmanager
def at(where: str) -> Iterator[None]:
    """Say where a mistake is."""
    try:
        yield
    except KeyError as error:
        raise BadBench(f"{where}: {error} is missing") from error
    except BadBench:
        raise
    except OSError as error:
        raise BadBench(f"{where}: {error.filename}: {error.strerror}") from error
    except (TypeError, ValueError, AttributeError) as error:
        raise BadBench(f"{where}: {error}") from error


def table(value: Any, where: str) -> Mapping[str, Any]:
    """A mapping.

    Raises
    ------
    BadBench
        If it is none.
    """
    if not isinstance(value, Mapping):
        raise BadBench(f"{where} is no list of names with values")
    return value
