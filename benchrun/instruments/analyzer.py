"""The network analyzer: preset, set up, sweep once, read the 2x2 readings, source off."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from benchrun.errors import DeadlineExceeded, InputError, InvalidMeasurement, ReplyError
from benchrun.instruments.dialect import Dialect
from benchrun.instruments.safety import switched_off
from benchrun.quantity import Dimension, render
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort
from benchrun.scpi.keywords import compound
from benchrun.scpi.session import Session

__all__ = ["NetworkAnalyzer", "Readings", "SweepSettings"]

_POLLS_PER_SWEEP = 20
_FORGIVENESS_S = 5.0
_SINGLE = 2e-7  # 32-bit numbers, and text of seven digits


@dataclass(frozen=True, slots=True, eq=False)
class SweepSettings:
    """What a sweep is asked to be.

    Parameters
    ----------
    grid_hz
        Frequencies in Hz, ``(f,)``.
    spacing
        ``"linear"``, ``"log"`` or ``"list"``.
    bandwidth_hz, power_dbm, averages
        IF bandwidth, source power, and how many sweeps are averaged.
    """

    grid_hz: FloatArray
    spacing: str
    bandwidth_hz: float
    power_dbm: float
    averages: int = 1

    @property
    def expected_s(self) -> float:
        """Time that both directions take together: about two over the bandwidth a point (common practice)."""
        return 2.0 * len(self.grid_hz) * self.averages * (2.0 / self.bandwidth_hz + 100e-6)

    @property
    def deadline_s(self) -> float:
        """Time after which something is wrong."""
        return 3.0 * self.expected_s + _FORGIVENESS_S


@dataclass(frozen=True, slots=True, eq=False)
class Readings:
    """One sweep as read: raw readings on their grid."""

    f_hz: FloatArray
    raw: TwoPort


class NetworkAnalyzer:
    """A two-port network analyzer behind a session.

    Parameters
    ----------
    session
        The conversation.
    dialect
        How this family words requests.
    """

    def __init__(self, session: Session, dialect: Dialect) -> None:
        self.session = session
        self.dialect = dialect
        self._settings: SweepSettings | None = None
        self._last: TwoPort | None = None
        self.replayed = False
        """Recordings are served again: the same reading twice is what they are, not a fault."""

    def preset(self) -> None:
        """Known state: source as the instrument's reset leaves it, no error pending.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.preset)

    def set_up(self, settings: SweepSettings) -> None:
        """Set up a sweep and read the number of points back.

        Raises
        ------
        InputError
            If the dialect has no words for such a sweep.
        InstrumentError, TransportError, ReplyError
        """
        words = self.dialect.sweep
        listed = settings.spacing == "list" or (settings.spacing == "log" and not words.log)
        if listed and not words.listed:
            raise InputError(
                f"the dialect {self.dialect.dialect} has no words for a {settings.spacing} sweep; "
                "write a linear sweep, or add them to the dialect file"
            )
        spacing = () if listed else words.log if settings.spacing == "log" else words.linear
        messages = (*(words.listed if listed else words.span), *spacing, *words.common)
        values = {
            "start_hz": repr(float(settings.grid_hz[0])),
            "stop_hz": repr(float(settings.grid_hz[-1])),
            "points": len(settings.grid_hz),
            "list_hz": ",".join(repr(x) for x in settings.grid_hz.tolist()) if listed else "",
            "bandwidth_hz": f"{settings.bandwidth_hz:.12g}",
            "power_dbm": f"{settings.power_dbm:.12g}",
            "averages": settings.averages,
            "averaging": "ON" if settings.averages > 1 else "OFF",
        }
        self.session.set(*(m.format(**values) for m in messages))
        points = self.session.query_float(words.points)
        if points != len(settings.grid_hz):
            raise ReplyError(
                f"{points:g}",
                f"{len(settings.grid_hz)} points as set",
                resource=self.session.name,
                request=words.points,
            )
        self.session.set(*self.dialect.source_on)
        self._settings = settings

    def sweep(self) -> Readings:
        """Sweep once and read everything.

        Raises
        ------
        InvalidMeasurement
            For an overload, an unlocked reference, readings that are not finite, another grid, or the very
            same readings as before.
        InstrumentError, TransportError, ReplyError
        """
        settings = self._settings
        if settings is None:
            raise RuntimeError("set_up() comes before sweep()")
        self._trigger(settings)
        raw = self._read(settings)
        grid = self._grid(settings)
        self.session.raise_errors(self.dialect.read.values)
        self._judge_health()
        self._judge_readings(raw, settings)
        self._last = raw
        return Readings(grid, raw)

    def switch_terms(self) -> TwoPort | None:
        """What the idle port reflected in the last sweep; None where the dialect has no words for it.

        Returns
        -------
        TwoPort
            ``s21`` holds a2/b2 with port 1 driven, ``s12`` a1/b1 with port 2 driven, ``(f,)``; the rest is 0.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        words, settings = self.dialect.read, self._settings
        if words.switch is None or settings is None:
            return None
        count = len(settings.grid_hz)
        values = self.session.query_values(words.switch, words.form, 4 * count).reshape(count, 2, 2)
        self.session.raise_errors(words.switch)
        zero = np.zeros(count, np.complex128)
        forward, reverse = (values[:, i, 0] + 1j * values[:, i, 1] for i in (0, 1))
        return TwoPort(zero, np.ascontiguousarray(reverse), np.ascontiguousarray(forward), zero)

    def _trigger(self, settings: SweepSettings) -> None:
        words = self.dialect.trigger
        message = compound(*words.start)
        if words.wait == "operation complete":
            self.session.complete(message, settings.deadline_s)
        else:
            self._poll(message, settings)
        self.session.raise_errors(message)

    def _poll(self, message: str, settings: SweepSettings) -> None:
        words = self.dialect.trigger
        self.session.write(message)
        clock, start = self.session.clock, self.session.clock.seconds()
        assert words.condition is not None  # the dialect says so with wait: condition
        while int(self.session.query_float(words.condition)) & (1 << words.bit):
            if clock.seconds() - start > settings.deadline_s:
                raise DeadlineExceeded(
                    f"is still sweeping after {settings.deadline_s:.3g} s; reset it and run again",
                    resource=self.session.name,
                    request=message,
                    elapsed_s=clock.seconds() - start,
                    limit_s=settings.deadline_s,
                )
            clock.wait(settings.expected_s / _POLLS_PER_SWEEP)

    def _read(self, settings: SweepSettings) -> TwoPort:
        words, count = self.dialect.read, len(settings.grid_hz)
        planes: dict[str, ComplexArray] = {}
        if words.how == "all at once":
            matrix = self.session.query_values(words.values, words.form, 8 * count).reshape(count, 4, 2)
            for i, name in enumerate(words.order):
                planes[name] = np.ascontiguousarray(matrix[:, i, 0] + 1j * matrix[:, i, 1])
        else:
            for name in words.order:
                if words.select:
                    self.session.set(words.select.format(receiver=name[1], source=name[2]))
                request = words.values.format(receiver=name[1], source=name[2])
                values = self.session.query_values(request, words.form, 2 * count).reshape(count, 2)
                planes[name] = np.ascontiguousarray(values[:, 0] + 1j * values[:, 1])
        return TwoPort(planes["S11"], planes["S12"], planes["S21"], planes["S22"])

    def _grid(self, settings: SweepSettings) -> FloatArray:
        words = self.dialect.read
        if words.grid is None:
            return settings.grid_hz
        grid = self.session.query_values(words.grid, words.form, len(settings.grid_hz))
        off = np.abs(grid - settings.grid_hz) / settings.grid_hz
        if not np.all(off <= (1e-9 if "64" in words.form else _SINGLE)):  # so that nan is off, too
            i = int(np.argmax(off))
            raise InvalidMeasurement(
                f"{self.session.name} swept another grid: point {i + 1} lies at {grid[i]:.9g} Hz, "
                f"asked was {settings.grid_hz[i]:.9g} Hz.",
                "Reset the analyzer and run again.",
            )
        return settings.grid_hz

    def _judge_health(self) -> None:
        for trouble in self.health():
            raise InvalidMeasurement(
                f"{self.session.name} reports {trouble} in this sweep.",
                {
                    "an overload": "Lower the source power or put a pad before the port, then read again.",
                    "an unlocked reference": "Check the reference signal and the warm-up, then read again.",
                }[trouble],
            )

    def health(self) -> list[str]:
        """Conditions that spoil readings, in words; empty when all is well.

        Raises
        ------
        TransportError, ReplyError
        """
        words = self.dialect.health
        bits = int(self.session.query_float(words.condition))
        found = []
        if bits & (1 << words.overload):
            found.append("an overload")
        if bits & (1 << words.unlocked):
            found.append("an unlocked reference")
        return found

    def _judge_readings(self, raw: TwoPort, settings: SweepSettings) -> None:
        for name in ("S11", "S21", "S12", "S22"):
            plane = raw.parameter(name)
            bad = ~np.isfinite(plane) | (np.abs(plane) > 1e6)  # 9.91E37 is SCPI's way to write "no number"
            if bad.any():
                where = render(float(settings.grid_hz[int(np.argmax(bad))]), Dimension.FREQUENCY)
                raise InvalidMeasurement(
                    f"{self.session.name} gave no number for {name} at {where} ({int(bad.sum())} points).",
                    "Read again; if it stays, the receiver is faulty.",
                )
        before = self._last
        if before is None or self.replayed:
            return
        if all(np.array_equal(a, b) for a, b in zip(raw.planes, before.planes, strict=True)):
            raise InvalidMeasurement(
                f"{self.session.name} gave the very same readings as before, digit for digit: "
                "they are stale.",
                "Trigger a new sweep; if it stays, reset the analyzer.",
            )

    def off(self) -> None:
        """Source off.

        Raises
        ------
        InstrumentError, TransportError, ReplyError
        """
        self.session.set(*self.dialect.source_off)

    def make_safe(self) -> str:
        """Source off, as far as the line allows.

        Returns
        -------
        str
            Empty when the source is off; otherwise what is left on and what to do by hand.
        """
        return switched_off(self.session, self.off, "the source of")
