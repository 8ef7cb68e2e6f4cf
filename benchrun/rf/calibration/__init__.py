"""Calibration methods, one file each; this table is the only place that knows them all."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.rf.calibration.definitions import define
from benchrun.rf.calibration.lrm import LineReflectMatch
from benchrun.rf.calibration.lrrm import LineReflectReflectMatch
from benchrun.rf.calibration.method import Method
from benchrun.rf.calibration.multiline import MultilineThruReflectLine
from benchrun.rf.calibration.one_path import OnePath
from benchrun.rf.calibration.one_port import ShortOpenLoad
from benchrun.rf.calibration.response import Response
from benchrun.rf.calibration.solr import ShortOpenLoadReciprocal
from benchrun.rf.calibration.solt import ShortOpenLoadThru
from benchrun.rf.calibration.trl import ThruReflectLine
from benchrun.rf.twoport import TwoPort

__all__ = ["METHODS", "define", "differ"]

_ALL: tuple[Method, ...] = (
    Response(),
    ShortOpenLoad(),
    OnePath(),
    ShortOpenLoadThru(),
    ShortOpenLoadReciprocal(),
    ThruReflectLine(),
    MultilineThruReflectLine(),
    LineReflectMatch(),
    LineReflectReflectMatch(),
)

METHODS: Mapping[str, Method] = {method.name: method for method in _ALL}
"""By the word that a sequence writes."""


def differ(a: object, b: object) -> float:
    """Greatest absolute difference of two corrected results, linear; nan if either holds a nan."""
    import numpy as np

    if isinstance(a, TwoPort) and isinstance(b, TwoPort):
        # numpy's max hands a nan on; Python's would lose it in the second place and later.
        return float(np.max([np.max(np.abs(x - y)) for x, y in zip(a.planes, b.planes, strict=True)]))
    return float(np.max(np.abs(np.asarray(a) - np.asarray(b))))
