"""Every error that benchrun raises on purpose, by who can act on it.

::

    BenchError
    ├── InputError            the author of a file or command line     exit 2
    ├── TransportError        whoever looks after the bench            exit 3
    │   ├── ResourceNotFound
    │   ├── DeadlineExceeded
    │   ├── ConnectionLost
    │   └── FramingError
    ├── InstrumentError       an instrument reported an error          exit 3
    ├── ReplyError            an instrument answered nonsense          exit 3
    ├── IdentityError         another instrument than expected         exit 3
    ├── InvalidMeasurement    the reading cannot be trusted            exit 3
    └── RecordError           whoever keeps the records                exit 5
        ├── RecordNotWritten
        ├── SignatureWrong
        ├── DigestWrong
        └── CouldNotCheck     no verdict: never to be read as "good"
    Stopped (BaseException)   an operator ended the run                exit 4

A failed limit is a result and never an exception. ``Stopped`` derives from ``BaseException``
so that no ``except Exception`` between the operator and the safe state can swallow it.

The room imports nothing of the project.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import ClassVar

__all__ = [
    "BenchError",
    "ConnectionLost",
    "CouldNotCheck",
    "DeadlineExceeded",
    "DigestWrong",
    "FramingError",
    "IdentityError",
    "InputError",
    "InstrumentError",
    "InvalidMeasurement",
    "Problem",
    "RecordError",
    "RecordNotWritten",
    "ReplyError",
    "ResourceNotFound",
    "SignatureWrong",
    "Stopped",
    "TransportError",
]


class BenchError(Exception):
    """The root: anything benchrun refuses, with a sentence a person can act on."""

    exit_code: ClassVar[int] = 3


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing wrong in a file, and where.

    Parameters
    ----------
    message
        What is wrong, with the value found and what is allowed.
    file
        Path as the user named it; empty for a command-line value.
    line, column
        One-based; 0 where the place is not known.
    advice
        What to do about it; may be empty.
    severity
        ``"error"`` refuses the file; ``"warning"`` is only said.
    """

    message: str
    file: str = ""
    line: int = 0
    column: int = 0
    advice: str = ""
    severity: str = "error"

    @property
    def where(self) -> str:
        """``file:line:column``, as far as known."""
        place = self.file
        if self.line:
            place += f":{self.line}:{self.column}"
        return place

    def __str__(self) -> str:
        head = f"{self.where}: " if self.where else ""
        kind = "" if self.severity == "error" else f"{self.severity}: "
        tail = f"{'' if self.message.endswith(('.', '?')) else '.'} {self.advice}" if self.advice else ""
        return f"{head}{kind}{self.message}{tail}"


class InputError(BenchError, ValueError):
    """A file or a command line says something that cannot be carried out.

    Parameters
    ----------
    problems
        All problems found, not only the first; or one sentence.
    """

    exit_code = 2

    def __init__(self, problems: str | Problem | Iterable[Problem]) -> None:
        if isinstance(problems, str):
            problems = Problem(problems)
        self.problems: tuple[Problem, ...] = (problems,) if isinstance(problems, Problem) else tuple(problems)
        super().__init__("\n".join(str(p) for p in self.problems))

    def __reduce__(self) -> tuple[type[InputError], tuple[tuple[Problem, ...]]]:
        return type(self), (self.problems,)


class _Exchange(BenchError):
    """Base of errors that belong to one exchange with one instrument."""

    def __init__(self, message: str, *, resource: str = "", request: str = "") -> None:
        self.message = message
        self.resource = resource
        self.request = request
        super().__init__(message, resource, request)

    def __str__(self) -> str:
        said = f" after {_shorten(self.request)!r}" if self.request else ""
        return f"{self.resource}{said}: {self.message}" if self.resource else self.message

    def __reduce__(self) -> tuple[object, ...]:
        return _rebuild, (type(self), dict(self.__dict__))


def _rebuild(kind: type[_Exchange], state: dict[str, object]) -> _Exchange:
    error = kind.__new__(kind)
    error.__dict__.update(state)
    BenchError.__init__(error, error.message, error.resource, error.request)
    return error


def _shorten(request: str, limit: int = 60) -> str:
    return request if len(request) <= limit else request[: limit - 3] + "..."


class TransportError(_Exchange):
    """The line to an instrument did not carry a whole message."""


class ResourceNotFound(TransportError):
    """Nothing answers under this VISA resource name."""


class DeadlineExceeded(TransportError):
    """No whole answer came within the time that the request may take.

    Parameters
    ----------
    elapsed_s, limit_s
        How long was waited, and how long was allowed, in seconds.
    """

    def __init__(
        self,
        message: str,
        *,
        resource: str = "",
        request: str = "",
        elapsed_s: float = 0.0,
        limit_s: float = 0.0,
    ) -> None:
        super().__init__(message, resource=resource, request=request)
        self.elapsed_s = elapsed_s
        self.limit_s = limit_s


class ConnectionLost(TransportError):
    """The line was closed from the other side, or cannot be used any more."""


class FramingError(TransportError):
    """An answer came whose frame is wrong: block header, byte count or terminator."""


class InstrumentError(_Exchange):
    """The instrument put an error into its queue.

    Parameters
    ----------
    number, text
        As the instrument's error queue gave them (SCPI-1999 Vol. 2, chapter 21).
    """

    def __init__(self, number: int, text: str, *, resource: str = "", request: str = "") -> None:
        super().__init__(f'reported error {number}, "{text}"', resource=resource, request=request)
        self.number = number
        self.text = text


class ReplyError(_Exchange):
    """The instrument answered something that cannot be read as an answer.

    Parameters
    ----------
    reply
        The raw reply; the message shows its beginning.
    expected
        The form that was expected, in words.
    """

    def __init__(self, reply: str, expected: str, *, resource: str = "", request: str = "") -> None:
        super().__init__(
            f"answered {_shorten(reply)!r} where {expected} was expected", resource=resource, request=request
        )
        self.reply = reply
        self.expected = expected


class IdentityError(_Exchange):
    """Another instrument stands there than the bench file says."""

    def __init__(self, expected: str, found: str, *, resource: str = "") -> None:
        super().__init__(
            f"is {found!r}, but the bench file expects {expected!r}; connect the right instrument or "
            "correct the bench file",
            resource=resource,
        )
        self.expected = expected
        self.found = found


class InvalidMeasurement(BenchError):
    """A reading cannot be trusted, so nothing may be concluded about the unit.

    Parameters
    ----------
    reason
        What was found, with the value and what was allowed.
    advice
        What the technician should do next.
    """

    def __init__(self, reason: str, advice: str = "") -> None:
        self.reason = reason
        self.advice = advice
        super().__init__(reason, advice)

    def __str__(self) -> str:
        return f"{self.reason} {self.advice}".strip()


class RecordError(BenchError):
    """A record could not be written, read or believed."""

    exit_code = 5


class RecordNotWritten(RecordError):
    """The record could not be stored; nothing half-written was left behind."""


class SignatureWrong(RecordError):
    """The signature was checked and does not fit the bytes, or the key is not trusted."""


class DigestWrong(RecordError):
    """A file of the record is missing, added, or is not the file that was signed."""


class CouldNotCheck(RecordError):
    """The check itself could not be made; this is not a verdict of "good"."""


class Stopped(BaseException):
    """An operator ended the run: it passes through to the safe state untouched."""

    exit_code: ClassVar[int] = 4

    def __init__(self, reason: str = "the operator ended the run") -> None:
        self.reason = reason
        super().__init__(reason)
