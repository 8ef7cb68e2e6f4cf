"""Signals on their way: tones and noise through a row of parts, linear and not.

A part is heeded by its S-parameters and, if it is active, by its :class:`~sim_instruments.parts.base.Stage`:

- gain: the part's ``gain_factor`` at the drive that a tone meets, -1 dB at P1dB by definition; other tones
  weigh twice in that drive, as in a cubic nonlinearity (cross-compression, common practice);
- second order: amplitude ``a b / sqrt(IP2)`` at f1 +- f2, half of that at 2 f (slope 2; IM2 is 6.02 dB above
  the harmonic);
- third order: ``a^2 b* / IP3`` at 2 f1 - f2 (``3 P - 2 IP3``), a third of it at 3 f (slope 3; 9.54 dB below);
- noise: Friis for active parts, ``kT (1 - |S21|^2)`` added by passive ones.

The ratios follow from a power series; Pozar, Microwave Engineering, 10.3 (from memory).
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from sim_instruments.parts import Part, Surroundings
from sim_instruments.parts.base import Stage
from sim_instruments.waves import Matrix, Plane, Real, chain, seen_through, thru

__all__ = ["KT0_MW_HZ", "Gamma", "Row", "Signal", "dbm", "milliwatt", "products", "through"]

Gamma = Callable[[Real], Plane]
"""Reflection coefficient ``(f,)`` at frequencies ``(f,)``."""

KT0_MW_HZ = 1.380649e-23 * 290.0 * 1e3
"""-173.975 dBm/Hz: Boltzmann's constant, exact in the SI, at 290 K."""
_IP2_ABOVE_IP3_DB = 12.0
"""Second-order intercept of a stage that states none, above its third-order one (common practice: 10 to 15 dB
for a single-ended stage)."""
_STRONGEST = 4
_RELEVANT_DB = 90.0
"""Products are made of this many tones, and of none this far below the strongest."""


def dbm(power_mw: Real) -> Real:
    """Level of a power in milliwatt; nothing at all is -400 dBm."""
    return np.asarray(10 * np.log10(np.maximum(power_mw, 1e-40)))


def milliwatt(level_dbm: float) -> float:
    """Power of a level."""
    return float(10.0 ** (level_dbm / 10.0))


@dataclass(frozen=True)
class Signal:
    """What runs towards a plane.

    Parameters
    ----------
    f_hz
        Of the tones, ``(n,)``.
    wave
        Of the tones, ``(n,)``: the square of its magnitude is milliwatt.
    noise
        ``f_hz (f,) -> (f,)``: mW/Hz.
    """

    f_hz: Real
    wave: Plane
    noise: Callable[[Real], Real]

    @classmethod
    def none(cls) -> Signal:
        """No tones, and the noise of a termination at 290 K."""
        return cls(np.empty(0), np.empty(0, np.complex128), lambda f_hz: np.full(len(f_hz), KT0_MW_HZ))


@dataclass(frozen=True)
class Row:
    """Parts from the source's side to the receiver's, with their joints.

    Parameters
    ----------
    parts
        n of them.
    joints
        ``(f_hz, k) -> (f, 2, 2)``: the joint before part k; number n is the last one.
    source, load
        Reflection of the two ends.
    """

    parts: Sequence[Part]
    joints: Callable[[Real, int], Matrix]
    source: Gamma
    load: Gamma

    def matrix(self, f_hz: Real, around: Surroundings, start: int = 0, stop: int | None = None) -> Matrix:
        """From the joint before part ``start`` to the joint before part ``stop``, ``(f, 2, 2)``."""
        stop = len(self.parts) if stop is None else stop
        row = [thru(len(f_hz)), self.joints(f_hz, start)]
        for k in range(start, stop):
            row += [self.parts[k].matrix(f_hz, around), self.joints(f_hz, k + 1)]
        return chain(*row)


def through(row: Row, signal: Signal, around: Surroundings) -> Signal:
    """What arrives at the receiving end of a row.

    Linear stretches are exact, reflections at both ends included; products of an active part run onwards
    from its output and are not followed back.
    """
    f_hz, wave, source, start = signal.f_hz, signal.wave, row.source, 0
    for k, part in enumerate(row.parts):
        if part.stage is None or part.gain_factor is None:
            continue
        m = part.matrix(f_hz, around)
        onwards = seen_through(row.matrix(f_hz, around, k + 1), row.load(f_hz))
        arriving = _arriving(row.matrix(f_hz, around, start, k), wave, source(f_hz), seen_through(m, onwards))
        power = np.abs(arriving) ** 2
        drive = dbm(2 * np.sum(power) - power)
        amplified = arriving * m[:, 1, 0] * part.gain_factor(f_hz, around, drive)
        f_hz, wave = products(f_hz, amplified, *_intercepts(part.stage))
        source, start = _output_of(part, around), k + 1
    final = _arriving(row.matrix(f_hz, around, start), wave, source(f_hz), row.load(f_hz))
    return Signal(f_hz, final, lambda at_hz: _noise(row, signal, around, at_hz))


