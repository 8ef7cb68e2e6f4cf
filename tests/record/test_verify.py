"""Every byte of a record is bound, and whoever may not speak for a run cannot."""

from __future__ import annotations

import base64
import json
import os
import re
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from benchrun.errors import CouldNotCheck, DigestWrong, RecordError, SignatureWrong
from benchrun.record.draft import Draft
from benchrun.record.envelope import Signature, parse, sign
from benchrun.record.keys import KeyStore
from benchrun.record.signer import FileSigner
from benchrun.record.statement import build
from benchrun.record.verify import MAX_ENVELOPE_BYTES, read, verify
from benchrun.record.write import MAX_FILE_BYTES, write

MakeDraft = Callable[..., Draft]


def resign(record: Path, payload: bytes, signer: FileSigner) -> None:
    (record / "envelope.json").write_bytes(sign(payload, [signer]).to_json())


def statement(record: Path) -> bytes:
    return parse((record / "envelope.json").read_bytes()).payload


def test_good_record_is_verified(
    record: Path, store: KeyStore, rehearsal: FileSigner, draft: MakeDraft
) -> None:
    """The payload comes back as it was written, with who signed it."""
    verified = verify(record, store)
    assert verified.record.payload == draft().payload
    assert [key.key_id for key in verified.keys] == [rehearsal.key_id]
    assert set(verified.record.files) == {"raw/unit.s2p", "sequence.yaml", "public-key.pem"}
    assert verified.record.content("sequence.yaml") == b"sequence: filter\n"


def test_reading_needs_no_trust(record: Path, draft: MakeDraft) -> None:
    """Anyone can look at a record."""
    assert read(record).payload == draft().payload


def flips(content: bytes) -> Iterator[tuple[int, bytes]]:
    """The content with one bit of one byte changed, for every byte; all eight bits have their turn."""
    for place, byte in enumerate(content):
        yield place, content[:place] + bytes([byte ^ 1 << place % 8]) + content[place + 1 :]


@pytest.mark.slow
def test_change_of_any_byte_of_any_file_is_found_and_named(record: Path, store: KeyStore) -> None:
    """Exhaustive over all bytes of all files, the envelope included."""
    tried = 0
    for path in sorted(path for path in record.rglob("*") if path.is_file()):
        good = path.read_bytes()
        for place, bad in flips(good):
            path.write_bytes(bad)
            with pytest.raises(RecordError) as caught:
                verify(record, store)
            assert str(path) in str(caught.value), (place, bad[place])
            tried += 1
        path.write_bytes(good)
    assert tried == sum(path.stat().st_size for path in record.rglob("*") if path.is_file())
    verify(record, store)


@pytest.mark.parametrize("name", ["raw/unit.s2p", "sequence.yaml", "public-key.pem", "envelope.json"])
@pytest.mark.parametrize("change", ["cut", "longer", "empty", "gone"])
def test_length_of_any_file_is_bound(record: Path, store: KeyStore, name: str, change: str) -> None:
    """Cut by a byte, longer by a byte, emptied, removed."""
    path = record / name
    good = path.read_bytes()
    if change == "gone":
        path.unlink()
    else:
        path.write_bytes({"cut": good[:-1], "longer": good + b"\n", "empty": b""}[change])
    with pytest.raises(RecordError, match=re.escape(name)):
        verify(record, store)


@pytest.mark.parametrize("name", ["note.txt", "raw/note.txt", ".hidden", "raw/.DS_Store", "empty/"])
def test_added_file_is_named(record: Path, store: KeyStore, name: str) -> None:
    """Nothing may lie in a record that was not signed, not even an empty folder."""
    path = record / name
    if name.endswith("/"):
        path.mkdir()
    else:
        path.write_bytes(b"")
    with pytest.raises(DigestWrong, match=re.escape(f"{name.rstrip('/')}: was added")):
        verify(record, store)


def test_added_name_is_shown_on_one_line(record: Path, store: KeyStore) -> None:
    """A name of another file system, or made to fool a reader, cannot break the message."""
    os.close(os.open(os.fsencode(record) + b"/bad\n\xff", os.O_CREAT | os.O_WRONLY))
    with pytest.raises(DigestWrong, match=r"bad\\n\\udcff'?: was added") as caught:
        verify(record, store)
    assert str(caught.value).isprintable()


def test_renamed_file_is_named(record: Path, store: KeyStore) -> None:
    """Names differing in case are different names, and the message says so."""
    (record / "sequence.yaml").rename(record / "Sequence.yaml")
    with pytest.raises(DigestWrong, match=r"sequence\.yaml: is missing; 'Sequence\.yaml' is another name"):
        verify(record, store)


