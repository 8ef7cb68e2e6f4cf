"""A night of rehearsals: 201 points, SOLT, de-embedding, 12 limits, signed records; two workers against one.

Usage: python tests/benchmarks/night.py [RUNS]
"""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path

from benchrun.engine.overnight import Settings, overnight
from benchrun.record.keys import KeyStore
from benchrun.sequence.files import read
from benchrun.sequence.night import Night

SEQUENCES = Path(__file__).parents[2] / "sequences"
TARGET_S, TARGET_GAIN = 120.0, 1.8

MORE = """\
        - {figure: insertion loss, over: 100 MHz to 150 MHz, at most: 0.6 dB}
        - {figure: rejection, over: 400 MHz to 500 MHz, at least: 45 dB}
        - {figure: return loss, port: 1, over: 150 MHz to 160 MHz, at least: 12 dB}
        - {figure: return loss, port: 2, over: 150 MHz to 160 MHz, at least: 12 dB}
"""


def night(runs: int, workers: int, folder: Path) -> tuple[float, int]:
    """Seconds, and how many did not pass."""
    text = (SEQUENCES / "harmonic-filter.yaml").read_text().replace("points: 801", "points: 201")
    text = text.replace("aperture: 4 MHz", "aperture: 6 MHz")  # 201 points are further apart
    text = text.replace("      limits:\n", "      limits:\n" + MORE)
    (folder / "sequence.yaml").write_text(text)
    (folder / "night.yaml").write_text(
        f"night: study\nedition: 1\ntitle: Study\nworkers: {workers}\njobs:\n"
        f"  - {{job: filters, sequence: sequence.yaml, bench: workshop, units: [HF-0001], "
        f"repeats: {runs}, rehearsal: {{}}}}\n"
    )
    records = folder / f"records-{workers}"
    result = overnight(read(folder / "night.yaml", Night), Settings(records, "study"))
    units = [unit for answer in result.answers["filters"] for unit in answer["units"]]
    return result.seconds, runs - sum(unit["conclusion"] == "pass" for unit in units)


def main(runs: int) -> int:
    """Print the figures; exit code 1 if a target is missed."""
    with tempfile.TemporaryDirectory() as name:
        os.environ["BENCHRUN_HOME"] = str(Path(name) / "home")
        KeyStore().rehearsal()
        two, bad_two = night(runs, 2, Path(name))
        one, bad_one = night(runs, 1, Path(name))
    scaled = two * 1000 / runs
    print(f"{runs} runs: {two:.1f} s with two workers ({scaled:.0f} s for 1000), {one:.1f} s with one")
    print(f"one worker takes {one / two:.2f} times as long; did not pass: {bad_two} and {bad_one}")
    print(f"targets: at most {TARGET_S:g} s for 1000 runs, at least {TARGET_GAIN:g} times")
    return int(scaled > TARGET_S or one / two < TARGET_GAIN or bad_one + bad_two > 0)


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 1000))
