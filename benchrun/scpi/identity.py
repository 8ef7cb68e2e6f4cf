"""Who an instrument says it is (IEEE 488.2, 10.14)."""

from __future__ import annotations

from dataclasses import dataclass

from benchrun.errors import ReplyError

__all__ = ["Identity"]


@dataclass(frozen=True, slots=True)
class Identity:
    """The four fields of ``*IDN?``.

    Examples
    --------
    >>> Identity.parse("SIMULATED,NA-3,0007,1.0").origin
    'simulated'
    """

    maker: str
    model: str
    serial: str
    firmware: str

    @classmethod
    def parse(cls, reply: str, resource: str = "") -> Identity:
        """From the reply.

        Raises
        ------
        ReplyError
            If there are not four fields.
        """
        fields = [field.strip() for field in reply.split(",")]
        if len(fields) != 4 or not all(fields[:2]):
            raise ReplyError(
                reply, "four fields: maker, model, serial, firmware", resource=resource, request="*IDN?"
            )
        return cls(*fields)

    @property
    def text(self) -> str:
        """As the instrument wrote it."""
        return ",".join((self.maker, self.model, self.serial, self.firmware))

    @property
    def origin(self) -> str:
        """``"simulated"``, ``"recorded"`` or ``"measured"``: simulated instruments name themselves so."""
        return {"SIMULATED": "simulated", "RECORDED": "recorded"}.get(self.maker, "measured")
