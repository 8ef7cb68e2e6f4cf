"""Keys and trust of one place."""

from __future__ import annotations

import json
import os
import stat
import subprocess
import sys
import threading
from pathlib import Path

import pytest

from benchrun.errors import CouldNotCheck, InputError, RecordError
from benchrun.record.keys import KeyStore, home_folder
from benchrun.record.publickey import PublicKey
from benchrun.record.signer import FileSigner

posix = pytest.mark.skipif(os.name == "nt", reason="Windows has no file modes")


@posix
@pytest.mark.parametrize(
    ("environ", "expected"),
    [
        ({"BENCHRUN_HOME": "/keys/here", "XDG_CONFIG_HOME": "/etc/me"}, Path("/keys/here")),
        ({"XDG_CONFIG_HOME": "/etc/me"}, Path("/etc/me/benchrun")),
        ({"XDG_CONFIG_HOME": "not/absolute"}, Path.home() / ".config" / "benchrun"),
        ({"BENCHRUN_HOME": "~/k"}, Path.home() / "k"),
        ({}, Path.home() / ".config" / "benchrun"),
    ],
)
def test_home_follows_the_environment(environ: dict[str, str], expected: Path) -> None:
    """The own variable first, then the XDG Base Directory Specification."""
    assert home_folder(environ) == expected


def test_unknown_user_is_told_what_to_set() -> None:
    """No home folder can be found for a user that does not exist."""
    with pytest.raises(InputError, match="BENCHRUN_HOME"):
        home_folder({"BENCHRUN_HOME": "~no-such-user-here/k"})


def test_empty_store_is_not_made_by_looking(store: KeyStore) -> None:
    """Listing and searching leave no folder behind."""
    assert store.list() == ()
    assert store.trusted() == ()
    assert store.find("0" * 64) is None
    assert not store.home.exists()


def test_rehearsal_key_is_made_once(store: KeyStore) -> None:
    """And trusted for rehearsals only."""
    first, second = store.rehearsal(), store.rehearsal()
    assert first.key_id == second.key_id
    assert first.purpose == "rehearsal"
    assert [key.key_id for key in store.trusted("rehearsal")] == [first.key_id]
    assert store.trusted("bench") == ()


