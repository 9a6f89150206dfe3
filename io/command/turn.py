"""``backveer turn``: the main job, from files to the statement."""

from __future__ import annotations

import sys

import click

from backveer.io.command.options import (
    exit_status,
    geostrophic_wind,
    numbers,
    options_given,
    reading_options,
    units_option,
)
from backveer.io.readers.reading import Hints


@click.command(short_help="The main job: the statement for each profile.")
@reading_options
@click.option("--json", "as_json", is_flag=True, help="Print JSON, in SI units.")
@click.option("--figure", type=click.Path(), metavar="OUT", help="Draw to OUT.svg, .pdf or .png.")
@click.option("--report", type=click.Path(), metavar="OUT.html", help="Write a page to look at.")
@click.option(
    "--profile",
    type=click.IntRange(min=1),
    metavar="N",
    help="Of many profiles, the full statement (and figure) of the Nth.",
)
@units_option
@click.option("--sources", is_flag=True, help="Add each number's method, equation, publication.")
@click.option(
    "--geostrophic",
    metavar="DIRECTION/SPEED",
    help="The geostrophic wind, where it is known: 250/14 (m/s) or 250/27kt.",
)
@click.option(
    "--wind-error",
    type=click.FloatRange(min=0, min_open=True, max=20),
    help="Standard error of a wind component, m/s; otherwise estimated.",
)
@click.option(
    "--equator-limit",
    type=click.FloatRange(0.1, 90),
    default=5.0,
    show_default=True,
    help="Degrees of latitude within which what divides by f declines.",
)
@click.option("--layers", metavar="Z,Z,...", help="Heights above ground to tell turning by, m.")
@click.option(
    "--pressures", metavar="P,P,...", help="Bounds of the thermal-wind layers, hPa, increasing."
)
@click.option(
    "--varying-viscosity",
    is_flag=True,
    help="Fit layers whose viscosity varies with height beside the spirals.",
)
@click.option(
    "--roughness",
    type=click.FloatRange(1e-6, 5),
    metavar="Z0",
    help="Roughness length for that, m; fitted when left out.",
)
@click.option(
    "--critical-richardson",
    type=click.FloatRange(0.05, 2),
    default=0.25,
    show_default=True,
    help="Bulk Richardson number at the top of the boundary layer.",
)
def turn(
    files: tuple[str, ...],
    hints: Hints,
    as_json: bool,
    figure: str | None,
    report: str | None,
    profile: int | None,
    units: str,
    sources: bool,
    geostrophic: str | None,
    wind_error: float | None,
    equator_limit: float,
    layers: str | None,
    pressures: str | None,
    varying_viscosity: bool,
    roughness: float | None,
    critical_richardson: float,
) -> int:
    """
    State how the wind turns and strengthens with height, how far it is from balance, and why.

    FILE may be a path, a glob, a .gz, .bz2, .xz, .zst or .zip, or - for standard input.
    """
    given = geostrophic_wind(geostrophic)
    edges = numbers(layers, "--layers")
    bounds = numbers(pressures, "--pressures")
    from backveer.io import readers
    from backveer.profiles.statement import Settings, statement

    if figure is not None:
        from backveer.io.atomic import suffix_among
        from backveer.io.figures import SUFFIXES

        suffix_among(figure, SUFFIXES)
    if report is not None:
        from backveer.io.atomic import suffix_among

        suffix_among(report, (".html", ".htm"))
    reading = readers.read(files, hints)
    if not reading.files:
        return exit_status(reading)
    chosen = {} if edges is None else {"layer_edges": edges}
    said = statement(
        reading.stack,
        Settings(
            equator_limit=equator_limit,
            geostrophic_wind=given,
            wind_error=wind_error,
            pressures=None if bounds is None else tuple(100.0 * p for p in reversed(bounds)),
            critical_richardson=critical_richardson,
            varying_viscosity=varying_viscosity or roughness is not None,
            roughness_length=roughness,
            **chosen,
        ),
    )
    count = said.stack.profile_count
    if profile is not None and profile > count:
        raise click.BadParameter(
            f"there are only {count} profiles", param_hint="--profile", ctx=None
        )
    index = (profile or 1) - 1
    if as_json:
        from backveer.io.words.record import write_json

        write_json(sys.stdout, reading, said)
    elif count == 1 or profile is not None:
        from backveer.io.words.text import statement_text

        click.echo(statement_text(said, index, reading=reading, units=units, sources=sources))
    else:
        from backveer.io.words.table import summary_text

        click.echo(summary_text(said, units=units))
    if figure is not None:
        from backveer.io.figures.sheet import draw

        draw(said, index, figure, units=units)
    if report is not None:
        from backveer.io.report.page import write_report

        write_report(report, reading, said, units=units, options=options_given())
    return exit_status(reading)
