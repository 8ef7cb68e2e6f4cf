"""Touchstone examples of both versions, against what another reader made of them.

Data: shared/data/touchstone_v2; ref_parsed.npz was written by scikit-rf 2.2.0. Files of other than one or
two ports at one reference resistance, and bad ones, must be refused in words.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose

from benchrun.errors import InputError
from benchrun.rf.touchstone import read

FOLDER = Path(__file__).parents[3] / "shared" / "data" / "touchstone_v2"
pytestmark = pytest.mark.skipif(not FOLDER.is_dir(), reason="the open data lie beside the checkout; not here")

READ = {
    "v1_1port_ma.s1p": 50.0,
    "v1_2port_noise.s2p": 50.0,
    "v1_2port_ri.s2p": 50.0,
    "v2_2port_order_21_12.ts": 50.0,
    "v2_g_2port.ts": 1.0,
    "v2_h_2port.ts": 1.0,
    "v2_z_1port_ref20.ts": 20.0,
    "v2_z_1port_ref20_b.ts": 20.0,
}
REFUSED = {
    "bad_truncated_header_4port.ts": "'4' ports",
    "v1_4port_ma.s4p": r"is not named \.s1p or \.s2p",
    "v1_h_2port.s2p": r":\d+:\d+: holds H-parameters",
    "v1_z_1port_ref75.s1p": r":\d+:\d+: holds Z-parameters",
    "v2_2port_noise_ref50_25.ts": r"has its ports at \[25\. 50\.\] ohm",
    "v2_3port_dc_point_reference_per_line.ts": "'3' ports",
    "v2_4port_full.ts": "'4' ports",
    "v2_4port_lower_reference_split.ts": "'4' ports",
    "v2_4port_reference_next_line.ts": "'4' ports",
    "v2_mixed_mode_6port.ts": "mixed-mode",
    # The other reader lets this pass; the specification requires the keyword in version 2.
    "v2_z_1port.ts": r"has no \[Network Data\]",
}


def test_every_file_of_the_set_is_expected_here() -> None:
    files = {p.name for p in FOLDER.iterdir() if p.suffix in (".ts", ".s1p", ".s2p", ".s4p")}
    assert files == READ.keys() | REFUSED.keys()


@pytest.mark.parametrize(("name", "z0_ohm"), READ.items())
def test_what_is_plain_is_read_as_the_other_reader_does(name: str, z0_ohm: float) -> None:
    data = read((FOLDER / name).read_bytes(), name)
    key = name.replace(".", "_")
    with np.load(FOLDER / "ref_parsed.npz") as reference:
        assert_allclose(data.f_hz, reference[f"{key}__f"], rtol=1e-15)
        assert_allclose(data.s, reference[f"{key}__s"], rtol=1e-13, atol=1e-13)
    assert data.z0_ohm == z0_ohm


@pytest.mark.parametrize(("name", "words"), REFUSED.items())
def test_what_is_not_is_refused_in_words(name: str, words: str) -> None:
    with pytest.raises(InputError, match=words) as caught:
        read((FOLDER / name).read_bytes(), name)
    assert str(caught.value).startswith(name)


def test_the_order_trap() -> None:
    """Made-up values 111, 121, 112, 122: S21 is 121 and S12 is 112."""
    name = "v2_2port_order_21_12.ts"
    data = read((FOLDER / name).read_bytes(), name).two_port
    assert (data.s21[0], data.s12[0]) == (121.0, 112.0)


def test_a_noise_block_does_not_become_data() -> None:
    """Network points at 2 and 22 GHz; the noise points at 4 and 18 GHz are none of them."""
    name = "v1_2port_noise.s2p"
    assert_allclose(read((FOLDER / name).read_bytes(), name).f_hz, [2e9, 22e9])