def test_rehearsal_key_is_the_same_for_all_threads(store: KeyStore) -> None:
    """Sixteen at once, on a store that does not exist yet; no temporary file is left."""
    start, ids = threading.Barrier(16), list[str]()

    def one() -> None:
        start.wait()
        ids.append(store.rehearsal().key_id)

    threads = [threading.Thread(target=one) for _ in range(16)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(ids) == 16
    assert len(set(ids)) == 1
    assert sorted(path.name for path in (store.home / "keys").iterdir()) == [
        "rehearsal.pem",
        "rehearsal.public.pem",
    ]


@pytest.mark.slow
def test_rehearsal_key_is_the_same_for_all_processes(store: KeyStore) -> None:
    """As when a night starts several runs at once on a new machine."""
    code = (
        "import pathlib, sys; from benchrun.record.keys import KeyStore; "
        "print(KeyStore(pathlib.Path(sys.argv[1])).rehearsal().key_id)"
    )
    command = [sys.executable, "-c", code, str(store.home)]
    running = [subprocess.Popen(command, stdout=subprocess.PIPE, text=True) for _ in range(4)]
    ids = {process.communicate()[0].strip() for process in running}
    assert ids == {store.rehearsal().key_id}


@posix
def test_private_keys_are_for_the_user_alone(store: KeyStore) -> None:
    """Mode 0600 in folders of mode 0700, whatever the umask allows."""
    old = os.umask(0)
    try:
        store.rehearsal()
        store.make("bench-1")
    finally:
        os.umask(old)
    for name in ("rehearsal", "bench-1"):
        assert stat.S_IMODE((store.home / "keys" / f"{name}.pem").stat().st_mode) == 0o600
    assert stat.S_IMODE((store.home / "keys").stat().st_mode) == 0o700


@posix
def test_private_key_that_others_can_read_is_refused(store: KeyStore) -> None:
    """Whoever could read it could sign."""
    store.make("bench-1")
    (store.home / "keys" / "bench-1.pem").chmod(0o640)
    with pytest.raises(RecordError, match=r"others can read .* \(mode 0640\).* chmod 600"):
        store.signer("bench-1")


def test_made_key_signs_and_is_trusted(store: KeyStore) -> None:
    """As a bench key, under its name."""
    made = store.make("bench-1")
    assert store.signer().key_id == made.key_id
    assert store.signer().purpose == "bench"
    assert [(key.label, key.purpose) for key in store.trusted()] == [("bench-1", "bench")]
    assert PublicKey.from_pem(store.export("bench-1")).key_id == made.key_id


def test_protected_key_is_listed_and_exported_without_its_passphrase(store: KeyStore) -> None:
    """Only signing needs it."""
    made = store.make("bench-1", "correct horse")
    assert store.list() == (made,)
    assert made.protected
    assert PublicKey.from_pem(store.export("bench-1")).key_id == made.key_id
    assert store.signer("bench-1", "correct horse").key_id == made.key_id
    with pytest.raises(InputError, match=r"key 'bench-1' \(.*\): the key is protected by a passphrase"):
        store.signer("bench-1")


def test_list_shows_all_private_keys(store: KeyStore) -> None:
    """By name, with what each may speak for; without its public half an id comes from the key itself."""
    store.rehearsal()
    made = store.make("bench.1")
    (store.home / "keys" / "bench.1.public.pem").unlink()
    assert [(key.name, key.purpose, key.protected) for key in store.list()] == [
        ("bench.1", "bench", False),
        ("rehearsal", "rehearsal", False),
    ]
    assert store.list()[0].key_id == made.key_id


@pytest.mark.parametrize("name", ["", ".x", "../x", "a/b", "a b", "x.", "x" * 65, "x.public", "ü"])
def test_names_that_are_none_are_refused(store: KeyStore, name: str) -> None:
    """For making, signing and exporting."""
    for call in (store.make, store.signer, store.export):
        with pytest.raises(InputError, match="is no name for a key"):
            call(name)
    assert not store.home.exists()


def test_taken_and_reserved_names_are_refused(store: KeyStore) -> None:
    """The former key stays as it is."""
    made = store.make("bench-1")
    with pytest.raises(InputError, match="there is a key 'bench-1' already"):
        store.make("bench-1")
    with pytest.raises(InputError, match="name of the key for rehearsals"):
        store.make("Rehearsal")
    with pytest.raises(InputError, match="the passphrase is empty"):
        store.make("bench-2", "")
    assert store.signer().key_id == made.key_id


def test_missing_key_says_how_to_make_one(store: KeyStore) -> None:
    """None at all, not that one, more than one."""
    with pytest.raises(InputError, match="make one with: benchrun keys make NAME"):
        store.signer()
    store.make("bench-1")
    with pytest.raises(
        InputError, match=r"no key 'bench-9' .*\(there: bench-1\); .* benchrun keys make bench-9"
    ):
        store.signer("bench-9")
    store.make("bench-2")
    with pytest.raises(InputError, match=r"there are 2 keys \(bench-1, bench-2\); say which one signs"):
        store.signer()


def test_damaged_private_key_is_said(store: KeyStore) -> None:
    """With the file's name."""
    store.make("bench-1")
    (store.home / "keys" / "bench-1.pem").write_text("hello")
    with pytest.raises(InputError, match=r"bench-1\.pem\): this is no private key"):
        store.signer()


def test_trusted_key_is_found_until_it_is_distrusted(store: KeyStore) -> None:
    """By its id; the first 8 digits are enough to end it."""
    pem = FileSigner.generate().public_key.pem
    key = store.trust(pem, "  bench in hall 2 ")
    assert store.find(key.key_id) == key
    assert key.label == "bench in hall 2"
    assert store.distrust(key.key_id[:8].upper()) == key
    assert store.find(key.key_id) is None
    assert list((store.home / "trusted").iterdir()) == []


@pytest.mark.parametrize(
    ("beginning", "said"), [("abc", "too short"), ("0123456789", "beginning of 0 trusted keys")]
)
def test_unknown_beginning_is_refused(store: KeyStore, beginning: str, said: str) -> None:
    """Nothing is distrusted by accident."""
    store.trust(FileSigner.generate().public_key.pem, "hall 2")
    with pytest.raises(InputError, match=said):
        store.distrust(beginning)
    assert len(store.trusted()) == 1


def test_key_speaks_for_one_purpose_only(store: KeyStore) -> None:
    """A rehearsal key cannot be made a bench key by trusting it again."""
    pem = store.rehearsal().public_key.pem
    with pytest.raises(InputError, match=r"is trusted as a rehearsal key .* cannot be a bench key too"):
        store.trust(pem, "hall 2")
    assert store.trusted("bench") == ()


@pytest.mark.parametrize("label", ["", "  ", "two\nlines"])
def test_label_must_say_something(store: KeyStore, label: str) -> None:
    """On one line."""
    with pytest.raises(InputError, match="must be printable text"):
        store.trust(FileSigner.generate().public_key.pem, label)


@pytest.mark.parametrize("damage", ["json", "other key", "no key", "purpose"])
def test_damaged_trust_is_no_verdict(store: KeyStore, damage: str) -> None:
    """An entry that holds another key than it says must not be believed, nor passed over."""
    key = store.trust(FileSigner.generate().public_key.pem, "hall 2")
    entry = store.home / "trusted" / f"{key.key_id}.json"
    if damage == "json":
        entry.write_text("{")
    elif damage == "other key":
        entry.with_suffix(".pem").write_bytes(FileSigner.generate().public_key.pem)
    elif damage == "no key":
        entry.with_suffix(".pem").unlink()
    else:
        entry.write_text(json.dumps({"keyid": key.key_id, "label": "x", "purpose": "anything"}))
    for look in (store.trusted, lambda: store.find(key.key_id)):
        with pytest.raises(
            CouldNotCheck, match=r"\.json is damaged \(.*\); remove both .* benchrun keys trust FILE"
        ):
            look()


def test_home_that_is_a_file_is_said(tmp_path: Path) -> None:
    """With the folder's name and the variable that changes it."""
    (tmp_path / "home").write_text("mine")
    for call in (KeyStore(tmp_path / "home").rehearsal, lambda: KeyStore(tmp_path / "home").make("x")):
        with pytest.raises(RecordError, match=r"could not be written: .* BENCHRUN_HOME"):
            call()
    assert (tmp_path / "home").read_text() == "mine"
