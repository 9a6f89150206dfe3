"""The JSON of what turbines meet: SI, an object a turbine in each profile, tables over time."""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from typing import IO, Any

import numpy as np

from backveer.io.readers.reading import Reading
from backveer.io.run import Run
from backveer.io.words.cautions import TURBINE
from backveer.io.words.record import failure_record, plain, profile_records, version
from backveer.profiles.expected_veer import ExpectedVeer
from backveer.profiles.labels import Labelled, labels
from backveer.profiles.rotor import Rotor
from backveer.profiles.rotor_climate import RotorClimate

WORDS = ("why", "roughness_why", "air_density_from", "geostrophic_from", "roughness_from")


def write_rotor_json(
    out: IO[str],
    reading: Reading,
    told: Rotor,
    expected: ExpectedVeer | None,
    over: Sequence[RotorClimate],
    run: Run,
) -> None:
    """
    Write the JSON of ``backveer rotor``.

    Parameters
    ----------
    out
        Text stream.
    reading
        What the answers are of.
    told, expected
        The answers, a row for each profile of ``reading.stack``.
    over
        Tables over time, one a turbine; they stand under ``climate``.
    run
        What the run was; it stands under ``run``.
    """
    out.write(f'{{"backveer": {json.dumps(version())}, "run": {_text(run.record())},\n')
    out.write(f'"caution": {_text(TURBINE)}, "profiles": [')
    rows = rotor_records(told, expected)
    before = "\n"
    for record, rotors in zip(profile_records(reading), rows, strict=True):
        record["rotors"] = rotors
        out.write(before + _text(record))
        before = ",\n"
    failures = [failure_record(failure) for failure in reading.failures]
    out.write(f'\n], "climate": {_text([climate_record(each) for each in over])},\n')
    out.write(f'"failures": {_text(failures)}}}\n')


def rotor_records(
    told: Rotor, expected: ExpectedVeer | None = None
) -> Iterator[list[dict[str, Any]]]:
    """Give the objects of each profile, one a turbine."""
    count, turbines = told.veer.shape
    columns = _columns(told)
    more = {} if expected is None else _columns(expected)
    names, hubs, diameters = (
        plain(told.turbine),
        plain(told.hub_height),
        plain(told.rotor_diameter),
    )
    for row in range(count):
        of_profile = []
        for place in range(turbines):
            record = {
                "turbine": names[place],
                "hub_height": hubs[place],
                "rotor_diameter": diameters[place],
                **{name: values[row][place] for name, values in columns.items()},
            }
            if expected is not None:
                record["expected_veer"] = {
                    name: values[row][place] for name, values in more.items()
                }
            of_profile.append(record)
        yield of_profile


def climate_record(over: RotorClimate) -> dict[str, Any]:
    """Return one turbine over time."""
    return {
        "turbine": over.turbine,
        "quantity": over.quantity,
        "unit": over.unit,
        "tables": [_table(table) for table in over.tables],
        "direction": _table(over.direction),
        "events": [
            {
                "threshold": each.threshold,
                "count": len(each.count),
                "recovery": _number(each.recovery),
                "interval": _number(each.interval),
                **{
                    name: plain(np.asarray(getattr(each, name)))
                    for name in ("duration", "peak", "cut")
                },
                "begin": [_time(time) for time in each.begin],
            }
            for each in over.events
        ],
        "joint": [
            {
                "rows": each.row_kind,
                "columns": each.column_kind,
                "row": each.row.tolist(),
                "column": each.column.tolist(),
                "count": each.count.tolist(),
                "recovery": _number(each.recovery),
            }
            for each in (over.by_speed, over.by_hour)
        ],
    }


def _table(table: Any) -> dict[str, Any]:
    kept: dict[str, Any] = {"by": table.kind}
    for name in ("confidence", "block_days"):
        if hasattr(table, name):
            kept[name] = _number(float(getattr(table, name)))
    kept.update({name: plain(np.asarray(getattr(table, name))) for name in labels(table)})
    if "why" in kept:
        kept["why"] = [why or None for why in kept["why"]]
    return kept


def _columns(holder: Labelled) -> dict[str, list[Any]]:
    found = {}
    for name, label in labels(holder).items():
        if label.dims != ("profile", "turbine"):
            continue
        values = plain(np.asarray(getattr(holder, name)))
        if name in WORDS:
            values = [[word or None for word in row] for row in values]
        found[name] = values
    return found


def _number(value: float) -> float | None:
    return value if np.isfinite(value) else None


def _time(time: Any) -> str | None:
    return None if np.isnat(time) else f"{np.datetime_as_string(time, unit='s')}Z"


def _text(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False, allow_nan=False)
