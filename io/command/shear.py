"""``backveer shear``: low-level wind shear at an aerodrome."""

from __future__ import annotations

import os
import sys
from typing import TYPE_CHECKING

import click

from backveer.io.command.options import exit_status, reading_options
from backveer.io.command.runways import height, runways
from backveer.io.readers.reading import Hints, Reading

if TYPE_CHECKING:
    from pathlib import Path

    from backveer.io.command.runways import Runway
    from backveer.profiles.shear_statement import ShearSettings


@click.command(short_help="Aviation: low-level wind shear.")
@reading_options
@click.option(
    "--runway",
    multiple=True,
    metavar="HEADING",
    help="True heading in three digits (268), both ends are told; repeatable.",
)
@click.option(
    "--magnetic-variation",
    type=click.FloatRange(-180, 180),
    metavar="DEG",
    help="East positive; --runway is then a designator (27, 09L).",
)
@click.option(
    "--top", default="2000ft", show_default=True, metavar="HEIGHT", help="2000ft or 600m."
)
@click.option(
    "--step",
    default="100ft",
    show_default=True,
    metavar="DEPTH",
    help="Depth of the fixed layers, with its unit.",
)
@click.option(
    "--criteria",
    type=click.Path(exists=True, dir_okay=False),
    metavar="FILE.toml",
    help="Local criteria: they add to those shipped, or replace them by name.",
)
@click.option(
    "--ground-speed",
    type=click.FloatRange(30, 400),
    default=140.0,
    show_default=True,
    help="Of the aircraft, kt.",
)
@click.option(
    "--glide-slope",
    type=click.FloatRange(0.5, 10),
    default=3.0,
    show_default=True,
    help="Of the approach, degrees.",
)
@click.option(
    "--climb-gradient",
    type=click.FloatRange(0.5, 30),
    default=3.3,
    show_default=True,
    help="Of the departure, per cent.",
)
@click.option(
    "--wind-error",
    type=click.FloatRange(min=0, min_open=True, max=20),
    help="Standard error of a wind component, m/s; otherwise estimated.",
)
@click.option(
    "--units",
    type=click.Choice(["si", "aviation"]),
    default="aviation",
    show_default=True,
    help="Units that people read; JSON is always SI.",
)
@click.option("--json", "as_json", is_flag=True, help="Print JSON, in SI units.")
@click.option("--figure", type=click.Path(), metavar="OUT", help="Draw to OUT.svg, .pdf or .png.")
@click.option("--sources", is_flag=True, help="Add each number's method, equation, publication.")
@click.option(
    "--profile",
    type=click.IntRange(min=1),
    metavar="N",
    help="Of many profiles, all about the Nth (and its figure).",
)
@click.option(
    "--watch",
    type=click.Path(exists=True, file_okay=False),
    metavar="DIR",
    help="Evaluate files as they arrive in DIR, a line each, until Ctrl-C.",
)
@click.option(
    "--interval",
    type=click.FloatRange(0.05, 3600),
    default=2.0,
    show_default=True,
    help="Seconds between two looks at the watched folder.",
)
def shear(
    files: tuple[str, ...],
    hints: Hints,
    runway: tuple[str, ...],
    magnetic_variation: float | None,
    top: str,
    step: str,
    criteria: str | None,
    ground_speed: float,
    glide_slope: float,
    climb_gradient: float,
    wind_error: float | None,
    units: str,
    as_json: bool,
    figure: str | None,
    sources: bool,
    profile: int | None,
    watch: str | None,
    interval: float,
) -> int:
    """
    State the wind shear between the ground and 2000 ft, along runways, and which criteria it meets.

    FILE may be a path, a glob, a .gz, .bz2, .xz, .zst or .zip, or - for standard input.

    Official warnings and pilot reports come first. A single profile does not see convective or
    terrain-induced shear. Local criteria and licensed forecasters decide.
    """
    ends = runways(runway, magnetic_variation)
    reach = height(top, "--top", 30.0, 6000.0)
    deep = height(step, "--step", 3.0, reach)
    if bool(files) == bool(watch):
        raise click.UsageError("give either FILE... or --watch DIR")
    if watch and (figure or profile or sources):
        raise click.UsageError("--watch goes with none of --figure, --profile, --sources")
    if figure is not None:
        from backveer.io.atomic import suffix_among
        from backveer.io.figures import SUFFIXES

        suffix_among(figure, SUFFIXES)
    from backveer.io.readers.errors import ReadError
    from backveer.io.readers.shear_rules import read_rules
    from backveer.profiles.low_level_shear import KNOT
    from backveer.profiles.shear_statement import ShearSettings

    try:
        rules = read_rules(criteria)
    except ReadError as error:
        raise click.BadParameter(str(error), param_hint="--criteria") from None
    settings = ShearSettings(
        headings=tuple(end.heading for end in ends),
        rules=rules,
        top=reach,
        step=deep,
        ground_speed=ground_speed * KNOT,
        glide_slope=glide_slope,
        climb_slope=climb_gradient,
        wind_error=wind_error,
    )
    if watch:
        return watch_folder(watch, hints, settings, ends, units, as_json, interval)
    from backveer.io.readers.door import read

    reading = read(files, hints)
    if not reading.files:
        return exit_status(reading)
    _answer(reading, settings, ends, units, as_json, figure, sources, profile)
    return exit_status(reading)


