"""Every error carries a sentence, typed fields and an exit code, and survives a process boundary."""

from __future__ import annotations

import copy
import pickle

import pytest

from benchrun import errors
from benchrun.errors import (
    BenchError,
    ConnectionLost,
    CouldNotCheck,
    DeadlineExceeded,
    DigestWrong,
    FramingError,
    IdentityError,
    InputError,
    InstrumentError,
    InvalidMeasurement,
    Problem,
    RecordError,
    RecordNotWritten,
    ReplyError,
    ResourceNotFound,
    SignatureWrong,
    Stopped,
    TransportError,
)

SAMPLES = [
    BenchError("something"),
    InputError("no such figure"),
    InputError([Problem("a", "f.yaml", 3, 7), Problem("b", "f.yaml", 9, 1, "Do this.", "warning")]),
    TransportError("is silent", resource="TCPIP::a::5025::SOCKET", request="*IDN?"),
    ResourceNotFound("is not there", resource="GPIB::16"),
    DeadlineExceeded("took too long", resource="R", request="*OPC?", elapsed_s=2.5, limit_s=2.0),
    ConnectionLost("was closed", resource="R"),
    FramingError("has no block header", resource="R", request="CALC:DATA?"),
    InstrumentError(-222, "Data out of range", resource="R", request="FREQ 1E30"),
    ReplyError("abc", "a number", resource="R", request="FREQ?"),
    IdentityError("MAKER,ONE", "MAKER,TWO", resource="R"),
    InvalidMeasurement("The thru is dead.", "Join the ports."),
    RecordError("r"),
    RecordNotWritten("disk full"),
    SignatureWrong("wrong key"),
    DigestWrong("file added"),
    CouldNotCheck("no key"),
]


@pytest.mark.parametrize("error", SAMPLES, ids=lambda e: type(e).__name__)
@pytest.mark.parametrize(
    "carry",
    [lambda e: pickle.loads(pickle.dumps(e)), copy.copy, copy.deepcopy],
    ids=["pickle", "copy", "deep"],
)
def test_an_error_survives_being_carried(error: BenchError, carry) -> None:
    """Type, sentence, arguments and every typed field arrive as they left."""
    back = carry(error)
    assert type(back) is type(error)
    assert str(back) == str(error)
    assert vars(back) == vars(error)
    assert back.args == error.args


def test_a_note_travels_with_the_error() -> None:
    """What the engine adds on the way up (PEP 678) is not lost in another process."""
    error = FramingError("is cut", resource="R")
    error.add_note("in step 3")
    back = pickle.loads(pickle.dumps(error))
    assert back.__notes__ == ["in step 3"]
    assert back.args == error.args


def test_every_class_of_the_room_is_sampled() -> None:
    """A new error cannot be forgotten here."""
    public = {getattr(errors, name) for name in errors.__all__} - {Problem, Stopped}
    assert {type(e) for e in SAMPLES} == public


def test_exports_are_sorted() -> None:
    assert errors.__all__ == sorted(errors.__all__)


def test_the_tree_in_the_docstring_names_every_class() -> None:
    """The tree that readers see is the tree that is."""
    missing = [n for n in errors.__all__ if n != "Problem" and n not in (errors.__doc__ or "")]
    assert missing == []


@pytest.mark.parametrize("error", SAMPLES, ids=lambda e: type(e).__name__)
def test_exit_codes_follow_who_can_act(error: BenchError) -> None:
    """2 bad input, 3 bench or measurement, 5 record: the house plan's list."""
    wanted = 2 if isinstance(error, InputError) else 5 if isinstance(error, RecordError) else 3
    assert error.exit_code == wanted


def test_a_stop_passes_through_except_exception() -> None:
    """Nothing between the operator and the safe state may swallow it."""
    assert not issubclass(Stopped, Exception)

    def careless() -> None:
        try:
            raise Stopped("red button")
        except Exception:  # pragma: no cover - reaching it is the failure
            pytest.fail("a stop was swallowed")

    with pytest.raises(Stopped, match="red button") as caught:
        careless()
    assert caught.value.exit_code == 4
    back = pickle.loads(pickle.dumps(caught.value))
    assert back.reason == "red button"


def test_a_stop_says_something_by_default() -> None:
    assert str(Stopped()) == "the operator ended the run"


def test_input_errors_are_value_errors_too() -> None:
    """So that ordinary Python callers can catch them."""
    assert issubclass(InputError, ValueError)


@pytest.mark.parametrize(
    ("problem", "text"),
    [
        (Problem("is bad", "a.yaml", 3, 7, "Mend it."), "a.yaml:3:7: is bad. Mend it."),
        (Problem("is bad", "a.yaml"), "a.yaml: is bad"),
        (Problem("is bad?", "a.yaml", 1, 1, "Mend it."), "a.yaml:1:1: is bad? Mend it."),
        (Problem("is bad.", advice="Mend it."), "is bad. Mend it."),
        (Problem("is odd", "a.yaml", 2, 1, severity="warning"), "a.yaml:2:1: warning: is odd"),
    ],
)
def test_a_problem_says_where_and_what_to_do(problem: Problem, text: str) -> None:
    assert str(problem) == text


def test_all_problems_are_told_at_once() -> None:
    """An author mends a file in one go."""
    error = InputError([Problem("one", "f", 1, 2), Problem("two", "f", 3, 4)])
    assert str(error) == "f:1:2: one\nf:3:4: two"
    assert [p.line for p in error.problems] == [1, 3]


def test_a_sentence_alone_becomes_one_problem() -> None:
    assert InputError("no").problems == (Problem("no"),)


def test_an_exchange_names_instrument_and_request() -> None:
    error = InstrumentError(-113, "Undefined header", resource="GPIB::16", request="FRQE 1")
    assert str(error) == "GPIB::16 after 'FRQE 1': reported error -113, \"Undefined header\""
    assert (error.number, error.text) == (-113, "Undefined header")


def test_an_exchange_without_a_resource_is_still_a_sentence() -> None:
    assert str(FramingError("has no header")) == "has no header"


def test_a_long_request_is_shortened_in_the_sentence_only() -> None:
    """A segment table of thousands of numbers must not fill the screen."""
    request = "SENS:SEGM:LIST " + "1," * 500
    error = TransportError("is silent", resource="R", request=request)
    assert len(str(error)) < 100
    assert error.request == request


def test_a_long_reply_is_shortened_in_the_sentence_only() -> None:
    error = ReplyError("x" * 1000, "a number", resource="R")
    assert "..." in str(error)
    assert len(str(error)) < 120
    assert len(error.reply) == 1000


def test_a_deadline_keeps_both_times() -> None:
    error = DeadlineExceeded("is late", elapsed_s=2.5, limit_s=2.0)
    assert (error.elapsed_s, error.limit_s) == (2.5, 2.0)


def test_an_identity_error_shows_both_names() -> None:
    text = str(IdentityError("A,1", "B,2", resource="R"))
    assert "'A,1'" in text
    assert "'B,2'" in text
    assert "bench file" in text


def test_an_invalid_measurement_ends_with_advice() -> None:
    assert str(InvalidMeasurement("Dead.", "Join.")) == "Dead. Join."
    assert str(InvalidMeasurement("Dead.")) == "Dead."
