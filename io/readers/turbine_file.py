"""Turbines kept in a file: tables [[turbine]] with name, hub_height and rotor_diameter, in m."""

from __future__ import annotations

import tomllib
from pathlib import Path

from backveer.profiles.rotor import Turbine

KEYS = {"name", "hub_height", "rotor_diameter"}


def read_turbines(path: str) -> list[Turbine]:
    """
    Read a TOML file of turbines.

    Parameters
    ----------
    path
        The file.

    Raises
    ------
    ValueError
        If it is no such file, or a turbine has no name or a size that none has; the message names
        the file and what to do.
    """
    try:
        kept = tomllib.loads(Path(path).read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError) as error:
        raise ValueError(f"{path}: not a TOML file that can be read ({error})") from None
    tables = kept.get("turbine")
    if set(kept) != {"turbine"} or not isinstance(tables, list) or not tables:
        raise ValueError(
            f"{path}: holds no turbines. Write tables [[turbine]] with name, hub_height and "
            f"rotor_diameter"
        )
    turbines: list[Turbine] = []
    for number, table in enumerate(tables, 1):
        if not isinstance(table, dict) or set(table) != KEYS:
            raise ValueError(
                f"{path}: turbine {number} must have name, hub_height and rotor_diameter, and "
                f"nothing else"
            )
        sizes = table["hub_height"], table["rotor_diameter"]
        if not isinstance(table["name"], str) or not all(
            isinstance(size, int | float) and not isinstance(size, bool) for size in sizes
        ):
            raise ValueError(
                f"{path}: turbine {number}: the name must be a text, the sizes numbers of metres"
            )
        turbines.append(Turbine(table["name"], float(sizes[0]), float(sizes[1])))
    if len({each.name for each in turbines}) < len(turbines):
        raise ValueError(f"{path}: two turbines have the same name. Name them apart")
    return turbines
