"""The insides of a simulated network analyzer: couplers, switch, cables, receivers, noise.

Each port is a coupler with its receivers (directivity, match, tracking) behind which a test cable leads to
the reference plane; a switch feeds one port and ends the other. A reading is the chain coupler, cable,
device, cable, coupler, switch joined wave by wave; the error terms of any calibration model are never used
here, they come out of it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from sim_instruments.draws import Draws
from sim_instruments.instruments.ageing import COLD_DB, Ageing
from sim_instruments.instruments.noise import Noise
from sim_instruments.instruments.settings import allowed
from sim_instruments.values import number
from sim_instruments.waves import Matrix, Plane, Real, chain, empty, flip, join, line, two
from sim_instruments.world import World

__all__ = ["Receivers", "TrueTerms", "WorldReadings"]


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
        ``tracking`` (dB rms), ``cable`` (``delay``, ``loss`` at 1 GHz, ``drift`` in 1/K of its delay,
        ``bend`` in degrees at 1 GHz for a usual bend); what :class:`Noise` takes: ``noise``, ``trace noise``,
        ``compression``, ``spurious``; what :class:`Ageing` takes: ``warm-up``, ``on for``, ``drift``.
    draws
        What makes this specimen.
    """

    keys = (
        "directivity", "source match", "load match", "isolation", "tracking", "cable", "noise", "trace noise",
        "compression", "spurious", "warm-up", "on for", "drift",
    )  # fmt: skip

    def __init__(self, spec: Mapping[str, Any], draws: Draws) -> None:
        allowed("receivers", spec, *self.keys)
        allowed("their cable", spec["cable"], "delay", "loss", "drift", "bend")
        self.draws = draws
        self.size = {
            key: 10 ** (-abs(number(spec[key])) / 20)
            for key in ("directivity", "source match", "load match", "isolation")
        }
        self.tracking_db = number(spec["tracking"])
        cable = spec["cable"]
        self.delay, self.loss_db = number(cable["delay"]), number(cable["loss"])
        self.drift, self.bend_deg = number(cable.get("drift", 0.0)), number(cable.get("bend", 2.0))
        self._cables = {
            port: (
                self.delay * (1 + draws.normal(f"cable {port}", 0.01)),
                50.0 + draws.normal(f"cable impedance {port}", 0.15),
                draws.uniform(f"cable bend {port}", -1.0, 1.0),
            )
            for port in (1, 2)
        }
        self.noise = Noise(spec, draws.generator("noise"))
        self.ageing = Ageing(spec, draws / "ageing")
        self._fixed: tuple[Real, dict[str, Any]] | None = None

    def raw(
        self,
        f_hz: Real,
        device: Matrix,
        temperature_c: float,
        *,
        reverse: Matrix | None = None,
        time_s: float = 0.0,
        bend: float = 0.0,
    ) -> Matrix:
        """Readings without noise, ``(f, 2, 2)``, of a true device between the reference planes.

        Parameters
        ----------
        f_hz
            ``(f,)``.
        device
            ``(f, 2, 2)``, as it is with port 1 driven.
        temperature_c
            Of the room.
        reverse
            As it is with port 2 driven, where that differs.
        time_s
            Since the world began: warm-up and drift.
        bend
            How far the test cables were moved.
        """
        m = empty(len(f_hz))
        shape = self._shape(f_hz)
        boxes = {port: self._source(f_hz, port, temperature_c, time_s, bend) for port in (1, 2)}
        for port, far in ((1, 2), (2, 1)):
            seen = device if port == 1 else flip(device if reverse is None else reverse)
            whole = chain(boxes[port], seen, self._ended(flip(boxes[far]), shape[f"switch {far}"]))
            m[:, port - 1, port - 1] = whole[:, 0, 0]
            m[:, far - 1, port - 1] = whole[:, 1, 0] + shape[f"leak {port}"]
        return m

    def noisy(self, m: Matrix, bandwidth_hz: float, power_dbm: float | Real, averages: int) -> Matrix:
        """With noise, see :class:`Noise`."""
        return self.noise.on(m, bandwidth_hz, power_dbm, averages)

    def nothing(self, points: int) -> Matrix:
        """Readings with the source off: noise over noise."""
        return self.noise.alone(points)

    def true_terms(
        self, f_hz: Real, port: int, temperature_c: float, *, time_s: float = 0.0, bend: float = 0.0
    ) -> TrueTerms:
        """Error terms with ``port`` driven, read off the chain."""
        near = self._source(f_hz, port, temperature_c, time_s, bend)
        shape, other = self._shape(f_hz), 3 - port
        far = self._ended(
            flip(self._source(f_hz, other, temperature_c, time_s, bend)), shape[f"switch {other}"]
        )
        return TrueTerms(
            directivity=near[:, 0, 0],
            source_match=near[:, 1, 1],
            tracking=near[:, 0, 1] * near[:, 1, 0],
            load_match=far[:, 0, 0],
            transmission=near[:, 1, 0] * far[:, 1, 0],
            isolation=shape[f"leak {port}"],
        )

    def switch_term(self, f_hz: Real, port: int, temperature_c: float) -> Plane:
        """What the receivers of the other port see of its switch, ``a/b``, with ``port`` driven, ``(f,)``."""
        return np.asarray(self._shape(f_hz)[f"switch {3 - port}"])

    def _source(self, f_hz: Real, port: int, temperature_c: float, time_s: float, bend: float) -> Matrix:
        """From the receivers of a port to its reference plane."""
        shape = self._shape(f_hz)
        aged = self.ageing.factor(port, time_s, temperature_c)
        coupler = two(
            shape[f"directivity {port}"], shape[f"receive {port}"] * aged, shape[f"tracking {port}"],
            shape[f"source {port}"],
        )  # fmt: skip
        return join(coupler, self._cable(f_hz, port, temperature_c, bend))

    @staticmethod
    def _ended(box: Matrix, switch: Plane) -> Matrix:
        """A receiving port: its ``a`` is what its switch throws back of its ``b``; out comes ``b``."""
        zeros = np.zeros(len(switch), np.complex128)
        rounds = 1.0 / (1.0 - box[:, 1, 1] * switch)
        return two(
            box[:, 0, 0] + box[:, 0, 1] * switch * box[:, 1, 0] * rounds, zeros, box[:, 1, 0] * rounds, zeros
        )

    def _cable(self, f_hz: Real, port: int, temperature_c: float, bend: float) -> Matrix:
        delay, z_ohm, way = self._cables[port]
        delay *= 1 + self.drift * (temperature_c - 23.0)
        delay += bend * way * self.bend_deg / 360.0 / 1e9
        return line(f_hz, delay, z_ohm, self.loss_db)

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
                # The switch ends a receiving port so that the match ahead of its cable is "load".
                step = shape[f"load {port}"] - shape[f"source {port}"]
                around = shape[f"tracking {port}"] * shape[f"receive {port}"]
                shape[f"switch {port}"] = step / (around + shape[f"directivity {port}"] * step)
            self._fixed = f_hz.copy(), shape
        return self._fixed[1]


