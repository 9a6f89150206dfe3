"""``backveer rotor``: wind energy, what turbines meet in each profile and over time."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import click

from backveer.io.command.options import (
    exit_status,
    geostrophic_wind,
    reading_options,
    units_option,
)
from backveer.io.readers.reading import Hints, Reading

if TYPE_CHECKING:
    from backveer.profiles.rotor import Rotor, Turbine
    from backveer.profiles.stack import Stack

_BLOCK = 8192  # profiles at a time, and between two steps of the progress bar
BY = ("hour", "month", "season", "sector", "speed", "stability")


@click.command(short_help="Wind energy: what a turbine's rotor meets.")
@reading_options
@click.option("--hub-height", type=float, metavar="M", help="Of the hub above ground, m.")
@click.option("--rotor-diameter", type=float, metavar="M", help="Of the rotor, m.")
@click.option(
    "--turbines",
    type=click.Path(exists=True, dir_okay=False),
    metavar="FILE.toml",
    help="Several turbines: tables [[turbine]] with name, hub_height and rotor_diameter, m.",
)
@click.option("--json", "as_json", is_flag=True, help="Print JSON, in SI units.")
@click.option(
    "--to",
    type=click.Path(),
    metavar="OUT",
    help="Store a row a profile and turbine as OUT.parquet, OUT.csv or OUT.nc, in SI units.",
)
@click.option("--figure", type=click.Path(), metavar="OUT", help="Draw to OUT.svg, .pdf or .png.")
@click.option(
    "--profile",
    type=click.IntRange(min=1),
    metavar="N",
    help="Of many profiles, the full answer of the Nth.",
)
@units_option
@click.option(
    "--coverage-limit",
    type=click.FloatRange(0, 1, min_open=True),
    default=0.78,
    show_default=True,
    help="Share of the rotor's area that valid levels must cover.",
)
@click.option(
    "--segments",
    type=click.IntRange(1, 1000),
    default=5,
    show_default=True,
    help="Slices of the rotor for the equivalent speeds by segments.",
)
@click.option(
    "--extrapolate",
    is_flag=True,
    help="Above the highest level, continue with the Ekman model where it is well determined.",
)
@click.option(
    "--wind-error",
    type=click.FloatRange(min=0, min_open=True, max=20),
    help="Standard error of a wind component, m/s; otherwise estimated.",
)
@click.option(
    "--stamp",
    type=click.Choice(["begin", "end"]),
    default="begin",
    show_default=True,
    help="Whether a time is at the begin or the end of its interval.",
)
@click.option(
    "--utc-offset",
    type=click.FloatRange(-12, 14),
    metavar="HOURS",
    help="Hours that the file's clock is ahead of UTC, all year; tables go by that clock.",
)
@click.option(
    "--interval",
    type=click.FloatRange(min=0, min_open=True),
    metavar="MINUTES",
    help="First average faster profiles over so many minutes.",
)
@click.option(
    "--by",
    type=click.Choice(BY),
    multiple=True,
    help="A table over time by this; may be repeated.",
)
@click.option("--quantity", default="veer", show_default=True, help="What the tables are of.")
@click.option(
    "--sectors",
    type=click.Choice(["12", "16", "36"]),
    default="12",
    show_default=True,
    help="Direction sectors.",
)
@click.option(
    "--thresholds",
    metavar="X,X,...",
    help="Shares and events beyond these, in SI units; below where negative.",
)
@click.option(
    "--joint",
    type=click.Choice(["speed", "hour"]),
    multiple=True,
    help="How often ranges of veer meet speed bins or hours.",
)
@click.option(
    "--confidence",
    type=click.FloatRange(0.5, 0.999),
    metavar="SHARE",
    help="Add block-bootstrap intervals to the tables, such as 0.95.",
)
@click.option(
    "--roughness",
    type=click.FloatRange(1e-6, 5),
    metavar="M",
    help="Roughness length of the site, m: compare with a neutral layer.",
)
@click.option(
    "--geostrophic",
    metavar="DIRECTION/SPEED",
    help="The geostrophic wind, for the comparison: 250/14 (m/s) or 250/27kt.",
)
def rotor(
    files: tuple[str, ...],
    hints: Hints,
    hub_height: float | None,
    rotor_diameter: float | None,
    turbines: str | None,
    as_json: bool,
    to: str | None,
    figure: str | None,
    profile: int | None,
    units: str,
    coverage_limit: float,
    segments: int,
    extrapolate: bool,
    wind_error: float | None,
    stamp: str,
    utc_offset: float | None,
    interval: float | None,
    by: tuple[str, ...],
    quantity: str,
    sectors: str,
    thresholds: str | None,
    joint: tuple[str, ...],
    confidence: float | None,
    roughness: float | None,
    geostrophic: str | None,
) -> int:
    """
    State what turbines meet: veer, shear, equivalent speed and energy over the rotor.

    Supports and does not replace the standards' own procedures and licensed practice.

    FILE may be a path, a glob, a .gz, .bz2, .xz, .zst or .zip, or - for standard input.
    """
    options: dict[str, Any] = {
        key: value
        for key, value in locals().items()
        if key not in ("files", "hints", "as_json", "to", "figure") and value not in (None, ())
    }
    options |= {key: value for key, value in vars(hints).items() if value not in (None, {})}
    given = geostrophic_wind(geostrophic)
    limits = _thresholds(thresholds)
    wanted = _turbines(hub_height, rotor_diameter, turbines)
    from backveer.profiles.rotor_climate import QUANTITIES, Over

    if quantity not in QUANTITIES:
        raise click.BadParameter(
            f"{quantity!r} is none of {', '.join(QUANTITIES)}", param_hint="--quantity"
        )
    if to is not None or figure is not None:
        _check_outputs(to, figure)

    from backveer.io import readers
    from backveer.io.progress import progress
    from backveer.io.readers.series import series

    with progress("reading", None):
        found = series(
            readers.read(files, _with_offset(hints, utc_offset)),
            utc_offset=utc_offset,
        )
    reading = found.reading
    if not reading.files:
        return exit_status(reading)
    if interval is not None:
        reading = _averaged(reading, interval, stamp)
    stack = reading.stack
    remarks = reading.files[0].remarks
    count = stack.profile_count
    if profile is not None and profile > count:
        raise click.BadParameter(f"there are only {count} profiles", param_hint="--profile")
    single = count == 1 or profile is not None
    if single and not (as_json or to or figure or by):
        stack = stack.select(slice((profile or 1) - 1, profile or 1))
        count, profile = 1, None
    fit, coriolis, error = _fitted(stack, extrapolate or count == 1, wind_error)
    told = _told(stack, wanted, coverage_limit, segments, extrapolate, fit, error)
    expected = None
    if count == 1 or roughness is not None or given is not None:
        from backveer.profiles.expected_veer import expected_veer

        expected = expected_veer(told, coriolis, fit, geostrophic=given, roughness=roughness)
    over = []
    if count > 1 and (as_json or figure or by or limits or joint or confidence is not None):
        from backveer.profiles.rotor_climate import rotor_climate

        how = Over(
            quantity=quantity,
            by=tuple(dict.fromkeys(by)),
            thresholds=limits,
            confidence=confidence,
            utc_offset=utc_offset or 0.0,
            stamp=stamp,
            sectors=int(sectors),
        )
        over = [rotor_climate(stack, told, place, how) for place in range(len(wanted))]

    from backveer.io.run import run_of

    run = run_of("rotor", found.inputs, options | {"turbines": [vars(each) for each in wanted]})
    if as_json:
        from backveer.io.words.rotor_record import write_rotor_json

        write_rotor_json(sys.stdout, reading, told, expected, over, run)
    else:
        click.echo(
            _printed(stack, told, expected, over, joint, units, remarks, profile, stamp, utc_offset)
        )
        from backveer.io.words.rotor_text import caution

        click.echo(f"\n{run.short()}\n{caution()}")
    if to is not None:
        from backveer.io.rotor_store import write_rotor

        write_rotor(stack, told, expected, run, to)
    if figure is not None:
        from backveer.io.figures.rotor import draw

        draw(
            stack,
            told,
            over,
            figure,
            run,
            units=units,
            index=None if profile is None else profile - 1,
        )
    return exit_status(reading)


def _with_offset(hints: Hints, hours: float | None) -> Hints:
    """Say the offset of the files' clock to the readers; a time that names its zone keeps it."""
    if hours is None or "time" in hints.units:
        return hints
    minutes = round(abs(hours) * 60)
    said = f"UTC{'-' if hours < 0 else '+'}{minutes // 60:02d}:{minutes % 60:02d}"
    return Hints(
        **{name: getattr(hints, name) for name in vars(hints) if name != "units"},
        units={**hints.units, "time": said},
    )