def _output_of(part: Part, around: Surroundings) -> Gamma:
    return lambda f_hz: part.matrix(f_hz, around)[:, 1, 1]


def _arriving(m: Matrix, wave: Plane, source: Plane, load: Plane) -> Plane:
    """Wave into a load behind a two-port, from a source wave with its reflection (signal-flow graph)."""
    around = (1 - m[:, 0, 0] * source) * (1 - m[:, 1, 1] * load)
    return np.asarray(wave * m[:, 1, 0] / (around - m[:, 0, 1] * m[:, 1, 0] * source * load))


def _intercepts(stage: Stage) -> tuple[float, float]:
    ip2 = getattr(stage, "ip2_dbm", None)
    return stage.ip3_dbm + _IP2_ABOVE_IP3_DB if ip2 is None else float(ip2), stage.ip3_dbm


def products(f_hz: Real, wave: Plane, ip2_dbm: float, ip3_dbm: float) -> tuple[Real, Plane]:
    """Tones at an output with everything of second and third order that they make.

    Parameters
    ----------
    f_hz, wave
        ``(n,)``; the square of a wave's magnitude is milliwatt.
    ip2_dbm, ip3_dbm
        Intercepts of the two-tone products, at the same plane.

    Returns
    -------
    f_hz, wave
        ``(m,)``, the first n those that were given; products that fall on the same frequency are summed as
        waves.

    Examples
    --------
    >>> f, a = products(np.array([1e8]), np.array([1.0 + 0j]), 40.0, 30.0)
    >>> [round(float(x), 2) for x in dbm(abs(a) ** 2)]
    [0.0, -46.02, -69.54]
    """
    second, third = 10 ** (-ip2_dbm / 20), 10 ** (-ip3_dbm / 10)
    order = np.argsort(-np.abs(wave))[:_STRONGEST]
    strong = [k for k in order if abs(wave[k]) > abs(wave[order[0]]) * 10 ** (-_RELEVANT_DB / 20)]
    made: list[tuple[float, complex]] = []
    for i, k in enumerate(strong):
        f, a = float(f_hz[k]), complex(wave[k])
        made += [(2 * f, a * a * second / 2), (3 * f, -(a**3) * third / 3)]
        for j in strong[i + 1 :]:
            g, b = float(f_hz[j]), complex(wave[j])
            made += _two_tones(f, a, g, b, second, third)
    tones = dict(enumerate(zip(f_hz.tolist(), wave.tolist(), strict=True)))
    for f, a in made:
        if f <= 0:
            continue
        same = next((k for k, (g, _) in tones.items() if abs(g - f) < 1e-3), len(tones))
        tones[same] = (
            f if same == len(tones) else tones[same][0],
            a + (0.0 if same == len(tones) else tones[same][1]),
        )
    return (
        np.array([f for f, _ in tones.values()], np.float64),
        np.array([a for _, a in tones.values()], np.complex128),
    )


def _two_tones(
    f: float, a: complex, g: float, b: complex, second: float, third: float
) -> list[tuple[float, complex]]:
    """Products of two tones; a negative frequency is the conjugate wave at the positive one."""
    made = [
        (f + g, a * b * second),
        (f - g, a * b.conjugate() * second),
        (2 * f - g, -a * a * b.conjugate() * third),
        (2 * g - f, -b * b * a.conjugate() * third),
        (2 * f + g, -a * a * b * third),
        (2 * g + f, -b * b * a * third),
    ]
    return [(h, w) if h >= 0 else (-h, w.conjugate()) for h, w in made]


def _noise(row: Row, signal: Signal, around: Surroundings, f_hz: Real) -> Real:
    """Density at the end, mW/Hz, ``(f,)``: Friis part by part, gains as |S21|^2 (near match)."""
    density = signal.noise(f_hz)
    room = KT0_MW_HZ * (around.temperature_c + 273.15) / 290.0
    for part in row.parts:
        gain = np.abs(part.matrix(f_hz, around)[:, 1, 0]) ** 2
        if part.stage is None:
            density = density * gain + room * np.maximum(1 - gain, 0.0)
        else:
            own = KT0_MW_HZ * (10 ** (part.stage.noise_figure_db / 10) - 1)
            density = np.maximum((density + own) * gain, KT0_MW_HZ)
    return density
