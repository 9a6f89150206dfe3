"""Profiles and answers as files for other programs: CF netCDF, Parquet, CSV; always SI."""

from __future__ import annotations

from typing import TYPE_CHECKING

from backveer.io.atomic import replacing, suffix_among

if TYPE_CHECKING:
    import pandas

    from backveer.profiles.labels import Labelled
    from backveer.profiles.stack import Stack

SUFFIXES = (".nc", ".parquet", ".csv")


def write_stack(stack: Stack, path: str) -> None:
    """
    Store a stack; :func:`backveer.io.readers.read` takes the CSV back.

    Parameters
    ----------
    stack
        Profiles.
    path
        Where to: ``.nc`` (CF discrete profiles), ``.parquet`` or ``.csv`` (one row a level, with
        the unit in each column's name). Written beside its place and renamed.

    Raises
    ------
    WriteError
        If the suffix says no known format, or the place cannot be written.
    """
    if suffix_among(path, SUFFIXES) == ".nc":
        write_netcdf(stack, path)
    else:
        write_table(long_table(stack), path)


def write_netcdf(holder: Labelled, path: str) -> None:
    """Store labelled arrays as netCDF-4 with CF names, units and meanings."""
    with replacing(path) as temporary:
        dataset = holder.to_xarray()
        encoding = {
            name: {"zlib": True, "complevel": 4}
            for name, array in dataset.variables.items()
            if array.dtype.kind in "fiu" and array.ndim == 2
        }
        for name, array in dataset.variables.items():
            if array.dtype.kind == "b":
                dataset[name] = array.astype("int8")
        dataset.to_netcdf(temporary, engine="netcdf4", encoding=encoding)


def write_table(table: pandas.DataFrame, path: str) -> None:
    """Store a table as Parquet or CSV."""
    with replacing(path) as temporary:
        if suffix_among(path, SUFFIXES) == ".parquet":
            table.to_parquet(temporary, engine="pyarrow", index=False)
        else:
            table.to_csv(temporary, index=False, date_format="%Y-%m-%dT%H:%M:%SZ")


def long_table(stack: Stack) -> pandas.DataFrame:
    """
    One row a level, without the padding, the unit in each column's name.

    ``profile`` counts from 1, so that profiles of the same time and station stay apart.
    """
    import numpy as np

    from backveer.profiles.labels import labels

    table = stack.to_pandas("level")
    kept = np.zeros(len(table), dtype=bool)
    names = {}
    for name, label in labels(stack).items():
        if label.dims == ("profile", "level") and name != "level_flag":
            kept |= np.isfinite(table[name].to_numpy())
            if not stack.has(name):
                table = table.drop(columns=name)
                continue
        if label.unit and name != "level_flag":
            names[name] = f"{name} ({label.unit})"
    table = table[kept].reset_index(level="profile").rename(columns=names)
    table["profile"] += 1
    return table
