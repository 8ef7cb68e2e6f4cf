"""Who may talk to an instrument when a client has locked it (locks of VISA and HiSLIP)."""

from __future__ import annotations

import threading

__all__ = ["Locks"]


class Locks:
    """Locks of one instrument.

    An exclusive lock keeps all others out; a shared one is held by everybody who knows its key, and one of
    those may hold the exclusive lock as well (IVI-6.1, 6.5, from memory).

    Examples
    --------
    >>> locks = Locks()
    >>> locks.acquire("first"), locks.acquire("second"), locks.admits("second")
    (True, False, False)
    """

    def __init__(self) -> None:
        self._changed = threading.Condition()
        self._exclusive: object | None = None
        self._sharers: set[object] = set()
        self._key = ""

    @property
    def exclusive(self) -> bool:
        """Whether an exclusive lock is held."""
        return self._exclusive is not None

    @property
    def holders(self) -> int:
        """How many clients hold a lock."""
        return len(self._sharers | ({self._exclusive} if self.exclusive else set()))

    def holds(self, client: object, key: str | None = None) -> bool:
        """Whether this client holds the exclusive lock or, with a key, that shared one."""
        if key:
            return client in self._sharers and key == self._key
        return client == self._exclusive

    def admits(self, client: object) -> bool:
        """Whether this client may talk now."""
        if self._exclusive is not None:
            return client == self._exclusive
        return not self._sharers or client in self._sharers

    def wait_admitted(self, client: object, wait_s: float) -> bool:
        """Wait, in real time, until this client may talk."""
        with self._changed:
            return self._changed.wait_for(lambda: self.admits(client), wait_s)

    def acquire(self, client: object, key: str = "", wait_s: float = 0.0) -> bool:
        """Lock; without a key exclusively.

        Parameters
        ----------
        wait_s
            How long, in real time, to wait for others to let go.
        """
        with self._changed:
            if not self._changed.wait_for(lambda: self._free_for(client, key), wait_s):
                return False
            if key:
                self._sharers.add(client)
                self._key = key
            else:
                self._exclusive = client
            return True

    def _free_for(self, client: object, key: str) -> bool:
        if self._exclusive not in (None, client):
            return False
        if key:
            return not self._sharers or key == self._key
        return self._exclusive is None and (not self._sharers or client in self._sharers)

    def release(self, client: object) -> str:
        """Let go of the exclusive lock, or else of the shared one.

        Returns
        -------
        str
            ``"exclusive"``, ``"shared"``, or nothing where none was held.
        """
        with self._changed:
            kind = ""
            if self._exclusive == client:
                self._exclusive, kind = None, "exclusive"
            elif client in self._sharers:
                self._sharers.discard(client)
                kind = "shared"
            self._changed.notify_all()
            return kind

    def leave(self, client: object) -> None:
        """Let go of everything: the client has gone."""
        while self.release(client):
            pass
