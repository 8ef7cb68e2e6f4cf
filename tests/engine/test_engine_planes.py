"""Whole runs whose planes move more than once, and whose kit was measured: record and audit hold it all."""

from __future__ import annotations

import numpy as np
import pytest

from benchrun.errors import InputError
from benchrun.paths import installed_sequences
from benchrun.record.keys import KeyStore
from benchrun.record.verify import verify
from benchrun.rf.kit import Standard
from benchrun.rf.touchstone import read, write
from benchrun.sequence.files import read as read_file
from benchrun.sequence.kit import KitFile

MOVES = """\
  - de-embed: {as: farther, from: filter, shift: {1: {delay: 20 ps, loss: 0.01 dB}, 2: {delay: 5 ps, away: true}}}
  - de-embed: {as: back, from: farther, shift: {1: {delay: 20 ps, loss: 0.01 dB, away: true}, 2: {delay: 5 ps}}}
  - de-embed: {as: again-in-jig, from: back, left: jig-left.s2p, right: jig-right.s2p, embed: true}
  - de-embed: {as: in-75, from: back, renormalise: [75 ohm, 60 + 10j ohm]}
  - de-embed: {as: in-50, from: in-75, renormalise: 50 ohm}
  - judge: {as: last, from: in-50, limits: [{figure: insertion loss, at: 169 MHz, at most: 0.6 dB}]}
"""  # noqa: E501 - a step a line


def matrix(record, name):
    return read(record.content(f"de-embedded/{name}.s2p"), f"{name}.s2p").s


def test_planes_go_forth_and_back_and_the_audit_goes_with_them(workplace, small_filter):
    w = workplace(small_filter + MOVES)
    answer = w.run()
    assert answer.code == 0, answer.document
    assert w.audit(w.records[-1]).code == 0
    record = verify(w.records[-1], KeyStore()).record
    unit = matrix(record, "filter")
    for name in ("back", "in-50"):
        assert np.max(np.abs(matrix(record, name) - unit)) < 1e-12
    (in_jig,) = (one.file for one in record.payload.results if one.step == "in-jig")
    found = read(record.content(in_jig), in_jig).s
    assert np.max(np.abs(matrix(record, "again-in-jig") - found)) < 1e-12
    assert np.max(np.abs(matrix(record, "farther") - unit)) > 0.01
    head = record.content("de-embedded/in-75.s2p").decode().splitlines()[1]
    assert head.startswith("! reference impedance of port 1: 75.0 +0.0j ohm; of port 2: 60.0 +10.0j ohm")
    first, last = (next(f for f in record.payload.figures if n in f.name) for n in ("insertion", "169 MHz"))
    assert first.uncertainty == pytest.approx(last.uncertainty, rel=0.2), "the variations went the same way"


def measured_kit(folder, last_hz=6e9, **changes):
    """The workshop's kit with its open given by a file in place of its model."""
    text = (installed_sequences() / "kits" / "n50-workshop.yaml").read_text()
    f = np.linspace(100e3, last_hz, 2001)
    kit = read_file(installed_sequences() / "kits" / "n50-workshop.yaml", KitFile).model.build()
    opened = kit.standards["open"]
    assert isinstance(opened, Standard)
    (folder / "open-014.s1p").write_bytes(write(f, opened.reflection(f)))
    first, last = text.index("  open:\n"), text.index("  load:\n")
    text = f"{text[:first]}  open: {{kind: open, file: open-014.s1p}}\n{text[last:]}"
    for old, new in changes.items():
        text = text.replace(old, new)
    (folder / "mine.yaml").write_text(text)
    return "mine.yaml"


def test_a_kit_with_a_measured_standard_is_kept_whole(workplace, small_filter, tmp_path):
    kit = measured_kit(tmp_path)
    w = workplace(small_filter.replace("kit: n50-workshop", f"kit: {kit}"))
    assert w.run().code == 0
    assert w.audit(w.records[-1]).code == 0
    measured = verify(w.records[-1], KeyStore()).record
    assert measured.payload.inputs[f"standard:{kit}/open-014.s1p"] == "inputs/standard-open-014.s1p"
    plain = workplace(small_filter)
    assert plain.run().code == 0
    models = verify(plain.records[-1], KeyStore()).record
    for one, two in zip(measured.payload.figures, models.payload.figures, strict=True):
        assert one.value == pytest.approx(two.value, rel=1e-6), "the file says what the model says"


def test_a_measured_standard_that_does_not_reach_is_told_before_the_run(workplace, small_filter, tmp_path):
    kit = measured_kit(tmp_path, last_hz=1e9)
    with pytest.raises(InputError, match="open was measured from 100 kHz to 1 GHz, but the kit promises"):
        workplace(small_filter.replace("kit: n50-workshop", f"kit: {kit}"))
    (tmp_path / "open-014.s1p").unlink()
    with pytest.raises(InputError, match=r"there is no standard 'open-014\.s1p'"):
        workplace(small_filter.replace("kit: n50-workshop", f"kit: {kit}"))


def test_an_overruled_kit_stands_in_the_record_with_its_reason(workplace, small_filter, tmp_path):
    kit = measured_kit(tmp_path, **{"due: 2031-06-30": "due: 2026-06-30"})
    text = small_filter.replace("kit: n50-workshop", f"kit: {kit}")
    with pytest.raises(InputError, match="was due for calibration on 2026-06-30"):
        workplace(text)
    reason = "Compared with the other kit this morning."
    w = workplace(text.replace(f"kit: {kit}", f'kit: {kit}, overrule: "{reason}"'))
    assert w.run().code == 0
    payload = verify(w.records[-1], KeyStore()).record.payload
    assert (payload.calibrations[0].overruled, payload.calibrations[0].kit_due) == (reason, "2026-06-30")
    (said,) = (e for e in w.events if "past its date" in getattr(e, "text", ""))
    assert reason in said.text
    assert said.weight == "warning"
