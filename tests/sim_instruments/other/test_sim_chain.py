"""Generator, part, spectrum analyzer: carrier, compression, products, noise, the analyzer's own distortion.

Definitions of P1dB, intercepts and their slopes: Pozar, Microwave Engineering, 10.3 (from memory); noise:
facts.md 9.5; mismatch: EA-4/02 by facts.md 9.5.
"""

from __future__ import annotations

import numpy as np
import pytest
import skrf

from sim_instruments.instruments.signals import products

F0 = 1e8


@pytest.fixture
def chain(make_bench, amplifier, generator, analyzer):
    """A perfect generator on port 3, a perfect analyzer on port 4, an amplifier, pads."""

    def make(items=("unit-amp",), two=False, **mixer):
        bench = make_bench(**{"unit-amp": amplifier, "pad": {"kind": "pad", "loss": "10 dB"}})
        sources = [bench.add(generator) for _ in range(2 if two else 1)]
        seen = bench.add(analyzer, mixer={**analyzer["mixer"], **mixer})
        bench.world.connect([(list(items), [3, 4])])
        for client in sources:
            client.write("FREQ 100 MHZ;:POW -30;:OUTP ON")
        seen.write("POW:RANG 30;ATT 0;:DET SAMP;:SWE:POIN 11")
        return bench, sources, seen

    return make


def _level(seen, f_hz: float) -> float:
    """Of a tone: narrow, and average detector."""
    seen.write(f"FREQ:CENT {f_hz};SPAN 0;:BAND 100 HZ;:DET AVER")
    return float(np.mean(seen.trace()))


def _sweep_power(chain, levels, f_hz, two=False):
    _, sources, seen = chain(two=two)
    if two:
        sources[1].write("FREQ 101 MHZ")
    read = []
    for level in levels:
        for source in sources:
            source.write(f"POW {level}")
        read.append(_level(seen, f_hz))
    return np.array(read)


def test_gain_of_the_carrier(chain) -> None:
    """-30 dBm through 16 dB."""
    _, _, seen = chain()
    assert _level(seen, F0) == pytest.approx(-14.0, abs=0.02)


def test_p1db_is_where_gain_is_down_by_one_decibel(chain) -> None:
    """At 5 dBm in, 20 dBm come out instead of 21."""
    small, at = _sweep_power(chain, (-30.0, 5.0), F0)
    assert at == pytest.approx(20.0, abs=0.03)
    assert (small + 30) - (at - 5) == pytest.approx(1.0, abs=0.03)


@pytest.mark.parametrize(
    ("f_hz", "slope", "two"), [(F0, 1, False), (2 * F0, 2, False), (3 * F0, 3, False), (99e6, 3, True)]
)
def test_slopes_of_the_orders(chain, f_hz: float, slope: int, two: bool) -> None:
    """Well below compression, 1 dB more gives 1, 2 or 3 dB more."""
    low, high = _sweep_power(chain, (-15.0, -12.0), f_hz, two)
    assert (high - low) / 3 == pytest.approx(slope, abs=0.03)


def test_third_order_product_by_the_intercept(chain) -> None:
    """3 P - 2 IP3 with IP3 = 32 dBm at the output."""
    carrier = _sweep_power(chain, (-14.0,), F0, two=True)[0]
    product = _sweep_power(chain, (-14.0,), 99e6, two=True)[0]
    assert product == pytest.approx(3 * carrier - 64, abs=0.03)


def test_harmonics_against_two_tone_products() -> None:
    """Power series: second-order product 6.02 dB over the second harmonic, third 9.54 dB over the third."""
    f, a = products(np.array([1e8, 1.3e8]), np.array([1.0 + 0j, 1.0 + 0j]), 40.0, 30.0)
    level = {round(x / 1e6): 20 * np.log10(abs(w)) for x, w in zip(f, a, strict=True)}
    assert level[230] == level[30] == pytest.approx(-40.0)
    assert level[200] == pytest.approx(-40 - 6.0206)
    assert level[70] == level[160] == pytest.approx(-60.0)
    assert level[300] == pytest.approx(-60 - 9.5424)


def test_products_match_a_power_series_in_time() -> None:
    """A sampled two-tone signal through x + a x^2 - b x^3: every product where and as strong as stated."""
    n, k1, k2, a1, a2, second, third = 4096, 100, 130, 1e-2, 0.7e-2, 0.03, 0.02
    t = np.arange(n) / n
    x = a1 * np.cos(2 * np.pi * k1 * t) + a2 * np.cos(2 * np.pi * k2 * t)
    spectrum = np.abs(np.fft.rfft(x + second * x**2 - third * x**3)) * 2 / n
    # Amplitude a b c2 at the sum, 3/4 a^2 b c3 at the third-order product.
    ip2, ip3 = -20 * np.log10(second), -10 * np.log10(0.75 * third)
    f, a = products(np.array([k1, k2], float), np.array([a1, a2], complex), ip2, ip3)
    for place, wave in zip(f[2:], a[2:], strict=True):
        assert spectrum[round(place)] == pytest.approx(abs(wave), rel=1e-6)