def _check_outputs(to: str | None, figure: str | None) -> None:
    """Refuse what cannot be written before the work is done."""
    from backveer.io.atomic import suffix_among

    if to is not None:
        from backveer.io.store import SUFFIXES

        suffix_among(to, SUFFIXES)
    if figure is not None:
        from backveer.io.figures import SUFFIXES as PICTURES

        suffix_among(figure, PICTURES)


def _turbines(hub: float | None, diameter: float | None, path: str | None) -> list[Turbine]:
    from backveer.profiles.rotor import Turbine

    if path is not None and (hub is not None or diameter is not None):
        raise click.UsageError("give --turbines or --hub-height and --rotor-diameter, not both")
    try:
        if path is not None:
            from backveer.io.readers.turbine_file import read_turbines

            return read_turbines(path)
        if hub is None or diameter is None:
            raise click.UsageError(
                "what turbine? Give --hub-height and --rotor-diameter in m, or --turbines FILE.toml"
            )
        return [Turbine("turbine", hub, diameter)]
    except ValueError as error:
        raise click.UsageError(str(error)) from None


def _thresholds(text: str | None) -> tuple[float, ...]:
    if text is None:
        return ()
    try:
        values = tuple(float(part) for part in text.split(","))
    except ValueError:
        values = (float("nan"),)
    if not all(abs(value) < 1e9 for value in values):
        raise click.BadParameter(f"{text!r} is not a list of numbers", param_hint="--thresholds")
    return tuple(dict.fromkeys(values))


