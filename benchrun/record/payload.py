"""What a record says about a run: the predicate of its in-toto statement, version 1.

The models refuse unknown keys when written, so that a typing error in the program cannot slip into a
signed record; when read, unknown keys are ignored, as in-toto asks of consumers (Statement v1, "Parsing
rules"), so that a later benchrun may add to version 1.
"""

from __future__ import annotations

import copy
import functools
import json
import re
from datetime import UTC, datetime
from typing import Annotated, Any, Literal, TypeAlias

from pydantic import AfterValidator, BaseModel, ConfigDict, ValidationError, model_validator

from benchrun.evaluate.judgement import JudgedFigure

__all__ = [
    "PREDICATE_TYPE",
    "Agreement",
    "CalibrationEntry",
    "Conclusion",
    "InstrumentEntry",
    "Origin",
    "Payload",
    "ReadingEntry",
    "ResultEntry",
    "SequenceEntry",
    "UnitEntry",
    "check_path",
    "safe_name",
    "utc_text",
]

PREDICATE_TYPE = "https://benchrun.invalid/run/v1"
"""Type of the predicate. ``.invalid`` is reserved (RFC 6761, 6.4): the name belongs to nobody, leads nowhere,
and only tells this kind of statement from all others. The number is the version; it is raised when a reader
of the former one would misunderstand."""

Conclusion: TypeAlias = Literal["pass", "conditional pass", "conditional fail", "fail", "invalid", "stopped"]
"""What was concluded about the unit, or why nothing was."""

Origin: TypeAlias = Literal["measured", "simulated", "recorded"]
"""Where readings came from: instruments, a simulated bench, or kept readings served again."""