def test_a_weak_tone_is_compressed_by_a_strong_one_twice_as_hard(chain) -> None:
    """Cubic nonlinearity: 10 dB below P1dB's drive the strong tone loses x dB, the weak one 2 x."""
    _, sources, seen = chain(two=True)
    sources[1].write("FREQ 101 MHZ;:POW -60")
    small = _level(seen, F0), _level(seen, 101e6)
    sources[0].write("POW -3")
    strong, weak = _level(seen, F0) - small[0] - 27.0, _level(seen, 101e6) - small[1]
    assert weak < strong < 0
    alone = _level(seen, F0)
    sources[0].write("POW 0.0103")  # 3.01 dB more: what twice the power does to the strong tone itself
    assert weak == pytest.approx(_level(seen, F0) - alone - 3.0103 + strong, abs=0.02)


def test_friis_through_pad_and_amplifier(chain) -> None:
    """A pad of loss L ahead of F: F L in all; the output density is kT0 F L G (facts.md 9.5)."""
    bench, _, _ = chain(("pad", "unit-amp"))
    bench.world.temperature_c = 290.0 - 273.15
    density = 10 * np.log10(bench.world.arriving(4).noise(np.array([F0])))
    assert density[0] == pytest.approx(-173.975 + 3.0 + 10.0 + 6.0, abs=0.03)


def test_a_pad_behind_the_amplifier(chain) -> None:
    """F + (L - 1)/G with gain G/L."""
    bench, _, _ = chain(("unit-amp", "pad"))
    g, f, loss = 10**1.6, 10**0.3, 10.0
    density = 10 * np.log10(bench.world.arriving(4).noise(np.array([F0])))
    total = f + (loss - 1) / g
    assert density[0] == pytest.approx(-173.975 + 10 * np.log10(total * g / loss), abs=0.03)


def test_the_floor_is_ktb_and_noise_figure_and_attenuation(chain) -> None:
    """-173.975 + 10 log B + NF + attenuation, B the noise bandwidth (facts.md 9.5)."""
    _, sources, seen = chain(("thru",))
    sources[0].write("OUTP OFF")
    seen.write("FREQ:CENT 300 MHZ;SPAN 10 MHZ;:SWE:POIN 1001;:DET AVER")
    for rbw, attenuation in ((1e3, 0), (1e4, 0), (1e5, 0), (1e4, 20)):
        floor = 10 * np.log10(np.mean(10 ** (seen.trace(f"BAND {rbw};:POW:ATT {attenuation}") / 10)))
        expected = -173.975 + 10 * np.log10(1.0645 * rbw) + 20.0 + attenuation
        assert floor == pytest.approx(expected, abs=0.15)


def test_the_analyzers_own_harmonic_depends_on_the_mixer_level(chain) -> None:
    """2 P - intercept at the mixer: 10 dB more attenuation gives 10 dB less; a true harmonic would stay."""
    _, sources, seen = chain(("thru",), **{"second harmonic intercept": 40, "noise figure": 0})
    sources[0].write("POW 0")
    own = []
    for attenuation in (0, 10):
        seen.write(f"POW:ATT {attenuation}")
        own.append(_level(seen, 2 * F0))
    assert own[0] == pytest.approx(2 * 0.0 - 40.0, abs=0.03)
    assert own[0] - own[1] == pytest.approx(10.0, abs=0.05)


def test_the_analyzers_own_intermodulation(chain) -> None:
    """Third order: 10 dB more attenuation gives 20 dB less."""
    _, sources, seen = chain(("thru",), two=True, **{"third order intercept": 15, "noise figure": 0})
    for source in sources:
        source.write("POW 0")
    sources[1].write("FREQ 101 MHZ")
    own = []
    for attenuation in (0, 10):
        seen.write(f"POW:ATT {attenuation}")
        own.append(_level(seen, 99e6))
    assert own[0] == pytest.approx(-30.0, abs=0.03)
    assert own[0] - own[1] == pytest.approx(20.0, abs=0.1)


@pytest.mark.parametrize(("attenuation", "overloaded"), [(0, 1), (10, 0)])
def test_overload_is_reported(chain, attenuation: int, overloaded: int) -> None:
    """Mixer level above what it stands: bit 3 of QUEStionable, until a sweep without."""
    _, sources, seen = chain(("thru",), overload=0)
    sources[0].write("POW 5")
    seen.write(f"POW:ATT {attenuation}")
    _level(seen, F0)
    assert int(seen.ask("STAT:QUES:COND?")) >> 3 & 1 == overloaded


