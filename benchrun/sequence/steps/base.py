"""What every step of a sequence has."""

from __future__ import annotations

from typing import ClassVar

from benchrun.sequence.fields import FileModel

__all__ = ["StepModel"]


class StepModel(FileModel):
    """One step; its kind is the key it stands under.

    Subclasses set ``kind`` and have a field ``name`` (written ``as``) under which later steps refer to what
    this one leaves.
    """

    kind: ClassVar[str]
    leaves: ClassVar[str]
    """``"calibration"``, ``"network"`` or ``"judgement"``."""
    roles: ClassVar[tuple[str, ...]] = ()
    """Instruments that it needs."""
    name: str

    def needs(self) -> dict[str, tuple[str, str]]:
        """Tell what must stand before: by key of the file, the kind of thing and its name."""
        return {}
