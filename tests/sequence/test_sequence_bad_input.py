"""Slips in a sequence: each is told at its line and column, with what to do."""

# ruff: noqa: E501 - the table reads as one slip a line

from __future__ import annotations

import pytest

# old text, new text, what the place begins with, words of the message, words of the advice
SLIPS = {
    "wrong unit": ("from: 5 MHz", "from: 5 dB", "5 dB", "'5 dB' is not in Hz", ""),
    "unit in other letters": ("from: 5 MHz", "from: 5 mhz", "5 mhz", "'5 mhz'", 'did you mean "MHz"'),
    "milli for mega": ("from: 5 MHz", "from: 5 mHz", "5 mHz", "m is milli", 'did you mean "MHz"?'),
    "bare number": ("from: 5 MHz", "from: 5", "5,", "5 has no unit", 'write it as in "169.4 MHz"'),
    "bare number for dBm": ("power: -10 dBm", "power: -10", "-10}", "-10 has no unit", '"-10 dBm"'),
    "not a number": ("from: 5 MHz", "from: low", "low", "'low' is not a value with a unit", ""),
    "infinite": ("points: 801", "points: 1e999", "1e999", "points: inf is not allowed", "valid integer"),
    "infinite with unit": ("from: 5 MHz", "from: inf MHz", "inf MHz", "'inf MHz' is not a value", ""),
    "nan": ("from: 5 MHz", "from: .nan", ".nan", "'.nan' is not a value with a unit", ""),
    "too large": ("to: 1.2 GHz", "to: 1e400 GHz", "1e400", "too large", ""),
    "beyond all bands": ("to: 1.2 GHz", "to: 1.2e5 GHz", "1.2e5", "less than or equal to", ""),
    "negative frequency": ("from: 5 MHz", "from: -5 MHz", "-5 MHz", "greater than or equal to 0", ""),
    "range of one": ("160 MHz to 175 MHz", "160 MHz", "160 MHz", "is not a range", "both units"),
    "range backwards": ("160 MHz to 175 MHz", "175 MHz to 160 MHz", "175", "does not increase", "lower value"),
    "range with bare": ("160 MHz to 175 MHz", "160 to 175 MHz", "160 to", "'160' has no unit", ""),
    "range below zero": ("160 MHz to 175 MHz", "-1 MHz to 175 MHz", "-1", "no range of frequencies", ""),
    "text for points": ("points: 801", 'points: "801"', '"801"', "points: '801' is not allowed", "valid integer"),
    "one point": ("points: 801", "points: 1", "1,", "greater than or equal to 2", ""),
    "key typo": ("bandwidth: 1 kHz", "bandwith: 1 kHz, bandwidth: 1 kHz", "bandwith", "'bandwith'", "Known here"),
    "key typo in unit": ("  part: low", "  prat: x\n  part: low", "prat", "'prat' means nothing", "Did you mean 'ports'?"),
    "typo of an optional key": ("with: plane", "wiht: plane, with: plane", "wiht", "'wiht'", "Known here"),
    "key of another place": ("kit: n50}", "kit: n50, points: 3}", "points", "'points' means nothing", "Did you mean 'ports'?"),
    "step typo": ("- de-embed:", "- deembed:", "deembed", "there is no step 'deembed'", "Did you mean 'de-embed'?"),
    "step unknown": ("- de-embed:", "- frobnicate:", "frobnicate", "no step 'frobnicate'", "Known steps: calibrate"),
    "step with a space": ("- de-embed:", "- take it out:", "take it", "no step 'take it out'", "Known steps"),
    "step as a word": ("- sweep: {as: raw, with: plane}", "- sweep", "sweep", "a step is one key", "Known steps"),
    "two steps in one": ("- sweep: {as: raw, with: plane}", "- {sweep: {}, judge: {}}", "{sweep", "one key", "Known"),
    "step number": ("- sweep: {as: raw, with: plane}", "- 7: {}", "7: {}", "there is no step '7'", "Known steps"),
    "figure typo": ("figure: insertion loss", "figure: insertion los", "insertion los", "is no figure", "did you mean 'insertion loss'?"),
    "method typo": ("method: SOLT", "method: SOLTT", "SOLTT", "method: 'SOLTT' is not known", "Did you mean 'SOLT'?"),
    "method in lower case": ("method: SOLT", "method: trl", "trl", "method: 'trl' is not known", "Did you mean 'TRL'?"),
    "limit without bound": (", at most: 0.45 dB", "", "{figure", "neither `at most` nor `at least`", ""),
    "limit without unit": ("at most: 0.45 dB", "at most: 0.45", "0.45}", "`at most`: '0.45' has no unit", '"0.5 dB"'),
    "limit in another unit": ("at most: 0.45 dB", "at most: 3 MHz", "3 MHz", "'3 MHz' is not in dB", ""),
    "limits the wrong way": ("at most: 0.45 dB", "at least: 1 dB, at most: 0.45 dB", "1 dB", "is not below", ""),
    "limit with both bands": ("at most: 0.45", "at: 170 MHz, at most: 0.45", "{figure", "one of them", ""),
    "parameter of another figure": ("at most: 0.45", "drop: 3 dB, at most: 0.45", "3 dB", "`drop` means nothing for insertion loss", "it takes"),
    "key typo in a limit": ("at most: 0.45 dB", "at mots: 0.45 dB, at most: 1 dB", "at mots", "'at mots'", "Did you mean 'at least'?"),
    "key typo in a mask limit": ("mask: stop", "mask: stop, tarce: S11", "tarce", "'tarce' means nothing", "Known here"),
    "rule": ("from: filter\n", "from: filter\n      rule: generous\n", "generous", "'generous' is no decision rule", "`simple`"),
    "rule too wide": ("from: filter\n", "from: filter\n      rule: {guard band: 99 U}\n", "{guard", "no sensible guard band", '"1 U"'),
    "sweep without end": ("to: 1.2 GHz, ", "", "{from", "has no `to`", "`from`, `to` and `points`"),
    "sweep backwards": ("to: 1.2 GHz", "to: 1 MHz", "1 MHz", "`from` is not below `to`", ""),
    "sweep from zero": ("from: 5 MHz", "from: 0 Hz", "0 Hz", "`from` is 0 Hz", ""),
    "sweep with both forms": ("points: 801", "points: 801, at: [1 MHz, 2 MHz]", "[1 MHz", "keep one of them", ""),
    "sweep list not rising": ("from: 5 MHz, to: 1.2 GHz, points: 801", "at: [2 MHz, 2 MHz]", "[2 MHz", "do not increase", ""),
    "sweep of both": ("with: plane", "with: plane, sweep: wide", "{as: raw", "say one", ""),
    "fixture of none": (", left: left.s2p", "", "{as: filter", "says nothing to take out", ""),
    "missing key": ("  part: low-pass filter\n", "", "serial", "lacks the key 'part'", "Add it."),
    "missing key in a step": (", kit: n50", "", "{as: plane", "lacks the key 'kit'", "Add it."),
    "edition": ("edition: 1", "edition: 2", "2", "edition: 2 is not allowed here", ""),
    "name with a path": ("sequence: demo", "sequence: ../demo", "../demo", "'../demo' is not allowed here", ""),
    "sweep name": ("  wide:", "  Wide:", "Wide:", "the key 'Wide' is not allowed here", ""),
    "serial pattern": ('"HF-[0-9]{4}"', '"HF-[0-9"', '"HF-[0-9"', "is no regular expression", ""),
    "serial pattern that may change": ('"HF-[0-9]{4}"', '"[[a]"', '"[[a]"', "is no regular expression", ""),
    "serial pattern too long": ('"HF-[0-9]{4}"', '"' + "(" * 5000 + '"', '"(((', "at most 200", ""),
    "null": ("title: Demo", "title:", "\n", "title: None is not allowed here", "valid string"),
    "boolean": ("title: Demo", "title: true", "true", "title: True is not allowed here", "valid string"),
    "duplicate key": ("edition: 1", "edition: 1\nedition: 1", "edition", "says 'edition' twice; the first is at 2:1", "Keep one"),
    "duplicate name of a sweep": ("steps:", "  wide: {}\nsteps:", "wide", "says 'wide' twice; the first is at 9:3", "Keep one"),
    "anchor": ("title: Demo", "title: &a Demo", "&a", "uses an anchor or alias", "Write the value out"),
    "alias": ("title: Demo", "title: *a", "*a", "uses an anchor or alias", "Write the value out"),
    "tag": ("title: Demo", "title: !!str Demo", "!!str", "uses the tag tag:yaml.org,2002:str", "Tags are not used"),
    "tag without name": ("title: Demo", "title: ! Demo", "! Demo", "uses the tag !", "Tags are not used"),
    "python tag": ("title: Demo", "title: !!python/object/apply:os.system [x]", "!!python", "uses the tag", "Tags"),
    "second document": ("steps:\n", "steps: []\n---\nx:\n", "---", "holds a second document", "Keep one document"),
    "tab": ("  part: low", "\tpart: low", "\tpart", "has a tab in the indentation", "Indent with spaces"),
    "tab after spaces": ("  part: low", "  \tpart: low", "\tpart", "has a tab in the indentation", "Indent"),
    "NUL": ("title: Demo", "title: De\0mo", "\0mo", "has the control character 0x00", "Remove it"),
    "escape": ("title: Demo", "title: \x1b[31mDemo", "\x1b", "has the control character 0x1B", "Remove it"),
    "NUL in an escape": ("title: Demo", 'title: "De\\0mo"', '"De', "hides the control character 0x00", "Remove it"),
    "line separator": ("title: Demo", "title: De\u2028mo", "\u2028mo", "the control character 0x2028", "Remove it"),
    "list as a key": ("title: Demo", "? [a]\n: Demo", "[a]", "uses [] as a key", "Keys are words"),
    "unclosed": ("withstands: {power: 30 dBm}", "withstands: {power: 30 dBm", ":", "is not YAML here: while parsing a flow mapping", ""),
    "empty name": ("sequence: demo", 'sequence: ""', '""', "sequence: '' is not allowed here", ""),
}  # fmt: skip


