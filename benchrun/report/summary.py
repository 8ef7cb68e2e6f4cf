"""The end of a batch, as a person reads it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from benchrun.report.words import difference

if TYPE_CHECKING:
    from benchrun.engine.batch import Skipped
    from benchrun.engine.tally import Tally

__all__ = ["summary"]


def summary(tally: Tally, skipped: Sequence[Skipped] = ()) -> list[str]:
    """Lines: how many, which share conforms, the worst margins, what drifts, who was left out.

    Parameters
    ----------
    tally
        The batch in numbers.
    skipped
        Units that were left out.
    """
    again = tally.tests - tally.units
    tests = f", {again} of them tested again" if again == 1 else f" in {tally.tests} tests" if again else ""
    what = ", ".join(f"{count} {word}" for word, count in sorted(tally.conclusions.items()))
    lines = [f"{tally.units} unit{'' if tally.units == 1 else 's'}{tests}: {what or 'nothing tested'}"]
    if not math.isnan(tally.share):
        lines.append(f"conforming: {100 * tally.share:.1f} % of those about which something was concluded")
    lines += [
        f"least margin of {worst.name}: {difference(worst.margin, worst.unit)}, {worst.serial}"
        for worst in tally.worst
    ]
    lines += [
        f"{drift.name} drifts: {drift.change:+.3g} {drift.unit} from the first unit to the last "
        f"({drift.sigmas:.1f} standard deviations of the slope); check cables and temperature"
        for drift in tally.drifts
    ]
    return lines + [f"left out: {one.serial}, {one.reason}" for one in skipped]
