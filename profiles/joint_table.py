"""How often two classes meet: veer and speed, veer and hour of the day."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from backveer.profiles.classes import Classes
from backveer.profiles.labels import Floats, Labelled, Words, variable

if TYPE_CHECKING:
    import pandas


@dataclass(frozen=True, eq=False)
class Joint(Labelled):
    """How often two classes meet."""

    row: Words = variable("", "row", "names of the first classes")
    column: Words = variable("", "column", "names of the second classes")
    count: Any = variable("1", "row column", "profiles in both")
    share: Floats = variable("1", "row column", "their share of all that have both classes")
    row_kind: str = ""
    column_kind: str = ""
    recovery: float = np.nan

    def to_pandas(self, dimension: str | None = None) -> pandas.DataFrame:
        """
        Return the shares, a row for each first class and a column for each second.

        Raises
        ------
        ValueError
            For any other ``dimension`` than ``"row"``.
        """
        import pandas

        if dimension not in (None, "row"):
            raise ValueError(f"a joint table has a row for each first class, not {dimension!r}.")
        return pandas.DataFrame(
            self.share,
            index=pandas.Index(self.row, name=self.row_kind),
            columns=pandas.Index(self.column, name=self.column_kind),
        )


def joint(rows: Classes, columns: Classes) -> Joint:
    """
    Count how often two classes meet: veer and speed, veer and hour.

    Parameters
    ----------
    rows, columns
        Of the same profiles.

    Returns
    -------
    Joint
        ``recovery`` is the share of all profiles that have both classes.

    Raises
    ------
    ValueError
        For classes of different numbers of profiles.

    Examples
    --------
    >>> a = Classes("veer", ("low", "high"), np.array([0, 0, 1, -1]))
    >>> b = Classes("speed", ("light", "strong"), np.array([0, 1, 1, 1]))
    >>> joint(a, b).count.tolist()
    [[1, 1], [0, 1]]
    """
    if rows.index.shape != columns.index.shape:
        raise ValueError(
            f"{rows.kind} has {rows.index.size} profiles, {columns.kind} {columns.index.size}. "
            f"Sort the same profiles."
        )
    both = (rows.index >= 0) & (columns.index >= 0)
    place = rows.index[both] * len(columns) + columns.index[both]
    count = np.bincount(place, minlength=len(rows) * len(columns)).reshape(len(rows), len(columns))
    total = int(count.sum())
    return Joint(
        row=np.array(rows.names, dtype=object),
        column=np.array(columns.names, dtype=object),
        count=count,
        share=count / total if total else np.full(count.shape, np.nan),
        row_kind=rows.kind,
        column_kind=columns.kind,
        recovery=total / both.size if both.size else np.nan,
    )