@pytest.mark.parametrize("slip", SLIPS)
def test_a_slip_is_told_at_its_place(changed, slip):
    old, new, where, message, advice = SLIPS[slip]
    problem, text = changed(old, new)
    assert (text + "\n").startswith(where), f"points at {text!r}"
    assert problem.file == "f.yaml"
    assert message in str(problem)
    assert advice in str(problem)
    assert len(str(problem)) < 600


def test_the_place_is_exact(problems, good):
    (problem,) = problems(good.replace("at most: 0.45 dB", "at most: 0.45 ohm"))
    assert str(problem).startswith("f.yaml:17:71: `at most`: '0.45 ohm' is not in dB")


@pytest.mark.parametrize(
    ("old", "new", "meant"),
    [
        ("bandwidth:", "bandwith:", "bandwidth"),
        ("as: plane", "ass: plane", "as"),
        ("title:", "tilte:", "title"),
        ("at most:", "atmost:", "at most"),
        ("sweeps:", "sweep:", "sweeps"),
        ("withstands:", "withstand:", "withstands"),
        ("mask: stop", "maks: stop", "mask"),
    ],
)
def test_a_typo_says_which_key_was_meant(problems, good, old, new, meant):
    found = [str(p) for p in problems(good.replace(old, new)) if "means nothing here" in p.message]
    assert found
    assert found[0].endswith(f"Did you mean {meant!r}?")