def _averaged(reading: Reading, minutes: float, stamp: str) -> Reading:
    import numpy as np

    from backveer.io.readers.series import joined
    from backveer.profiles.interval_means import AVAILABILITY_LIMIT, interval_means
    from backveer.profiles.quality import check

    stack = reading.stack
    if 1440 % minutes:
        raise click.BadParameter(
            f"averages over {minutes:g} min do not fill a day. Ten minutes are usual",
            param_hint="--interval",
        )
    try:
        means = interval_means(stack, np.timedelta64(round(minutes * 60e9), "ns"), stamp=stamp)
    except ValueError as error:
        raise click.BadParameter(str(error), param_hint="--interval") from None
    if not means.profile_count:
        raise click.BadParameter(
            'no profile has a time to average by. Give --column time="HEADER"',
            param_hint="--interval",
        )
    said = (
        f"{means.profile_count} averages over {minutes:g} min of {stack.profile_count} profiles; "
        f"levels with under {100 * AVAILABILITY_LIMIT:.0f} % of the samples left out"
    )
    return joined(reading, check(means), [said])


def _fitted(stack: Stack, wanted: bool, wind_error: float | None) -> tuple[Any, Any, Any]:
    """Ekman fit where it is wanted, Coriolis parameter, and the error of a wind component."""
    import numpy as np

    from backveer.profiles import earth
    from backveer.profiles.wind_error import wind_error as estimated

    if wind_error is not None:
        error = np.full(stack.profile_count, wind_error)
    else:
        # In blocks, because each needs many times the memory of its winds.
        starts = range(0, max(stack.profile_count, 1), _BLOCK)
        parts = [estimated(stack.select(slice(start, start + _BLOCK))) for start in starts]
        error = np.concatenate(parts)
    coriolis = earth.coriolis(stack)
    if not wanted:
        return None, coriolis, error
    from backveer.io.progress import progress
    from backveer.profiles import ekman

    with progress("fitting the Ekman model", None):
        return ekman.fit(stack, coriolis, error=error), coriolis, error


def _told(
    stack: Stack,
    turbines: list[Turbine],
    coverage_limit: float,
    segments: int,
    extrapolate: bool,
    fit: Any,
    error: Any,
) -> Rotor:
    """Run the rotor over blocks of profiles, and show how far it is."""
    from dataclasses import replace

    import numpy as np

    from backveer.io.progress import progress
    from backveer.profiles.labels import labels
    from backveer.profiles.rotor import rotor

    parts = []
    count = stack.profile_count
    with progress("rotors", count) as advance:
        for start in range(0, max(count, 1), _BLOCK):
            rows = slice(start, start + _BLOCK)
            parts.append(
                rotor(
                    stack.select(rows),
                    turbines,
                    coverage_limit=coverage_limit,
                    segments=segments,
                    extrapolate=extrapolate,
                    fit=None if fit is None else fit.select(rows),
                    error=error[rows],
                )
            )
            advance(len(parts[-1].veer))
    if len(parts) == 1:
        return parts[0]
    whole: dict[str, Any] = {
        name: np.concatenate([getattr(part, name) for part in parts])
        for name, label in labels(parts[0]).items()
        if label.dims[0] == "profile"
    }
    return replace(parts[0], **whole)


def _printed(
    stack: Stack,
    told: Rotor,
    expected: Any,
    over: Any,
    joint: tuple[str, ...],
    units: str,
    remarks: Sequence[str],
    profile: int | None,
    stamp: str,
    utc_offset: float | None,
) -> str:
    from backveer.io.words import rotor_text

    if stack.profile_count == 1 or profile is not None:
        return rotor_text.rotor_text(
            stack, told, expected, (profile or 1) - 1, remarks=remarks, units=units
        )
    head, complete = rotor_text.record_text(stack, stamp, utc_offset, remarks)
    blocks = [head]
    for place in range(len(told.turbine)):
        blocks.append(rotor_text.rotor_summary(stack, told, expected, place, complete, units=units))
        if over:
            from backveer.io.words.climate_text import climate_text

            blocks.append(climate_text(over[place], joint, units=units))
    blocks.append("The full answer of one profile: --profile N.")
    return "\n\n".join(blocks)
