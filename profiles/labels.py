"""What a variable is called, its unit and its meaning, said once beside the field that holds it."""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Self

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    import pandas
    import xarray

Floats = NDArray[np.float64]
Flags = NDArray[np.uint32]
Bools = NDArray[np.bool_]
Words = NDArray[np.object_]
Times = NDArray[np.datetime64]


@dataclass(frozen=True)
class Variable:
    """
    The label of one array: everything that prints, converts, stores or checks it reads this.

    Attributes
    ----------
    unit
        SI unit as CF writes it (``"m s-1"``); ``"1"`` for pure numbers, ``""`` for words and times.
    dims
        Names of the axes, ``"profile"`` first.
    meaning
        What it is, with its sign where it has one.
    standard_name
        CF standard name, where there is one.
    """

    unit: str
    dims: tuple[str, ...]
    meaning: str
    standard_name: str | None = None


def variable(unit: str, dims: str, meaning: str, standard_name: str | None = None) -> Any:
    """
    Declare a labelled field of a dataclass; ``dims`` are the axis names, apart by spaces.

    Examples
    --------
    >>> @dataclass(frozen=True)
    ... class Depth(Labelled):
    ...     depth: Floats = variable("m", "profile", "depth of the layer")
    >>> labels(Depth)["depth"].unit
    'm'
    """
    label = Variable(unit, tuple(dims.split()), meaning, standard_name)
    return dataclasses.field(metadata={"variable": label})


def labels(holder: Any) -> dict[str, Variable]:
    """Return the label of every labelled field of a dataclass (or an instance of one), in order."""
    return {
        field.name: field.metadata["variable"]
        for field in dataclasses.fields(holder)
        if "variable" in field.metadata
    }


class Labelled:
    """A frozen dataclass of labelled arrays, which crosses to xarray and pandas."""

    def select(self, profiles: Any) -> Self:
        """Return the same with only the given profiles (an index array, a mask or a slice)."""
        if isinstance(profiles, (int, np.integer)):
            profiles = slice(int(profiles), int(profiles) + 1 or None)
        return dataclasses.replace(
            self,  # type: ignore[type-var]
            **{
                name: getattr(self, name)[profiles]
                for name, label in labels(self).items()
                if label.dims[:1] == ("profile",)
            },
        )

    def to_xarray(self) -> xarray.Dataset:
        """
        Return an :class:`xarray.Dataset` with CF names, units and meanings.

        Words are object arrays of ``str``; settings that are no arrays become attributes.
        """
        import xarray

        data = {}
        for name, label in labels(self).items():
            attributes = {"long_name": label.meaning}
            if label.standard_name:
                attributes["standard_name"] = label.standard_name
            if label.unit:
                attributes["units"] = label.unit
            data[name] = xarray.Variable(label.dims, np.array(getattr(self, name)), attributes)
        settings = {
            field.name: getattr(self, field.name)
            for field in dataclasses.fields(self)  # type: ignore[arg-type]
            if "variable" not in field.metadata
            and isinstance(getattr(self, field.name), (str, int, float))
        }
        return xarray.Dataset(data, attrs=settings)

    def to_pandas(self, dimension: str | None = None) -> pandas.DataFrame:
        """
        Return a long table: one row for each profile, or for each profile and ``dimension``.

        Parameters
        ----------
        dimension
            The second axis to lay out (``"layer"``, ``"level"``). When left out: the only second
            axis there is, otherwise a row a profile.

        Raises
        ------
        ValueError
            If no variable has that axis.
        """
        import pandas

        table = labels(self)
        # A third axis does not fit into a table of rows.
        second = {label.dims[1] for label in table.values() if len(label.dims) == 2}
        if dimension is None and len(second) == 1:
            dimension = next(iter(second))
        if dimension is None or dimension == "profile":
            return pandas.DataFrame(
                {
                    name: np.array(getattr(self, name))
                    for name, label in table.items()
                    if label.dims == ("profile",)
                }
            ).rename_axis("profile")
        if dimension not in second:
            raise ValueError(
                f"{type(self).__name__} has no axis {dimension!r}. Choose one of "
                f"{', '.join(sorted(second | {'profile'}))}."
            )
        wide = {n: np.asarray(getattr(self, n)) for n, v in table.items() if dimension in v.dims}
        shape = np.broadcast_shapes(
            *(a.shape for n, a in wide.items() if table[n].dims[0] == "profile")
        )
        index = pandas.MultiIndex.from_product(
            [range(shape[0]), range(shape[1])], names=["profile", dimension]
        )
        columns: dict[str, Any] = {}
        for name, label in table.items():
            array = np.asarray(getattr(self, name))
            if label.dims == ("profile",):
                columns[name] = np.repeat(array, shape[1])
            elif label.dims == ("profile", dimension):
                columns[name] = array.reshape(-1)
            elif label.dims == (dimension,):
                columns[name] = np.tile(array, shape[0])
        return pandas.DataFrame(columns, index=index)
