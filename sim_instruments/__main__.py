"""``python -m sim_instruments``: serve a simulated bench, or look at it."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from typing import TextIO

__all__ = ["main"]


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(prog="python -m sim_instruments", description=__doc__)
    actions = parser.add_subparsers(dest="action", required=True, metavar="serve | look")
    common = argparse.ArgumentParser(add_help=False)
    common.add_argument("bench", metavar="BENCH", help="its name, or the path of its .yaml file")
    common.add_argument("--seed", type=int, default=1, metavar="N", help="of everything random (1)")
    common.add_argument(
        "--do",
        action="append",
        default=[],
        metavar="WORDS",
        help='first do this: --do "connect short to port 1"',
    )
    serving = actions.add_parser(
        "serve", parents=[common], help="open it to any PyVISA program on this machine"
    )
    serving.add_argument("--port", type=int, default=0, metavar="N", help="first TCP port (free ones)")
    serving.add_argument("--forever", action="store_true", help="no console; go on until interrupted")
    actions.add_parser("look", parents=[common], help="draw what is plugged into what")
    return parser


def main(arguments: Sequence[str], commands: TextIO, out: TextIO, complaints: TextIO) -> int:
    """Run.

    Parameters
    ----------
    arguments
        Without the program's name.
    commands, out, complaints
        Standard streams.

    Returns
    -------
    int
        0 done, 2 bad input.
    """
    asked = _parser().parse_args(arguments)
    if asked.seed < 0 or not 0 <= getattr(asked, "port", 0) <= 65_000:
        complaints.write("--seed is a whole number from 0 on, --port one from 0 to 65000\n")
        return 2
    from sim_instruments.bench import BadBench, load_bench  # here, so that help needs no numpy
    from sim_instruments.console import Console
    from sim_instruments.look import draw
    from sim_instruments.serve import serve

    try:
        bench = load_bench(asked.bench, asked.seed)
    except BadBench as error:
        complaints.write(f"{error}\n")
        return 2
    first = Console(bench, complaints)
    if not all(first.carry_out(words) for words in asked.do):
        return 2
    if asked.action == "look":
        out.write(draw(bench, colour=out.isatty()) + "\n")
        return 0
    try:
        serve(bench, commands, out, asked.port, asked.forever)
    except KeyboardInterrupt:
        out.write("\n")
    except OSError as error:
        complaints.write(f"cannot serve at port {asked.port}: {error.strerror}; choose another with --port\n")
        return 2
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:], sys.stdin, sys.stdout, sys.stderr))
