"""Criteria for low-level wind shear: from TOML to rules."""

from __future__ import annotations

import dataclasses
import re
import tomllib
from pathlib import Path
from typing import Any

from backveer.io.readers.errors import Contradiction, NotFound, ReadError
from backveer.profiles.low_level_shear import FOOT, KNOT, KNOT_PER_100_FEET
from backveer.profiles.shear_criteria import METRICS, Rule

SHIPPED = Path(__file__).with_name("shear_rules.toml")
_SHEARS = {"kt/100 ft": KNOT_PER_100_FEET, "m/s/30 m": 1 / 30.0, "s-1": 1.0}
_SPEEDS = {"kt": KNOT, "m/s": 1.0}
_HEIGHTS = {"ft": FOOT, "m": 1.0}
_FORM = 'Write a text such as "15 kt", "10 kt/100 ft", "2000 ft"'
_WORDS = ("name", "authority", "source", "verified", "wording")


def read_rules(path: str | None = None) -> tuple[Rule, ...]:
    """
    Read the shipped criteria, and those of a file, which add to them or replace the same names.

    Parameters
    ----------
    path
        A TOML file with ``[[rule]]`` tables; with ``only = true`` at its top it stands alone.

    Raises
    ------
    ReadError
        For a file that cannot be read, or a rule that says too little or contradicts itself.

    Examples
    --------
    >>> read_rules()[0].authority.split()[0]
    'ICAO'
    """
    shipped = _rules(_load(SHIPPED), "the shipped criteria")
    if path is None:
        return shipped
    content = _load(Path(path))
    rules = {} if content.get("only") is True else {rule.name: rule for rule in shipped}
    rules.update({rule.name: rule for rule in _rules(content, path)})
    return tuple(rules.values())


def _load(path: Path) -> dict[str, Any]:
    try:
        return tomllib.loads(path.read_text(encoding="utf-8"))
    except OSError as error:
        raise NotFound(f"{error.strerror}", "Name a TOML file", source=str(path)) from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise ReadError(f"not TOML ({error})", "Correct it there", source=str(path)) from None


def _rules(content: dict[str, Any], source: str) -> tuple[Rule, ...]:
    unknown = set(content) - {"rule", "only"}
    tables = content.get("rule", [])
    if unknown or not isinstance(tables, list) or not all(isinstance(t, dict) for t in tables):
        raise Contradiction(
            "only [[rule]] tables and `only` are understood", "See --help of shear", source=source
        )
    return tuple(_rule(table, source) for table in tables)


def _rule(table: dict[str, Any], source: str) -> Rule:
    name = str(table.get("name", "?"))

    def refuse(problem: str, remedy: str) -> ReadError:
        return Contradiction(f"rule {name!r}: {problem}", remedy, source=source)

    known = {field.name for field in dataclasses.fields(Rule)} - {"unit"}
    if unknown := sorted(set(table) - known):
        raise refuse(f"{', '.join(unknown)} is not understood", f"Use {', '.join(sorted(known))}")
    needed = ("name", "authority", "metric", "threshold", "top")
    if missing := [key for key in needed if key not in table]:
        raise refuse(f"{', '.join(missing)} is missing", "Add it")
    if table["metric"] not in METRICS:
        raise refuse(f"metric {table['metric']!r} is not known", f"Use {', '.join(METRICS)}")
    if not isinstance(table.get("strict", False), bool):
        raise refuse("strict is neither true nor false", "Write true or false")
    units = _SHEARS if table["metric"] == "shear" else _SPEEDS
    quantities = {"threshold": units, "top": _HEIGHTS, "depth": _HEIGHTS}
    numbers: dict[str, Any] = {}
    unit = ""
    for key, among in quantities.items():
        text = table.get(key, "0 m" if key == "depth" else None)
        match = re.fullmatch(r"\s*(\d+(?:\.\d+)?)\s*(\S.*?)\s*", str(text))
        if match is None or match[2] not in among:
            raise refuse(f"{key} = {text!r} is not in {' or '.join(among)}", _FORM)
        numbers[key] = float(match[1]) * among[match[2]]
        if key == "threshold":
            unit = match[2]
    if numbers["threshold"] <= 0 or numbers["top"] <= 0:
        raise refuse("threshold and top must be greater than zero", _FORM)
    words: dict[str, Any] = {key: str(table.get(key, "")) for key in _WORDS}
    return Rule(
        **words,
        metric=table["metric"],
        unit=unit,
        strict=table.get("strict", False),
        **numbers,
    )