_PART = re.compile(r"[A-Za-z0-9_+][A-Za-z0-9._+-]*")
_RESERVED = re.compile(r"(con|prn|aux|nul|com[0-9]|lpt[0-9])(\..*)?", re.IGNORECASE)
_UNKNOWN = {"extra_forbidden", "unexpected_keyword_argument"}
_UTC = re.compile(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d(\.\d{1,6})?Z")


def safe_name(text: str) -> str:
    """A name that any file system takes: what is not a letter, digit or one of ``._+-`` becomes ``-``.

    Parameters
    ----------
    text
        Any text, such as a hook-up in words.

    Examples
    --------
    >>> safe_name("short on port 1 (n50/workshop)")
    'short-on-port-1-n50-workshop'
    >>> safe_name("...")
    'x'
    """
    name = re.sub(r"[^A-Za-z0-9._+]+", "-", text).strip(".-")[:100].rstrip(".-") or "x"
    return f"x-{name}" if _RESERVED.fullmatch(name) else name


def check_path(path: str) -> str:
    """Check the path of a file in a record: relative, POSIX, plain names.

    Raises
    ------
    ValueError
        If it could mean different files on different systems, or one outside the record.

    Examples
    --------
    >>> check_path("raw/short-1.s1p")
    'raw/short-1.s1p'
    """
    for part in path.split("/"):
        if not _PART.fullmatch(part) or len(part) > 120 or part.endswith(".") or _RESERVED.fullmatch(part):
            raise ValueError(
                f"{path!r} is no path of a record; each part must be of letters, digits and . _ + - only, "
                "and must not begin or end with a dot"
            )
    return path


def utc_text(moment: datetime) -> str:
    """ISO 8601 text in UTC, to the millisecond.

    Examples
    --------
    >>> utc_text(datetime(2026, 3, 1, 12, 0, 0, 250_000, tzinfo=UTC))
    '2026-03-01T12:00:00.250Z'
    """
    if moment.tzinfo is None:
        raise ValueError(f"{moment} has no time zone; a record needs UTC")
    return moment.astimezone(UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")


def _check_utc(text: str) -> str:
    if not _UTC.fullmatch(text):
        raise ValueError(f"{text!r} is no UTC time like 2026-03-01T12:00:00.000Z")
    return text


FilePath: TypeAlias = Annotated[str, AfterValidator(check_path)]
UtcText: TypeAlias = Annotated[str, AfterValidator(_check_utc)]


class _Entry(BaseModel):
    """Frozen and strict; unknown keys are refused."""

    model_config = ConfigDict(
        frozen=True, strict=True, extra="forbid", allow_inf_nan=False, revalidate_instances="always"
    )


class SequenceEntry(_Entry):
    """Which sequence was run."""

    name: str
    title: str
    edition: int


class UnitEntry(_Entry):
    """Which unit was tested."""

    serial: str
    part: str


class InstrumentEntry(_Entry):
    """An instrument, as it named itself."""

    role: str
    resource: str
    identity: str
    origin: Origin


class ReadingEntry(_Entry):
    """One raw reading: which step took it, of what, when on the bench's clock, and its file."""

    step: str
    hookup: str
    file: FilePath
    taken_s: float


class ResultEntry(_Entry):
    """A corrected or de-embedded result that was computed from the readings."""

    step: str
    kind: Literal["corrected", "de-embedded"]
    file: FilePath


class Agreement(_Entry):
    """How far scikit-rf's result for the same readings lies away: greatest difference, linear."""

    step: str
    difference: float


class CalibrationEntry(_Entry):
    """What a calibration depends on; it serves only what is read under the same.

    Parameters
    ----------
    step, method, kit, kit_serial
        As in the sequence and the kit file.
    kit_due
        ISO date; empty where the kit has none.
    overruled
        Why a kit past its date was used; empty where it was not.
    ports
        Analyzer ports.
    from_hz, to_hz, points, spacing
        The grid.
    bandwidth_hz, power_dbm, averages
        How each point was read.
    analyzer, cables
        Identity, and what stands between it and the planes.
    operator
        Who connected the standards.
    made_utc, made_s
        When its last standard was read: UTC, and on the bench's clock from the start of the unit's run,
        negative for a calibration that an earlier unit was read with too.
    """

    step: str
    method: str
    kit: str
    kit_serial: str = ""
    kit_due: str = ""
    overruled: str = ""
    ports: tuple[int, ...]
    from_hz: float
    to_hz: float
    points: int
    spacing: str
    bandwidth_hz: float
    power_dbm: float
    averages: int
    analyzer: str
    cables: tuple[str, ...] = ()
    operator: str
    made_utc: UtcText
    made_s: float


class Payload(_Entry):
    """A run in one document.

    Parameters
    ----------
    sequence, unit, operator, bench
        What was run, on what, by whom, where (names as in the files).
    conclusion, reason, advice
        The worst of all figures, or why there is none, and what to do next.
    figures
        All judged limits, SI units.
    origin
        Where the readings came from; "measured" needs instruments that all say so themselves.
    seed, residual_seed
        Seed of the simulated bench, and of the draws for noise in the uncertainty.
    started_utc, ended_utc
        ISO 8601, UTC.
    bench_seconds, wall_seconds
        Duration on the bench's clock, and on the machine's.
    instruments, readings, results, agreements, calibrations
        See the entries' own descriptions.
    inputs
        Logical name (``"sequence"``, ``"kit:n50-workshop"``) to file in the record.
    software
        Program or library to version.
    plan
        Digest of the resolved plan.
    left_on
        Sources that could not be switched off at the end, and what to do by hand.
    repeated
        What was asked of an instrument once more, and why.
    resumed
        Where the run was taken up again after a break: what stands, what was begun anew, and why.
    retest
        Why the unit was tested again.
    """

    sequence: SequenceEntry
    unit: UnitEntry
    conclusion: Conclusion
    reason: str = ""
    advice: str = ""
    figures: tuple[JudgedFigure, ...] = ()
    origin: Origin
    seed: int | None = None
    operator: str
    bench: str
    started_utc: UtcText
    ended_utc: UtcText
    bench_seconds: float
    wall_seconds: float
    instruments: tuple[InstrumentEntry, ...] = ()
    inputs: dict[str, FilePath] = {}
    readings: tuple[ReadingEntry, ...] = ()
    results: tuple[ResultEntry, ...] = ()
    agreements: tuple[Agreement, ...] = ()
    calibrations: tuple[CalibrationEntry, ...] = ()
    software: dict[str, str] = {}
    plan: str
    residual_seed: int = 0
    left_on: tuple[str, ...] = ()
    repeated: tuple[str, ...] = ()
    resumed: tuple[str, ...] = ()
    retest: str = ""

    @model_validator(mode="after")
    def _origin_holds(self) -> Payload:
        others = [one.role for one in self.instruments if one.origin != "measured"]
        if self.origin == "measured" and others:
            raise ValueError(
                f"the run cannot count as measured: {', '.join(others)} is not a real instrument"
            )
        return self

    @property
    def files(self) -> tuple[str, ...]:
        """All files that the payload refers to."""
        taken = (one.file for one in self.readings)
        computed = (one.file for one in self.results)
        return tuple(dict.fromkeys((*self.inputs.values(), *taken, *computed)))

    @classmethod
    def from_data(cls, data: Any) -> Payload:
        """Read a predicate from plain data, ignoring keys that this version does not know.

        Raises
        ------
        pydantic.ValidationError
            If it is no predicate of this version.
        """
        try:
            return cls.model_validate_json(json.dumps(data))
        except ValidationError as error:
            unknown = [one["loc"] for one in error.errors() if one["type"] in _UNKNOWN]
            if not unknown:
                raise
        known = copy.deepcopy(data)
        for *way, key in unknown:
            del functools.reduce(lambda inner, part: inner[part], way, known)[key]
        return cls.model_validate_json(json.dumps(known))
