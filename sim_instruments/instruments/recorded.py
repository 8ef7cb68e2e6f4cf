"""Recorded raw readings behind the analyzer's front: real data through the whole chain."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np

from sim_instruments.parts.measured import read_file
from sim_instruments.scpi.errors import ScpiError
from sim_instruments.waves import Matrix, Real
from sim_instruments.world import World

__all__ = ["Recorded"]


class Recorded:
    """Readings from Touchstone files by what is connected.

    A one-port file gives the reading of the port that it hangs on; the other readings are nothing. Two
    files, one for each port, may serve one connection of both ports.

    Parameters
    ----------
    world
        Whose connection counts.
    files
        By the connection in words: ``"short on port 1"``, ``"unit from port 1 to port 2"``; the words for
        the unit hold for the serial offered, or ``"SERIAL: unit on port 1"`` for one serial.
    """

    def __init__(self, world: World, files: Mapping[str, Path]) -> None:
        self.world = world
        self.files = dict(files)

    def switch_terms(self, f_hz: Real) -> Matrix:
        """Nobody recorded what the idle port reflected.

        Raises
        ------
        ScpiError
            -241, always.
        """
        raise ScpiError(-241, "no recording of the idle port")

    def is_cold(self) -> bool:
        """A recording does not warm up."""
        return False

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float | Real, averages: int, source_on: bool
    ) -> Matrix:
        """The recording of what is connected.

        Raises
        ------
        ScpiError
            -230 if nothing was recorded for it, -221 if it was recorded on another grid.
        """
        connection = self.world.connection
        path = self.files.get(f"{self.world.serial}: {connection}") or self.files.get(connection)
        if path is None:
            raise ScpiError(-230, f"nothing was recorded for {connection}")
        grid, s = read_file(path)
        if len(grid) != len(f_hz) or np.max(np.abs(grid - f_hz) / f_hz) > 1e-9:
            raise ScpiError(-221, f"recorded was {len(grid)} points from {grid[0]:g} to {grid[-1]:g} Hz")
        if s.shape[-1] == 2:
            return s
        m = np.zeros((len(grid), 2, 2), np.complex128)
        port = self.world.links[0].ports[0] - 1
        m[:, port, port] = s[:, 0, 0]
        return m
