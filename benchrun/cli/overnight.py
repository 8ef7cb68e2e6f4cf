"""``benchrun overnight``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from benchrun.cli.options import operator_or_user

if TYPE_CHECKING:
    from benchrun.engine.overnight import NightResult

__all__ = ["command", "write_reports"]


@click.command("overnight")
@click.argument("file", type=click.Path(path_type=Path))
@click.option("--operator", metavar="NAME", help="Goes into the records; your login name by default.")
@click.option("--key", metavar="NAME", help="Key that signs; needed only if there are several.")
@click.option(
    "--records", metavar="DIR", type=click.Path(path_type=Path), default=Path("records"), show_default=True,
    help="Folder in which the records and the reports are put.",
)  # fmt: skip
@click.option("--afresh", is_flag=True, help="Forget what an earlier night of that name had done.")
def command(file: Path, operator: str | None, key: str | None, records: Path, afresh: bool) -> int:
    """Run the jobs of the night FILE by themselves, several benches side by side.

    What happens is told as lines of JSON on standard output. At the end the folder of records holds
    NIGHT.xml, a test report for build servers, and NIGHT.json. A night that was broken off goes on where it
    was when it is started again. Exit code 0 only if everything was concluded and conforms.
    """
    import json

    from benchrun.engine.overnight import Settings, overnight
    from benchrun.sequence.files import read
    from benchrun.sequence.night import Night

    def progress(event: dict[str, Any]) -> None:
        click.echo(json.dumps(event, ensure_ascii=False))

    settings = Settings(records, operator_or_user(operator), key or "", progress, afresh)
    result = overnight(read(file, Night), settings)
    report, document = write_reports(result, records)
    progress(
        {
            "event": "night ended", "exit_code": result.exit_code, "seconds": round(result.seconds, 3),
            "report": str(report), "document": str(document),
        }
    )  # fmt: skip
    return result.exit_code


def write_reports(result: NightResult, records: Path) -> tuple[Path, Path]:
    """Put the test report and the JSON document beside the records.

    Raises
    ------
    RecordError
        If the system refuses.
    """
    import json
    import platform
    from datetime import UTC, datetime, timedelta

    from benchrun.record.placing import place_over
    from benchrun.report.night import night_document, suites
    from benchrun.report.test_report import test_report

    began = datetime.now(UTC) - timedelta(seconds=result.seconds)
    report, document = records / f"{result.night}.xml", records / f"{result.night}.json"
    place_over(report, test_report(suites(result), platform.node(), began))
    place_over(document, (json.dumps(night_document(result), ensure_ascii=False, indent=1) + "\n").encode())
    return report, document
