"""``benchrun match``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    from benchrun.rf.touchstone import TouchstoneData

__all__ = ["command"]

_SERIES = click.Choice(["E6", "E12", "E24", "E48", "E96", "E192"])


@click.command("match")
@click.argument("source", required=False, metavar="[RECORD|FILE]", type=click.Path(path_type=Path))
@click.option("--load", metavar="OHM", help='A given impedance instead, as in "18 - 35j ohm".')
@click.option("--at", "at_text", required=True, metavar="FREQUENCY", help='Where it is matched: "169.4 MHz".')
@click.option("--port", type=click.Choice(["1", "2"]), default="1", help="Port of a two-port file.")
@click.option("--z0", default="50 ohm", show_default=True, metavar="OHM", help="The source's resistance.")
@click.option("--vswr", type=float, default=1.5, show_default=True, help="Up to which it counts as matched.")
@click.option("--coils", type=_SERIES, default="E24", show_default=True, help="Series of the coils.")
@click.option(
    "--capacitors", type=_SERIES, default="E24", show_default=True, help="Series of the capacitors."
)
@click.option("--q", type=float, help="Q of pi and tee sections; by default a little more than needed.")
@click.option("--json", "as_json", is_flag=True, help="One JSON document on standard output, nothing else.")
def command(
    source: Path | None,
    load: str | None,
    at_text: str,
    port: str,
    z0: str,
    vswr: float,
    coils: str,
    capacitors: str,
    q: float | None,
    as_json: bool,
) -> int:
    """Match an impedance: every L, pi and tee section and one-stub line, with parts that can be bought.

    The impedance is read from a record's last result, from a Touchstone file, or given with --load. Shown
    are the VSWR with preferred values, the band in which it holds, the loss, and the share of pieces that
    will do.
    """
    import sys

    import numpy as np

    from benchrun.errors import InputError
    from benchrun.quantity import Dimension, QuantityError, parse
    from benchrun.report.match import as_json as document
    from benchrun.report.match import show
    from benchrun.rf.design import load_over
    from benchrun.rf.design.choices import Wish, choices
    from benchrun.rf.figures.band import at
    from benchrun.sequence.steps.deembed import impedance_of

    if (source is None) == (load is None):
        raise click.UsageError("name a record or file, or give an impedance with --load; one of them")
    try:
        at_hz, z0_ohm = parse(at_text, Dimension.FREQUENCY), parse(z0, Dimension.IMPEDANCE)
        if load is not None:
            f_hz = at_hz * np.linspace(0.5, 2.0, 3001)
            ohm = load_over(f_hz, impedance_of(load), at_hz)
        else:
            assert source is not None  # see above
            f_hz, ohm = _measured(_data(source), int(port), str(source))
        wish = Wish(at_hz, z0_ohm, vswr, coils, capacitors, q=q)
        found = choices(f_hz, ohm, wish)
    except InputError:
        raise
    except (QuantityError, ValueError) as error:
        raise InputError(str(error)) from None
    here = complex(at(f_hz, ohm.real, at_hz)[0], at(f_hz, ohm.imag, at_hz)[0])
    if as_json:
        click.echo(document(found, here, at_hz, vswr))
    else:
        show(found, here, at_hz, vswr, sys.stdout)
    return 0


def _data(source: Path) -> TouchstoneData:
    """A Touchstone file, or the last result that a record keeps."""
    from benchrun.errors import InputError
    from benchrun.rf.touchstone import read
    from benchrun.sequence.loading import read_bytes

    if not source.is_dir():
        return read(read_bytes(source, 20_000_000), str(source))
    from benchrun.record.verify import read as read_record

    record = read_record(source)
    results = record.payload.results
    if not results:
        raise InputError(f"{source}: the record keeps no corrected result to take an impedance from")
    return read(record.content(results[-1].file), results[-1].file)


def _measured(data: TouchstoneData, port: int, name: str):  # type: ignore[no-untyped-def]  # numpy comes late
    from benchrun.errors import InputError

    if port > data.ports:
        raise InputError(f"{name} has one port, so there is no port {port}")
    gamma = data.s[:, port - 1, port - 1]
    if not (abs(gamma) < 1.0).all():
        worst = int(abs(gamma).argmax())
        raise InputError(
            f"{name} reflects {abs(gamma[worst]):.4g} times what it gets at {data.f_hz[worst] / 1e6:g} MHz; "
            "only what takes power, below 1, can be matched"
        )
    return data.f_hz, data.z0_ohm * (1.0 + gamma) / (1.0 - gamma)
