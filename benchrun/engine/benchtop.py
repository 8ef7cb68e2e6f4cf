"""The bench, opened: sessions, identities, and the one place that switches sources off."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import TracebackType
from typing import Any

from benchrun.clock import Clock
from benchrun.engine.locks import Held, take
from benchrun.engine.steady import SteadyAnalyzer
from benchrun.errors import BenchError, IdentityError, InstrumentError, InvalidMeasurement
from benchrun.instruments.analyzer import NetworkAnalyzer
from benchrun.instruments.dialect import Dialect
from benchrun.instruments.generator import SignalGenerator
from benchrun.instruments.scalar_dialects import GeneratorDialect, SpectrumDialect, SupplyDialect
from benchrun.instruments.spectrum import SpectrumAnalyzer
from benchrun.instruments.supply import Supply
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
    who, what
        For whoever finds the instruments taken.
    """

    def __init__(
        self,
        bench: Bench,
        dialect: Dialect | None,
        library: Any,
        clock: Clock,
        others: Mapping[str, FileModel] | None = None,
        who: str = "somebody",
        what: str = "a look at the bench",
    ) -> None:
        self.bench = bench
        self._specs = {str(role): spec for role, spec in bench.instruments.items()}
        self.dialect = dialect
        self.others = dict(others or {})
        self.library = library
        self.clock = clock
        self.transcript = Transcript()
        self.found: tuple[Found, ...] = ()
        self.who, self.what = who, what
        self.held = Held()
        """Locks; a rehearsal has its instruments to itself and takes none."""
        self._closed = False
        self.repeats: list[str] = []
        """What was asked once more because the line had failed."""
        self.ready = False
        """Whether the whole bench was opened and brought into a known state."""
        self._sessions: dict[str, Session] = {}
        self.analyzer: NetworkAnalyzer | None = None
        self.generator: SignalGenerator | None = None
        self.spectrum: SpectrumAnalyzer | None = None
        self.supply: Supply | None = None

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
        self.found = ()
        for role in self.roles:
            spec = self._specs[role]
            session = self._open_line(role)
            found = Found(role, spec.resource, session.identity())
            self.found = (*self.found, found)
            tell(found)
            _check_identity(spec, found.identity)
        agreed()
        # From here on they are ours; to another instrument nothing is ever sent, not even "source off".
        if self.dialect is not None:
            self.analyzer = SteadyAnalyzer(
                self._sessions["analyzer"], self.dialect, self._recovered, self.repeats
            )
            self.analyzer.replayed = self.found[0].identity.origin == "recorded"
        generator, spectrum = self.others.get("generator"), self.others.get("spectrum analyzer")
        if isinstance(generator, GeneratorDialect):
            self.generator = SignalGenerator(self._sessions["generator"], generator)
        if isinstance(spectrum, SpectrumDialect):
            can = self.bench.instruments["spectrum analyzer"].range
            most = can.power[1] if can and can.power else 20.0
            self.spectrum = SpectrumAnalyzer(self._sessions["spectrum analyzer"], spectrum, most)
        supply = self.others.get("supply")
        if isinstance(supply, SupplyDialect):
            self.supply = Supply(self._sessions["supply"], supply)
        for instrument in self._instruments():
            instrument.preset()
        self.ready = True

    @property
    def roles(self) -> tuple[str, ...]:
        """What is opened."""
        return (*(("analyzer",) if self.dialect is not None else ()), *self.others)

    def _open_line(self, role: str) -> Session:
        spec = self._specs[role]
        if role in self._sessions:
            self._sessions[role].close()
        manager = open_manager(self.library if self.library is not None else spec.library)
        self._sessions[role] = open_session(manager, spec.resource, self.clock, self.transcript)
        return self._sessions[role]

    def _recovered(self, lost: bool, role: str = "analyzer") -> Session:
        """A line that works again, to the instrument that was there before.

        Raises
        ------
        InvalidMeasurement
            If another one answers.
        TransportError, ReplyError
        """
        if lost:
            self._open_line(role)
        else:
            self._sessions[role].clear()
        self._confirm(next(found for found in self.found if found.role == role))
        return self._sessions[role]

    def _instruments(self) -> tuple[NetworkAnalyzer | SignalGenerator | SpectrumAnalyzer | Supply, ...]:
        """What is ours, in the order of making safe: RF first, the supply of the driven unit after it."""
        every = (self.generator, self.analyzer, self.supply, self.spectrum)
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
            self._confirm(found)

    def _confirm(self, found: Found) -> None:
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
        """Switch every source off, one after the other; what could not be switched off is said.

        A line that was lost is made anew once, if the same instrument answers. A fault at one instrument, of
        whatever kind, never keeps the next from being switched off.
        """
        left = () if self._closed else tuple(self._made_safe(i) for i in self._instruments())
        return tuple(text for text in left if text)

    def _made_safe(self, instrument: NetworkAnalyzer | SignalGenerator | SpectrumAnalyzer | Supply) -> str:
        try:
            left = instrument.make_safe()
            if not left:
                return ""
            try:
                role = next(role for role, s in self._sessions.items() if s is instrument.session)
                instrument.session = self._recovered(True, role)
            except BenchError:
                return left
            return instrument.make_safe()
        except Exception as error:
            name, said = instrument.session.name, f"{type(error).__name__}: {error}"
            return f"{name} could not be made safe ({said}): switch it off by hand"

    def close(self) -> None:
        """Close the lines; twice is once."""
        self._closed = True
        for session in self._sessions.values():
            session.close()
        self.held.release()

    def __enter__(self) -> Benchtop:
        if self.library is None:
            names = tuple(self._specs[role].resource for role in self.roles)
            self.held = take(names, self.who, self.what)
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
    for instrument in (top.analyzer, top.generator, top.supply, top.spectrum):
        if instrument is not None:
            try:
                instrument.session.raise_errors("preset")
                if isinstance(instrument, NetworkAnalyzer):
                    troubles += instrument.health()
            except InstrumentError as error:
                troubles.append(str(error))
    return troubles
