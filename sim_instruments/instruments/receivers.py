"""The insides of a simulated network analyzer: couplers, switch, cables, receivers, noise.

Each port is a coupler (directivity, match, tracking) behind which a test cable leads to the reference
plane. A reading is the chain coupler, cable, device, cable, receiver joined wave by wave; the error terms
of any calibration model are never used here, they come out of it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.values import number
from sim_instruments.waves import Matrix, Plane, Real, chain, flip, join, line, two

__all__ = ["Receivers", "TrueTerms"]


@dataclass(frozen=True)
class TrueTerms:
    """The true error terms of one driven port, ``(f,)`` each: for tests and studies only."""

    directivity: Plane
    source_match: Plane
    tracking: Plane
    load_match: Plane
    transmission: Plane
    isolation: Plane


def _wander(f_hz: Real, draws: Draws, name: str, size: float) -> Plane:
    """A smooth complex function of frequency of rms ``size``: three reflections at random distances."""
    total = np.zeros(len(f_hz), np.complex128)
    for k in range(3):
        delay = draws.uniform(f"{name} delay {k}", 0.05e-9, 1.2e-9)
        total += draws.phase(f"{name} {k}") * np.exp(-2j * np.pi * f_hz * delay)
    return np.asarray(total * size / np.sqrt(3.0))


class Receivers:
    """Physics of a two-port analyzer.

    Parameters
    ----------
    spec
        ``directivity``, ``source match``, ``load match``, ``isolation`` (dB below one),
        ``tracking`` (dB rms), ``cable`` (``delay``, ``loss`` at 1 GHz, ``drift`` in 1/K of its delay),
        ``noise`` (dBm in 1 Hz), ``trace noise`` (dB rms in 1 kHz).
    draws
        What makes this specimen.
    """

    def __init__(self, spec: Mapping[str, Any], draws: Draws) -> None:
        self.draws = draws
        self.size = {
            key: 10 ** (-abs(number(spec[key])) / 20)
            for key in ("directivity", "source match", "load match", "isolation")
        }
        self.tracking_db = number(spec["tracking"])
        cable = spec["cable"]
        self.delay, self.loss_db = number(cable["delay"]), number(cable["loss"])
        self.drift = number(cable.get("drift", 0.0))
        self.noise_dbm_hz, self.trace_db = number(spec["noise"]), number(spec["trace noise"])
        self.noise = draws.generator("noise")
        self._fixed: tuple[Real, dict[str, Any]] | None = None

    def raw(self, f_hz: Real, device: Matrix, temperature_c: float) -> Matrix:
        """Readings without noise, ``(f, 2, 2)``, of a true device between the reference planes."""
        m = np.empty((len(f_hz), 2, 2), np.complex128)
        for port in (1, 2):
            seen = device if port == 1 else flip(device)
            far = 3 - port
            whole = chain(
                self._source(f_hz, port, temperature_c), seen, self._receiver(f_hz, far, temperature_c)
            )
            m[:, port - 1, port - 1] = whole[:, 0, 0]
            m[:, far - 1, port - 1] = whole[:, 1, 0] + self._shape(f_hz)[f"leak {port}"]
        return m

    def noisy(self, m: Matrix, bandwidth_hz: float, power_dbm: float, averages: int) -> Matrix:
        """With noise: a floor that source power lifts readings above, and trace noise in proportion."""
        root = np.sqrt(1.0 / averages)
        floor = 10 ** ((self.noise_dbm_hz + 10 * np.log10(bandwidth_hz) - power_dbm) / 20) * root
        trace = (10 ** (self.trace_db / 20) - 1) * np.sqrt(bandwidth_hz / 1e3) * root
        draws = self.noise.standard_normal((4, *m.shape)) / np.sqrt(2.0)
        return np.asarray(m * (1 + trace * (draws[0] + 1j * draws[1])) + floor * (draws[2] + 1j * draws[3]))

    def nothing(self, points: int) -> Matrix:
        """Readings with the source off: noise over noise."""
        draws = self.noise.standard_normal((4, points, 2, 2))
        return np.asarray((draws[0] + 1j * draws[1]) / (draws[2] + 1j * draws[3]))

    def true_terms(self, f_hz: Real, port: int, temperature_c: float) -> TrueTerms:
        """Error terms with ``port`` driven, read off the chain."""
        near, far = self._source(f_hz, port, temperature_c), self._receiver(f_hz, 3 - port, temperature_c)
        return TrueTerms(
            directivity=near[:, 0, 0],
            source_match=near[:, 1, 1],
            tracking=near[:, 0, 1] * near[:, 1, 0],
            load_match=far[:, 0, 0],
            transmission=near[:, 1, 0] * far[:, 1, 0],
            isolation=self._shape(f_hz)[f"leak {port}"],
        )

    def _source(self, f_hz: Real, port: int, temperature_c: float) -> Matrix:
        """From the reference receiver of a driven port to its reference plane."""
        shape = self._shape(f_hz)
        ones = np.ones(len(f_hz), np.complex128)
        coupler = two(shape[f"directivity {port}"], ones, shape[f"tracking {port}"], shape[f"source {port}"])
        return join(coupler, self._cable(f_hz, port, temperature_c))

    def _receiver(self, f_hz: Real, port: int, temperature_c: float) -> Matrix:
        """From the reference plane of a receiving port to its receiver, ended in the load match."""
        shape = self._shape(f_hz)
        zeros = np.zeros(len(f_hz), np.complex128)
        end = two(shape[f"load {port}"], zeros, shape[f"receive {port}"], zeros)
        return join(flip(self._cable(f_hz, port, temperature_c)), end)

    def _cable(self, f_hz: Real, port: int, temperature_c: float) -> Matrix:
        delay = self.delay * (1 + self.draws.normal(f"cable {port}", 0.01))
        delay *= 1 + self.drift * (temperature_c - 23.0)
        return line(f_hz, delay, 50.0 + self.draws.normal(f"cable impedance {port}", 0.15), self.loss_db)

    def _shape(self, f_hz: Real) -> dict[str, Any]:
        """What depends on frequency alone, kept for the last grid."""
        if self._fixed is None or not np.array_equal(self._fixed[0], f_hz):
            tilt = 10 ** (self.tracking_db / 20) - 1
            shape: dict[str, Any] = {}
            for port in (1, 2):
                for name, size in (
                    ("directivity", "directivity"),
                    ("source", "source match"),
                    ("load", "load match"),
                ):
                    shape[f"{name} {port}"] = _wander(f_hz, self.draws, f"{name} {port}", self.size[size])
                for name in ("tracking", "receive"):
                    gain = self.draws.uniform(f"{name} level {port}", 0.85, 1.0) * self.draws.phase(
                        f"{name} angle {port}"
                    )
                    shape[f"{name} {port}"] = gain * (1 + _wander(f_hz, self.draws, f"{name} {port}", tilt))
                shape[f"leak {port}"] = _wander(f_hz, self.draws, f"leak {port}", self.size["isolation"])
            self._fixed = f_hz.copy(), shape
        return self._fixed[1]
