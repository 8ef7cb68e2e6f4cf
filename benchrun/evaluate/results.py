"""Results of a state as Touchstone files: the bytes that a record keeps and an audit makes again."""

from __future__ import annotations

from benchrun.evaluate.state import State
from benchrun.rf.tone import Tone
from benchrun.rf.touchstone import write

__all__ = ["result_files"]


def result_files(state: State) -> dict[tuple[str, str], tuple[str, bytes]]:
    """Corrected and de-embedded networks.

    Returns
    -------
    dict
        By step and kind (``"corrected"`` or ``"de-embedded"``): path inside a record, and contents.
    """
    found = {}
    for step, network in state.networks.items():
        kind = state.kinds[step]
        if kind in ("uncorrected", "tone"):  # the raw reading itself is kept already
            continue
        path = f"{kind}/{step}.s{network.ports}p"
        nominal = network.nominal
        assert not isinstance(nominal, Tone)  # its kind is "tone"
        contents = write(network.f_hz, nominal, f"{step}: {kind}", network.z0_ohm)
        found[step, kind] = path, contents
    return found
