"""Every bad input as a technician meets it at the command line: sentence, place, exit code, nothing left.

The table is the list of bad input that the program promises to refuse.
"""

# ruff: noqa: E501 - the tables read as one slip a line

from __future__ import annotations

import pytest

from benchrun.paths import installed_sequences

JIG = (installed_sequences() / "fixtures/jig-left.s2p").read_text()
KIT = (installed_sequences() / "kits/n50-workshop.yaml").read_text()
BENCH = (installed_sequences() / "benches/workshop.yaml").read_text()
ROWS = JIG.splitlines()
MASK = "mask: m\nedition: 1\ntitle: M\nlines:\n  - {side: at most, through: [[300 MHz, -30 dB], [700 MHz, -50 dB]]}\n"
REJECTION = "- {figure: rejection, over: 338 MHz to 352 MHz, at least: 45 dB}"


def flat(transmission: str, impedance: str = "50") -> str:
    return f"# Hz S RI R {impedance}\n" + "".join(
        f"{f} 0 0 {transmission} 0 {transmission} 0 0 0\n" for f in ("1e6", "2e9")
    )


SEQUENCE = {
    "wrong unit": ("from: 5 MHz", "from: 5 dB", "filter.yaml:10:16: '5 dB' is not in Hz; write it as in"),
    "bare number": ("from: 5 MHz", "from: 5", "filter.yaml:10:16: 5 has no unit; write it as in"),
    "typo in a key": ("with: plane", "wiht: plane", "filter.yaml:13:25: the key 'wiht' means nothing here. Did you mean 'with'?"),
    "missing key": (", bandwidth: 10 kHz", "", "filter.yaml:10:9: lacks the key 'bandwidth'. Add it."),
    "missing step": ("  - sweep: {as: in-jig, with: plane}\n", "", "filter.yaml:13:34: `from: in-jig` names no network that stands before"),
    "unknown step": ("- de-embed", "- deembed", "filter.yaml:14:5: there is no step 'deembed'. Did you mean 'de-embed'?"),
    "circular name": ("from: in-jig", "from: filter", "filter.yaml:14:34: `from: filter` refers to itself. Put the step it needs before it."),
    "unknown name": ("from: filter", "from: nothing", "filter.yaml:16:13: `from: nothing` names no network that stands before this step. Standing here: in-jig, filter."),
    "duplicate key": ("title: Harm", "edition: 1\ntitle: Harm", "filter.yaml:3:1: says 'edition' twice; the first is at 2:1. Keep one of them."),
    "alias": ("title: Harm", "title: &a Harm", "filter.yaml:3:8: uses an anchor or alias."),
    "tab": ("title: Harm", "\ttitle: Harm", "filter.yaml:3:1: has a tab in the indentation. Indent with spaces."),
    "limit outside the sweep": ("338 MHz to 352 MHz", "338 MHz to 3 GHz", "rejection looks at 338 MHz to 3 GHz, but the sweep covers 5 MHz to 1.2 GHz"),
    "mask with a gap": (REJECTION, "- {trace: S21, mask: m.yaml, over: 100 MHz to 900 MHz}", "filter.yaml:20:44: mask m.yaml must cover 100 MHz to 900 MHz, but has no line from 100 MHz to 300 MHz."),
    "no such mask": (REJECTION, "- {trace: S21, mask: harmonic-filter-stp}", "there is no mask 'harmonic-filter-stp'. Did you mean 'harmonic-filter-stop'?"),
    "kit out of range": ("kit: n50-workshop", "kit: short.yaml", "filter.yaml:12:60: the sweep wide covers 5 MHz to 1.2 GHz, but kit n50-workshop is defined only for 100 kHz to 600 MHz."),
    "kit overdue": ("kit: n50-workshop", "kit: old.yaml", "2020-01-01"),
    "no such kit": ("kit: n50-workshop", "kit: n5-workshop", "filter.yaml:12:60: there is no kit 'n5-workshop'. Did you mean 'n50-workshop'?"),
    "sweep beyond everything": ("to: 1.2 GHz", "to: 7 GHz", "filter.yaml:10:27: sweep wide covers 5 MHz to 7 GHz, but the analyzer of workshop only 300 kHz to 6 GHz."),
    "too much power": ("power: -10 dBm", "power: 25 dBm", "filter.yaml:10:88: 25 dBm and a gain of 0 dB bring 25 dBm to a port that withstands 20 dBm. Lower the power"),
    "too much for the unit": ("withstands: {power: 30 dBm}", "withstands: {power: -20 dBm}", "-10 dBm"),
    "no such fixture": ("left: jig-left.s2p", "left: jig-lft.s2p", "filter.yaml:14:48: there is no fixture 'jig-lft.s2p'. Did you mean 'jig-left.s2p'?"),
}  # fmt: skip

