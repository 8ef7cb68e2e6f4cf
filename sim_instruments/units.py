"""Units by serial number: families of one design, each with what is known of some."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

from sim_instruments.draws import Draws
from sim_instruments.parts import Part, build
from sim_instruments.trouble import BadBench, at
from sim_instruments.world import NoSuchItem

__all__ = ["Family", "Units", "placed"]


def placed(spec: Mapping[str, Any], folder: Path) -> dict[str, Any]:
    """File names in a description are looked up beside the bench file."""
    return {**spec, "file": str(folder / spec["file"])} if "file" in spec else dict(spec)


class Family:
    """Units of one design: their serial numbers, and what is known of some."""

    def __init__(self, name: str, spec: Mapping[str, Any], folder: Path, draws: Draws) -> None:
        self.name, self._folder, self._draws = name, folder, draws
        self.where = f"unit family {name!r}"
        with at(self.where):
            self._design = dict(spec["design"])
            self._changes = {str(k): dict(v or {}) for k, v in (spec.get("known") or {}).items()}
            try:
                self.pattern = re.compile(str(spec["serial"]))
            except re.error as error:
                raise BadBench(f"{self.where}: serial {spec['serial']!r} is no pattern: {error}") from error
        self.known = {k: str(v.get("says", "good")) for k, v in self._changes.items()}

    def unit(self, serial: str, further: Sequence[str] = ()) -> Part:
        """The unit of a serial number.

        Parameters
        ----------
        serial
            Of this family.
        further
            Faults that it has beside those of the file, in words.

        Raises
        ------
        BadBench
            If its description makes no sense.
        """
        change: dict[str, Any] = {k: v for k, v in self._changes.get(serial, {}).items() if k != "says"}
        if further:
            own = change.get("faults") or self._design.get("faults") or ()
            change["faults"] = [*own, *further]
        with at(f"{self.where}, {serial}"):
            return build(placed({**self._design, **change}, self._folder), self._draws / serial)


class Units:
    """Gives the unit of a serial number.

    Parameters
    ----------
    families
        What there is.
    """

    def __init__(self, families: Sequence[Family]) -> None:
        self.families = families
        self.known = {serial: says for family in families for serial, says in family.known.items()}
        self._spoils: list[tuple[str, Callable[[], bool]]] = []

    def __call__(self, serial: str) -> Part:
        """The unit, with the faults that happen to it.

        Raises
        ------
        NoSuchItem
            If no family has such a serial number, or the unit cannot have a fault.
        BadBench
            If its description makes no sense.
        """
        family = next((family for family in self.families if family.pattern.fullmatch(serial)), None)
        if family is None:
            known = ", ".join(self.known) or "none"
            raise NoSuchItem(f"the simulated bench has no unit {serial!r}; it has {known}")
        further = [fault for fault, when in self._spoils if when()]
        if not further:
            return family.unit(serial)
        try:
            return family.unit(serial, further)
        except BadBench as error:
            raise NoSuchItem(f"unit {serial} cannot have the fault that was put in: {error}") from error

    def spoil(self, fault: str, when: Callable[[], bool]) -> None:
        """Give units a fault from now on.

        Parameters
        ----------
        fault
            In words, as bench files have them: ``"L2 +15 %"``.
        when
            Asked for each unit that is laid on the bench.

        Raises
        ------
        ValueError
            If no family can have it.
        """
        refused = []
        for family in self.families:
            try:
                family.unit(next(iter(family.known), ""), [fault])
                break
            except BadBench as error:
                refused.append(str(error))
        else:
            raise ValueError(f"no unit of this bench can have the fault {fault!r}: " + "; ".join(refused))
        self._spoils.append((fault, when))
