"""Every message of a run, with its time; blocks are summarised by size and digest."""

from __future__ import annotations

import hashlib
import json
from dataclasses import asdict, dataclass, field

__all__ = ["Exchange", "Transcript"]


@dataclass(frozen=True, slots=True)
class Exchange:
    """One message in one direction.

    Parameters
    ----------
    at_s
        Bench seconds.
    resource
        VISA resource name.
    way
        ``"sent"``, ``"received"`` or ``"failed"``.
    text
        The message, or a summary of a block.
    """

    at_s: float
    resource: str
    way: str
    text: str


@dataclass(slots=True)
class Transcript:
    """The messages of a run, in order."""

    exchanges: list[Exchange] = field(default_factory=list)

    def note(self, at_s: float, resource: str, way: str, text: str) -> None:
        """Keep one message."""
        self.exchanges.append(Exchange(round(at_s, 6), resource, way, text))

    def note_block(self, at_s: float, resource: str, data: bytes) -> None:
        """Keep the fact of a block."""
        digest = hashlib.sha256(data).hexdigest()
        self.note(at_s, resource, "received", f"block of {len(data)} bytes, SHA-256 {digest}")

    def as_json_lines(self) -> bytes:
        """One JSON object a line."""
        return "".join(json.dumps(asdict(e), ensure_ascii=False) + "\n" for e in self.exchanges).encode()
