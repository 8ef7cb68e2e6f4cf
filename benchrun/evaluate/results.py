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
        comment = f"{step}: {kind}"
        if network.ports_ohm is not None:  # which the option line has no way to say
            one, two = (f"{z.real!r} {z.imag:+}j ohm" for z in network.ports_ohm)
            comment += (
                f"\nreference impedance of port 1: {one}; of port 2: {two}; not that of the option line"
            )
        contents = write(network.f_hz, nominal, comment, network.z0_ohm)
        found[step, kind] = path, contents
    return found