def test_far_above_the_reference_level_the_trace_clips(chain) -> None:
    """The converter's headroom is 3 dB: the reading stays there, and bit 3 says so."""
    _, sources, seen = chain(("thru",))
    sources[0].write("POW 0")
    seen.write("POW:RANG -20")
    assert _level(seen, F0) == pytest.approx(-17.0)
    assert int(seen.ask("STAT:QUES:COND?")) & 8


def test_mismatch_at_both_ends_stays_within_its_limits(make_bench, generator, analyzer) -> None:
    """0.1 and 0.1: between -0.0873 and +0.0864 dB, and both nearly reached over frequency."""
    bench = make_bench(line={"kind": "line", "sections": [{"delay": "20 ns"}]})
    source, seen = bench.add(generator, match=20), bench.add(analyzer, match=20)
    bench.world.connect([(["line"], [3, 4])])
    source.write("POW 0;:OUTP ON")
    off = []
    for f in np.linspace(100e6, 130e6, 31):
        source.write(f"FREQ {f}")
        off.append(20 * np.log10(abs(bench.world.arriving(4).wave[0])))
    assert -0.0873 - 2e-3 < min(off) < -0.07
    assert 0.07 < max(off) < 0.0864 + 2e-3
    assert seen.errors() == []


@pytest.mark.parametrize("ports", [[3, 4], [4, 3]])
def test_the_linear_way_agrees_with_scikit_rf(make_bench, amplifier, generator, analyzer, ports) -> None:
    """Bad matches at both ends and within: source, parts and load cascaded as networks (scikit-rf)."""
    line = {"kind": "line", "sections": [{"delay": "3 ns", "impedance": 75}]}
    amplifier.update({"input": 6, "output": 8, "reverse": 20})
    bench = make_bench(line=line, pad={"kind": "pad", "loss": "1 dB"}, amp=amplifier)
    bench.add(generator, match=6)
    bench.add(analyzer, match=8)
    world = bench.world
    world.torque_wrench = False
    row = ["pad", "line", "amp", "line"]
    world.connect([(row if ports == [3, 4] else row[::-1], ports)])
    f = np.array([123e6])
    source, load = np.zeros((1, 2, 2), complex), np.zeros((1, 2, 2), complex)
    source[0, 1], load[0, :, 0] = [1.0, world.outlets[3].gamma(f)[0]], [world.outlets[4].gamma(f)[0], 1.0]
    inner = skrf.Network(f=f, s=world.path(3, 4, f), z0=50, f_unit="Hz")
    whole = skrf.Network(f=f, s=source, z0=50, f_unit="Hz") ** inner
    expected = (whole ** skrf.Network(f=f, s=load, z0=50, f_unit="Hz")).s[0, 1, 0]
    # -60 dBm: too low to compress.
    world.outlets[3].sources[0].frequency, world.outlets[3].sources[0].power = 123e6, -60.0
    world.outlets[3].sources[0].output = True
    assert world.arriving(4).wave[0] * 1e3 == pytest.approx(expected, rel=1e-6)


def test_phase_noise_falls_by_20_db_a_decade(chain) -> None:
    """-90 dBc/Hz at 10 kHz, -110 at 100 kHz, in a bandwidth of 1 kHz (common practice)."""
    _, sources, seen = chain(("thru",), **{"phase noise": -90, "noise figure": 0})
    sources[0].write("POW 0")
    seen.write("FREQ:CENT 100 MHZ;SPAN 400 KHZ;:BAND 1 KHZ;:DET AVER;:SWE:POIN 401;:SWE:TIME 100")
    level = seen.trace()
    for away, expected in ((20, -90.0), (100, -110.0)):  # points are 1 kHz apart
        beside = np.mean(10 ** (level[200 + away : 203 + away] / 10))
        fallen = 20 * np.log10((away + 1) / (10 if away == 20 else 100))
        assert 10 * np.log10(beside) == pytest.approx(expected + 30.27 - fallen, abs=0.2)


def test_the_analyzers_own_compression(chain) -> None:
    """1 dB low where the mixer meets its compression level; right with attenuation (definition of P1dB)."""
    _, sources, seen = chain(("thru",), compression=5)
    sources[0].write("POW 5")
    assert _level(seen, F0) == pytest.approx(4.0, abs=0.02)
    seen.write("POW:ATT 30")
    assert _level(seen, F0) == pytest.approx(5.0, abs=0.02)


def test_backwards_through_an_amplifier(chain) -> None:
    """Isolation, no gain."""
    bench, _, seen = chain()
    bench.world.connect([(["unit-amp"], [4, 3])])
    assert _level(seen, F0) == pytest.approx(-30 - 80, abs=0.5)
