"""``benchrun keys``."""

from __future__ import annotations

from pathlib import Path

import click

__all__ = ["command"]


@click.group("keys")
def command() -> None:
    """Make, list and trust the keys that sign records.

    Keys lie in the folder named by BENCHRUN_HOME, or in your folder for settings.
    """


@command.command("make")
@click.argument("name")
@click.option(
    "--protect", is_flag=True, help="Protect it with a passphrase (BENCHRUN_PASSPHRASE, or you are asked)."
)
def make(name: str, protect: bool) -> int:
    """Make a key NAME for measured runs, and trust it here."""
    import os

    from benchrun.record.keys import KeyStore

    passphrase = None
    if protect:
        passphrase = os.environ.get("BENCHRUN_PASSPHRASE") or click.prompt(
            "Passphrase", hide_input=True, confirmation_prompt=True, err=True
        )
    info = KeyStore().make(name, passphrase)
    click.echo(f"made key {info.name}, id {info.key_id}")
    click.echo(f"give its public half to whoever checks your records: benchrun keys export {info.name}")
    return 0


@command.command("list")
def list_keys() -> int:
    """List own keys, and those that are trusted."""
    from benchrun.record.keys import KeyStore

    store = KeyStore()
    own, trusted = store.list(), store.trusted()
    click.echo(f"keys in {store.home}")
    for info in own:
        guard = ", with passphrase" if info.protected else ""
        click.echo(
            f"  {info.name:<20} {info.key_id[:16] or 'id not known'}  signs {info.purpose} runs{guard}"
        )
    if not own:
        click.echo("  none; the rehearsal key is made on first use, others with: benchrun keys make NAME")
    click.echo("trusted")
    for key in trusted:
        click.echo(f"  {key.label:<28} {key.key_id[:16]}  for {key.purpose} runs")
    if not trusted:
        click.echo("  none")
    return 0


@command.command("trust")
@click.argument("file", type=click.Path(path_type=Path))
@click.option("--label", required=True, help="Whose key it is.")
@click.option("--rehearsal", is_flag=True, help="It speaks for simulated runs only.")
def trust(file: Path, label: str, rehearsal: bool) -> int:
    """Trust the public key in FILE (PEM)."""
    from benchrun.record.keys import KeyStore
    from benchrun.sequence.loading import read_bytes

    key = KeyStore().trust(read_bytes(file, 100_000), label, "rehearsal" if rehearsal else "bench")
    click.echo(f"trusted for {key.purpose} runs: {key.label}, id {key.key_id}")
    return 0


@command.command("distrust")
@click.argument("key_id")
def distrust(key_id: str) -> int:
    """Trust the key KEY_ID (or its first digits, at least eight) no more."""
    from benchrun.record.keys import KeyStore

    key = KeyStore().distrust(key_id)
    click.echo(f"no longer trusted: {key.label}, id {key.key_id}")
    return 0


@command.command("export")
@click.argument("name")
def export(name: str) -> int:
    """Print the public half of key NAME as PEM."""
    from benchrun.record.keys import KeyStore

    click.echo(KeyStore().export(name).decode(), nl=False)
    return 0
