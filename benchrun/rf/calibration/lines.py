"""Lines of TRL: what a read pair of thru and line tells, and which line serves where."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import cast

import numpy as np
from numpy.typing import NDArray

from benchrun.errors import InvalidMeasurement
from benchrun.rf.calibration.method import Definitions, Options
from benchrun.rf.calibration.self_calibration import root_towards
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = [
    "WINDOW_DEG",
    "Eigen",
    "LineReport",
    "choose",
    "eigen_of",
    "guesses_of",
    "length_m",
    "propagation_of",
    "refuse_beyond",
    "refuse_equal",
    "report_of",
]

_LIGHT_M_PER_S = 299_792_458.0

WINDOW_DEG = (20.0, 160.0)
"""How much longer than the thru a line must be, modulo 180 degrees; common practice."""

_WEAK = 1e-3

_ROUNDING_DEG = 0.01
"""A line made for the very edge of the window is not to fail by the last digit."""


@dataclass(frozen=True, slots=True, eq=False)
class LineReport:
    """Which line has what phase where.

    Parameters
    ----------
    names
        Of the lines.
    phase_deg
        ``(lines, f)``: how much longer than the thru each line is, as measured, folded into 0 to 180.
    chosen
        ``(f,)``: index of the line that is nearest to 90 degrees.
    """

    names: tuple[str, ...]
    phase_deg: FloatArray
    chosen: NDArray[np.intp]

    @property
    def best_deg(self) -> FloatArray:
        """Phase of the chosen line, ``(f,)``."""
        return np.asarray(np.take_along_axis(self.phase_deg, self.chosen[np.newaxis], 0)[0])

    @property
    def within(self) -> NDArray[np.bool_]:
        """Where the chosen line lies inside of :data:`WINDOW_DEG`, ``(f,)``."""
        low, high = WINDOW_DEG[0] - _ROUNDING_DEG, WINDOW_DEG[1] + _ROUNDING_DEG
        return np.asarray((self.best_deg >= low) & (self.best_deg <= high))

    @property
    def magnification(self) -> FloatArray:
        """By how much errors grow with the chosen line, ``1 / |sin|`` of its phase, ``(f,)``."""
        return np.asarray(1.0 / np.maximum(np.abs(np.sin(np.radians(self.best_deg))), 1e-12))

    def text(self, f_hz: FloatArray) -> str:
        """One line of text for each line: where it is used, and its phases there.

        Examples
        --------
        >>> import numpy as np
        >>> report = LineReport(("line",), np.array([[30.0, 90.0]]), np.array([0, 0]))
        >>> report.text(np.array([1e9, 3e9]))
        'line: 2 of 2 points, 1000 MHz to 3000 MHz, 30 to 90 degrees'
        """
        said = []
        for index, name in enumerate(self.names):
            mine = self.chosen == index
            if not mine.any():
                said.append(f"{name}: not used")
                continue
            f, phase = f_hz[mine] / 1e6, self.phase_deg[index, mine]
            said.append(
                f"{name}: {mine.sum()} of {len(mine)} points, {f[0]:.6g} MHz to {f[-1]:.6g} MHz, "
                f"{phase.min():.3g} to {phase.max():.3g} degrees"
            )
        return "\n".join(said)


@dataclass(frozen=True, slots=True, eq=False)
class Eigen:
    r"""What thru and line alone tell of port 1.

    Parameters
    ----------
    match
        Reading of port 1 with a matched load, ``(..., f)``.
    far
        Reciprocal of its reading where :math:`(a S + b)/(c S + 1)` has ``S`` at infinity: ``c / a``.
    mean, half_gap
        Of the eigenvalues :math:`e^{-\gamma l}` and :math:`e^{+\gamma l}`; the mean before ``scale``.
    scale
        Reciprocal of the transmissions that belong to the matrices.
    """

    match: ComplexArray
    far: ComplexArray
    mean: ComplexArray
    half_gap: ComplexArray
    scale: ComplexArray

    @property
    def propagation(self) -> ComplexArray:
        r""":math:`e^{-\gamma l}` of the line's excess over the thru, ``(..., f)``."""
        return self.mean * self.scale + self.half_gap

    @property
    def phase_deg(self) -> FloatArray:
        """Of the first draw's propagation, folded into 0 to 180 degrees, ``(f,)``."""
        mean, scale, gap = (p.reshape(-1, p.shape[-1])[0] for p in (self.mean, self.scale, self.half_gap))
        return np.asarray(np.degrees(np.abs(np.angle(mean * scale + gap))))


def eigen_of(thru: TwoPort, line: TwoPort, guess: ComplexArray) -> Eigen:
    """Eigenvectors of line over thru, in wave-cascade form; the guess decides which is which.

    Parameters
    ----------
    thru, line
        As read, freed of leakage and switch terms.
    guess
        About what ``propagation`` should be; right within 90 degrees.
    """
    # [[-det, s11], [-s22, 1]] of the line times the adjugate of the same of the thru.
    dl, dt = line.determinant, thru.determinant
    m11, m12 = line.s11 * thru.s22 - dl, dl * thru.s11 - line.s11 * dt
    m21, m22 = thru.s22 - line.s22, line.s22 * thru.s11 - dt
    half, mean = 0.5 * (m22 - m11), 0.5 * (m11 + m22)
    size = line.s21 * thru.s12
    scale = 1.0 / size
    square = (half * half + m12 * m21) * (scale * scale)
    half_gap = root_towards(square, guess - 1.0 / guess)[0]
    root = half_gap * size
    # The usual form, without cancellation as long as port 1 transmits more than it reflects ...
    below = root - half
    if float(np.min(np.abs(below))) > _WEAK * float(np.max(np.abs(root))):
        inverse = 1.0 / below
        return Eigen(m12 * -inverse, m21 * inverse, mean, half_gap, scale)
    above = root + half  # ... and the other one where it does not.
    weak = np.abs(below) < np.abs(above)
    with np.errstate(divide="ignore", invalid="ignore"):
        match = np.where(weak, -above / m21, -m12 / below)
        far = np.where(weak, above / m12, m21 / below)
    return Eigen(match, far, mean, half_gap, scale)