HALVES = {
    "truncated": ("\n".join(ROWS[:100])[:-30] + "\n", "half.s2p:101:1: ends in the middle of a frequency: 8 of 9 numbers. The file is cut off."),
    "other impedance": (JIG.replace("R 50.0", "R 75.0"), "filter.yaml:14:48: half.s2p is given for 75 ohm, but the result it is taken out of for 50 ohm. Convert"),
    "other frequencies": ("\n".join(ROWS[:60]) + "\n", "filter.yaml:14:48: half.s2p covers 1 MHz to 285 MHz, but the sweep 5 MHz to 1.2 GHz. Use a file that reaches"),
    "too few frequencies": ("\n".join([*ROWS[:3], *ROWS[40:300:120], ROWS[-1]]) + "\n", "too few to fill in between"),
    "not a number": (JIG.replace(ROWS[50].split()[3], "nan"), "half.s2p:51:56: 'nan' is not a finite number. The reading failed there; read it again."),
    "no text": ("\x00\x01\x02", "half.s2p"),
    "empty": ("", "half.s2p:1:1: holds no data"),
    "one port": ("# Hz S RI R 50\n1e6 0 0\n2e9 0 0\n", "half.s2p:"),
    "gain": (flat("1.1"), "filter.yaml:14:48: half.s2p shows a gain of 0.83 dB; a fixture half has none. Measure it again."),
    "nothing through": (flat("1e-9"), "filter.yaml:14:48: half.s2p lets next to nothing through, so nothing behind it can be found."),
}  # fmt: skip

FILES = {
    "empty": (b"", "f.yaml:1:1: is empty. A file begins with its kind, such as `sequence: NAME`."),
    "10 MB": (b"# " + b"x" * 10_000_000, "f.yaml: is 10,000,002 bytes long, at most 1,000,000 are allowed."),
    "not UTF-8": ("a: Harm\u00f6nic".encode("latin-1"), "f.yaml:1:8: is not UTF-8 text (byte 0xF6). Save it as UTF-8."),
    "alias bomb": (b"a: &a [x,x]\nb: &b [*a,*a]\nc: [*b,*b]\n", "f.yaml:1:4: uses an anchor or alias."),
    "deep": (b"[" * 5000, "f.yaml:1:1001: is not YAML here"),
    "a word": (b"hello", "f.yaml:1:1: is "),
    "another kind": (KIT.encode(), "f.yaml:"),
}  # fmt: skip

BENCHES = {
    "dialect": ("whole-matrix", "whole-matrx", "b.yaml:8:14: there is no dialect 'whole-matrx'. Did you mean 'whole-matrix'?"),
    "rehearsal": ("rehearsal: workshop", "rehearsal: wrkshop", "b.yaml:4:12: there is no simulated bench 'wrkshop'"),
    "no rehearsal": ("rehearsal: workshop\n", "", "b.yaml:1:8: names no simulated bench. Add `rehearsal: NAME` to rehearse on it."),
    "residual": ("directivity: 42 dB", "directivty: 42 dB", "b.yaml:19:5: 'directivty' is no residual term; known are directivity,"),
    "residual unit": ("directivity: 42 dB", "directivity: 42", "b.yaml:19:"),
}  # fmt: skip

SERIALS = ["../HF-0001", "/etc/passwd", "HF-0001/..", "HF-1;*RST", "HF-0001\n*RST", ":SYST:PRES", "HF 0001", "", "-", "HF-0001\u202e", "x" * 65]  # fmt: skip