def test_all_problems_are_told_in_the_order_of_the_file(problems, good):
    text = good.replace("from: 5 MHz", "from: 5").replace("method: SOLT", "method: X").replace("30 dBm", "30")
    assert [p.line for p in problems(text)] == [7, 9, 11]


@pytest.mark.parametrize(
    ("raw", "place", "message"),
    [
        (b"", (1, 1), "is empty"),
        (b"\n\n# only a remark\n", (1, 1), "is empty"),
        (b"\xef\xbb\xbf", (1, 1), "is empty"),
        (b"--- \n", (1, 1), "is empty"),
        (b"hello", (1, 1), "is a str, not keys with values"),
        (b"[1, 2]", (1, 1), "is a list, not keys with values"),
        (b"a: b\nc: \xff\n", (2, 4), "is not UTF-8 text (byte 0xFF)"),
        ("sequence: é".encode("latin-1"), (1, 11), "is not UTF-8 text (byte 0xE9)"),
        ("sequence: demo".encode("utf-16"), (1, 1), "is not UTF-8 text (byte 0xFF)"),
        (b"a:\n  - b\n c: d\n", (3, 2), "is not YAML here"),
        (b"\t", (1, 1), "has a tab in the indentation"),
        (b"%YAML 1.2\n%FOO\n---\na: b", (2, 5), "is not YAML here"),
    ],
)
def test_files_that_are_no_sequence_at_all(problems, raw, place, message):
    (problem,) = problems(raw)
    assert (problem.line, problem.column) == place
    assert message in problem.message