@pytest.mark.parametrize("name", ["raw/unit.s2p", "envelope.json", "raw"])
def test_link_instead_of_a_file_is_named(record: Path, store: KeyStore, tmp_path: Path, name: str) -> None:
    """Even if it leads to the right bytes: they could be changed after the check."""
    path = record / name
    path.rename(tmp_path / "elsewhere")
    path.symlink_to(tmp_path / "elsewhere")
    with pytest.raises(RecordError, match=re.escape(f"{path}: is a link")):
        verify(record, store)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="this system has no named pipes")
def test_pipe_instead_of_a_file_does_not_hold_the_check_up(record: Path, store: KeyStore) -> None:
    """It would be waited on for ever if it were simply opened."""
    (record / "sequence.yaml").unlink()
    os.mkfifo(record / "sequence.yaml")
    with pytest.raises(DigestWrong, match=r"sequence\.yaml: is no plain file"):
        verify(record, store)


@pytest.mark.parametrize(
    ("name", "limit"), [("raw/unit.s2p", MAX_FILE_BYTES), ("envelope.json", MAX_ENVELOPE_BYTES)]
)
def test_huge_file_is_refused_unread(record: Path, store: KeyStore, name: str, limit: int) -> None:
    """A sparse file of a terabyte must cost nothing."""
    os.truncate(record / name, 1 << 40)
    with pytest.raises(
        RecordError, match=rf"{re.escape(name)}: has {1 << 40} bytes; .* no more than {limit}"
    ):
        verify(record, store)


def test_what_is_no_record_is_said(tmp_path: Path, store: KeyStore) -> None:
    """No folder, a folder without envelope, an envelope that is none."""
    with pytest.raises(CouldNotCheck, match="is no folder"):
        verify(tmp_path / "nothing", store)
    with pytest.raises(CouldNotCheck, match=r"is no record: it has no envelope\.json"):
        read(tmp_path)
    (tmp_path / "envelope.json").write_text("hello")
    with pytest.raises(CouldNotCheck, match=r"envelope\.json: is not JSON text"):
        read(tmp_path)


@pytest.mark.parametrize(
    "change",
    [
        lambda text: json.dumps(json.loads(text)).encode(),
        lambda text: text.replace(b'"payload":', b'"payload" :'),
        lambda text: text.replace(b"{\n", b'{\n "note": "seen",\n', 1),
        lambda text: text.replace(b"==", b"=") if b"==" in text else text.replace(b'="', b'"', 1),
        lambda text: text.replace(b"/json", b"\\/json").replace(b"vnd", b"\\u0076nd"),
        lambda text: text + b" ",
    ],
    ids=["compact", "space", "note", "padding", "escape", "end"],
)
def test_envelope_has_one_written_form(
    record: Path, store: KeyStore, change: Callable[[bytes], bytes]
) -> None:
    """What another writer might call the same envelope is not the file that was written."""
    path = record / "envelope.json"
    good = path.read_bytes()
    path.write_bytes(change(good))
    assert path.read_bytes() != good
    with pytest.raises(SignatureWrong, match=r"envelope\.json: was changed: it is not in the form"):
        verify(record, store)


def test_unused_bits_of_base64_are_bound(record: Path, store: KeyStore) -> None:
    """RFC 4648, 3.5: the last letter before the padding has bits that decode to nothing."""
    path = record / "envelope.json"
    text = path.read_text()
    sig = json.loads(text)["signatures"][0]["sig"]
    letters = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/"
    other = sig[:-3] + letters[letters.index(sig[-3]) ^ 1] + "=="
    assert base64.b64decode(other) == base64.b64decode(sig)
    path.write_text(text.replace(sig, other))
    with pytest.raises(SignatureWrong, match="was changed"):
        verify(record, store)


def test_key_id_in_the_envelope_is_bound(record: Path, store: KeyStore, rehearsal: FileSigner) -> None:
    """Another trusted key's id, or none, in place of the signer's."""
    store.make("bench-1")
    path = record / "envelope.json"
    good = parse(path.read_bytes())
    for key_id in (store.signer().key_id, ""):
        bad = type(good)(good.payload, good.payload_type, (Signature(key_id, good.signatures[0].sig),))
        path.write_bytes(bad.to_json())
        with pytest.raises(
            SignatureWrong, match=rf"was changed: it names key .* but {rehearsal.key_id[:16]}"
        ):
            verify(record, store)


