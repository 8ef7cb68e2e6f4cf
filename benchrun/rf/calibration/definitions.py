"""A kit's standards on one grid."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.rf.calibration.method import Defined
from benchrun.rf.kit import Kit
from benchrun.rf.twoport import FloatArray

__all__ = ["define"]


def define(
    kit: Kit,
    names: tuple[str, ...],
    f_hz: FloatArray,
    deltas: Mapping[str, Mapping[str, float | FloatArray]] | None = None,
) -> Defined:
    """Evaluate what the kit says its standards are, on this grid.

    Parameters
    ----------
    kit
        The kit.
    names
        Standards wanted.
    f_hz
        Frequencies in Hz, ``(f,)``.
    deltas
        Departures per standard and parameter, scalar or ``(d, 1)``.

    Returns
    -------
    dict
        One plane per one-port standard, one :class:`TwoPort` per thru.

    Raises
    ------
    KeyError
        If the kit lacks a standard.
    """
    found = Defined(f_hz)
    for name in names:
        standard, moved = kit.standards[name], (deltas or {}).get(name)
        if standard.joins:
            found[name] = standard.two_port(f_hz, kit.z0_ohm, moved)
        else:
            found[name] = standard.reflection(f_hz, kit.z0_ohm, moved)
    return found