# With --watch there is no FILE.
for _parameter in shear.params:
    if _parameter.name == "files":
        _parameter.required = False


def _answer(
    reading: Reading,
    settings: ShearSettings,
    ends: tuple[Runway, ...],
    units: str,
    as_json: bool,
    figure: str | None,
    sources: bool,
    profile: int | None,
) -> None:
    from backveer.profiles.shear_statement import shear_statement

    count = reading.stack.profile_count
    if profile is not None and profile > count:
        held = f"{count} profile{'s' * (count != 1)}"
        raise click.BadParameter(f"there is no {profile}, only {held}", param_hint="--profile")
    index = (profile or 1) - 1
    names = tuple(end.name for end in ends)
    said = shear_statement(reading.stack, settings, cause=as_json)
    if as_json:
        from backveer.io.words.record import write_json
        from backveer.io.words.shear_record import answer, shear_records

        records = shear_records(answer(said, names))
        write_json(sys.stdout, reading, low_level_shear=records)
    elif count == 1 or profile is not None:
        from backveer.io.words.shear_record import answer
        from backveer.io.words.shear_text import shear_text

        one = answer(said.select(index).with_cause(), names)
        click.echo(shear_text(one, 0, reading=_only(reading, index), units=units, sources=sources))
    else:
        from backveer.io.words.shear_table import shear_summary

        click.echo(shear_summary(said, units=units))
    if figure is not None:
        from backveer.io.figures.shear import draw

        draw(said.select(index), names, figure, units=units)


def _only(reading: Reading, index: int) -> Reading:
    """Return the reading of a single profile."""
    from dataclasses import replace

    for file in reading.files:
        if index < file.stack.profile_count:
            return Reading((replace(file, stack=file.stack.select(index)),), ())
        index -= file.stack.profile_count
    return reading


def watch_folder(
    folder: str,
    hints: Hints,
    settings: ShearSettings,
    ends: tuple[Runway, ...],
    units: str,
    as_json: bool,
    interval: float,
    scans: int | None = None,
) -> int:
    """
    Evaluate files as they come to rest in a folder, one line each, until interrupted.

    A file that cannot be read is said so on standard error and read again when it changes. The line
    is about the latest profile of the file; what it changes is against the profile told before.
    ``scans`` ends after so many looks.
    """
    from pathlib import Path

    from backveer.io.command.watch import settled

    before: dict[str, frozenset[str]] = {}
    try:
        for paths in settled(Path(folder), interval, scans=scans):
            for path in paths:
                try:
                    line = _told_of(path, hints, settings, ends, units, as_json, before)
                except Exception as error:
                    # A night's watch must not end with one odd file.
                    if os.environ.get("BACKVEER_TRACEBACK"):
                        raise
                    fault = " ".join(f"{type(error).__name__}: {error}".split())[:200]
                    line = None
                    click.echo(
                        f"backveer: {path}: internal fault ({fault}). Please report it.", err=True
                    )
                if line is not None:
                    click.echo(line)
                    sys.stdout.flush()
    except KeyboardInterrupt:
        click.echo("backveer: stopped watching.", err=True)
    return 0


def _told_of(
    path: Path,
    hints: Hints,
    settings: ShearSettings,
    ends: tuple[Runway, ...],
    units: str,
    as_json: bool,
    before: dict[str, frozenset[str]],
) -> str | None:
    """Return the line about a file's latest profile, and keep what it meets in ``before``."""
    from backveer.io.readers.door import read
    from backveer.io.words.shear_change import change_line, latest, met_rules
    from backveer.io.words.units import NAMED
    from backveer.profiles.shear_statement import shear_statement

    reading = read([path], hints)
    for failure in reading.failures:
        click.echo(f"backveer: {failure}", err=True)
    if not reading.files or not reading.stack.profile_count:
        return None
    said = shear_statement(reading.stack, settings, cause=False)
    row = latest(said)
    one = said.select(row)
    station = str(one.stack.station[0])
    if as_json:
        import json

        from backveer.io.words.record import profile_records
        from backveer.io.words.shear_record import answer, shear_records

        record = next(iter(profile_records(_only(reading, row))))
        told = answer(one.with_cause(), tuple(end.name for end in ends))
        record["low_level_shear"] = shear_records(told)[0]
        line = json.dumps(record, ensure_ascii=False, allow_nan=False)
    else:
        line = change_line(one, 0, before.get(station), NAMED[units])
    before[station] = met_rules(one)
    return line