class WorldReadings:
    """Readings of a world: what an analyzer asks for when a sweep ends."""

    def __init__(self, world: World, receivers: Receivers) -> None:
        self.world = world
        self.receivers = receivers

    def read(
        self, f_hz: Real, bandwidth_hz: float, power_dbm: float | Real, averages: int, source_on: bool
    ) -> Matrix:
        """Raw readings ``(f, 2, 2)`` of what is connected now, at one level or at one a point."""
        if not source_on:
            return self.receivers.nothing(len(f_hz))
        world = self.world
        with world.lock:
            ahead = world.between_ports(f_hz, power_dbm, 1)
            back = world.between_ports(f_hz, power_dbm, 2) if world.has_active else None
            raw = self.receivers.raw(
                f_hz, ahead, world.temperature(), reverse=back, time_s=world.time_s, bend=world.bend
            )
        raw[:, 0, 1] += (spurs := self.receivers.noise.spurs(f_hz, bandwidth_hz, power_dbm))
        raw[:, 1, 0] += spurs
        return self.receivers.noisy(raw, bandwidth_hz, power_dbm, averages)

    def is_cold(self) -> bool:
        """Whether readings still move because it was switched on not long ago."""
        return self.receivers.ageing.cold_db(self.world.time_s) > COLD_DB

    def switch_terms(self, f_hz: Real) -> Matrix:
        """What the idle port reflects, with port 1 and with port 2 driven, ``(f, 2)``."""
        warmth = self.world.temperature()
        return np.stack([self.receivers.switch_term(f_hz, port, warmth) for port in (1, 2)], -1)
