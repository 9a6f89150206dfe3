"""
The JSON of a reading and of a statement: SI, the names of the house, ``null`` where there is none.

The object of a profile is made from rows of plain Python values; :class:`_Plain` turns each array
of an answer into such rows once for the whole stack, because ten thousand profiles are asked for
at once. Numbers are given to six significant digits, levels to four decimals.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from typing import IO, Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.errors import ReadError
from backveer.io.readers.reading import FileReading, Reading
from backveer.io.words.findings import findings
from backveer.profiles.labels import Labelled
from backveer.profiles.stack import Stack
from backveer.profiles.statement import Statement

LEVEL_DECIMALS = 4
DIGITS = 6
LEVELS = (
    "height",
    "altitude",
    "air_pressure",
    "air_temperature",
    "dew_point_temperature",
    "eastward_wind",
    "northward_wind",
)
EKMAN = (
    "scale_height",
    "eddy_viscosity",
    "geostrophic_eastward_wind",
    "geostrophic_northward_wind",
    "geostrophic_eastward_shear",
    "geostrophic_northward_shear",
    "departure_eastward_at_ground",
    "departure_northward_at_ground",
    "cross_isobar_angle",
    "friction_velocity",
)
VISCOSITY = (
    "friction_velocity",
    "roughness_length",
    "depth",
    "cross_isobar_angle",
    "geostrophic_eastward_wind",
    "geostrophic_northward_wind",
)


def write_json(
    out: IO[str], reading: Reading, statement: Statement | None = None, **more: Sequence[Any]
) -> None:
    """
    Write the JSON of a reading, and of the statement made from it, one profile at a time.

    Parameters
    ----------
    out
        Text stream.
    reading
        What was read.
    statement
        The statement of ``reading.stack``.
    **more
        Further keys of every profile, one value a profile (``rotors``, ``low_level_shear``, ...).
    """
    out.write(f'{{"backveer": {json.dumps(version())}, "profiles": [')
    before = "\n"
    for index, record in enumerate(profile_records(reading, statement)):
        record.update({name: values[index] for name, values in more.items()})
        out.write(before + json.dumps(record, ensure_ascii=False, allow_nan=False))
        before = ",\n"
    failures = [failure_record(failure) for failure in reading.failures]
    out.write(f'\n], "failures": {json.dumps(failures, ensure_ascii=False)}}}\n')


def version() -> str:
    """Return the version of the package that gives the answers."""
    from importlib.metadata import version

    return version("backveer")


def failure_record(failure: ReadError) -> dict[str, Any]:
    """Return one input that could not be read, as JSON has it."""
    return {
        "source": failure.source,
        "line": failure.line,
        "problem": failure.problem,
        "remedy": failure.remedy,
    }


def profile_records(
    reading: Reading, statement: Statement | None = None
) -> Iterator[dict[str, Any]]:
    """Give the object of each profile, in the order of ``reading.stack``."""
    answers = None if statement is None else _Answers(statement)
    index = 0
    for file in reading.files:
        levels = _Plain(file.stack, decimals=LEVEL_DECIMALS)
        columns = [_column(column) for column in file.columns]
        remarks = findings(file)
        for row in range(file.stack.profile_count):
            record = _profile(file, levels, row)
            record["columns"] = columns
            record["levels"] = _levels(levels, row)
            record["remarks"] = remarks[row]
            if answers is not None:
                record.update(answers.record(index))
            yield record
            index += 1


class _Plain:
    """The arrays of one labelled answer as rows of plain Python values, made when first asked."""

    def __init__(self, holder: Labelled, decimals: int | None = None) -> None:
        self.holder = holder
        self.decimals = decimals
        self.made: dict[str, list[Any]] = {}

    def __call__(self, name: str, row: int) -> Any:
        if name not in self.made:
            self.made[name] = plain(getattr(self.holder, name), self.decimals)
        return self.made[name][row]

    def has(self, name: str) -> bool:
        return hasattr(self.holder, name)


def plain(array: NDArray[Any], decimals: int | None = None) -> list[Any]:
    """
    Return nested lists of Python values: rounded, and None where there is no finite number.

    Parameters
    ----------
    array
        Numbers, truths, words or times.
    decimals
        Decimals to round to; six significant digits when left out.

    Examples
    --------
    >>> plain(np.array([1.23456789e-4, np.nan, 5.0]))
    [0.000123457, None, 5.0]
    """
    array = np.asarray(array)
    if array.dtype.kind != "f":
        return array.tolist()  # type: ignore[no-any-return]
    finite = np.isfinite(array)
    values = np.where(finite, array, 0.0)
    if decimals is not None:
        rounded = np.round(values, decimals)
    else:
        size = np.where(values == 0, 1.0, np.abs(values))
        with np.errstate(over="ignore", under="ignore"):
            scale = 10.0 ** np.clip(DIGITS - 1 - np.floor(np.log10(size)), 0, 300)
            rounded = np.round(values * scale) / scale
        rounded = np.where(np.isfinite(rounded), rounded, values)
    rounded = rounded + 0.0  # no negative zero
    if finite.all():
        return rounded.tolist()  # type: ignore[no-any-return]
    boxed = rounded.astype(object)
    boxed[~finite] = None
    return boxed.tolist()  # type: ignore[no-any-return]


def _column(column: Any) -> dict[str, Any]:
    return {
        "column": column.column,
        "read_as": column.read_as,
        "unit": column.unit,
        "why": column.why,
    }


def _profile(file: FileReading, levels: _Plain, row: int) -> dict[str, Any]:
    time = file.stack.time[row]
    return {
        "source": file.stack.source[row] or file.source,
        "station": file.stack.station[row] or None,
        "time": None if np.isnat(time) else f"{np.datetime_as_string(time, unit='s')}Z",
        "latitude": _coordinate(file.stack, "latitude", row),
        "longitude": _coordinate(file.stack, "longitude", row),
        "elevation": _coordinate(file.stack, "elevation", row),
    }


def _coordinate(stack: Stack, name: str, row: int) -> float | None:
    value = float(getattr(stack, name)[row])
    return round(value, 6) if np.isfinite(value) else None


def _levels(levels: _Plain, row: int) -> dict[str, Any]:
    columns = {name: levels(name, row) for name in LEVELS}
    count = 0
    for values in columns.values():
        for i in range(len(values) - 1, count - 1, -1):
            if values[i] is not None:
                count = i + 1
                break
    flags = levels("level_flag", row)
    trimmed = {name: values[:count] for name, values in columns.items()}
    return {**trimmed, "level_flag": flags[:count]}


class _Answers:
    """What ``turn`` adds to the object of a profile."""

    def __init__(self, statement: Statement) -> None:
        self.height = _Plain(statement.stack, decimals=LEVEL_DECIMALS)
        self.of = {name: _Plain(answer) for name, answer in statement.answers.items()}
        self.criterion = statement.boundary_layer.jet_criterion
        self.wind_error = plain(statement.wind_error)

    def record(self, row: int) -> dict[str, Any]:
        return {
            "wind_error": self.wind_error[row],
            "coriolis": self._coriolis(row),
            "turning": self._turning(row),
            "ekman": self._ekman(row),
            **(
                {"viscosity_profile": self._viscosity(row)}
                if "viscosity_profile" in self.of
                else {}
            ),
            "geostrophic": self._geostrophic(row),
            "thermal_wind": {
                "layers": _layers(
                    self.of["thermal_wind"],
                    row,
                    "layer_base_pressure",
                    "base_pressure top_pressure base_height top_height eastward northward "
                    "temperature_gradient_eastward temperature_gradient_northward advection error "
                    "uncorrected_advection mean_temperature sense why",
                )
            },
            "boundary_layer": self._boundary_layer(row),
        }

    def _coriolis(self, row: int) -> dict[str, Any]:
        of = self.of["coriolis"]
        return {
            "coriolis_parameter": of("coriolis_parameter", row),
            "horizontal_coriolis_parameter": of("horizontal_coriolis_parameter", row),
            "inertial_period": of("inertial_period", row),
            "applies": of("applies", row),
            "why": of("why", row) or None,
        }

    def _turning(self, row: int) -> dict[str, Any]:
        of = self.of["turning"]
        return {
            "total": of("total", row),
            "error": of("error", row),
            "sense": of("sense", row) or None,
            "base": of("base", row),
            "top": of("top", row),
            "why": of("why", row) or None,
            "layers": _layers(
                of, row, "layer_base", "base top turning error rate speed_change sense why"
            ),
        }

    def _ekman(self, row: int) -> dict[str, Any]:
        of = self.of["ekman"]
        errors = {name: of(f"{name}_error", row) for name in EKMAN if of.has(f"{name}_error")}
        intervals = {
            name: [of(f"{name}_low", row), of(f"{name}_high", row)]
            for name in EKMAN
            if of.has(f"{name}_low")
        }
        candidates = []
        for place, model in enumerate(of("candidate_model", row)):
            if not model:
                continue
            candidates.append(
                {
                    "model": model,
                    "parameters": {
                        name: of(f"candidate_{name}", row)[place]
                        for name in EKMAN
                        if of.has(f"candidate_{name}")
                    },
                    "rms": of("candidate_rms", row)[place],
                    "aicc": of("candidate_aicc", row)[place],
                }
            )
        return {
            "model": of("model", row) or None,
            **{name: of(name, row) for name in EKMAN if of.has(name)},
            "rms": of("rms", row),
            "errors": errors,
            "intervals": intervals,
            "effective_levels": of("effective_levels", row),
            "noise_length": of("noise_length", row),
            "top": of("top", row),
            "verdict": of("verdict", row),
            "why": of("why", row) or None,
            "candidates": candidates,
        }

    def _viscosity(self, row: int) -> dict[str, Any]:
        of = self.of["viscosity_profile"]
        candidates = [
            {
                "shape": shape,
                "aicc": of("candidate_aicc", row)[place],
                "friction_velocity": of("candidate_friction_velocity", row)[place],
                "cross_isobar_angle": of("candidate_cross_isobar_angle", row)[place],
            }
            for place, shape in enumerate(of("candidate_shape", row))
            if shape
        ]
        return {
            "shape": of("shape", row) or None,
            **{name: of(name, row) for name in VISCOSITY},
            "rms": of("rms", row),
            "aicc": of("aicc", row),
            "aicc_gain": of("aicc_gain", row),
            "errors": {name: of(f"{name}_error", row) for name in VISCOSITY},
            "intervals": {
                name: [of(f"{name}_low", row), of(f"{name}_high", row)] for name in VISCOSITY
            },
            "noise_length": of("noise_length", row),
            "verdict": of("verdict", row),
            "why": of("why", row) or None,
            "candidates": candidates,
        }

    def _geostrophic(self, row: int) -> dict[str, Any]:
        of = self.of["geostrophic"]
        evidence = [
            {"from": origin, "eastward": u, "northward": v, "error": error, "why": why or None}
            for origin, u, v, error, why in zip(
                of("evidence_from", row),
                of("evidence_eastward", row),
                of("evidence_northward", row),
                of("evidence_error", row),
                of("evidence_why", row),
                strict=True,
            )
            if origin
        ]
        kept = [
            (z, along, across)
            for z, along, across in zip(
                self.height("height", row),
                of("departure_along", row),
                of("departure_across", row),
                strict=True,
            )
            if along is not None
        ]
        return {
            "evidence": evidence,
            "chosen": of("chosen", row) or None,
            "departure": {
                "height": [z for z, _, _ in kept],
                "along": [along for _, along, _ in kept],
                "across": [across for _, _, across in kept],
            },
            "departure_error": of("departure_error", row),
            "departure_why": of("departure_why", row) or None,
            "depth": of("depth", row),
            "depth_from": of("depth_from", row) or None,
            "friction_velocity": of("friction_velocity", row),
            "friction_velocity_error": of("friction_velocity_error", row),
            "why": of("friction_velocity_why", row) or None,
        }

    def _boundary_layer(self, row: int) -> dict[str, Any]:
        of = self.of["boundary_layer"]
        inversions = [
            {"base": base, "top": top, "strength": strength, "kind": kind}
            for base, top, strength, kind in zip(
                of("inversion_base", row),
                of("inversion_top", row),
                of("inversion_strength", row),
                of("inversion_kind", row),
                strict=True,
            )
            if base is not None
        ]
        return {
            "bulk_richardson_depth": of("bulk_richardson_depth", row),
            "why": of("depth_why", row) or None,
            "inversions": inversions,
            "jet": {
                "height": of("jet_height", row),
                "speed": of("jet_speed", row),
                "falloff": of("jet_falloff", row),
                "meets_criterion": bool(of("jet_meets_criterion", row)),
                "criterion": self.criterion,
                "why": of("jet_why", row) or None,
            },
        }


def _layers(of: _Plain, row: int, present: str, names: str) -> list[dict[str, Any]]:
    """Return one object a layer, for the layers that the profile has."""
    kept = names.split()
    columns = [of(f"layer_{name}", row) for name in kept if of.has(f"layer_{name}")]
    kept = [name for name in kept if of.has(f"layer_{name}")]
    layers = []
    for there, *values in zip(of(present, row), *columns, strict=True):
        if there is None:
            continue
        layer = dict(zip(kept, values, strict=True))
        for word in ("sense", "why"):
            if word in layer:
                layer[word] = layer[word] or None
        layers.append(layer)
    return layers
