"""Several units under one calibration; and a rehearsal that is the same every time, and never waits."""

from __future__ import annotations

import base64
import json
import shutil
from pathlib import Path

import pytest

from benchrun.clock import SystemClock
from benchrun.errors import InputError


def raw(record: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted((record / "raw").iterdir())}


def calibration(record: Path) -> dict[str, bytes]:
    return {name: data for name, data in raw(record).items() if "plane" in name}


def records(answer) -> list[Path]:
    return [Path(unit["record"]) for unit in answer.document["units"]]


def times(record: Path) -> list[float]:
    text = json.loads((record / "envelope.json").read_text())["payload"]
    return [r["taken_s"] for r in json.loads(base64.b64decode(text))["predicate"]["readings"]]


def test_units_share_a_calibration(workplace):
    w = workplace(units=("HF-0001", "HF-0002", "HF-0003"))
    answer = w.run()
    assert answer.code == 0
    assert sum(one.startswith("INIT") for one in w.mishaps.requests) == 7 + 3
    one, two, three = records(answer)
    assert calibration(one) == calibration(two) == calibration(three)
    assert len({raw(r)[sorted(raw(r))[-1]] for r in (one, two, three)}) == 3
    for record in (one, two, three):
        audit = w.audit(record)
        assert audit.code == 0, audit.err
    assert min(times(one)) > 0
    assert times(two)[:7] == sorted(times(two)[:7])
    assert times(two)[6] < 0 < times(two)[7], "older readings count from before the run"
    assert any("plane serves on, " in getattr(event, "text", "") for event in w.events)
    values = [u["figures"][0]["value"] for u in answer.document["units"]]
    assert len(set(values)) == 3


@pytest.mark.parametrize("spoiled", [0, 1])
def test_a_shared_file_that_is_changed_spoils_every_record_it_stands_in(workplace, spoiled):
    """A hard link is one file with two names: overwriting it in place must be noticed in both records."""
    w = workplace(units=("HF-0001", "HF-0002"))
    both = records(w.run())
    shared = both[spoiled] / "raw" / "03-plane-load-on-port-1.s2p"
    linked = shared.stat().st_nlink
    data = bytearray(shared.read_bytes())
    data[len(data) // 2] ^= 1
    with shared.open("r+b") as file:
        file.write(data)
    for record in both if linked > 1 else [both[spoiled]]:
        audit = w.audit(record)
        assert audit.code == 5
        assert "03-plane-load-on-port-1.s2p" in audit.err


def test_a_shared_file_that_is_replaced_spoils_one_record(workplace):
    w = workplace(units=("HF-0001", "HF-0002"))
    one, two = records(w.run())
    file = two / "raw" / "03-plane-load-on-port-1.s2p"
    data = file.read_bytes().replace(b"raw:", b"Raw:")
    file.unlink()
    file.write_bytes(data)
    assert w.audit(one).code == 0
    assert w.audit(two).code == 5


def test_removing_one_record_leaves_the_other_whole(workplace):
    w = workplace(units=("HF-0001", "HF-0002"))
    one, two = records(w.run())
    shutil.rmtree(one)
    assert w.audit(two).code == 0


def test_a_calibration_that_is_too_old_is_made_again(workplace, small_filter):
    # A jig takes 102 s to put in, so 4 min serve the second and third unit, and not the fourth.
    w = workplace(
        small_filter.replace("keep: 8 h", "keep: 4 min"), units=tuple(f"HF-000{n}" for n in range(1, 6))
    )
    answer = w.run()
    sweeps = sum(one.startswith("INIT") for one in w.mishaps.requests)
    made = [calibration(record) for record in records(answer)]
    groups = [i for i in range(1, 5) if made[i] != made[i - 1]]
    assert len(groups) >= 1
    assert sweeps == 5 + 7 * (1 + len(groups))
    assert len(groups) < 4, "and not for every unit either"
    for record in records(answer):
        audit = w.audit(record)
        assert audit.code == 0, audit.err
        assert max(-t for t in times(record)) <= 4 * 60 + 400
    examined = [
        [line for line in w.audit(record).out.splitlines() if "filter: at the time of the run" in line]
        for record in records(answer)
    ]
    # scikit-rf repeats the slow step with the first unit after each calibration.
    assert [bool(lines) for lines in examined] == [i == 0 or i in groups for i in range(5)]


def test_no_age_is_too_old_without_keep(workplace, small_filter):
    w = workplace(small_filter.replace(", keep: 8 h", ""), units=("HF-0001", "HF-0002"))
    w.mishaps.at("OUTP OFF", 1, lambda: w.rehearsal.bench.world.advance(1e6))
    w.run()
    assert sum(one.startswith("INIT") for one in w.mishaps.requests) == 9


def test_a_unit_that_is_not_on_the_bench_is_bad_input(workplace, small_filter):
    w = workplace(small_filter.replace("HF-[0-9]{4}", "[A-Z0-9-]+"), units=("HF-0001", "XX-1"))
    with pytest.raises(InputError, match=r"no unit 'XX-1'; it has HF-0001"):
        w.run()
    assert w.mishaps.requests == []


def test_a_unit_that_cannot_be_connected_so_is_told(workplace, small_filter):
    w = workplace(small_filter.replace("HF-[0-9]{4}", "[A-Z0-9-]+"), units=("WA-0001",))
    answer = w.run()
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert "cannot connect jig-left, unit, jig-right" in answer.document["reason"]
    assert "'unit' has one port" in answer.document["reason"]


def test_the_same_seed_gives_the_same_bytes(workplace):
    one = workplace(seed=11)
    first, bytes_one = one.run().document, raw(one.records[-1])
    two = workplace(seed=11)
    second, bytes_two = two.run().document, raw(two.records[-1])
    assert bytes_one == bytes_two
    assert first["figures"] == second["figures"]
    assert [e.as_json() for e in one.events if e.name == "reading"] == [
        e.as_json() for e in two.events if e.name == "reading"
    ]


def test_another_seed_gives_another_bench(workplace):
    found = []
    for seed in (11, 12):
        w = workplace(seed=seed)
        w.run()
        found.append(raw(w.records[-1]))
    assert found[0].keys() == found[1].keys()
    assert all(found[0][name] != found[1][name] for name in found[0])


def test_a_rehearsal_never_sleeps(workplace, monkeypatch):
    def sleeping(self, seconds):
        raise AssertionError(f"somebody slept {seconds} s")

    monkeypatch.setattr(SystemClock, "wait", sleeping)
    monkeypatch.setattr("time.sleep", lambda seconds: sleeping(None, seconds))
    w = workplace(bench="workshop-second", units=("HF-0001", "HF-0002"))
    assert w.run().code == 0