def propagation_of(line: TwoPort) -> tuple[ComplexArray, ComplexArray]:
    r"""Propagation and impedance step of a defined line.

    Returns
    -------
    propagation, g
        :math:`e^{-\gamma l}`, and :math:`(Z_c - Z_0)/(Z_c + Z_0)`; from
        :math:`\cosh \gamma l = (1 - S_{11}^2 + S_{21}^2) / (2 S_{21})` and
        :math:`Z_c^2/Z_0^2 = ((1 + S_{11})^2 - S_{21}^2) / ((1 - S_{11})^2 - S_{21}^2)` (any network text,
        from memory).
    """
    s11, s21 = line.s11, line.s21
    if not np.any(s11):
        return s21, np.zeros_like(s21)
    cosh = (1.0 - s11**2 + s21**2) / (2.0 * s21)
    root = np.sqrt(cosh**2 - 1.0)
    one, two = cosh - root, cosh + root
    e = np.where(np.abs(one - s21) <= np.abs(two - s21), one, two)
    z = np.sqrt(((1.0 + s11) ** 2 - s21**2) / ((1.0 - s11) ** 2 - s21**2))
    return np.asarray(e), np.asarray((z - 1.0) / (z + 1.0))


def guesses_of(
    definitions: Definitions, options: Options
) -> tuple[dict[str, ComplexArray], TwoPort, ComplexArray]:
    """Excess propagation of each line, the thru in the lines' own impedance, and that impedance."""
    found = {name: propagation_of(cast(TwoPort, definitions[name])) for name in options.lines}
    g = found[options.lines[0]][1]
    for name, (_, other) in list(found.items())[1:]:
        if not np.allclose(other, g, atol=1e-6):
            raise InvalidMeasurement(
                f"{options.lines[0]} and {name} are defined with different impedances; TRL needs "
                "lines of one kind.",
                "Use lines of one cross-section, or correct the kit file.",
            )
    e = propagation_of(cast(TwoPort, definitions["thru"]))[0]
    zero = np.zeros_like(e)
    return {name: p / e for name, (p, _) in found.items()}, TwoPort(zero, e, e, zero), g


def length_m(f_hz: FloatArray, guess: ComplexArray) -> float:
    """Length in vacuum of a line of this propagation, in metres: what scikit-rf wants to be told."""
    delay = -np.unwrap(np.angle(guess)) / (2.0 * np.pi * f_hz)
    return float(np.mean(delay)) * _LIGHT_M_PER_S


def choose(thru: TwoPort, read: Mapping[str, TwoPort], guesses: Mapping[str, ComplexArray]) -> LineReport:
    """Take for each frequency the line nearest to 90 degrees, by the first draw as measured."""
    first = _first(thru)
    phases = []
    for name, line in read.items():
        found = eigen_of(first, _first(line), guesses[name].reshape(-1, guesses[name].shape[-1])[0])
        phases.append(found.phase_deg)
    return report_of(tuple(read), np.array(phases))


def report_of(names: tuple[str, ...], phase_deg: FloatArray) -> LineReport:
    """Choose by phases ``(lines, f)``."""
    return LineReport(names, phase_deg, np.argmin(np.abs(phase_deg - 90.0), axis=0))


def _first(two: TwoPort) -> TwoPort:
    return two.map(lambda plane: plane.reshape(-1, plane.shape[-1])[0])


def refuse_beyond(report: LineReport, allowed: bool) -> None:
    """Refuse frequencies at which no line serves.

    Raises
    ------
    InvalidMeasurement
        With the greatest departure, unless ``allowed``.
    """
    if allowed or report.within.all():
        return
    worst = int(np.argmax(np.abs(report.best_deg - 90.0)))
    raise InvalidMeasurement(
        f"At {np.count_nonzero(~report.within)} of {len(report.chosen)} points no line is between "
        f"{WINDOW_DEG[0]:.0f} and {WINDOW_DEG[1]:.0f} degrees longer than the thru; the worst is "
        f"{report.names[report.chosen[worst]]} with {report.best_deg[worst]:.1f} degrees at point "
        f"{worst + 1}, where errors grow {report.magnification[worst]:.1f} times.",
        "Narrow the sweep, add a line of another length, or allow it in the step.",
    )


def refuse_equal(thru: TwoPort, read: Mapping[str, TwoPort]) -> None:
    """Refuse lines that read like the thru or like one another.

    Raises
    ------
    InvalidMeasurement
        Naming both.
    """
    parts: Sequence[tuple[str, ComplexArray]] = [
        (name, _first(two).s21) for name, two in {"thru": thru, **read}.items()
    ]
    for index, (name, plane) in enumerate(parts):
        for other, another in parts[:index]:
            gap = float(np.max(np.abs(np.angle(plane / another))))
            if not gap > np.radians(2.0):
                raise InvalidMeasurement(
                    f"{other} and {name} have the same phase within {np.degrees(gap):.2f} degrees over the "
                    "whole sweep: they are one length, or one of them was read twice.",
                    f"Connect {name} and read it again, or use a line of another length.",
                )
