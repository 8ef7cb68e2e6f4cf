"""Calibration standards by physical parameters, and the kit that holds them.

The model is the polynomial one of the calibration-kit literature: a termination behind an offset line
with skin-effect loss. Sources: scikit-rf documentation, "SOLT Calibration Standards Creation" with its
appendix, which cites IEEE 287-2007 for the lines.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.rf.interpolation import resample
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Kit", "Measured", "Offset", "Standard"]

_GHZ = 1e9


@dataclass(frozen=True, slots=True)
class Offset:
    """The line between the reference plane and what ends it.

    Parameters
    ----------
    delay_s
        One-way delay in seconds.
    loss_ohm_per_s
        Skin-effect loss at 1 GHz, grows with the square root of frequency.
    z0_ohm
        Characteristic impedance without loss.
    """

    delay_s: float = 0.0
    loss_ohm_per_s: float = 0.0
    z0_ohm: float = 50.0

    def line(
        self, f_hz: FloatArray, delay_s: float | FloatArray | None = None
    ) -> tuple[ComplexArray, ComplexArray]:
        r"""Propagation and impedance at each frequency.

        With :math:`\alpha l = \frac{loss\,\tau}{2 Z_o}\sqrt{f/1\,\mathrm{GHz}}`,
        :math:`\gamma l = \alpha l + j(2\pi f\tau + \alpha l)` and
        :math:`Z_c = Z_o + (1-j)\frac{loss}{4\pi f}\sqrt{f/1\,\mathrm{GHz}}`.

        Parameters
        ----------
        f_hz
            Frequencies in Hz, ``(f,)``, above zero.
        delay_s
            Another delay in its place, scalar or ``(d, 1)``.

        Returns
        -------
        gamma_l, zc_ohm
            Complex propagation (Np, rad) and impedance, ``(..., f)``.
        """
        tau = np.asarray(self.delay_s if delay_s is None else delay_s)
        root = np.sqrt(f_hz / _GHZ)
        alpha = self.loss_ohm_per_s * tau / (2.0 * self.z0_ohm) * root
        gamma = alpha + 1j * (2.0 * np.pi * f_hz * tau + alpha)
        zc = self.z0_ohm + (1.0 - 1.0j) * self.loss_ohm_per_s / (4.0 * np.pi * f_hz) * root
        return np.asarray(gamma), np.asarray(zc)


@dataclass(frozen=True, slots=True)
class Standard:
    """One standard of a kit.

    Parameters
    ----------
    kind
        ``"open"``, ``"short"``, ``"load"``, ``"thru"`` or ``"line"``.
    offset
        Line in front of the termination, or the thru or line itself.
    capacitance
        ``C0, C1, C2, C3`` in F, F/Hz, F/Hz^2, F/Hz^3 (open).
    inductance
        ``L0, L1, L2, L3`` in H, H/Hz, ... (short).
    resistance_ohm, series_inductance_h
        The load.
    uncertainty
        Standard uncertainty by parameter name: ``c0_f``, ``l0_h``, ``delay_s``, ``resistance_ohm``,
        ``series_inductance_h``.

    Examples
    --------
    >>> import numpy as np
    >>> short = Standard("short")
    >>> complex(short.reflection(np.array([1e9]))[0])
    (-1+0j)
    """

    kind: str
    offset: Offset = Offset()
    capacitance: tuple[float, float, float, float] = (0.0, 0.0, 0.0, 0.0)
    inductance: tuple[float, float, float, float] = (0.0, 0.0, 0.0, 0.0)
    resistance_ohm: float = 50.0
    series_inductance_h: float = 0.0
    uncertainty: Mapping[str, float] = field(default_factory=dict)

    @property
    def joins(self) -> bool:
        """Whether it stands between two ports."""
        return self.kind in ("thru", "line")

    def reflection(
        self, f_hz: FloatArray, zr_ohm: float = 50.0, deltas: Mapping[str, float | FloatArray] | None = None
    ) -> ComplexArray:
        """Reflection of a one-port standard.

        Parameters
        ----------
        f_hz
            Frequencies in Hz, ``(f,)``.
        zr_ohm
            Reference impedance.
        deltas
            Departures from the nominal parameters, by the names of ``uncertainty``; scalar or ``(d, 1)``.

        Returns
        -------
        numpy.ndarray
            Linear complex reflection, ``(f,)`` or ``(d, f)``.

        Raises
        ------
        ValueError
            For a two-port standard.
        """
        d = deltas or {}
        gamma_t = self._termination(f_hz, zr_ohm, d)
        gamma_l, zc = self.offset.line(f_hz, self.offset.delay_s + np.asarray(d.get("delay_s", 0.0)))
        g1 = (zc - zr_ohm) / (zc + zr_ohm)
        e = np.exp(-2.0 * gamma_l)
        result = (g1 * (1.0 - e - g1 * gamma_t) + e * gamma_t) / (1.0 - g1 * (e * g1 + gamma_t * (1.0 - e)))
        return np.asarray(result, dtype=np.complex128)

    def _termination(self, f_hz: FloatArray, zr: float, d: Mapping[str, float | FloatArray]) -> ComplexArray:
        w = 2.0 * np.pi * f_hz
        if self.kind == "open":
            c = np.polynomial.polynomial.polyval(f_hz, self.capacitance) + np.asarray(d.get("c0_f", 0.0))
            y = 1j * w * c * zr
            return np.asarray((1.0 - y) / (1.0 + y))
        if self.kind == "short":
            inductance = np.polynomial.polynomial.polyval(f_hz, self.inductance) + np.asarray(
                d.get("l0_h", 0.0)
            )
            z = 1j * w * inductance / zr
        elif self.kind == "load":
            r = self.resistance_ohm + np.asarray(d.get("resistance_ohm", 0.0))
            z = (r + 1j * w * (self.series_inductance_h + np.asarray(d.get("series_inductance_h", 0.0)))) / zr
        else:
            raise ValueError(f"a {self.kind} has no single reflection")
        return np.asarray((z - 1.0) / (z + 1.0))

    def two_port(
        self, f_hz: FloatArray, zr_ohm: float = 50.0, deltas: Mapping[str, float | FloatArray] | None = None
    ) -> TwoPort:
        """S-parameters of a thru or line: a line of ``offset``, in a system of ``zr_ohm``.

        Source: a line of impedance :math:`Z_c` between two reference planes, any network text, for
        example Pozar, Microwave Engineering, table 4.2 (from memory).
        """
        d = deltas or {}
        gamma_l, zc = self.offset.line(f_hz, self.offset.delay_s + np.asarray(d.get("delay_s", 0.0)))
        g1 = (zc - zr_ohm) / (zc + zr_ohm)
        e = np.exp(-gamma_l)
        denominator = 1.0 - g1**2 * e**2
        s11 = g1 * (1.0 - e**2) / denominator
        s21 = e * (1.0 - g1**2) / denominator
        return TwoPort(s11, s21, s21, s11)


@dataclass(frozen=True, slots=True, eq=False)
class Measured:
    """A standard by its own measured S-parameters instead of a model.

    Parameters
    ----------
    kind
        As for :class:`Standard`.
    f_hz
        ``(k,)``, increasing.
    data
        Reflection ``(k,)``, or a :class:`TwoPort` for a thru or line, in ``z0_ohm``.
    z0_ohm
        Reference impedance of ``data``; the system's must be the same.
    uncertainty
        Standard uncertainty of a complex value, by ``"reflection"``; linear, each of real and imaginary part.
    """

    kind: str
    f_hz: FloatArray
    data: ComplexArray | TwoPort
    z0_ohm: float = 50.0
    uncertainty: Mapping[str, float] = field(default_factory=dict)

    @property
    def joins(self) -> bool:
        """Whether it stands between two ports."""
        return isinstance(self.data, TwoPort)

    def reflection(
        self, f_hz: FloatArray, zr_ohm: float = 50.0, deltas: Mapping[str, float | FloatArray] | None = None
    ) -> ComplexArray:
        """Measured reflection at ``f_hz``, by a polynomial between the measured points.

        Parameters
        ----------
        f_hz
            ``(f,)``, within the measured range.
        zr_ohm
            Reference impedance, that of the data.
        deltas
            ``"reflection"``: departure, complex, scalar or ``(d, 1)``.

        Raises
        ------
        InvalidMeasurement
            Beyond the measured range: nothing is made up there.
        ValueError
            For a two-port standard, or in another impedance.
        """
        if isinstance(self.data, TwoPort):
            raise ValueError(f"a {self.kind} has no single reflection")
        self._refuse(f_hz, zr_ohm)
        moved = np.asarray((deltas or {}).get("reflection", 0.0))
        return np.asarray(resample(self.f_hz, self.data, f_hz) + moved)

    def two_port(
        self, f_hz: FloatArray, zr_ohm: float = 50.0, deltas: Mapping[str, float | FloatArray] | None = None
    ) -> TwoPort:
        """Measured S-parameters of a thru or line at ``f_hz``; raises as :meth:`reflection` does."""
        if not isinstance(self.data, TwoPort):
            raise ValueError(f"a {self.kind} does not join two ports")
        self._refuse(f_hz, zr_ohm)
        return self.data.map(lambda plane: resample(self.f_hz, plane, f_hz))

    def _refuse(self, f_hz: FloatArray, zr_ohm: float) -> None:
        if zr_ohm != self.z0_ohm:
            raise ValueError(f"measured in {self.z0_ohm:g} ohm, asked for in {zr_ohm:g} ohm")
        low, high = float(self.f_hz[0]), float(self.f_hz[-1])
        if f_hz[0] < low * (1 - 1e-12) or f_hz[-1] > high * (1 + 1e-12):
            raise InvalidMeasurement(
                f"The {self.kind} was measured from {low / 1e6:.6g} MHz to {high / 1e6:.6g} MHz; the "
                f"sweep goes from {f_hz[0] / 1e6:.6g} MHz to {f_hz[-1] / 1e6:.6g} MHz.",
                "Narrow the sweep, or use a kit that was measured over it.",
            )


@dataclass(frozen=True, slots=True)
class Kit:
    """The standards that belong together in one box.

    Parameters
    ----------
    name, serial, connector
        As on the box.
    standards
        By name: ``"short"``, ``"open"``, ``"load"``, ``"thru"``.
    low_hz, high_hz
        Range in which the definitions hold.
    z0_ohm
        Reference impedance of the system.
    """

    name: str
    standards: Mapping[str, Standard | Measured]
    low_hz: float = 0.0
    high_hz: float = np.inf
    z0_ohm: float = 50.0
    serial: str = ""
    connector: str = ""

    def with_standard(self, name: str, standard: Standard | Measured) -> Kit:
        """Copy the kit with one standard replaced."""
        return replace(self, standards={**self.standards, name: standard})