def refused(answer, words, tmp_path, code=2):
    assert (answer.code, answer.out) == (code, "")
    assert answer.err.startswith("benchrun: ")
    assert words in answer.err, answer.err
    assert "Traceback" not in answer.err
    assert not (tmp_path / "R").exists(), "nothing was begun, so nothing is left behind"


@pytest.mark.parametrize("what", list(SEQUENCE))
def test_sequence(cli, small_filter, tmp_path, what):
    old, new, words = SEQUENCE[what]
    assert small_filter.count(old) >= 1
    (tmp_path / "m.yaml").write_text(MASK)
    (tmp_path / "short.yaml").write_text(KIT.replace("100 kHz to 6 GHz", "100 kHz to 600 MHz"))
    (tmp_path / "old.yaml").write_text(KIT.replace("2031-06-30", "2020-01-01"))
    (tmp_path / "filter.yaml").write_text(small_filter.replace(old, new, 1))
    refused(cli("rehearse", "filter.yaml", "--records", "R", "--json"), words, tmp_path)
    refused(
        cli("run", "filter.yaml", "--bench", "workshop", "--unit", "HF-0001", "--records", "R"),
        words,
        tmp_path,
    )
    checked = cli("check", "filter.yaml")
    if "of workshop" not in words and "dBm" not in words:  # without a bench nothing is known of it
        assert (checked.code, checked.out) == (2, "")
        assert words in checked.err
        assert "1 file checked, " in checked.err


@pytest.mark.parametrize("what", list(HALVES))
def test_fixture(cli, small_filter, tmp_path, what):
    text, words = HALVES[what]
    (tmp_path / "half.s2p").write_text(text)
    (tmp_path / "filter.yaml").write_text(small_filter.replace("left: jig-left.s2p", "left: half.s2p"))
    refused(cli("rehearse", "filter.yaml", "--records", "R"), words, tmp_path)


@pytest.mark.parametrize("what", list(FILES))
def test_file(cli, tmp_path, what):
    raw, words = FILES[what]
    (tmp_path / "f.yaml").write_bytes(raw)
    refused(cli("rehearse", "f.yaml", "--records", "R"), words, tmp_path)
    refused(cli("rehearse", "filter.yaml", "--bench", "f.yaml", "--records", "R"), words, tmp_path)
    checked = cli("check", "filter.yaml", "f.yaml")
    if what != "another kind":
        assert (checked.code, checked.out) == (2, "")
        assert checked.err.startswith(words)
        assert checked.err.endswith("2 files checked, 1 problem\n")
    else:
        assert (checked.code, checked.err) == (0, "")


@pytest.mark.parametrize("what", list(BENCHES))
def test_bench(cli, tmp_path, what):
    old, new, words = BENCHES[what]
    assert old in BENCH
    (tmp_path / "b.yaml").write_text(BENCH.replace(old, new))
    refused(cli("rehearse", "filter.yaml", "--bench", "b.yaml", "--records", "R"), words, tmp_path)


@pytest.mark.parametrize("serial", SERIALS)
@pytest.mark.parametrize("more", [(), ("--unit", "HF-0001")])
def test_serial_that_is_none(cli, tmp_path, serial, more):
    words = f"serial number {serial!r} holds characters that no serial number may hold"
    refused(cli("rehearse", "filter.yaml", "--records", "R", *more, "--unit", serial), words, tmp_path)


