"""What a text file says before anyone knows what its columns mean."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True, eq=False)
class Table:
    """
    A header, its columns, and what stood around them.

    Attributes
    ----------
    source
        The file as the user named it (with the member's name, for an archive of several).
    header
        Names of the columns as written, stripped of quotes and outer white space.
    units
        What a units row under the header says of each column; empty where there is none.
    columns
        One array a column, all of one length: float64 where every cell is a number or one of the
        *textual* missing marks (``""``, ``///``, ``-``, ``NaN``, ``N/A``, ...), which become NaN;
        otherwise an object array of ``str``. Numeric missing codes (-999, 9999) are left alone:
        only who knows what a column is can tell a code from a value.
    lines
        Line of the file of each row, from 1.
    metadata
        Key and value of metadata lines before the header ("Latitude: 58.4 N"), in order, as
        written and stripped of the comment mark; lines without a key stand under ``""``.
    remarks
        What was left out or repaired on the way, each as a sentence without a full stop.
    encoding, delimiter, decimal
        The dress: e.g. ``"utf-8"``, ``","`` (``" "`` for white space, ``""`` for fixed columns),
        ``"."``.
    """

    source: str
    header: tuple[str, ...]
    units: tuple[str, ...]
    columns: tuple[NDArray[Any], ...]
    lines: NDArray[np.int64]
    metadata: tuple[tuple[str, str], ...]
    remarks: tuple[str, ...]
    encoding: str
    delimiter: str
    decimal: str
