"""Parts as somebody measured them: a Touchstone file, on its own grid or between its points."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.parts.base import Part, Surroundings, known_keys
from sim_instruments.waves import Matrix, Real

__all__ = ["measured", "read_file"]


def read_file(path: Path) -> tuple[Real, Matrix]:
    """Frequencies ``(f,)`` and S-parameters ``(f, n, n)`` of a Touchstone file, by scikit-rf."""
    import skrf

    network = skrf.Network(str(path))
    return np.asarray(network.f, np.float64), np.asarray(network.s, np.complex128)


def measured(spec: Mapping[str, Any], draws: Draws) -> Part:
    """A part from ``file``; outside its range the nearest point stands."""
    known_keys(spec, "file")
    f_file, s_file = read_file(Path(spec["file"]))

    def response(f_hz: Real, around: Surroundings) -> Matrix:
        if np.array_equal(f_hz, f_file):
            return s_file
        ports = s_file.shape[-1]
        out = np.empty((len(f_hz), ports, ports), np.complex128)
        for i in range(ports):
            for j in range(ports):
                out[:, i, j] = np.interp(f_hz, f_file, s_file[:, i, j])
        return out

    return Part(s_file.shape[-1], response, Path(spec["file"]).name)
