"""An audit compares what is recorded with what the readings give."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import fields, replace
from pathlib import Path
from typing import Any

import pytest

from benchrun.errors import CouldNotCheck, DigestWrong, InvalidMeasurement, SignatureWrong
from benchrun.evaluate.judgement import JudgedFigure
from benchrun.record.audit import Recomputed, ResultWrong, audit, compare
from benchrun.record.draft import Draft
from benchrun.record.keys import KeyStore
from benchrun.record.payload import Agreement, ResultEntry
from benchrun.record.signer import FileSigner
from benchrun.record.verify import Record, read
from benchrun.record.write import write

MakeDraft = Callable[..., Draft]
RESULT = b"# Hz S RI R 50\n1 0.1 0\n2 0.2 0\n"


@pytest.fixture
def computed(tmp_path: Path, draft: MakeDraft, rehearsal: FileSigner, result_entry: ResultEntry) -> Path:
    """A record that holds a computed result file too."""
    files = {**draft().files, result_entry.file: RESULT}
    made = draft(files, results=(result_entry,), agreements=(Agreement(step="plane", difference=2e-15),))
    return write(made, tmp_path / "records", "HF-0002", rehearsal)


def test_same_result_stands_the_audit(computed: Path, store: KeyStore, figure: JudgedFigure) -> None:
    """With a sentence for each thing that was checked."""
    asked: list[Record] = []

    def recompute(record: Record) -> Recomputed:
        asked.append(record)
        return Recomputed("pass", (figure,), {"results/raw.s2p": RESULT})

    done = audit(computed, store, recompute)
    assert asked == [done.record]
    text = "\n".join(done.findings)
    for part in (
        "rehearsal key of this place",
        "securesystemslib accepts",
        "4 files",
        "origin: simulated",
        "conclusion pass, 1 figures, 1 result files",
        "plane: at the time of the run scikit-rf agreed within 2.0e-15",
    ):
        assert part in text


OTHER: dict[str, Any] = {
    "name": "ripple",
    "value": 0.32,
    "unit": "Hz",
    "limit": 0.46,
    "side": "at least",
    "margin": None,
    "uncertainty": 0.061,
    "at_hz": None,
    "conclusion": "fail",
    "rule": "simple acceptance",
    "risk": 0.01,
    "remark": "not resolvable",
}


def test_every_field_of_a_figure_has_its_case() -> None:
    """A field added to the figure must be compared too."""
    assert list(OTHER) == [one.name for one in fields(JudgedFigure)]


@pytest.mark.parametrize("field", OTHER)
def test_difference_in_any_field_is_named(
    record: Path, store: KeyStore, figure: JudgedFigure, field: str
) -> None:
    """With the figure, the field, and both values."""
    new = replace(figure, **{field: OTHER[field]})
    with pytest.raises(ResultWrong) as caught:
        audit(record, store, lambda _: Recomputed("pass", (new,)))
    said = f"{figure.name}: {field}: recorded {getattr(figure, field)!r}, recomputed {OTHER[field]!r}"
    assert caught.value.differences == (said,)
    assert said in str(caught.value)
    assert str(record) in str(caught.value)
    assert caught.value.exit_code == 5


@pytest.mark.parametrize("field", ["value", "limit", "uncertainty", "at_hz"])
def test_rounding_is_no_difference(record: Path, figure: JudgedFigure, field: str) -> None:
    """Up to 1e-9 of the value, and no further."""
    for factor, good in ((1 + 9e-10, True), (1 - 9e-10, True), (1 + 2e-9, False), (1 - 2e-9, False)):
        again = Recomputed("pass", (replace(figure, **{field: getattr(figure, field) * factor}),))
        differences = compare(read(record), again)
        assert bool(differences) != good, factor


def test_margin_is_as_exact_as_what_it_is_taken_from(
    tmp_path: Path, store: KeyStore, rehearsal: FileSigner, draft: MakeDraft, figure: JudgedFigure
) -> None:
    """A margin near nothing between a limit and a value of 2e8 Hz may differ by 0.2 Hz; of nothing else."""
    near = replace(figure, unit="Hz", value=2e8 - 1.0, limit=2e8, margin=1.0)
    written = write(draft(figures=(near,)), tmp_path / "records", "HF-0003", rehearsal)
    assert compare(read(written), Recomputed("pass", (replace(near, margin=1.1),))) == ()
    with pytest.raises(ResultWrong, match="margin"):
        audit(written, store, lambda _: Recomputed("pass", (replace(near, margin=1.3),)))


def test_seconds_are_compared_as_small_as_they_are(
    tmp_path: Path, store: KeyStore, rehearsal: FileSigner, draft: MakeDraft, figure: JudgedFigure
) -> None:
    """A group delay of nanoseconds is not within rounding of one that differs by a picosecond."""
    delay = replace(figure, unit="s", value=3.1e-9, limit=5e-9, margin=1.9e-9)
    written = write(draft(figures=(delay,)), tmp_path / "records", "HF-0003", rehearsal)
    with pytest.raises(ResultWrong, match="value"):
        audit(written, store, lambda _: Recomputed("pass", (replace(delay, value=3.101e-9),)))


def test_other_conclusion_and_number_of_figures_are_named(record: Path, store: KeyStore) -> None:
    """All differences at once, not only the first."""
    with pytest.raises(ResultWrong) as caught:
        audit(record, store, lambda _: Recomputed("fail", ()))
    assert caught.value.differences == (
        "conclusion: recorded 'pass', recomputed 'fail'",
        "figures: recorded 1, recomputed 0",
    )


@pytest.mark.parametrize(
    ("results", "said"),
    [
        ({}, "results/raw.s2p: recorded only"),
        ({"results/raw.s2p": RESULT, "results/x.s2p": RESULT}, "results/x.s2p: recomputed only"),
        (
            {"results/raw.s2p": RESULT.replace(b"0.2", b"0.3")},
            "results/raw.s2p:3: recorded '2 0.2 0', recomputed '2 0.3 0'",
        ),
        (
            {"results/raw.s2p": RESULT + b"3 0 0\n"},
            f"results/raw.s2p: recorded {len(RESULT)} bytes, recomputed",
        ),
    ],
)
def test_result_files_are_compared_by_byte(
    computed: Path, store: KeyStore, figure: JudgedFigure, results: dict[str, bytes], said: str
) -> None:
    """Missing, more, a line that differs, an end that differs."""
    with pytest.raises(ResultWrong) as caught:
        audit(computed, store, lambda _: Recomputed("pass", (figure,), results))
    assert len(caught.value.differences) == 1
    assert caught.value.differences[0].startswith(said)


def never(record: Record) -> Recomputed:
    raise AssertionError("nothing is computed from a record that is not verified")


def test_nothing_is_computed_from_a_changed_record(record: Path, store: KeyStore, tmp_path: Path) -> None:
    """Verification comes first."""
    with pytest.raises(SignatureWrong, match="not trusted here"):
        audit(record, KeyStore(tmp_path / "other"), never)
    (record / "sequence.yaml").write_bytes(b"")
    with pytest.raises(DigestWrong, match=r"sequence\.yaml: was changed"):
        audit(record, store, never)


def test_failing_recomputation_is_no_verdict(record: Path, store: KeyStore) -> None:
    """Neither good nor bad: it could not be checked."""

    def recompute(record: Record) -> Recomputed:
        raise InvalidMeasurement("the short is missing.")

    with pytest.raises(CouldNotCheck, match=r"could not be recomputed: the short is missing\."):
        audit(record, store, recompute)
