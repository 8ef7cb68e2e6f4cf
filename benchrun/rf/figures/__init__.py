"""The figures a sequence may set limits on; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.rf.figures import along, crossing, flat, impedance, level, linear, matrix, phase, shape, tone
from benchrun.rf.figures.kind import FigureKind, Found, Parameter

__all__ = ["FIGURES", "FigureKind", "Found", "Parameter"]

FIGURES: Mapping[str, FigureKind] = {
    kind.name: kind
    for kind in (
        *level.KINDS,
        *impedance.KINDS,
        *crossing.KINDS,
        *shape.KINDS,
        *flat.KINDS,
        *phase.KINDS,
        *linear.KINDS,
        *matrix.KINDS,
        *along.KINDS,
        *tone.KINDS,
    )
}