def test_second_signature_must_be_good_too(record: Path, store: KeyStore, rehearsal: FileSigner) -> None:
    """Each byte of the envelope is accounted for: no unknown and no doubled signature rides along."""
    path = record / "envelope.json"
    payload = statement(record)
    path.write_bytes(sign(payload, [rehearsal, FileSigner.generate()]).to_json())
    with pytest.raises(SignatureWrong, match="is not trusted here"):
        verify(record, store)
    path.write_bytes(sign(payload, [rehearsal, rehearsal]).to_json())
    with pytest.raises(SignatureWrong, match="two signatures by the same key"):
        verify(record, store)


def test_two_trusted_signers_are_both_named(record: Path, store: KeyStore, rehearsal: FileSigner) -> None:
    """A second person may sign as well."""
    second = FileSigner.generate("rehearsal")
    store.trust(second.public_key.pem, "second rehearsal place", "rehearsal")
    path = record / "envelope.json"
    path.write_bytes(sign(statement(record), [rehearsal, second]).to_json())
    assert [key.label for key in verify(record, store).keys][1] == "second rehearsal place"


def test_unknown_key_is_told_from_a_wrong_signature(record: Path, tmp_path: Path, store: KeyStore) -> None:
    """Trust comes from the store only, but the key in the record tells which of the two it is."""
    stranger = KeyStore(tmp_path / "other")
    with pytest.raises(SignatureWrong, match=r"which is not trusted here; .* benchrun keys trust"):
        verify(record, stranger)
    path = record / "envelope.json"
    path.write_bytes(sign(statement(record).replace(b"0.31", b"0.30"), [FileSigner.generate()]).to_json())
    with pytest.raises(SignatureWrong, match="the signature does not fit, or key"):
        verify(record, stranger)


def test_changed_payload_is_a_wrong_signature(record: Path, store: KeyStore) -> None:
    """A better value under the old signature."""
    path = record / "envelope.json"
    good = parse(path.read_bytes())
    bad = type(good)(good.payload.replace(b"0.31", b"0.30"), good.payload_type, good.signatures)
    path.write_bytes(bad.to_json())
    with pytest.raises(
        SignatureWrong, match=r"envelope\.json: the signature does not fit: key .* \(rehearsal key"
    ):
        verify(record, store)


def test_rehearsal_key_cannot_speak_for_a_measured_run(
    record: Path, store: KeyStore, rehearsal: FileSigner, draft: MakeDraft
) -> None:
    """Not even if the payload was changed before signing, past every check of the writer."""
    measured = draft(origin="measured")
    files = {name: (record / name).read_bytes() for name in (*measured.files, "public-key.pem")}
    resign(record, build(measured.payload, files), rehearsal)
    with pytest.raises(SignatureWrong, match=r"the run was measured, but key .* is a rehearsal key"):
        verify(record, store)


def test_bench_key_cannot_speak_for_a_simulated_run(record: Path, store: KeyStore) -> None:
    """So that the kind of key alone tells the two apart."""
    store.make("bench-1")
    resign(record, statement(record), store.signer())
    with pytest.raises(SignatureWrong, match=r"the run was simulated, but key .* \(bench-1\) is a bench key"):
        verify(record, store)


def test_measured_run_is_verified_with_a_bench_key(tmp_path: Path, draft: MakeDraft, store: KeyStore) -> None:
    """The way of every real record."""
    store.make("bench-1", "correct horse")
    signer = store.signer("bench-1", "correct horse")
    written = write(draft(origin="measured"), tmp_path / "records", "HF-0001", signer)
    assert verify(written, store).keys[0].label == "bench-1"


def test_distrusted_key_is_trusted_no_more(record: Path, store: KeyStore, rehearsal: FileSigner) -> None:
    """Taking trust back reaches old records."""
    store.distrust(rehearsal.key_id)
    with pytest.raises(SignatureWrong, match="is not trusted here"):
        verify(record, store)


def test_file_changed_after_the_check_is_found_when_it_is_used(record: Path, store: KeyStore) -> None:
    """A recomputation reads the bytes that were signed, or none."""
    verified = verify(record, store)
    (record / "raw/unit.s2p").write_bytes(b"other")
    with pytest.raises(DigestWrong, match=r"raw/unit\.s2p: was changed"):
        verified.record.content("raw/unit.s2p")
    with pytest.raises(CouldNotCheck, match=r"has no file '\.\./secret'"):
        verified.record.content("../secret")


def test_other_payload_types_are_refused(record: Path, store: KeyStore, rehearsal: FileSigner) -> None:
    """The type is signed with the bytes: a good signature for something else is none for a record."""
    (record / "envelope.json").write_bytes(sign(statement(record), [rehearsal], "text/plain").to_json())
    with pytest.raises(SignatureWrong, match="payload is 'text/plain'"):
        verify(record, store)
