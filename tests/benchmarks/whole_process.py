"""How much the framework costs: ``benchrun run`` against a plain script, whole processes, side by side.

Both talk to the same simulated analyzer through a TCP socket and are served by the same hands: this script
reads each request to connect something, does it in the simulated world, and answers with Enter. The two take
turns, so that whatever else the machine does meets both alike; the median of the ratios of neighbours counts.

Usage: python tests/benchmarks/whole_process.py [ROUNDS]
"""

from __future__ import annotations

import json
import os
import re
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from sim_instruments.bench import load_bench
from sim_instruments.doors.socket import SocketDoor
from sim_instruments.world import World

HERE = Path(__file__).parent
SEQUENCES = HERE.parents[1] / "sequences"
TARGET = 1.5


def attend(command: list[str], world: World, environment: dict[str, str]) -> tuple[float, dict[str, object]]:
    """Run a process, connect what it asks for, and give its wall time and its JSON answer."""
    start = time.perf_counter()
    process = subprocess.Popen(
        command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment
    )
    assert process.stdin is not None
    assert process.stdout is not None
    assert process.stderr is not None
    said = b""
    while piece := os.read(process.stderr.fileno(), 4096):
        said += piece
        while match := re.search(rb"Connect (.+?), then Enter[^\n]*? (?=$|\s)", said):
            connect(world, match[1].decode())
            said = said[match.end() :]
            process.stdin.write(b"\n")
            process.stdin.flush()
    answer = process.stdout.read()
    if process.wait() not in (0,):
        sys.exit(f"{command[:3]} ended with {process.returncode}: {said.decode()}")
    return time.perf_counter() - start, json.loads(answer)


def connect(world: World, words: str) -> None:
    """Hands that understand a hook-up in words."""
    words = re.sub(r"unit \S+?(?=,|$)", "unit", words)
    chain, between, ports = re.fullmatch(r"(.+?) (on|from) port (.+)", words).groups()  # type: ignore[union-attr]
    numbers = [int(n) for n in re.findall(r"\d", ports)] if between == "from" else [int(ports)]
    world.connect([(chain.split(", "), numbers)])


def main(rounds: int) -> int:
    """Print the table; exit code 1 if a ratio is above the target."""
    worst = 0.0
    print(f"{'points':>7} {'script, ms':>11} {'benchrun, ms':>13} {'ratio':>6}", end="   ")
    print(f"(medians of {rounds} pairs)", flush=True)
    for points in (201, 1601):
        with tempfile.TemporaryDirectory() as name:
            ratio, script, ours = measure(points, rounds, Path(name))
        worst = max(worst, ratio)
        print(f"{points:>7} {script * 1e3:>11.0f} {ours * 1e3:>13.0f} {ratio:>6.2f}")
    print(f"target: at most {TARGET}")
    return int(worst > TARGET)


def measure(points: int, rounds: int, folder: Path) -> tuple[float, float, float]:
    """Median ratio, and both median times in seconds."""
    bench = load_bench("workshop", 1)
    bench.world.offer("HF-0001")
    environment = {**os.environ, "BENCHRUN_HOME": str(folder / "home")}
    # An installed package comes compiled; a checkout is compiled in the first round, unless this forbids it.
    environment.pop("PYTHONDONTWRITEBYTECODE", None)
    fixtures = [str(SEQUENCES / "fixtures" / f"jig-{side}.s2p") for side in ("left", "right")]
    with SocketDoor(bench.instruments["GPIB0::16::INSTR"]) as door:
        text = (SEQUENCES / "benches" / "workshop.yaml").read_text()
        text = text.replace("GPIB0::16::INSTR", door.resource)
        text = text.replace("dialect:", 'library: "@py"\n    dialect:', 1)
        (folder / "bench.yaml").write_text(text)
        text = (SEQUENCES / "harmonic-filter.yaml").read_text().replace("points: 801", f"points: {points}")
        text = text.replace("aperture: 4 MHz", "aperture: 6 MHz")  # 201 points are further apart
        (folder / "sequence.yaml").write_text(text)
        script = [sys.executable, str(HERE / "plain_script.py"), door.resource, str(points), *fixtures]
        script.append(str(folder / "plain"))
        ours = [
            str(Path(sys.executable).with_name("benchrun")),
            "run",
            str(folder / "sequence.yaml"),
            "--json",
        ]
        ours += [
            "--bench",
            str(folder / "bench.yaml"),
            "--unit",
            "HF-0001",
            "--records",
            str(folder / "records"),
        ]
        for command in (script, ours):
            attend(command, bench.world, environment)  # fills caches of the disk, makes the rehearsal key
        pairs = []
        for _ in range(rounds):
            first, _ = attend(script, bench.world, environment)
            second, answer = attend(ours, bench.world, environment)
            assert answer["conclusion"] == "pass", answer
            pairs.append((first, second))
    return (
        statistics.median(b / a for a, b in pairs),
        statistics.median(a for a, _ in pairs),
        statistics.median(b for _, b in pairs),
    )


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 9))
