"""A procedure from the bytes of its files: the same for a plan and for the copies kept in a record."""

from __future__ import annotations

from collections.abc import Mapping

from benchrun.evaluate.procedure import NOISE_SEED, Procedure
from benchrun.rf.kit import Kit
from benchrun.rf.touchstone import read as read_touchstone
from benchrun.sequence.bench import Bench
from benchrun.sequence.files import load_model
from benchrun.sequence.kit import KitFile
from benchrun.sequence.mask import MaskFile
from benchrun.sequence.models import Sequence
from benchrun.uncertainty.montecarlo import Effort

__all__ = ["build"]


def build(files: Mapping[str, bytes], noise_seed: int = NOISE_SEED) -> Procedure:
    """A procedure.

    Parameters
    ----------
    files
        By logical name: ``"sequence"``, ``"bench"``, ``"kit:NAME"``, ``"mask:NAME"``, ``"fixture:NAME"``,
        each NAME as the sequence writes it, and ``"standard:KIT/NAME"`` as the kit file KIT writes it.
    noise_seed
        Of the noise draws.

    Raises
    ------
    InputError
        If a file is not what its name says.
    KeyError
        If the sequence or the bench is missing.
    """

    def of(kind: str) -> dict[str, bytes]:
        return {name.split(":", 1)[1]: raw for name, raw in files.items() if name.startswith(f"{kind}:")}

    bench = load_model(files["bench"], "bench", Bench).model
    return Procedure(
        load_model(files["sequence"], "sequence", Sequence).model,
        {name: _kit(name, raw, of("standard")) for name, raw in of("kit").items()},
        {name: load_model(raw, name, MaskFile).model.build() for name, raw in of("mask").items()},
        {name: read_touchstone(raw, name) for name, raw in of("fixture").items()},
        bench.uncertainty.terms,
        noise_seed,
        bench.uncertainty.level_terms,
        bench.scalar_ports,
        bench.uncertainty.noise_at,
        bench.uncertainty.source_terms,
        Effort(bench.uncertainty.trials.number, bench.uncertainty.trials.digits),
    )


def _kit(name: str, raw: bytes, measured: Mapping[str, bytes]) -> Kit:
    own = {key.removeprefix(f"{name}/"): data for key, data in measured.items() if key.startswith(f"{name}/")}
    files = {key: read_touchstone(data, key) for key, data in own.items()}
    return load_model(raw, name, KitFile).model.build(files)
