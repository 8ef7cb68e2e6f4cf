"""Touchstone text in and out: strict about what it accepts, exact in what it writes.

Version 1 files of one and two ports with S-parameters are read here, so that every complaint has its line;
version 2 files are handed to scikit-rf. What is not a single-ended one- or two-port is refused in words.
Source of the rules: IBIS Open Forum, Touchstone File Format Specification 2.0 (2009).
"""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np

from benchrun.errors import InputError, Problem
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["TouchstoneData", "read", "write"]

_UNITS = {"hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9}
_WIDTH = {1: 3, 2: 9}


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
    if re.search(r"^\s*\[version\]", text, re.I | re.M):
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
        width, pending, number = _WIDTH[self.ports], list[float](), 0
        for number, raw in enumerate(self.text.splitlines(), 1):
            content = raw.split("!", 1)[0]
            if content.lstrip().startswith("#"):
                if not self.seen_option:
                    self.option(content, number)
                continue
            for match in re.finditer(r"\S+", content):
                pending.append(self.number(match[0], number, match.start() + 1))
            if len(pending) >= width:
                if self.rows and pending[0] * self.scale <= self.rows[-1][0]:
                    if len(pending) == 5 * (len(pending) // 5) and self.ports == 2:
                        return self.finish(number)  # noise data begins where frequency falls back
                    raise self.fail(
                        f"frequency {pending[0]:g} does not increase",
                        number,
                        advice="Frequencies must be in rising order.",
                    )
                if len(pending) > width:
                    raise self.fail(f"has {len(pending)} numbers where {width} make one frequency", number)
                self.rows.append([pending[0] * self.scale, *pending[1:]])
                pending = []
            elif pending and len(pending) == 5 and self.rows and pending[0] * self.scale <= self.rows[-1][0]:
                return self.finish(number)
        if pending:
            raise self.fail(
                f"ends in the middle of a frequency: {len(pending)} of {width} numbers",
                number,
                advice="The file is cut off.",
            )
        return self.finish(number)

    def option(self, content: str, line: int) -> None:
        self.seen_option = True
        words = content.replace("#", " ").lower().split()
        while words:
            word = words.pop(0)
            if word in _UNITS:
                self.scale = _UNITS[word]
            elif word in ("ma", "db", "ri"):
                self.form = word
            elif word == "r" and words:
                self.z0 = self.number(words.pop(0), line, content.lower().find(" r ") + 3)
            elif word in ("y", "z", "h", "g"):
                raise self.fail(
                    f"holds {word.upper()}-parameters", line, advice="Convert it to S-parameters first."
                )
            elif word != "s":
                raise self.fail(f"{word!r} means nothing in an option line", line)

    def number(self, text: str, line: int, column: int) -> float:
        try:
            value = float(text)
        except ValueError:
            raise self.fail(
                f"{text[:30]!r} is not a number", line, column, "Is this a Touchstone file?"
            ) from None
        if not np.isfinite(value):
            raise self.fail(
                f"{text!r} is not a finite number", line, column, "The reading failed there; read it again."
            )
        return value

    def finish(self, line: int) -> TouchstoneData:
        if not self.rows:
            raise self.fail("holds no data", max(line, 1))
        table = np.array(self.rows)
        first, second = table[:, 1::2], table[:, 2::2]
        if self.form == "ri":
            values = first + 1j * second
        else:
            magnitude = 10.0 ** (first / 20.0) if self.form == "db" else first
            values = magnitude * np.exp(1j * np.radians(second))
        if self.ports == 1:
            s = values[:, :, np.newaxis]
        else:  # version 1 writes 11, 21, 12, 22
            s = values[:, [0, 2, 1, 3]].reshape(-1, 2, 2)
        return TouchstoneData(table[:, 0], s, self.z0)


def _read_version_2(text: str, name: str) -> TouchstoneData:
    import io

    import skrf

    if re.search(r"^\s*\[mixed-mode order\]", text, re.I | re.M):
        raise InputError(
            Problem("holds mixed-mode parameters", name, advice="Convert it to single-ended two-port data.")
        )
    if not re.search(r"^\s*\[network data\]", text, re.I | re.M):
        raise InputError(Problem("has no [Network Data]", name, advice="The file is cut off."))
    stream = io.StringIO(text)
    stream.name = name if name.lower().endswith(".ts") else name + ".ts"
    try:
        network = skrf.Network()
        network.read_touchstone(stream)
    except Exception as error:  # scikit-rf has no error class of its own
        raise InputError(
            Problem(f"cannot be read as Touchstone 2: {type(error).__name__} {error}", name)
        ) from error
    z0 = np.unique(network.z0)
    if network.nports > 2 or len(z0) > 1:
        raise InputError(Problem(f"has {network.nports} ports at {np.array2string(z0.real)} ohm", name,
                                 advice="One or two ports at one reference resistance are needed."))  # fmt: skip
    return TouchstoneData(network.f.astype(np.float64), network.s.astype(np.complex128), float(z0[0].real))


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
    columns = [f_hz.tolist()]
    for plane in planes:
        columns += [plane.real.tolist(), plane.imag.tolist()]
    head = "".join(f"! {line}\n" for line in comment.splitlines()) + f"# Hz S RI R {float(z0_ohm)!r}\n"
    return (
        head + "\n".join([" ".join(map(repr, row)) for row in zip(*columns, strict=True)]) + "\n"
    ).encode()
