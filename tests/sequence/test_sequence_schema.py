"""The exported JSON Schema, judged by an independent validator (Draft 2020-12)."""

from __future__ import annotations

import json
import re

import jsonschema
import pytest

from benchrun.errors import InputError
from benchrun.quantity import Dimension, parse
from benchrun.sequence.fields import _schema
from benchrun.sequence.files import KINDS, kind_of, load_model
from benchrun.sequence.loading import load
from benchrun.sequence.schema import keys_at, schema

FOLDERS = {"sequence": "", "bench": "benches", "kit": "kits", "mask": "masks"}


def as_editor_sees(raw: bytes):
    """What an editor hands its validator: keys are text."""
    return json.loads(json.dumps(load(raw, "f.yaml").data))


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_the_schema_is_a_schema(kind):
    made = schema(KINDS[kind])
    assert made["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    jsonschema.Draft202012Validator.check_schema(made)
    assert json.loads(json.dumps(made)) == made


@pytest.mark.parametrize("kind", sorted(KINDS))
def test_installed_files_fit_the_schema(kind, installed):
    paths = sorted((installed / FOLDERS[kind]).glob("*.yaml"))
    assert paths
    validator = jsonschema.Draft202012Validator(schema(KINDS[kind]))
    for path in paths:
        document = load(path.read_bytes(), path.name)
        assert kind_of(document) == kind
        assert [e.message for e in validator.iter_errors(as_editor_sees(document.raw))] == []


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("from: 5 MHz", "from: 5"),
        ("from: 5 MHz", "from: 5 dB"),
        ("power: -10 dBm", "power: -10"),
        ("160 MHz to 175 MHz", "160 MHz"),
        ("160 MHz to 175 MHz", "160 to 175 MHz"),
        ("bandwidth:", "bandwith:"),
        ("- de-embed:", "- deembed:"),
        ("figure: insertion loss", "figure: insertion los"),
        ("method: SOLT", "method: trl"),
        ("edition: 1", "edition: 2"),
        ("title: Demo\n", ""),
        ("points: 801", "points: many"),
        ("trace: S21", "trace: S31"),
        ("sequence: demo", "sequence: ../demo"),
        ("  wide:", "  Wide:"),
    ],
)
def test_typical_slips_do_not_fit_the_schema(good, old, new):
    validator = jsonschema.Draft202012Validator(schema(KINDS["sequence"]))
    assert validator.is_valid(as_editor_sees(good.encode()))
    changed = good.replace(old, new)
    assert changed != good
    assert not validator.is_valid(as_editor_sees(changed.encode()))


@pytest.mark.parametrize("bound", ["1.5", '"1.5"', "2"])
def test_a_plain_ratio_fits_both_schema_and_model(good, load_text, bound):
    text = good.replace("insertion loss, over", "VSWR, over").replace("0.45 dB", bound)
    load_text(text)
    assert jsonschema.Draft202012Validator(schema(KINDS["sequence"])).is_valid(as_editor_sees(text.encode()))


@pytest.mark.parametrize("rule", ["simple", "{guard band: 1 U}", "{non-binary: 0.5 U}"])
def test_rules_fit_both_schema_and_model(good, load_text, rule):
    text = good.replace("from: filter\n", f"from: filter\n      rule: {rule}\n")
    load_text(text)
    assert jsonschema.Draft202012Validator(schema(KINDS["sequence"])).is_valid(as_editor_sees(text.encode()))


def test_ports_belong_to_one_instrument(installed, load_text):
    text = (installed / "benches" / "workshop.yaml").read_text()
    with pytest.raises(InputError, match=r"port 3 of the analyzer .*has ports 1 and 2"):
        load_model(text.replace("      2: {conn", "      3: {conn").encode(), "bench.yaml", KINDS["bench"])
    other = text.replace(
        "instruments:\n",
        "instruments:\n  generator:\n    resource: GPIB0::20::INSTR\n    dialect: standard-generator\n"
        "    ports:\n      2: {withstands: {power: 20 dBm}}\n",
    )
    with pytest.raises(InputError, match="port 2 of the generator"):
        load_model(other.encode(), "bench.yaml", KINDS["bench"])


@pytest.mark.parametrize("port", ["1", "0", "x"])
def test_ports_of_a_bench_are_named_alike(installed, load_text, port):
    text = (
        (installed / "benches" / "workshop.yaml")
        .read_text()
        .replace("      2: {conn", f"      {port}: {{conn")
    )
    text = text.replace("      1: {conn", "      2: {conn", 1) if port == "1" else text
    fits = jsonschema.Draft202012Validator(schema(KINDS["bench"])).is_valid(as_editor_sees(text.encode()))
    assert fits is (port == "1")


QUANTITIES = [
    (Dimension.FREQUENCY, ["169.4 MHz", "1e6 Hz", ".5 GHz", "5MHz"], ["5", "5 dB", "MHz", "5 mhz"]),
    (Dimension.TIME, ["8 h", "20 ms", "3 min", "1 d", "2 sec"], ["8 kh", "8 kmin", "8"]),
    (Dimension.IMPEDANCE, ["50 ohm", "1 kohm", "50 Ω"], ["50", "50 R"]),
    (Dimension.POWER, ["-10 dBm", "+3.5 dBm"], ["-10 dB", "1 mdBm", "-10"]),
    (Dimension.CAPACITANCE, ["50 fF", "1 µF"], ["50 fH"]),
]  # fmt: skip


@pytest.mark.parametrize(("dimension", "right", "wrong"), QUANTITIES)
def test_the_pattern_of_a_quantity_agrees_with_its_reader(dimension, right, wrong):
    pattern = _schema(dimension).json_schema["pattern"]
    for text in right:
        parse(text, dimension)
        assert re.search(pattern, text), text
    for text in wrong:
        assert not re.search(pattern, text), text
        with pytest.raises(ValueError, match=re.escape(repr(text))):
            parse(text, dimension)


def test_a_schema_handed_out_is_the_callers_own():
    schema(KINDS["mask"])["properties"].clear()
    assert "lines" in schema(KINDS["mask"])["properties"]


def test_keys_at_any_place(good):
    data = load(good.encode(), "f.yaml").data
    assert "points" in keys_at(KINDS["sequence"], data, ("sweeps", "wide"))
    assert "kit" in keys_at(KINDS["sequence"], data, ("steps", 0, "calibrate"))
    assert {"at most", "aperture"} <= set(
        keys_at(KINDS["sequence"], data, ("steps", 3, "judge", "limits", 0))
    )
    assert keys_at(KINDS["sequence"], data, ("steps", 9, "nothing")) == []
