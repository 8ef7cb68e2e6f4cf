"""The journal on disk is believed as far as it is whole, and no further."""

from __future__ import annotations

import errno

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchrun.engine.journal import Appended, Journal, JournalFailed, read_journal
from benchrun.engine.resume import is_going


def written(path):
    journal = Journal(path)
    journal.line("begun", edition=1, name="größe")
    journal.line("reading", b"1 2\n3 4\n", step="plane")
    journal.line("finished", number=1)
    journal.sync()
    journal.close()
    return path.read_bytes()


@pytest.fixture(scope="module")
def whole(tmp_path_factory):
    return written(tmp_path_factory.mktemp("journal") / ".a.journal")


def test_what_was_written_is_read(whole):
    found = read_journal(whole)
    assert [entry.what for entry in found.entries] == ["begun", "reading", "finished"]
    assert found.entries[0].facts == {"edition": 1, "name": "größe"}
    assert found.entries[1].content == b"1 2\n3 4\n"
    assert (found.good, found.torn) == (len(whole), "")


def test_a_torn_end_is_not_believed_wherever_it_tears(whole):
    ends = [read_journal(whole).good]
    for cut in range(len(whole)):
        found = read_journal(whole[:cut])
        assert found.good <= cut
        assert read_journal(whole[: found.good]).entries == found.entries
        assert len(found.entries) < 3
        assert bool(found.torn) == (cut != found.good)
    assert ends == [len(whole)]


@given(at=st.integers(0, 10_000), bit=st.integers(0, 7))
def test_no_changed_bit_is_believed(whole, at, bit):
    data = bytearray(whole)
    data[at % len(data)] ^= 1 << bit
    found = read_journal(bytes(data))
    assert found.entries == read_journal(whole).entries[: len(found.entries)]
    assert len(found.entries) < 3


def test_a_line_out_of_the_middle_is_missed(whole):
    first, rest = whole.split(b"\n", 1)
    last = rest.rsplit(b"\n", 2)[-2]
    found = read_journal(first + b"\n" + last + b"\n")
    assert [entry.what for entry in found.entries] == ["begun"]
    assert found.torn == "line 2 is torn"


def test_going_on_after_a_torn_end(tmp_path, whole):
    path = tmp_path / ".b.journal"
    path.write_bytes(whole[:-5])
    found = read_journal(path.read_bytes())
    journal = Journal(path, keep=found.good, last=found.last)
    journal.line("taken up")
    journal.close()
    again = read_journal(path.read_bytes())
    assert [entry.what for entry in again.entries] == ["begun", "reading", "taken up"]
    assert again.torn == ""


class Full(Appended):
    """A disk that fills up after some bytes; what fits of the last write is still written."""

    room = 60

    def write(self, data: bytes) -> None:
        fits, self.room = data[: self.room], max(self.room - len(data), 0)
        super().write(fits)
        if len(fits) < len(data):
            raise OSError(errno.ENOSPC, "No space left on device")


def test_a_full_disk_is_told_where_something_is_to_count(tmp_path):
    journal = Journal(tmp_path / ".c.journal", Full)
    journal.line("begun", text="x" * 100)
    journal.line("more")
    for _ in range(2):
        with pytest.raises(JournalFailed, match="could not be written: No space left on device"):
            journal.sync()
    journal.close()
    assert read_journal((tmp_path / ".c.journal").read_bytes()).entries == []


def test_a_journal_that_is_written_is_known_to_be_going(tmp_path):
    path = tmp_path / ".d.journal"
    journal = Journal(path)
    assert is_going(path)
    journal.close()
    assert not is_going(path)
    assert not is_going(tmp_path / ".none.journal")


def test_a_journal_removed_is_gone(tmp_path):
    journal = Journal(tmp_path / ".e.journal")
    journal.remove()
    assert list(tmp_path.iterdir()) == []