@pytest.mark.parametrize("serial", ["HF-001", "HF-00011", "XX-0001", "hf-0001"])
def test_serial_that_does_not_fit(cli, tmp_path, serial):
    words = (
        f"serial number {serial!r} does not match the pattern 'HF-[0-9]{{4}}' of small-filter; read the label"
    )
    refused(cli("rehearse", "filter.yaml", "--records", "R", "--unit", serial), words, tmp_path)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (("rehearse", "filtr.yaml"), "there is no sequence 'filtr.yaml'"),
        (("rehearse", "harmonic-filtr"), "Did you mean 'harmonic-filter'?"),
        (("rehearse", "filter.yaml", "--bench", "nowhere"), "there is no bench 'nowhere'. Known by name: amplifier, workshop"),
        (("bench", "nowhere"), "there is no bench 'nowhere'"),
        (("keys", "make", "../x"), "'../x' is no name for a key"),
        (("keys", "make", "rehearsal"), "is the name of the key for rehearsals"),
        (("keys", "export", "nope"), "there is no key 'nope'"),
        (("keys", "trust", "nope.pem", "--label", "x"), "nope.pem: cannot be read"),
        (("keys", "trust", "filter.yaml", "--label", "x"), "PEM"),
        (("keys", "distrust", "12"), "is too short; give at least 8 digits"),
        (("run", "filter.yaml", "--bench", "workshop", "--unit", "HF-0001", "--unattended"), "needs 8 different connections (first short on port 1, then open on port 1), and nobody is there"),
    ],
)  # fmt: skip
def test_arguments(cli, tmp_path, arguments, words):
    refused(cli(*arguments), words, tmp_path)
    assert not (tmp_path / "records").exists()


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((), "Usage:"),
        (("rehears",), "there is no command 'rehears'. Did you mean 'rehearse'?"),
        (
            ("xyz",),
            "there is no command 'xyz'. There are audit, bench, check, keys, match, overnight, rehearse, resume, run",
        ),
        (("rehearse",), "Missing argument 'SEQUENCE'"),
        (("rehearse", "filter.yaml", "--sed", "1"), "No such option"),
        (("rehearse", "filter.yaml", "--seed", "-1"), "-1 is not in the range"),
        (("rehearse", "filter.yaml", "--seed", "x"), "'x' is not a valid integer"),
        (("rehearse", "filter.yaml", "--operator", ""), "a name is 1 to 80 printable characters"),
        (("rehearse", "filter.yaml", "--operator", "a\x1b[2J"), "a name is 1 to 80 printable characters"),
        (("run", "filter.yaml", "--unit", "HF-0001"), "Missing option '--bench'"),
        (("run", "filter.yaml", "--bench", "workshop"), "Missing option '--unit'"),
        (("audit",), "Missing argument 'RECORD...'"),
        (("check",), "name at least one file, or --schema"),
        (("check", "--schema", "nonsense"), "'nonsense' is not one of"),
    ],
)
def test_usage(cli, tmp_path, arguments, words):
    answer = cli(*arguments)
    assert (answer.code, answer.out) == (2, "")
    assert words in answer.err
    assert "Traceback" not in answer.err
    assert not (tmp_path / "records").exists()


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ("GPIB0::16::INSTR", "GPIB0::3::INSTR", "GPIB0::3::INSTR after 'open': VI_ERROR_RSRC_NFOUND"),
        ("GPIB0::16::INSTR", "nonsense", "nonsense after 'open': VI_ERROR_INV_RSRC_NAME"),
        ("GPIB0::16::INSTR", "GPIB0::17::INSTR\n    identity: {model: NA-2}", "is 'SIMULATED,NA-1,S0017,1.0', but "),
        ("dialect: whole-matrix", "dialect: one-reading\n    identity: {serial: S0017}", "'serial S0017'"),
    ],
)  # fmt: skip
def test_instrument_that_is_not_there_or_another(cli, tmp_path, old, new, words):
    (tmp_path / "b.yaml").write_text(BENCH.replace(old, new))
    answer = cli("rehearse", "filter.yaml", "--bench", "b.yaml", "--records", "R", "--json")
    assert (answer.code, answer.document["conclusion"]) == (3, "invalid")
    assert words in answer.document["reason"]
    assert words in answer.err
    assert cli("audit", answer.document["record"]).code == 0
    asked = cli("bench", "b.yaml", "--simulated")
    assert asked.code == 3
    assert words in asked.err


@pytest.mark.parametrize(("records", "words"), [("filter.yaml", "a file stands where a folder is needed"), ("filter.yaml/R", "a file stands where a folder is needed"), ("x" * 300, "the path is too long")])  # fmt: skip
def test_records_folder_that_is_none(cli, tmp_path, records, words):
    answer = cli("rehearse", "filter.yaml", "--records", records)
    refused(answer, words, tmp_path, code=5)
    assert "--records" in answer.err
