"""Our arrays as scikit-rf's networks, for the examiners; imported only inside them."""

from __future__ import annotations

from typing import Any

import numpy as np

from benchrun.hookup import Hookup
from benchrun.rf.calibration.method import Readings
from benchrun.rf.calibration.reading import LOADS
from benchrun.rf.calibration.switch_terms import SwitchTerms
from benchrun.rf.twoport import ComplexArray, FloatArray, TwoPort

__all__ = ["Networks"]


class Networks:
    """Makes networks on one grid.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    """

    def __init__(self, f_hz: FloatArray) -> None:
        import skrf

        self.frequency = skrf.Frequency.from_f(f_hz, unit="hz")
        self._network = skrf.Network

    def one(self, plane: ComplexArray | complex) -> Any:
        """One-port."""
        full = np.broadcast_to(np.asarray(plane, np.complex128), (len(self.frequency),))
        return self._network(frequency=self.frequency, s=full[:, None, None].copy())

    def two(self, two: TwoPort, z0: ComplexArray | float = 50.0) -> Any:
        """Two-port, in pseudo-waves (which are all the same while ``z0`` is real)."""
        return self._network(frequency=self.frequency, s=two.matrix, z0=z0, s_def="pseudo")

    def renormalised(self, two: TwoPort, old: ComplexArray, new: float) -> TwoPort:
        """Another reference impedance for both ports, in pseudo-waves, by cascading two steps of impedance.

        ``Network.renormalize`` goes by way of Z, which a thru does not have: it then shifts the eigenvalues
        by the root of the rounding error, and so the result by 1e-7.
        """
        from skrf.network import impedance_mismatch

        step = self.two(TwoPort.of(impedance_mismatch(np.full_like(old, new), old, s_def="pseudo")))
        return TwoPort.of((step ** self.two(two) ** step.flipped()).s)

    def both(self, one: ComplexArray, two: ComplexArray) -> Any:
        """A reflection on each port and nothing between."""
        zero = np.zeros_like(one)
        return self.two(TwoPort(one, zero, zero, two))

    def hanging(
        self, one: ComplexArray, two: ComplexArray, readings: Readings, isolation: bool = False
    ) -> Any:
        """Readings of what hangs on each port, with nothing but the leakage between them."""
        if not isolation:
            return self.both(one, two)
        load = readings[LOADS.text]
        return self.two(TwoPort(one, load.s12, load.s21, two))

    def reflect(self, readings: Readings, name: str, isolation: bool = False) -> Any:
        """Readings of one standard on both ports."""
        one, two = readings[Hookup.of(name, 1).text].s11, readings[Hookup.of(name, 2).text].s22
        return self.hanging(one, two, readings, isolation)

    def through(self, readings: Readings, name: str) -> Any:
        """Reading of what joins the ports."""
        return self.two(readings[Hookup.of(name, 1, 2).text])

    def given(self, readings: Readings, isolation: bool) -> dict[str, Any]:
        """Switch terms and isolation, as scikit-rf's constructors take them."""
        switch = SwitchTerms.among(readings)
        leak = None
        if isolation:
            load = readings[LOADS.text]
            zero = np.zeros_like(load.s21)
            leak = self.two(TwoPort(zero, load.s12, load.s21, zero))
        return {
            # Zero instead of none, for which scikit-rf would warn.
            "switch_terms": (self.one(switch.forward), self.one(switch.reverse)),
            "isolation": leak,
        }
