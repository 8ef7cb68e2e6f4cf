"""What a step ``de-embed`` does to S-parameters, and the same by scikit-rf."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol, TypeAlias

import numpy as np

from benchrun.evaluate.network import Data, Network
from benchrun.rf.deembedding.dummies import (
    Circuit,
    without_open,
    without_open_then_short,
    without_short,
    without_short_then_open,
)
from benchrun.rf.deembedding.halves import reflection_behind, reflection_within, within, without
from benchrun.rf.deembedding.impedance import Wave, renormalise, renormalise_reflection
from benchrun.rf.twoport import ComplexArray, TwoPort

__all__ = ["Around", "Dummies", "Halves", "Impedances", "Planes", "Removal", "Thru", "inverse"]

Planes: TypeAlias = TwoPort | ComplexArray


class Removal(Protocol):
    """One way to move planes; nominal values and every variation go through it alike."""

    def take(self, data: Planes) -> Planes:
        """Planes ``(..., f)`` at the new place."""
        ...

    def examined(self, source: Network) -> Data:
        """The nominal values at the new place, by scikit-rf."""
        ...


@dataclass(frozen=True, slots=True, eq=False)
class Halves:
    """Fixture halves taken out."""

    left: TwoPort | None
    right: TwoPort | None

    def take(self, data: Planes) -> Planes:
        """Without the halves; a one-port sits behind the left one."""
        if isinstance(data, TwoPort):
            return without(data, self.left, self.right)
        return data if self.left is None else reflection_behind(data, self.left)

    def examined(self, source: Network) -> Data:
        """By inverse networks."""
        return _cascaded(source, self.left, self.right, lambda network: network.inv)


@dataclass(frozen=True, slots=True, eq=False)
class Around:
    """A circuit put around."""

    left: TwoPort | None
    right: TwoPort | None

    def take(self, data: Planes) -> Planes:
        """With the circuit; a one-port sits behind the left half."""
        if isinstance(data, TwoPort):
            return within(data, self.left, self.right)
        return data if self.left is None else reflection_within(data, self.left)

    def examined(self, source: Network) -> Data:
        """By cascaded networks."""
        return _cascaded(source, self.left, self.right, lambda network: network)


@dataclass(frozen=True, slots=True, eq=False)
class Dummies:
    """Pads and leads, from an open and a short dummy."""

    open: TwoPort | None
    short: TwoPort | None
    first: str

    def take(self, data: Planes) -> Planes:
        """Without pads and leads."""
        assert isinstance(data, TwoPort)  # a unit of one port is refused when the sequence is checked
        if self.short is None:
            assert self.open is not None  # the step names one at least
            return without_open(data, self.open)
        if self.open is None:
            return without_short(data, self.short)
        way = without_open_then_short if self.first == "open" else without_short_then_open
        return way(data, self.open, self.short)

    def examined(self, source: Network) -> Data:
        """By scikit-rf's de-embedding of the same name."""
        from skrf.calibration import deembedding as d

        make = _maker(source)
        unit = make(source.matrix)
        if self.short is None or self.open is None:
            one = self.short if self.open is None else self.open
            assert one is not None  # the step names one at least
            kind = d.Short if self.open is None else d.Open
            return TwoPort.of(kind(make(one.matrix)).deembed(unit).s)
        kind = d.OpenShort if self.first == "open" else d.ShortOpen
        named = {"dummy_open": make(self.open.matrix), "dummy_short": make(self.short.matrix)}
        return TwoPort.of(kind(**named).deembed(unit).s)


@dataclass(frozen=True, slots=True, eq=False)
class Thru:
    """A thru dummy split in two, with its halves already made: examined as a whole."""

    dummy: TwoPort
    halves: tuple[TwoPort, TwoPort]
    circuit: Circuit

    def take(self, data: Planes) -> Planes:
        """Without both halves."""
        return Halves(*self.halves).take(data)

    def examined(self, source: Network) -> Data:
        """By scikit-rf's split of the same circuit."""
        from skrf.calibration import deembedding as d

        make = _maker(source)
        kind = d.SplitPi if self.circuit == "pi" else d.SplitTee
        return TwoPort.of(kind(make(self.dummy.matrix)).deembed(make(source.matrix)).s)


@dataclass(frozen=True, slots=True)
class Impedances:
    """Other reference impedances."""

    old: tuple[complex, complex]
    new: tuple[complex, complex]
    wave: Wave

    def take(self, data: Planes) -> Planes:
        """In the new impedances."""
        if isinstance(data, TwoPort):
            return renormalise(data, self.old, self.new, self.wave)
        return renormalise_reflection(data, self.old[0], self.new[0], self.wave)

    def examined(self, source: Network) -> Data:
        """By scikit-rf's steps of impedance in pseudo-waves, and its change of waves before and after.

        Its ``renormalize`` goes by way of Z, which a thru or an open end does not have.
        """
        from skrf.network import impedance_mismatch, s2s

        ports = range(source.ports)
        old, new = (np.tile(np.array(z)[: source.ports], (len(source.f_hz), 1)) for z in (self.old, self.new))
        kind = "traveling" if self.wave == "travelling" else self.wave
        make = _maker(source)
        result = make(s2s(source.matrix, old, "pseudo", kind))
        steps = [make(impedance_mismatch(new[:, p], old[:, p], s_def="pseudo")) for p in ports]
        result = steps[0] ** result
        if source.ports == 2:
            result = result ** steps[1].flipped()
        return _result(source, s2s(result.s, new, kind, "pseudo"))


def inverse(two: TwoPort) -> TwoPort:
    r"""Give the two-port that undoes another: what is behind both is as if behind neither.

    :math:`S^{-} = [[S_{11}, -S_{21}], [-S_{12}, S_{22}]] / \det S`, from the inverse of the cascade matrix.

    Examples
    --------
    >>> import numpy as np
    >>> half = TwoPort.of(np.array([[[0.1, 0.8], [0.9, 0.2j]]]))
    >>> both = half @ inverse(half)
    >>> bool(abs(both.s11[0]) < 1e-15 and abs(both.s21[0] - 1) < 1e-15)
    True
    """
    size = 1.0 / two.determinant
    return TwoPort(two.s11 * size, -two.s21 * size, -two.s12 * size, two.s22 * size)


def _maker(source: Network) -> Callable[[ComplexArray], Any]:
    import skrf

    frequency = skrf.Frequency.from_f(source.f_hz, unit="hz")

    def make(s: ComplexArray) -> Any:
        return skrf.Network(frequency=frequency, s=np.array(s), z0=source.z0_ohm)

    return make


def _cascaded(
    source: Network, left: TwoPort | None, right: TwoPort | None, turn: Callable[[Any], Any]
) -> Data:
    make = _maker(source)
    result = make(source.matrix)
    if left is not None:
        result = turn(make(left.matrix)) ** result
    if right is not None and source.ports == 2:
        result = result ** turn(make(right.matrix))
    return _result(source, result.s)


def _result(source: Network, s: ComplexArray) -> Data:
    return TwoPort.of(s) if source.ports == 2 else np.asarray(s[:, 0, 0], dtype=np.complex128)
