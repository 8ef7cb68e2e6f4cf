"""The in-toto statement: which files a record consists of, and what is said about them.

Source: in-toto Attestation Framework, Statement v1. Subjects are matched by digest; here every file of the
record but the envelope is a subject, so nothing in a record's folder is outside the signature.
"""

from __future__ import annotations

import hashlib
import json
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from benchrun.errors import CouldNotCheck
from benchrun.record.payload import PREDICATE_TYPE, Payload, check_path

__all__ = ["STATEMENT_TYPE", "Statement", "build", "parse"]

STATEMENT_TYPE = "https://in-toto.io/Statement/v1"
"""``_type`` of an in-toto statement."""

_SHA256 = re.compile(r"[0-9a-f]{64}")


@dataclass(frozen=True, slots=True)
class Statement:
    """A statement that was read.

    Parameters
    ----------
    subjects
        File in the record to SHA-256, hexadecimal.
    payload
        What is said.
    """

    subjects: Mapping[str, str]
    payload: Payload


def build(payload: Payload, files: Mapping[str, bytes]) -> bytes:
    """The statement's bytes: one subject a line, so that line tools can check the digests too.

    Parameters
    ----------
    payload
        The predicate.
    files
        All files of the record but the envelope.
    """
    subject = ",\n".join(
        "  " + json.dumps({"name": name, "digest": {"sha256": hashlib.sha256(files[name]).hexdigest()}})
        for name in sorted(files)
    )
    predicate = json.dumps(payload.model_dump(mode="json"), indent=1, ensure_ascii=False, allow_nan=False)
    return (
        f'{{\n "_type": "{STATEMENT_TYPE}",\n "subject": [\n{subject}\n ],\n'
        f' "predicateType": "{PREDICATE_TYPE}",\n "predicate": {predicate}\n}}\n'
    ).encode()


def parse(text: bytes) -> Statement:
    """Read a statement about a run.

    Raises
    ------
    CouldNotCheck
        If it is none, or is of a version that this program does not know.
    """
    try:
        data = json.loads(text)
    except (ValueError, RecursionError) as error:
        raise CouldNotCheck(f"holds a payload that is not JSON text ({error})") from None
    if not isinstance(data, dict) or data.get("_type") != STATEMENT_TYPE:
        found = data.get("_type") if isinstance(data, dict) else data
        raise CouldNotCheck(f"holds {str(found)[:80]!r}, not a statement of type {STATEMENT_TYPE}")
    _check_predicate_type(data.get("predicateType"))
    return Statement(_subjects(data.get("subject")), _payload(data.get("predicate")))


def _check_predicate_type(found: Any) -> None:
    if found == PREDICATE_TYPE:
        return
    base = PREDICATE_TYPE.rstrip("0123456789")
    if isinstance(found, str) and found.startswith(base):
        raise CouldNotCheck(
            f"was written as version {found[len(base) :]!r} of run records, and this benchrun reads version "
            f"{PREDICATE_TYPE[len(base) :]}; install a newer benchrun to check it"
        )
    raise CouldNotCheck(f"speaks of {str(found)[:80]!r}, not of a run ({PREDICATE_TYPE})")


def _subjects(data: Any) -> dict[str, str]:
    subjects: dict[str, str] = {}
    for one in data if isinstance(data, list) else ():
        try:
            name, digest = check_path(one["name"]), one["digest"]["sha256"]
            if not _SHA256.fullmatch(digest) or name in subjects:
                raise ValueError(name)
        except (KeyError, TypeError, ValueError, AttributeError):
            raise CouldNotCheck(f"names a subject that is no file of a record: {str(one)[:120]}") from None
        subjects[name] = digest
    if not subjects:
        raise CouldNotCheck("names no files")
    return subjects


def _payload(data: Any) -> Payload:
    from pydantic import ValidationError

    try:
        return Payload.from_data(data)
    except RecursionError:
        raise CouldNotCheck("is nested too deeply for a run record") from None
    except ValidationError as error:
        first = error.errors(include_url=False)[0]
        where = ".".join(str(part) for part in first["loc"]) or "predicate"
        raise CouldNotCheck(f"is no run record of version 1: {where}: {first['msg']}") from None
