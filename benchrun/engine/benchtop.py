"""The bench, opened: sessions, identities, and the one place that switches sources off."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from types import TracebackType
from typing import Any

from benchrun.clock import Clock
from benchrun.errors import IdentityError, InstrumentError
from benchrun.instruments.analyzer import NetworkAnalyzer
from benchrun.instruments.dialect import Dialect
from benchrun.scpi.identity import Identity
from benchrun.scpi.opening import open_manager, open_session
from benchrun.scpi.session import Session
from benchrun.scpi.transcript import Transcript
from benchrun.sequence.bench import Bench, Instrument

__all__ = ["Benchtop", "Found", "ask_health"]


@dataclass(frozen=True, slots=True)
class Found:
    """An instrument that said who it is."""

    role: str
    resource: str
    identity: Identity


class Benchtop:
    """Instruments of a bench file, open from entering to leaving; leaving makes them safe first.

    Parameters
    ----------
    bench
        The bench.
    dialect
        Of its analyzer.
    library
        A VISA library to use instead of those that the bench file names: the rehearsal's.
    clock
        Bench time.
    """

    def __init__(self, bench: Bench, dialect: Dialect, library: Any, clock: Clock) -> None:
        self.bench = bench
        self.dialect = dialect
        self.library = library
        self.clock = clock
        self.transcript = Transcript()
        self.found: tuple[Found, ...] = ()
        self.analyzer: NetworkAnalyzer | None = None
        self.ready = False
        """Whether the whole bench was opened and brought into a known state."""
        self._session: Session | None = None

    @property
    def origin(self) -> str:
        """``"measured"`` only if every instrument says so itself."""
        origins = {found.identity.origin for found in self.found}
        return next((o for o in ("simulated", "recorded") if o in origins), "measured")

    def open(
        self, tell: Callable[[Found], None] = lambda _: None, agreed: Callable[[], None] = lambda: None
    ) -> NetworkAnalyzer:
        """Open, ask who is there, and bring everything into a known state.

        Parameters
        ----------
        tell
            Called for each instrument found.
        agreed
            Called when all are the right ones, before anything is set; what it raises ends the opening.

        Raises
        ------
        IdentityError
            If another instrument stands there than the bench file says.
        TransportError, ReplyError, InstrumentError
        """
        spec = self.bench.analyzer
        manager = open_manager(self.library if self.library is not None else spec.library)
        self._session = session = open_session(manager, spec.resource, self.clock, self.transcript)
        identity = session.identity()
        found = Found("analyzer", spec.resource, identity)
        self.found = (found,)
        tell(found)
        _check_identity(spec, identity)
        agreed()
        # From here on it is ours; to another instrument nothing is ever sent, not even "source off".
        self.analyzer = NetworkAnalyzer(session, self.dialect)
        self.analyzer.replayed = identity.origin == "recorded"
        self.analyzer.preset()
        self.ready = True
        return self.analyzer

    def make_safe(self) -> tuple[str, ...]:
        """Switch every source off; what could not be switched off is said."""
        if self.analyzer is None or self.analyzer.session.closed:
            return ()
        left = self.analyzer.make_safe()
        return (left,) if left else ()

    def close(self) -> None:
        """Close the lines."""
        if self._session is not None:
            self._session.close()

    def __enter__(self) -> Benchtop:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        try:
            self.make_safe()
        finally:
            self.close()


def _check_identity(spec: Instrument, identity: Identity) -> None:
    expected = spec.identity
    wanted = {"maker": expected.maker, "model": expected.model, "serial": expected.serial}
    wrong = [k for k, v in wanted.items() if v is not None and v != getattr(identity, k)]
    if wrong:
        text = ", ".join(f"{key} {value}" for key, value in wanted.items() if value is not None)
        raise IdentityError(text, identity.text, resource=spec.resource)


def ask_health(top: Benchtop, tell: Callable[[Found], None]) -> list[str]:
    """Open the bench, and say in words what its instruments complain of.

    Parameters
    ----------
    top
        The bench.
    tell
        Called for each instrument found.

    Raises
    ------
    BenchError
        If one does not answer, or is another than expected.
    """
    analyzer = top.open(tell)
    try:
        analyzer.session.raise_errors("preset")
        return analyzer.health()
    except InstrumentError as error:
        return [str(error)]
