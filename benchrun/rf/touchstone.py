"""Touchstone text in and out: strict about what it accepts, exact in what it writes.

Version 1 files of one and two ports with S-parameters are read here, so that every complaint has its line;
version 2 files are handed to scikit-rf. What is not a single-ended one- or two-port is refused in words.
Source of the rules: IBIS Open Forum, Touchstone File Format Specification 2.0 (2009).
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
import orjson

from benchrun.errors import InputError, Problem
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["TouchstoneData", "read", "write"]

_UNITS = {"hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9}
_WIDTH = {1: 3, 2: 9}
_NUMBER = re.compile(r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_NOT_FINITE = re.compile(r"[+-]?(?:nan|inf|infinity)", re.I)


@dataclass(frozen=True, slots=True, eq=False)
class TouchstoneData:
    """Contents of a file.

    Parameters
    ----------
    f_hz
        ``(f,)``, increasing.
    s
        ``(f, n, n)``, row index = outgoing port.
    z0_ohm
        Reference resistance of all ports.
    """

    f_hz: FloatArray
    s: ComplexArray
    z0_ohm: float

    @property
    def ports(self) -> int:
        """1 or 2."""
        return int(self.s.shape[-1])

    @property
    def two_port(self) -> TwoPort:
        """As four planes; a one-port stands in S11 with nothing else."""
        if self.ports == 2:
            return TwoPort.of(self.s)
        zero = np.zeros_like(self.s[:, 0, 0])
        return TwoPort(self.s[:, 0, 0], zero, zero, zero)


def read(data: bytes, name: str) -> TouchstoneData:
    """Read a file.

    Parameters
    ----------
    data
        The bytes.
    name
        File name: tells the number of ports (``.s1p``, ``.s2p``) and stands in every complaint.

    Raises
    ------
    InputError
        With line and column for what is wrong.
    """
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError(Problem(f"is not text: byte {error.start} is no UTF-8", name)) from None
    if re.search(r"^[ \t]*\[version\]", text, re.I | re.M):
        return _read_version_2(text, name)
    ports = re.search(r"\.s([12])p$", name, re.I)
    if ports is None:
        raise InputError(Problem("is not named .s1p or .s2p, so the number of ports is unknown", name))
    return _Reader(text, name, int(ports[1])).result()


class _Reader:
    """One pass over version 1 text."""

    def __init__(self, text: str, name: str, ports: int) -> None:
        self.name, self.ports = name, ports
        self.scale, self.form, self.z0 = 1e9, "ma", 50.0
        self.seen_option = False
        self.rows: list[list[float]] = []
        self.text = text

    def fail(self, message: str, line: int, column: int = 1, advice: str = "") -> InputError:
        return InputError(Problem(message, self.name, line, column, advice))

    def result(self) -> TouchstoneData:
        width, pending, number, noise = _WIDTH[self.ports], list[float](), 0, 0.0
        # Only what an editor counts as a line counts here; a form feed does not end one.
        for number, raw in enumerate(re.split(r"\r\n|\r|\n", self.text), 1):
            content = raw.split("!", 1)[0]
            if content.lstrip().startswith("#"):
                if not self.seen_option:
                    self.option(content, number)
                continue
            words = [(m[0], m.start() + 1) for m in re.finditer(r"\S+", content)]
            if not words:
                continue
            start = words[0][1]
            fresh = [self.number(word, number, column) for word, column in words]
            if not self.seen_option:
                raise self.fail(
                    "has data before any option line, so unit and format are unknown",
                    number,
                    start,
                    'A line such as "# Hz S RI R 50" comes first.',
                )
            falls_back = bool(self.rows) and fresh[0] * self.scale <= self.rows[-1][0]
            if noise or (self.ports == 2 and not pending and len(fresh) == 5 and falls_back):
                # Noise data of a two-port begins where frequency falls back (specification, noise data).
                if len(fresh) != 5 or fresh[0] <= noise:
                    raise self.fail("is no line of noise data: five numbers, rising frequency", number, start)
                noise = fresh[0]
                continue
            if not pending:
                self.check_frequency(fresh[0], number, start)
            pending += fresh
            if len(pending) > width:
                raise self.fail(f"has {len(pending)} numbers where {width} make one frequency", number, start)
            if len(pending) == width:
                self.rows.append([pending[0] * self.scale, *pending[1:]])
                pending = []
        if pending:
            raise self.fail(
                f"ends in the middle of a frequency: {len(pending)} of {width} numbers",
                number,
                advice="The file is cut off.",
            )
        return self.finish(number)

    def check_frequency(self, value: float, line: int, column: int) -> None:
        if value < 0 or not np.isfinite(value * self.scale):
            raise self.fail(f"{value:g} is no frequency", line, column)
        if self.rows and value * self.scale <= self.rows[-1][0]:
            raise self.fail(
                f"frequency {value:g} does not increase", line, column, "Frequencies must be in rising order."
            )

    def option(self, content: str, line: int) -> None:
        self.seen_option = True
        words = [(m[0].lower(), m.start() + 1) for m in re.finditer(r"[^\s#]+", content)]
        while words:
            word, column = words.pop(0)
            if word in _UNITS:
                self.scale = _UNITS[word]
            elif word in ("ma", "db", "ri"):
                self.form = word
            elif word == "r" and words:
                text, column = words.pop(0)
                self.z0 = self.number(text, line, column)
                if self.z0 <= 0:
                    raise self.fail(f"{text} ohm is no reference resistance", line, column)
            elif word in ("y", "z", "h", "g"):
                raise self.fail(
                    f"holds {word.upper()}-parameters", line, column, "Convert it to S-parameters first."
                )
            elif word != "s":
                raise self.fail(f"{word[:30]!r} means nothing in an option line", line, column)

    def number(self, text: str, line: int, column: int) -> float:
        if _NOT_FINITE.fullmatch(text):
            raise self.fail(
                f"{text!r} is not a finite number", line, column, "The reading failed there; read it again."
            )
        if _NUMBER.fullmatch(text) is None:
            raise self.fail(f"{text[:30]!r} is not a number", line, column, "Is this a Touchstone file?")
        value = float(text)
        if not np.isfinite(value):
            raise self.fail(f"{text[:30]!r} is too large to be a reading", line, column)
        return value

    def finish(self, line: int) -> TouchstoneData:
        if not self.rows:
            raise self.fail("holds no data", line)
        table = np.array(self.rows)
        first, second = table[:, 1::2], table[:, 2::2]
        values = np.empty(first.shape, np.complex128)
        if self.form == "ri":
            values.real, values.imag = first, second  # not "+ 1j": that would lose the sign of zero
        else:
            with np.errstate(over="ignore", invalid="ignore"):
                magnitude = 10.0 ** (first / 20.0) if self.form == "db" else first
                values[:] = magnitude * np.exp(1j * np.radians(second))
            if not np.isfinite(values).all():
                raise self.fail("holds a magnitude too large to be a reading", line)
        order = [0] if self.ports == 1 else [0, 2, 1, 3]  # version 1 writes 11, 21, 12, 22
        s = values[:, order].reshape(-1, self.ports, self.ports)
        return TouchstoneData(table[:, 0], s, self.z0)


def _read_version_2(text: str, name: str) -> TouchstoneData:
    import io
    import warnings

    import skrf

    def fail(message: str, advice: str = "") -> InputError:
        return InputError(Problem(message, name, advice=advice))

    if re.search(r"^[ \t]*\[mixed-mode order\]", text, re.I | re.M):
        raise fail("holds mixed-mode parameters", "Convert it to single-ended two-port data.")
    # Looked at before scikit-rf does, since it would set aside memory for any number.
    ports = re.search(r"^[ \t]*\[number of ports\][ \t]*(\S{1,30})", text, re.I | re.M)
    if ports is None or ports[1] not in ("1", "2"):
        found = f"{ports[1]!r} ports" if ports else "no [Number of Ports]"
        raise fail(f"has {found}", "One or two ports at one reference resistance are needed.")
    if not re.search(r"^[ \t]*\[network data\]", text, re.I | re.M):
        raise fail("has no [Network Data]", "The file is cut off.")
    stream = io.StringIO(text)
    stream.name = "data.ts"  # scikit-rf takes the version from it, and nothing else
    try:
        with warnings.catch_warnings(), np.errstate(all="ignore"):
            warnings.simplefilter("ignore")  # what it warns of is checked below
            network = skrf.Network()
            network.read_touchstone(stream)
            f_hz, s = network.f.astype(np.float64), network.s.astype(np.complex128)
            z0 = np.unique(network.z0)
    except Exception as error:  # scikit-rf has no error class of its own
        raise fail(f"cannot be read as Touchstone 2: {type(error).__name__} {error}"[:300]) from error
    if s.shape != (len(f_hz), int(ports[1]), int(ports[1])) or not len(f_hz):
        raise fail("holds no whole set of data", "The file is cut off.")
    if len(z0) != 1 or not z0[0].real > 0 or not np.isfinite(z0[0]):
        raise fail(f"has its ports at {np.array2string(z0.real)} ohm", "One reference resistance is needed.")
    counted = re.search(r"^[ \t]*\[number of frequencies\][ \t]*([0-9]{1,9})\b", text, re.I | re.M)
    if counted is None or int(counted[1]) != len(f_hz):
        said = counted[1] if counted else "nothing"
        raise fail(f"holds {len(f_hz)} frequencies where [Number of Frequencies] says {said}")
    if not (np.isfinite(f_hz).all() and np.isfinite(s).all()):
        raise fail("holds a value that is not a finite number", "The reading failed there; read it again.")
    if f_hz[0] < 0 or np.any(np.diff(f_hz) <= 0):
        raise fail("has frequencies that do not increase", "Frequencies must be in rising order.")
    return TouchstoneData(f_hz, s, float(z0[0].real))


def write(
    f_hz: FloatArray, network: TwoPort | ComplexArray, comment: str = "", z0_ohm: float = 50.0
) -> bytes:
    """Write version 1 text: Hz, S, real and imaginary, shortest digits that read back the same.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    network
        A two-port, or one plane ``(f,)`` of reflection.
    comment
        One line put on top.

    Returns
    -------
    bytes
        UTF-8.

    Raises
    ------
    ValueError
        If a value is not finite.

    Examples
    --------
    >>> import numpy as np
    >>> print(write(np.array([1e9]), np.array([0.5 + 0.25j])).decode())
    # Hz S RI R 50.0
    1000000000.0 0.5 0.25
    <BLANKLINE>
    """
    planes = (
        (network.s11, network.s21, network.s12, network.s22) if isinstance(network, TwoPort) else (network,)
    )
    columns = [f_hz, *(part for plane in planes for part in (plane.real, plane.imag))]
    table = np.ascontiguousarray(np.column_stack(columns), dtype=np.float64)
    if not np.isfinite(table).all():
        raise ValueError("a value is not finite; Touchstone cannot hold it")
    # A JSON array of rows is the same numbers with other separators, and orjson writes it eight times as fast
    # as repr() does.
    rows = orjson.dumps(table, option=orjson.OPT_SERIALIZE_NUMPY)[2:-2]
    head = "".join(f"! {line}\n" for line in comment.splitlines()) + f"# Hz S RI R {float(z0_ohm)!r}\n"
    return head.encode() + rows.replace(b"],[", b"\n").replace(b",", b" ") + b"\n"
