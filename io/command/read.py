"""``backveer read``: how each file was understood."""

from __future__ import annotations

import sys

import click

from backveer.io.command.options import exit_status, reading_options
from backveer.io.readers.reading import Hints


@click.command(short_help="How each file was understood.")
@reading_options
@click.option("--json", "as_json", is_flag=True, help="Print JSON, in SI units.")
@click.option(
    "--to",
    type=click.Path(),
    metavar="OUT",
    help="Store the profiles as OUT.nc, OUT.parquet or OUT.csv, in SI units.",
)
def read(files: tuple[str, ...], hints: Hints, as_json: bool, to: str | None) -> int:
    """
    Show how each file was understood: every column, what it was read as, its unit, and why.

    FILE may be a path, a glob, a .gz, .bz2, .xz, .zst or .zip, or - for standard input.
    """
    from backveer.io import readers

    if to is not None:
        from backveer.io.atomic import suffix_among
        from backveer.io.store import SUFFIXES

        suffix_among(to, SUFFIXES)
    reading = readers.read(files, hints)
    if as_json:
        from backveer.io.words.record import write_json

        write_json(sys.stdout, reading)
    else:
        from backveer.io.words.understood import reading_text

        for file in reading.files:
            click.echo(reading_text(file))
    if to is not None and reading.files:
        from backveer.io.store import write_stack

        write_stack(reading.stack, to)
    return exit_status(reading)
