"""What a user would write by hand for the same job: PyVISA, scikit-rf, json, and nothing of this project.

Usage: plain_script.py RESOURCE POINTS FIXTURE_LEFT FIXTURE_RIGHT FOLDER

It asks for each connection on standard error and waits for Enter, as :mod:`whole_process` expects.
"""

import json
import pathlib
import sys

import numpy as np
import pyvisa
import skrf as rf

resource, points, left, right, folder = sys.argv[1:]
points = int(points)
vna = pyvisa.ResourceManager("@py").open_resource(resource, read_termination="\n", write_termination="\n")
vna.timeout = 20000
vna.query("*RST;*CLS;:FORM REAL,64;:FORM:BORD NORM;*OPC?")
vna.query(
    f"SENS:FREQ:STAR 5E6;STOP 1.2E9;:SENS:SWE:POIN {points};:SENS:SWE:SPAC LOG;:SENS:BAND 1E3;"
    ":SOUR:POW -10;:OUTP ON;*OPC?"
)
frequency = rf.Frequency.from_f(np.geomspace(5e6, 1.2e9, points), unit="hz")


def read(what):
    print(f"  Connect {what}, then Enter ", end="", file=sys.stderr, flush=True)
    sys.stdin.readline()
    vna.query("INIT;*OPC?")
    values = vna.query_binary_values("TRAC? MATRIX", datatype="d", is_big_endian=True, container=np.array)
    v = values.reshape(points, 4, 2)
    v = v[:, :, 0] + 1j * v[:, :, 1]
    return rf.Network(frequency=frequency, s=v[:, [0, 2, 1, 3]].reshape(points, 2, 2))


def line(delay, loss):
    f = frequency.f
    root = np.sqrt(f / 1e9)
    a = loss * delay / 100 * root
    return a + 1j * (2 * np.pi * f * delay + a), 50 + (1 - 1j) * loss / (4 * np.pi * f) * root


def offset(z):
    gl, zc = line(30e-12, 1.3e9)
    zin = zc * (z + zc * np.tanh(gl)) / (zc + z * np.tanh(gl))
    return (zin - 50) / (zin + 50)


w = 2j * np.pi * frequency.f
f = frequency.f
short = offset(w * (2e-12 - 100e-24 * f + 2e-33 * f**2 - 0.01e-42 * f**3))
open_ = offset(1 / (w * (50e-15 - 300e-27 * f + 20e-36 * f**2 + 0.1e-45 * f**3)))
load = np.zeros(points, complex)


def both(a, b):
    s = np.zeros((points, 2, 2), complex)
    s[:, 0, 0], s[:, 1, 1] = a, b
    return rf.Network(frequency=frequency, s=s)


raw = {(name, port): read(f"{name} on port {port}") for port in (1, 2) for name in ("short", "open", "load")}
measured = [both(raw[n, 1].s[:, 0, 0], raw[n, 2].s[:, 1, 1]) for n in ("short", "open", "load")]
measured.append(read("thru from port 1 to port 2"))
thru = np.zeros((points, 2, 2), complex)
thru[:, 0, 1] = thru[:, 1, 0] = 1
ideals = [both(x, x) for x in (short, open_, load)] + [rf.Network(frequency=frequency, s=thru)]
calibration = rf.calibration.TwelveTerm(measured=measured, ideals=ideals, n_thrus=1)
corrected = calibration.apply_cal(read("jig-left, unit, jig-right from port 1 to port 2"))
halves = [rf.Network(x).interpolate(frequency) for x in (left, right)]
unit = halves[0].inv ** corrected ** halves[1].inv
vna.query("OUTP OFF;*OPC?")
vna.close()

places = {"11": (0, 0), "21": (1, 0), "22": (1, 1)}
db = {n: 20 * np.log10(np.abs(unit.s[:, i, j])) for n, (i, j) in places.items()}


def band(values, low, high):
    return values[(f >= low) & (f <= high)]


peak = int(np.argmax(db["21"]))
below = peak + int(np.argmax(db["21"][peak:] < db["21"].max() - 3))
delay = -np.gradient(np.unwrap(np.angle(unit.s[:, 1, 0])), f) / 2 / np.pi
limits = {
    "loss": (-band(db["21"], 160e6, 175e6).min(), "at most", 0.6),
    "corner low": (f[below], "at least", 195e6),
    "corner high": (f[below], "at most", 225e6),
    "rejection": (-band(db["21"], 338e6, 352e6).max(), "at least", 45),
    "return loss 1": (-band(db["11"], 160e6, 175e6).max(), "at least", 15),
    "return loss 2": (-band(db["22"], 160e6, 175e6).max(), "at least", 15),
    "ripple": (np.ptp(band(db["21"], 20e6, 175e6)), "at most", 0.6),
    "delay variation": (np.ptp(band(delay, 160e6, 175e6)), "at most", 2.5e-9),
    "stop band": (band(db["21"], 338e6, 1.1e9).max(), "at most", -45),
    "pass band": (band(db["21"], 20e6, 150e6).min(), "at least", -0.5),
}
verdict = {n: bool(v <= x if side == "at most" else v >= x) for n, (v, side, x) in limits.items()}
out = pathlib.Path(folder)
out.mkdir(parents=True, exist_ok=True)
corrected.write_touchstone(str(out / "corrected"))
unit.write_touchstone(str(out / "unit"))
report = {
    n: {"value": float(v), "limit": x, "side": s, "pass": verdict[n]} for n, (v, s, x) in limits.items()
}
(out / "result.json").write_text(json.dumps(report))
print(json.dumps({"pass": all(verdict.values())}))
