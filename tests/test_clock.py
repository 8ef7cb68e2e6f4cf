"""The clock seam: real time, or time that somebody else hands in."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from benchrun.clock import Clock, FunctionClock, SystemClock


def test_the_machine_clock_is_aware_and_monotonic() -> None:
    clock = SystemClock()
    assert clock.utc().utcoffset() == timedelta(0)
    first, second = clock.seconds(), clock.seconds()
    assert second >= first


def test_the_machine_clock_waits() -> None:
    """No wait at all still goes through the same door."""
    clock = SystemClock()
    before = clock.seconds()
    clock.wait(0.0)
    assert clock.seconds() >= before


def test_a_function_clock_never_sleeps() -> None:
    """Eight hours of bench time pass at once, and only where they were told to."""
    now = [100.0]

    def advance(seconds: float) -> None:
        now[0] += seconds

    clock: Clock = FunctionClock(lambda: now[0], advance)
    clock.wait(8 * 3600.0)
    assert clock.seconds() == 100.0 + 8 * 3600.0


def test_a_function_clock_dates_by_the_machine_unless_told() -> None:
    """A record is written in real time even when its bench time was simulated."""
    clock = FunctionClock(lambda: 0.0, lambda _: None)
    assert abs(clock.utc() - datetime.now(UTC)) < timedelta(minutes=1)


def test_a_function_clock_takes_a_date_handed_in() -> None:
    day = datetime(2031, 5, 6, 7, 8, 9, tzinfo=UTC)
    assert FunctionClock(lambda: 0.0, lambda _: None, lambda: day).utc() == day
