"""Calibration methods, one file each; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.rf.calibration.method import Definitions, Method
from benchrun.rf.calibration.one_port import ShortOpenLoad
from benchrun.rf.calibration.solt import ShortOpenLoadThru
from benchrun.rf.kit import Kit
from benchrun.rf.twoport import FloatArray, TwoPort

__all__ = ["METHODS", "define", "differ"]

METHODS: Mapping[str, Method] = {method.name: method for method in (ShortOpenLoad(), ShortOpenLoadThru())}


def define(
    kit: Kit,
    names: tuple[str, ...],
    f_hz: FloatArray,
    deltas: Mapping[str, Mapping[str, float | FloatArray]] | None = None,
) -> Definitions:
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
    found: dict[str, object] = {}
    for name in names:
        standard, moved = kit.standards[name], (deltas or {}).get(name)
        if standard.kind == "thru":
            found[name] = standard.two_port(f_hz, kit.z0_ohm, moved)
        else:
            found[name] = standard.reflection(f_hz, kit.z0_ohm, moved)
    return found  # type: ignore[return-value]  # filled with planes and two-ports only


def differ(a: object, b: object) -> float:
    """Greatest absolute difference of two corrected results, linear; nan if either holds a nan."""
    import numpy as np

    if isinstance(a, TwoPort) and isinstance(b, TwoPort):
        # numpy's max hands a nan on; Python's would lose it in the second place and later.
        return float(np.max([np.max(np.abs(x - y)) for x, y in zip(a.planes, b.planes, strict=True)]))
    return float(np.max(np.abs(np.asarray(a) - np.asarray(b))))
