"""An analyzer with readings that cost nothing, and a line to talk to it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
import pytest

from sim_instruments.instruments.analyzer import Analyzer
from sim_instruments.world import World


class CountedReadings:
    """S_ij of the nth reading is n + 10 i + j, at every point."""

    def __init__(self) -> None:
        self.made = 0

    def read(self, f_hz, bandwidth_hz, power_dbm, averages, source_on):
        self.made += 1
        m = np.zeros((len(f_hz), 2, 2), np.complex128)
        m += self.made + np.array([[11, 12], [21, 22]])
        return m * 1e-3

    def is_cold(self) -> bool:
        return False


class Bench:
    """One line to one analyzer, as a client that reads at once sees it."""

    def __init__(self, limits: Mapping[str, Any] | None, manners: Mapping[str, Any] | None) -> None:
        self.world = World(1)
        self.readings = CountedReadings()
        self.analyzer = Analyzer(self.world, self.readings, ("SIMULATED", "NA", "1", "1.0"), limits, manners)
        self.line = self.analyzer.line()

    def write(self, message: str) -> None:
        self.line.receive(message.encode("latin-1") + b"\n")

    def read(self) -> bytes:
        self.line.proceed()
        return self.line.take(1 << 30)[0]

    def ask(self, message: str) -> str:
        self.write(message)
        return self.read().decode("ascii").removesuffix("\n")

    def errors(self) -> list[int]:
        found = [int(n) for n in self.ask("SYST:ERR:CODE:ALL?").split(",")]
        return [] if found == [0] else found

    def after(self, *messages: str) -> list[int]:
        """Errors of these messages."""
        for message in messages:
            self.write(message)
        self.read()
        return self.errors()


@pytest.fixture
def make_bench() -> Callable[..., Bench]:
    return lambda limits=None, manners=None: Bench(limits, manners)


@pytest.fixture
def bench(make_bench) -> Bench:
    return make_bench()
