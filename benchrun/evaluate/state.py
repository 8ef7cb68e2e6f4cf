"""What the steps of one unit have found so far."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from benchrun.errors import InvalidMeasurement
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.evaluate.network import Data, Network
from benchrun.evaluate.procedure import Procedure
from benchrun.evaluate.propagation.propagate import Propagated
from benchrun.evaluate.propagation.trail import Basis, Trail
from benchrun.rf.calibration.method import Examiner, Terms
from benchrun.rf.twoport import FloatArray, TwoPort
from benchrun.uncertainty.decision import Conclusion, worst

__all__ = ["AGREEMENT", "Calibration", "State", "agree"]

AGREEMENT = 1e-9
"""Greatest difference to scikit-rf that a run may have, linear."""


@dataclass(frozen=True, slots=True, eq=False)
class Calibration:
    """Error terms on a grid, and what goes with them.

    Parameters
    ----------
    f_hz
        ``(f,)``.
    ports
        Analyzer ports calibrated.
    terms
        The error terms.
    examiner
        The same calibration by scikit-rf.
    noise
        Unit-variance draws for the uncertainty of every reading corrected with it; None where nothing is
        declared.
    z0_ohm
        Reference impedance, from the kit.
    basis
        How it was made, for a propagation to make it again; None where no sources are declared.
    standards
        Raw readings it was made of, by the text of their hook-up.
    """

    f_hz: FloatArray
    ports: tuple[int, ...]
    terms: Terms
    examiner: Examiner
    noise: Data | None
    z0_ohm: float
    basis: Basis | None = None
    standards: Mapping[str, TwoPort] = field(default_factory=dict)


@dataclass(slots=True, eq=False)
class State:
    """Results by step name.

    Parameters
    ----------
    procedure
        What is evaluated.
    thorough
        Have scikit-rf repeat every step, also those that it does slowly; an audit does so always, a run
        with the first unit after each calibration.
    provisional
        Judge by first-order propagation only, at once; the trials follow when the step is applied again
        without. Means nothing where no sources are declared.
    trails
        By step: how its network came about, where sources are declared.
    propagated
        By judge step: what became of the sources.
    halves
        Fixture halves on the grid of the step that takes them out, ``"step file"``; filled in once.
    """

    procedure: Procedure
    thorough: bool = True
    calibrations: dict[str, Calibration] = field(default_factory=dict)
    networks: dict[str, Network] = field(default_factory=dict)
    kinds: dict[str, str] = field(default_factory=dict)
    judged: dict[str, tuple[JudgedFigure, ...]] = field(default_factory=dict)
    agreements: dict[str, float] = field(default_factory=dict)
    halves: dict[str, TwoPort] = field(default_factory=dict)
    provisional: bool = False
    trails: dict[str, Trail] = field(default_factory=dict)
    propagated: dict[str, Propagated] = field(default_factory=dict)

    @property
    def figures(self) -> tuple[JudgedFigure, ...]:
        """All judged limits, in order."""
        return tuple(figure for figures in self.judged.values() for figure in figures)

    @property
    def conclusion(self) -> Conclusion:
        """The worst of all judged limits."""
        return worst(Conclusion(figure.conclusion) for figure in self.figures)

    def next_unit(self, calibrations: Mapping[str, Calibration] | None = None) -> State:
        """A fresh state under the same calibrations."""
        kept = self.calibrations if calibrations is None else calibrations
        return State(self.procedure, thorough=False, calibrations=dict(kept), halves=self.halves)


def agree(state: State, step: str, ours: Data, theirs: Data) -> float:
    """Compare with scikit-rf, and refuse to go on if it disagrees.

    Raises
    ------
    InvalidMeasurement
        If the greatest difference is above :data:`AGREEMENT`, or no number.
    """
    # numpy's greatest of all: Python's own would pass over a nan that is not the first.
    planes = zip(_planes(ours), _planes(theirs), strict=True)
    difference = float(np.max([np.max(np.abs(a - b)) for a, b in planes]))
    if np.isfinite(difference):  # no number can stand in a record
        state.agreements[step] = max(difference, state.agreements.get(step, 0.0))
    if not difference <= AGREEMENT:
        raise InvalidMeasurement(
            f"The result of {step} differs from scikit-rf's by {difference:.2e}; "
            f"at most {AGREEMENT:.0e} is allowed.",
            "This is a fault of the program or a reading beyond all reason: keep the record and report it.",
        )
    return difference


def _planes(data: Data) -> tuple[np.ndarray[tuple[int, ...], np.dtype[np.complex128]], ...]:
    return data.planes if isinstance(data, TwoPort) else (np.asarray(data),)
