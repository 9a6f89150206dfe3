"""From a table and what the user says to profiles: recognise, settle, put together."""

from __future__ import annotations

import numpy as np

from backveer.io.readers.levels import Draft
from backveer.io.readers.long_table import read_long
from backveer.io.readers.place_and_time import site
from backveer.io.readers.radial import is_radial, read_radial
from backveer.io.readers.reading import Hints
from backveer.io.readers.recognise import recognise
from backveer.io.readers.table import Table
from backveer.io.readers.wide_table import is_wide, read_wide


def understand(table: Table, hints: Hints) -> Draft:
    """
    Turn a table into profiles.

    Parameters
    ----------
    table
        As :func:`backveer.io.readers.text.read_tables` gives it.
    hints
        What the user says.

    Returns
    -------
    Draft
        Profiles, not yet quality-checked, with what each column was read as.

    Raises
    ------
    ReadError
        What cannot be understood, with the option that settles it; the source is not set.
    """
    if is_radial(table.header, hints):
        return read_radial(table, site(table.metadata, table.header, hints), hints)
    claims = recognise(
        table.header,
        table.units,
        tuple(column.dtype != np.float64 for column in table.columns),
        tuple(hints.columns.items()),
        tuple(hints.units.items()),
    )
    where = site(table.metadata, table.header, hints)
    read = read_wide if is_wide(claims) else read_long
    return read(table, claims, where)
