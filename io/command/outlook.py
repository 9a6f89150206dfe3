"""``backveer outlook``: the coming night from a sunset profile."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Any

import click

from backveer.io.command.options import (
    exit_status,
    geostrophic_wind,
    options_given,
    reading_options,
    units_option,
)
from backveer.io.readers.reading import Hints

if TYPE_CHECKING:
    from backveer.profiles.outlook import Outlook
    from backveer.profiles.stack import Stack


@click.command(short_help="The coming night from a sunset profile.")
@reading_options
@click.option("--until", metavar="TIME", help="Tell the night until then, ISO 8601, UTC; sunrise.")
@click.option("--release", metavar="TIME", help="When friction lets go, ISO 8601, UTC; sunset.")
@click.option(
    "--night-depth",
    type=click.FloatRange(20, 1000),
    default=150.0,
    show_default=True,
    help="Depth of the night's own frictional layer, m.",
)
@click.option(
    "--geostrophic", metavar="DIRECTION/SPEED", help="The geostrophic wind, where it is known."
)
@click.option("--hub-height", type=click.FloatRange(5, 300), help="Of a rotor to follow, m.")
@click.option("--rotor-diameter", type=click.FloatRange(5, 400), help="Of that rotor, m.")
@click.option(
    "--verify", type=click.Path(), metavar="FILE", help="A later sounding to compare with."
)
@click.option("--profile", type=click.IntRange(min=1), metavar="N", help="Of many, the Nth.")
@click.option("--json", "as_json", is_flag=True, help="Print JSON, in SI units.")
@click.option("--report", type=click.Path(), metavar="OUT.html", help="Write a page to look at.")
@units_option
def outlook(
    files: tuple[str, ...],
    hints: Hints,
    until: str | None,
    release: str | None,
    night_depth: float,
    geostrophic: str | None,
    hub_height: float | None,
    rotor_diameter: float | None,
    verify: str | None,
    profile: int | None,
    as_json: bool,
    report: str | None,
    units: str,
) -> int:
    """
    Tell the night after friction lets go: wind by height and hour, and the jet, with errors.

    FILE may be a path, a glob, a .gz, .bz2, .xz, .zst or .zip, or - for standard input.
    """
    given = geostrophic_wind(geostrophic)
    end, start = _time(until, "--until"), _time(release, "--release")
    if (hub_height is None) != (rotor_diameter is None):
        raise click.UsageError("--hub-height and --rotor-diameter go together")
    from backveer.io import readers
    from backveer.profiles import outlook as night
    from backveer.profiles.statement import Settings, statement

    reading = readers.read(files, hints)
    if not reading.files:
        return exit_status(reading)
    stack = reading.stack
    said = statement(stack, Settings(geostrophic_wind=given))
    told = night.outlook(
        stack,
        said.coriolis,
        said.geostrophic,
        said.ekman,
        said.wind_error,
        until=end,
        release=start,
        night_depth=night_depth,
    )
    count = stack.profile_count
    if profile is not None and profile > count:
        raise click.BadParameter(f"there are only {count} profiles", param_hint="--profile")
    from backveer.io.words.outlook import outlook_records, outlook_text

    records = outlook_records(stack, told)
    rotors = None
    if hub_height is not None and rotor_diameter is not None:
        rotors = [_rotor(stack, told, row, hub_height, rotor_diameter) for row in range(count)]
        for record, rows in zip(records, rotors, strict=True):
            record["rotor"] = rows
    checks = ["" for _ in range(count)]
    if verify is not None:
        later = readers.read([verify], hints)
        if later.failures:
            return exit_status(later)
        verified = _verify(told, stack, later.stack)
        for record, found in zip(records, verified, strict=True):
            record["verification"] = found
        checks = [_verified(found) for found in verified]
    if as_json:
        from backveer.io.words.record import write_json

        write_json(sys.stdout, reading, outlook=records)
    else:
        shown = range(count) if profile is None else [profile - 1]
        for row in shown:
            lines = None
            if rotors is not None:
                lines = [
                    {
                        "after": f"{r['time'] / 3600:.1f}",
                        "veer": _plain(r["veer"], "{:+.1f}"),
                        "exponent": _plain(r["shear_exponent"], "{:.2f}"),
                    }
                    for r in rotors[row]
                ]
            click.echo(outlook_text(stack, told, row, units=units, rotor=lines, check=checks[row]))
            if row != shown[-1]:
                click.echo()
    if report is not None:
        from backveer.io.report.page import write_report

        write_report(
            report, reading, said, units=units, options=options_given(), keys={"outlook": records}
        )
    return exit_status(reading)


def _plain(value: float | None, form: str) -> str:
    return "-" if value is None else form.format(value)


def _time(text: str | None, option: str) -> Any:
    if text is None:
        return None
    import datetime

    import numpy as np

    try:
        moment = datetime.datetime.fromisoformat(text)
    except ValueError:
        raise click.BadParameter(
            f"{text!r} is no ISO 8601 time, such as 2031-05-15T04:00", param_hint=option
        ) from None
    if moment.tzinfo is not None:
        moment = moment.astimezone(datetime.UTC).replace(tzinfo=None)
    return np.datetime64(moment, "ns")


def _rotor(
    stack: Stack, told: Outlook, row: int, hub_height: float, diameter: float
) -> list[dict[str, Any]]:
    """Return what a rotor meets at the told times of one night; the hours are profiles."""
    import numpy as np

    from backveer.io.words.record import plain
    from backveer.profiles.rotor import Turbine, rotor
    from backveer.profiles.stack import Stack as Profiles

    try:
        turbine = Turbine("rotor", hub_height, diameter)
    except ValueError as error:
        raise click.UsageError(str(error)) from None
    hours = Profiles.of(
        height=np.broadcast_to(stack.height[row], told.eastward_wind[row].shape),
        eastward_wind=told.eastward_wind[row],
        northward_wind=told.northward_wind[row],
    )
    met = rotor(hours, (turbine,))
    columns = {
        name: plain(getattr(met, name)[:, 0]) for name in ("hub_speed", "veer", "shear_exponent")
    }
    times = plain(told.hour[row])
    why = met.why[:, 0].tolist()
    return [
        {
            "time": times[i],
            **{name: values[i] for name, values in columns.items()},
            "why": why[i] or None,
        }
        for i in range(len(times))
        if times[i] is not None
    ]


def _verify(told: Outlook, stack: Stack, later: Stack) -> list[dict[str, Any]]:
    """Compare each outlook with the later sounding, at its heights within the told ones."""
    import numpy as np

    from backveer.profiles.grid import at_height
    from backveer.profiles.outlook import at_time

    when = np.full(stack.profile_count, later.time[0])
    u, v = at_time(told, when)
    usable = later.usable("wind")[0]
    z = later.height[0][usable]
    seen = (later.eastward_wind + 1j * later.northward_wind)[0][usable]
    found: list[dict[str, Any]] = []
    for row in range(stack.profile_count):
        predicted = at_height(stack.height[row], u[row] + 1j * v[row], z)
        sunset = stack.eastward_wind[row] + 1j * stack.northward_wind[row]
        start = at_height(stack.height[row], np.where(np.isfinite(u[row]), sunset, np.nan), z)
        both = np.isfinite(predicted)
        if not both.any():
            found.append(
                {"levels": 0, "rms": None, "rms_of_persistence": None,
                 "why": "the later sounding lies outside the told night or heights"}
            )  # fmt: skip
            continue
        rms = float(np.sqrt(np.mean(np.abs(predicted - seen)[both] ** 2)))
        held = float(np.sqrt(np.mean(np.abs(start - seen)[both] ** 2)))
        found.append(
            {"levels": int(both.sum()), "rms": round(rms, 3), "rms_of_persistence": round(held, 3),
             "why": None}
        )  # fmt: skip
    return found


def _verified(found: dict[str, Any]) -> str:
    if found["rms"] is None:
        return f"Not verified, because {found['why']}."
    return (
        f"Against the later sounding: {found['rms']:.1f} m/s (root mean square of the vector "
        f"difference over {found['levels']} levels); the sunset wind held unchanged would miss it "
        f"by {found['rms_of_persistence']:.1f} m/s."
    )
