"""The bench, opened: sessions, identities, and the one place that switches sources off."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import TracebackType
from typing import Any

from benchrun.clock import Clock
from benchrun.errors import IdentityError, InstrumentError, InvalidMeasurement
from benchrun.instruments.analyzer import NetworkAnalyzer
from benchrun.instruments.dialect import Dialect
from benchrun.instruments.generator import SignalGenerator
from benchrun.instruments.scalar_dialects import GeneratorDialect, SpectrumDialect
from benchrun.instruments.spectrum import SpectrumAnalyzer
from benchrun.scpi.identity import Identity
from benchrun.scpi.opening import open_manager, open_session
from benchrun.scpi.session import Session
from benchrun.scpi.transcript import Transcript
from benchrun.sequence.bench import Bench, Instrument
from benchrun.sequence.fields import FileModel

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
        Of its network analyzer; None where it is not needed, and then not opened.
    library
        A VISA library to use instead of those that the bench file names: the rehearsal's.
    clock
        Bench time.
    others
        Dialects of the other instruments to open, by role.
    """

    def __init__(
        self,
        bench: Bench,
        dialect: Dialect | None,
        library: Any,
        clock: Clock,
        others: Mapping[str, FileModel] | None = None,
    ) -> None:
        self.bench = bench
        self.dialect = dialect
        self.others = dict(others or {})
        self.library = library
        self.clock = clock
        self.transcript = Transcript()
        self.found: tuple[Found, ...] = ()
        self.ready = False
        """Whether the whole bench was opened and brought into a known state."""
        self._sessions: dict[str, Session] = {}
        self.analyzer: NetworkAnalyzer | None = None
        self.generator: SignalGenerator | None = None
        self.spectrum: SpectrumAnalyzer | None = None

    @property
    def origin(self) -> str:
        """``"measured"`` only if every instrument says so itself."""
        origins = {found.identity.origin for found in self.found}
        return next((o for o in ("simulated", "recorded") if o in origins), "measured")

    def open(
        self, tell: Callable[[Found], None] = lambda _: None, agreed: Callable[[], None] = lambda: None
    ) -> None:
        """Open what the plan needs, ask who is there, and bring everything into a known state.

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
        roles = (*(("analyzer",) if self.dialect is not None else ()), *self.others)
        for role in roles:
            spec = self.bench.instruments[role]
            manager = open_manager(self.library if self.library is not None else spec.library)
            session = open_session(manager, spec.resource, self.clock, self.transcript)
            self._sessions[role] = session
            found = Found(role, spec.resource, session.identity())
            self.found = (*self.found, found)
            tell(found)
            _check_identity(spec, found.identity)
        agreed()
        # From here on they are ours; to another instrument nothing is ever sent, not even "source off".
        if self.dialect is not None:
            self.analyzer = NetworkAnalyzer(self._sessions["analyzer"], self.dialect)
            self.analyzer.replayed = self.found[0].identity.origin == "recorded"
        generator, spectrum = self.others.get("generator"), self.others.get("spectrum analyzer")
        if isinstance(generator, GeneratorDialect):
            self.generator = SignalGenerator(self._sessions["generator"], generator)
        if isinstance(spectrum, SpectrumDialect):
            self.spectrum = SpectrumAnalyzer(self._sessions["spectrum analyzer"], spectrum)
        for instrument in self._instruments():
            instrument.preset()
        self.ready = True

    def _instruments(self) -> tuple[NetworkAnalyzer | SignalGenerator | SpectrumAnalyzer, ...]:
        """What is ours, the sources of the greatest level first: the order of making safe."""
        every = (self.generator, self.analyzer, self.spectrum)
        return tuple(instrument for instrument in every if instrument is not None)

    def confirm(self) -> None:
        """Ask once more who is there: another instrument voids what was read.

        Raises
        ------
        InvalidMeasurement
            If one is another than at the start.
        TransportError, ReplyError
        """
        for found in self.found:
            again = self._sessions[found.role].identity()
            if again != found.identity:
                raise InvalidMeasurement(
                    f"{found.resource} was {found.identity.text!r} at the start and is {again.text!r} now.",
                    "Find out who changed or restarted it, then run again.",
                )

    @property
    def ours(self) -> bool:
        """Whether anything was recognised as ours, and may have been set."""
        return bool(self._instruments())

    def make_safe(self) -> tuple[str, ...]:
        """Switch every source off; what could not be switched off is said."""
        left = [i.make_safe() for i in self._instruments() if not i.session.closed]
        return tuple(text for text in left if text)

    def close(self) -> None:
        """Close the lines."""
        for session in self._sessions.values():
            session.close()

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
    top.open(tell)
    troubles: list[str] = []
    for instrument in (top.analyzer, top.generator, top.spectrum):
        if instrument is not None:
            try:
                instrument.session.raise_errors("preset")
                if isinstance(instrument, NetworkAnalyzer):
                    troubles += instrument.health()
            except InstrumentError as error:
                troubles.append(str(error))
    return troubles
