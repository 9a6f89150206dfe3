"""What turbines meet as a file for other programs: a row a profile and turbine, always SI."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from backveer.io.atomic import replacing, suffix_among
from backveer.io.run import Run
from backveer.io.store import SUFFIXES
from backveer.io.words.cautions import TURBINE
from backveer.profiles.expected_veer import ExpectedVeer
from backveer.profiles.labels import labels
from backveer.profiles.rotor import Rotor
from backveer.profiles.stack import Stack

if TYPE_CHECKING:
    import pandas
    import xarray

OF_PROFILE = ("time", "station", "latitude", "longitude", "elevation", "source")


def write_rotor(
    stack: Stack, told: Rotor, expected: ExpectedVeer | None, run: Run, path: str
) -> None:
    """
    Store the answers of every profile and turbine, with the run they come from.

    Parameters
    ----------
    stack, told, expected
        Profiles and answers, in the same order.
    run
        Stands in the attributes of netCDF, the metadata of Parquet and the first line of CSV, which
        begins with ``#``, as one line of JSON.
    path
        Ends in ``.parquet``, ``.csv`` or ``.nc``. Written beside its place and renamed.

    Raises
    ------
    WriteError
        If the suffix says no known format, or the place cannot be written.
    """
    suffix = suffix_among(path, SUFFIXES)
    with replacing(path) as temporary:
        if suffix == ".nc":
            dataset = as_dataset(stack, told, expected)
            dataset.attrs.update(Conventions="CF-1.11", caution=TURBINE, backveer_run=run.line())
            dataset.to_netcdf(temporary, engine="netcdf4")
            return
        table = as_table(stack, told, expected)
        if suffix == ".csv":
            with temporary.open("w", encoding="utf-8", newline="") as out:
                out.write(f"# backveer run: {run.line()}\n")
                table.to_csv(out, index=False, date_format="%Y-%m-%dT%H:%M:%SZ")
            return
        import pyarrow
        from pyarrow import parquet

        whole = pyarrow.Table.from_pandas(table, preserve_index=False)
        metadata = dict(whole.schema.metadata or {})
        metadata |= {b"backveer_run": run.line().encode(), b"caution": TURBINE.encode()}
        parquet.write_table(whole.replace_schema_metadata(metadata), temporary)


def as_table(stack: Stack, told: Rotor, expected: ExpectedVeer | None) -> pandas.DataFrame:
    """
    One row a profile and turbine, the unit in each column's name.

    ``profile`` counts from 1.
    """
    import pandas

    profiles, turbines = told.veer.shape
    columns: dict[str, Any] = {"profile": np.repeat(np.arange(1, profiles + 1), turbines)}
    for name in OF_PROFILE:
        columns[_named(name, labels(stack)[name].unit)] = np.repeat(getattr(stack, name), turbines)
    for holder, before in ((told, ""), (expected, "expected_veer_")):
        if holder is None:
            continue
        for name, label in labels(holder).items():
            array = np.asarray(getattr(holder, name))
            of_turbine = label.dims == ("turbine",)
            array = np.tile(array, profiles) if of_turbine else array.reshape(-1)
            columns[_named(before + name, label.unit)] = array
    return pandas.DataFrame(columns)


def as_dataset(stack: Stack, told: Rotor, expected: ExpectedVeer | None) -> xarray.Dataset:
    """Return the same over (profile, turbine), with CF names, units and meanings."""
    dataset = told.to_xarray()
    if expected is not None:
        more = expected.to_xarray()
        dataset = dataset.merge(more.rename({name: f"expected_veer_{name}" for name in more}))
        dataset.attrs.update({f"expected_veer_{key}": value for key, value in more.attrs.items()})
    of_profile = stack.to_xarray()
    dataset = dataset.assign_coords({name: of_profile[name].variable for name in OF_PROFILE})
    for key, array in dataset.variables.items():
        if array.dtype.kind == "b":
            dataset[key] = array.astype("int8")
    return dataset


def _named(name: str, unit: str) -> str:
    return f"{name} ({unit})" if unit and unit != "1" else name
