"""Options that several commands share, and what they become."""

from __future__ import annotations

import functools
import itertools
import re
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import click
from click.core import ParameterSource

if TYPE_CHECKING:
    from backveer.io.readers.reading import Hints, Reading

FILES = "FILE... may be a path, a glob, a .gz, .bz2, .xz, .zst or .zip, or - for standard input."


def reading_options(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add the files and the options that every command that reads takes; they become ``hints``."""
    names = (
        "latitude",
        "longitude",
        "elevation",
        "station",
        "time",
        "unit",
        "column",
        "columns",
    )

    @functools.wraps(command)
    def with_hints(**given: Any) -> Any:
        said = {name: given.pop(name) for name in names}
        return command(hints=_hints(said), **given)

    for decorate in reversed(
        (
            click.argument("files", nargs=-1, required=True, metavar="FILE..."),
            click.option("--latitude", type=click.FloatRange(-90, 90), help="Degrees north."),
            click.option("--longitude", type=click.FloatRange(-180, 360), help="Degrees east."),
            click.option(
                "--elevation",
                type=click.FloatRange(-500, 9000),
                help="Height of the site above mean sea level, m.",
            ),
            click.option("--station", help="Name of the station."),
            click.option("--time", help="Time of the profile, ISO 8601; UTC unless it says."),
            click.option(
                "--unit",
                multiple=True,
                metavar="NAME=UNIT",
                help="Unit of a column, by its header or by what it is (wind_speed=kt).",
            ),
            click.option(
                "--column",
                multiple=True,
                metavar='NAME="HEADER"',
                help='What a column is to be read as (wind_speed="FF 10min").',
            ),
            click.option(
                "--columns",
                type=click.Path(exists=True, dir_okay=False),
                metavar="MAP.toml",
                help="The same, kept in a file: tables [columns] and [units], and the place.",
            ),
        )
    ):
        with_hints = decorate(with_hints)
    return with_hints


def units_option(command: Callable[..., Any]) -> Callable[..., Any]:
    """Add ``--units``: what people read; JSON and stored data are always SI."""
    return click.option(
        "--units",
        type=click.Choice(["si", "aviation"]),
        default="si",
        show_default=True,
        help="Units that people read; JSON is always SI.",
    )(command)


def _hints(said: dict[str, Any]) -> Hints:
    from backveer.io.readers.reading import Hints

    kept: dict[str, Any] = {}
    if said["columns"]:
        kept = _map_file(said["columns"])
    columns = dict(kept.pop("columns", {})) | dict(
        _pair(text, "--column") for text in said["column"]
    )
    units = dict(kept.pop("units", {})) | dict(_pair(text, "--unit") for text in said["unit"])
    place = ("latitude", "longitude", "elevation", "station", "time")
    for name in place:
        if said[name] is not None:
            kept[name] = said[name]
    return Hints(columns=columns, units=units, **kept)


def _pair(text: str, option: str) -> tuple[str, str]:
    name, equals, value = text.partition("=")
    if not equals or not name.strip() or not value.strip():
        raise click.UsageError(f"{option} {text!r} is not of the form NAME=VALUE")
    return name.strip(), value.strip().strip("\"'")


def _map_file(path: str) -> dict[str, Any]:
    """Read MAP.toml: [columns], [units], and the place at its top."""
    import tomllib
    from pathlib import Path

    try:
        kept = tomllib.loads(Path(path).read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise click.UsageError(f"{path}: not a TOML file that can be read ({error})") from None
    kinds: dict[str, Any] = {
        "columns": dict,
        "units": dict,
        "latitude": (int, float),
        "longitude": (int, float),
        "elevation": (int, float),
        "station": str,
        "time": str,
    }
    for name, value in kept.items():
        if name not in kinds:
            raise click.UsageError(f"{path}: {name!r} is none of {', '.join(kinds)}")
        if name == "time" and hasattr(value, "isoformat"):
            kept[name] = value.isoformat()
        elif not isinstance(value, kinds[name]) or isinstance(value, bool):
            raise click.UsageError(f"{path}: {name} = {value!r} is of the wrong kind")
        if kinds[name] is dict and not all(isinstance(text, str) for text in value.values()):
            raise click.UsageError(f"{path}: every entry of [{name}] must be a text in quotes")
    for name, limit in (("latitude", 90), ("longitude", 360)):
        if name in kept and not -limit <= kept[name] <= limit:
            raise click.UsageError(f"{path}: {name} = {kept[name]} is outside +-{limit}")
    return kept


def geostrophic_wind(text: str | None) -> tuple[float, float] | None:
    """
    Understand ``250/14`` (degrees and m/s) or ``250/27kt`` as eastward and northward wind.

    Raises
    ------
    click.BadParameter
        If it is neither.

    Examples
    --------
    >>> u, v = geostrophic_wind("270/10")
    >>> round(u, 6), round(v, 6)
    (10.0, 0.0)
    """
    if text is None:
        return None
    match = re.fullmatch(r"\s*(\d+(?:\.\d*)?)\s*/\s*(\d+(?:\.\d*)?)\s*(kt|kn|m/s|)\s*", text)
    if match is None or not float(match[1]) <= 360 or not float(match[2]) < 200:
        raise click.BadParameter(
            f"{text!r} is not DIRECTION/SPEED, such as 250/14 (m/s) or 250/27kt",
            param_hint="--geostrophic",
        )
    from backveer.io.readers.units import KNOT
    from backveer.profiles.stack import wind_components

    speed = float(match[2]) * (KNOT if match[3] in ("kt", "kn") else 1.0)
    u, v = wind_components(speed, float(match[1]))  # type: ignore[arg-type]
    return float(u), float(v)


def numbers(text: str | None, option: str) -> tuple[float, ...] | None:
    """Understand ``0,100,200`` as increasing numbers."""
    if text is None:
        return None
    try:
        values = tuple(float(part) for part in text.split(","))
    except ValueError:
        raise click.BadParameter(f"{text!r} is not a list of numbers", param_hint=option) from None
    if len(values) < 2 or any(b <= a for a, b in itertools.pairwise(values)):
        raise click.BadParameter(
            f"{text!r} must hold two or more increasing numbers", param_hint=option
        )
    return values


def options_given() -> str:
    """Write the options of the running command that were given, as they would be written again."""
    import shlex

    context = click.get_current_context()
    words = []
    for parameter in context.command.params:
        if not isinstance(parameter, click.Option) or parameter.name is None:
            continue
        if context.get_parameter_source(parameter.name) is not ParameterSource.COMMANDLINE:
            continue
        value = context.params.get(parameter.name)
        for one in value if parameter.multiple and isinstance(value, tuple) else (value,):
            words.append(parameter.opts[0])
            words += [] if parameter.is_flag else [shlex.quote(str(one))]
    return " ".join(words)


def exit_status(reading: Reading) -> int:
    """Say each failure on standard error and return the exit status of the run."""
    for failure in reading.failures:
        click.echo(f"backveer: {failure}", err=True)
    if not reading.failures:
        return 0
    return 1 if reading.files else 3
