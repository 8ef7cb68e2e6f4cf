"""The plan: everything in it, under one digest; names that clash; ``check`` of every kind of file."""

from __future__ import annotations

import datetime
import hashlib

import pytest

from benchrun.engine.plan import check_file, make_plan
from benchrun.errors import InputError
from benchrun.paths import installed_sequences

DAY = datetime.date(2026, 12, 1)
KIT = (installed_sequences() / "kits/n50-workshop.yaml").read_text()
MASK = (installed_sequences() / "masks/harmonic-filter-stop.yaml").read_text()
JIG = (installed_sequences() / "fixtures/jig-left.s2p").read_text()


def test_the_plan_holds_every_file_as_it_was(workplace, tmp_path, small_filter):
    plan = workplace().job.plan
    assert {name: path for name, (path, _) in plan.inputs.items()} == {
        "sequence": "inputs/sequence.yaml",
        "bench": "inputs/bench.yaml",
        "kit:n50-workshop": "inputs/kit-n50-workshop.yaml",
        "fixture:jig-left.s2p": "inputs/fixture-jig-left.s2p",
        "fixture:jig-right.s2p": "inputs/fixture-jig-right.s2p",
    }
    assert plan.inputs["sequence"][1] == small_filter.encode()
    assert plan.inputs["kit:n50-workshop"][1] == KIT.encode()
    assert plan.inputs["fixture:jig-left.s2p"][1] == JIG.encode()


def test_a_record_holds_them_under_those_names(workplace):
    w = workplace()
    w.run()
    (record,) = w.records
    for path, raw in w.job.plan.inputs.values():
        assert (record / path).read_bytes() == raw


def test_the_digest_is_of_names_and_contents(workplace, small_filter):
    one, same = workplace().job.plan, workplace().job.plan
    assert one.digest == same.digest
    assert len(one.digest) == len(hashlib.sha256().hexdigest())
    digests = {one.digest, workplace(small_filter + "# a remark\n").job.plan.digest}
    digests.add(workplace(bench="workshop-second").job.plan.digest)
    assert len(digests) == 3


def test_hookups_of_the_plan_in_order(workplace):
    texts = [hookup.text for hookup in workplace().job.plan.hookups]
    assert texts[0] == "short on port 1"
    assert texts[-2:] == ["thru from port 1 to port 2", "jig-left, unit, jig-right from port 1 to port 2"]
    assert len(texts) == 8


def test_files_of_one_name_in_two_folders_stay_two(workplace, small_filter, tmp_path):
    for folder in ("a", "B"):
        (tmp_path / folder).mkdir()
        (tmp_path / folder / "half.s2p").write_text(JIG if folder == "a" else JIG + "! another\n")
        (tmp_path / folder / "half.yaml").write_text(MASK)
    (tmp_path / "half.yaml").write_text(KIT)
    text = small_filter.replace(
        "left: jig-left.s2p, right: jig-right.s2p", "left: a/half.s2p, right: B/half.s2p"
    )
    text = text.replace("kit: n50-workshop", "kit: half.yaml") + (
        "        - {trace: S21, mask: a/half.yaml}\n        - {trace: S12, mask: B/half.yaml}\n"
    )
    w = workplace(text)
    paths = [path for path, _ in w.job.plan.inputs.values()]
    assert len({path.casefold() for path in paths}) == len(paths) == 7
    assert {"inputs/fixture-half.s2p", "inputs/fixture-half-2.s2p", "inputs/mask-half-2.yaml"} <= set(paths)
    answer = w.run()
    assert answer.document["record"]
    assert w.audit(answer.document["record"]).code == 0


def test_all_problems_in_all_files_are_told_at_once(small_filter, tmp_path):
    (tmp_path / "kit.yaml").write_text(KIT.replace("kind: load", "kind: lod"))
    (tmp_path / "half.s2p").write_text("")
    text = small_filter.replace("kit: n50-workshop", "kit: kit.yaml").replace("left: jig-left", "left: half")
    path = tmp_path / "sequence.yaml"
    path.write_text(text.replace("from: filter", "from: nothing"))
    with pytest.raises(InputError) as caught:
        make_plan(str(path), "nowhere", DAY)
    told = [str(problem) for problem in caught.value.problems]
    for words in ("names no network", "'lod'", "holds no data", "there is no bench 'nowhere'"):
        assert any(words in line for line in told), told


@pytest.mark.parametrize(
    ("name", "text", "words"),
    [
        ("s.yaml", "sequence: x\n", "lacks the key"),
        ("k.yaml", KIT.replace("2031-06-30", "2026-11-30"), "the kit was due for calibration on 2026-11-30"),
        ("m.yaml", MASK.replace("at most", "at mots"), "at mots"),
        ("b.yaml", "bench: x\nedition: 1\n", "lacks the key"),
        ("n.yaml", "nothing: 1\n", "must have one of the keys"),
    ],
)
def test_check_of_each_kind(tmp_path, name, text, words):
    (tmp_path / name).write_text(text)
    problems = check_file(tmp_path / name, DAY)
    assert any(words in str(problem) for problem in problems), problems
    assert all(problem.file == str(tmp_path / name) for problem in problems)
    assert all(problem.line >= 1 for problem in problems)


def test_a_kit_is_good_on_the_day_it_is_due(tmp_path):
    (tmp_path / "k.yaml").write_text(KIT.replace("2031-06-30", str(DAY)))
    assert check_file(tmp_path / "k.yaml", DAY) == []


def test_check_of_a_bench_knows_the_dialects(tmp_path):
    text = (installed_sequences() / "benches/workshop.yaml").read_text()
    (tmp_path / "b.yaml").write_text(text.replace("whole-matrix", "whole-matrx"))
    (problem,) = check_file(tmp_path / "b.yaml", DAY)
    assert (problem.line, "Did you mean 'whole-matrix'?") == (8, problem.advice)
