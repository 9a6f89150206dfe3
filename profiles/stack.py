"""What a stack of profiles is: numpy arrays over (profile, level), each described once."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Self

import numpy as np

from backveer.profiles.flags import FLAGS, bits_concerning
from backveer.profiles.labels import (
    Bools,
    Flags,
    Floats,
    Labelled,
    Times,
    Words,
    labels,
    variable,
)

if TYPE_CHECKING:
    import xarray


@dataclass(frozen=True, eq=False)
class Stack(Labelled):
    """
    Vertical profiles side by side, shape (profile, level), padded with NaN above the last level.

    A variable that no profile has is a NaN that takes no memory. Build one with :meth:`of`, which
    fills in what is left out and checks the shapes; one profile is a stack of one.

    Notes
    -----
    Wind direction is where the wind blows from, degrees clockwise from north:
    u = -M sin(direction), v = -M cos(direction).
    """

    height: Floats = variable(
        "m", "profile level", "height above the ground at the site, positive up", "height"
    )
    altitude: Floats = variable(
        "m", "profile level", "geometric altitude above mean sea level, positive up", "altitude"
    )
    geopotential_height: Floats = variable(
        "m", "profile level", "geopotential height, where given", "geopotential_height"
    )
    air_pressure: Floats = variable("Pa", "profile level", "air pressure", "air_pressure")
    air_temperature: Floats = variable("K", "profile level", "air temperature", "air_temperature")
    dew_point_temperature: Floats = variable(
        "K", "profile level", "dew point temperature", "dew_point_temperature"
    )
    eastward_wind: Floats = variable(
        "m s-1", "profile level", "wind toward the east", "eastward_wind"
    )
    northward_wind: Floats = variable(
        "m s-1", "profile level", "wind toward the north", "northward_wind"
    )
    upward_air_velocity: Floats = variable(
        "m s-1", "profile level", "vertical wind, positive up, where given", "upward_air_velocity"
    )
    wind_speed_deviation: Floats = variable(
        "m s-1", "profile level", "standard deviation of the wind speed within the interval"
    )
    availability: Floats = variable(
        "1", "profile level", "fraction of the interval with valid lidar data"
    )
    carrier_to_noise_ratio: Floats = variable("dB", "profile level", "lidar carrier-to-noise ratio")
    level_flag: Flags = variable("1", "profile level", "findings of the quality check, in bits")
    time: Times = variable("", "profile", "time of the profile, UTC", "time")
    latitude: Floats = variable("degree_north", "profile", "latitude, north positive", "latitude")
    longitude: Floats = variable("degree_east", "profile", "longitude, east positive", "longitude")
    elevation: Floats = variable(
        "m", "profile", "elevation of the site above mean sea level", "surface_altitude"
    )
    wind_error: Floats = variable(
        "m s-1", "profile", "standard error of a wind component, where given"
    )
    station: Words = variable("", "profile", "name of the station, empty where not known")
    source: Words = variable("", "profile", "where the profile was read from")

    @classmethod
    def of(cls, profiles: int | None = None, **arrays: Any) -> Self:
        """
        Build a stack from the variables that there are.

        Parameters
        ----------
        profiles
            Number of profiles, when no array says it.
        **arrays
            Any field of the class. A (level,) array stands for all profiles, a scalar for all
            profiles and levels; it is not copied out.

        Raises
        ------
        TypeError
            For a name that is no variable of a stack.
        ValueError
            For shapes that do not fit each other; the message names both.

        Examples
        --------
        >>> stack = Stack.of(height=[10.0, 80.0], eastward_wind=[4.0, 7.0], northward_wind=0.0)
        >>> stack.profile_count, stack.level_count
        (1, 2)
        >>> stack.wind_from_direction.tolist()
        [[270.0, 270.0]]
        """
        table = labels(cls)
        unknown = sorted(set(arrays) - set(table))
        if unknown:
            raise TypeError(f"no variable of a stack: {', '.join(unknown)}")
        given = {name: np.asarray(array) for name, array in arrays.items()}
        levels = 0
        for name, array in given.items():
            if table[name].dims == ("profile", "level"):
                if array.ndim == 2:
                    profiles = array.shape[0] if profiles is None else profiles
                if array.ndim:
                    levels = max(levels, array.shape[-1])
            elif array.ndim == 1 and profiles is None:
                profiles = array.shape[0]
        profiles = 1 if profiles is None else profiles
        shapes = {("profile", "level"): (profiles, levels), ("profile",): (profiles,)}
        filled = {}
        for name, label in table.items():
            kind, missing = _kind(name)
            array = given.get(name, np.asarray(missing, dtype=kind))
            try:
                filled[name] = np.broadcast_to(array.astype(kind, copy=False), shapes[label.dims])
            except ValueError:
                raise ValueError(
                    f"{name} has shape {array.shape}, the stack {shapes[label.dims]}. "
                    f"Give it over ({', '.join(label.dims)})."
                ) from None
        return cls(**filled)

    @property
    def profile_count(self) -> int:
        """Number of profiles."""
        return int(self.height.shape[0])

    @property
    def level_count(self) -> int:
        """Number of levels of the longest profile, with all padding."""
        return int(self.height.shape[1])

    @property
    def wind_speed(self) -> Floats:
        """Wind speed, shape (profile, level). [m s-1]"""
        return np.hypot(self.eastward_wind, self.northward_wind)

    @property
    def wind_from_direction(self) -> Floats:
        """Direction that the wind blows from, in [0, 360), NaN in a calm. [degree]"""
        return wind_from_direction(self.eastward_wind, self.northward_wind)

    def has(self, name: str) -> bool:
        """Say whether any level of any profile has a value of this variable."""
        array = getattr(self, name)
        if array.size and not any(array.strides):
            array = array[(slice(0, 1),) * array.ndim]
        return bool(np.isfinite(array).any())

    def usable(self, *groups: str) -> Bools:
        """
        Say which levels can be used for the given groups of variables.

        Parameters
        ----------
        *groups
            Of ``"wind"``, ``"direction"``, ``"temperature"``, ``"humidity"``, ``"pressure"``. The
            height is always asked for.

        Returns
        -------
        usable : array of bool, shape (profile, level)
            True where height and the variables asked for are there and no flag speaks against them.
            The heights of the usable levels increase strictly once the quality check has run.
        """
        good: Bools = np.isfinite(self.height) & ((self.level_flag & bits_concerning(*groups)) == 0)
        for group in groups:
            for name in _NEEDED[group]:
                good = good & np.isfinite(getattr(self, name))
        return good

    def replace(self, **arrays: Any) -> Self:
        """Return the stack with some variables replaced."""
        return dataclasses.replace(self, **arrays)

    @classmethod
    def concatenate(cls, stacks: Iterable[Stack]) -> Self:
        """Join stacks one after the other, padding the shorter ones with NaN."""
        stacks = list(stacks)
        if not stacks:
            return cls.of(profiles=0)
        levels = max(stack.level_count for stack in stacks)
        joined: dict[str, Any] = {}
        for name, label in labels(cls).items():
            parts = [getattr(stack, name) for stack in stacks]
            if label.dims == ("profile", "level"):
                kind, missing = _kind(name)
                # A variable that nobody has stays a single NaN, however many profiles there are.
                if name != "level_flag" and not any(stack.has(name) for stack in stacks):
                    count = sum(stack.profile_count for stack in stacks)
                    joined[name] = np.broadcast_to(np.float64(np.nan), (count, levels))
                    continue
                whole = np.full((sum(len(part) for part in parts), levels), missing, dtype=kind)
                row = 0
                for part in parts:
                    whole[row : row + len(part), : part.shape[1]] = part
                    row += len(part)
                joined[name] = whole
            else:
                joined[name] = np.concatenate(parts)
        return cls(**joined)

    def to_xarray(self) -> xarray.Dataset:
        """Return a CF data set of discrete profiles (units, standard names, flag masks)."""
        dataset = super().to_xarray()
        dataset["level_flag"].attrs.update(
            flag_masks=np.array([flag.bit for flag in FLAGS], dtype=np.uint32),
            flag_meanings=" ".join(flag.name for flag in FLAGS),
        )
        for name in ("height", "altitude"):
            dataset[name].attrs["positive"] = "up"
        dataset["height"].attrs["axis"] = "Z"
        dataset["station"].attrs["cf_role"] = "timeseries_id"
        dataset = dataset.set_coords(["time", "latitude", "longitude", "height", "station"])
        dataset.attrs.update(Conventions="CF-1.11", featureType="profile")
        return dataset

    @classmethod
    def from_xarray(cls, dataset: xarray.Dataset) -> Self:
        """
        Build a stack from a data set that uses our names or the CF standard names.

        Parameters
        ----------
        dataset
            With axes (profile, level), or (level,) for a single profile. Pint-quantified variables
            are converted; plain ones must carry the units of the stack's table (or none).

        Raises
        ------
        ValueError
            For a unit that is not the stack's; the message names the variable and both units.
        """
        table = labels(cls)
        by_standard_name = {
            label.standard_name: name for name, label in table.items() if label.standard_name
        }
        found: dict[str, Any] = {}
        for key, array in dataset.variables.items():
            name = (
                key if key in table else by_standard_name.get(str(array.attrs.get("standard_name")))
            )
            if name is None or (name in found and key != name):
                continue
            label = table[str(name)]
            data: Any = dataset[key].data
            if hasattr(data, "to") and hasattr(data, "magnitude"):
                data = data.to(_PINT.get(label.unit, label.unit)).magnitude
            elif array.attrs.get("units", label.unit) not in _SAME_UNIT.get(
                label.unit, (label.unit,)
            ):
                raise ValueError(
                    f"{key} is in {array.attrs['units']!r}, a stack holds {label.unit!r}. "
                    f"Convert it, or quantify the data set with pint."
                )
            found[str(name)] = np.asarray(data)
        return cls.of(**found)


def wind_from_direction(u: Floats, v: Floats) -> Floats:
    """
    Direction that the wind blows from.

    Parameters
    ----------
    u, v : array
        Wind toward east and toward north. [m s-1]

    Returns
    -------
    direction : array
        Degrees clockwise from north in [0, 360); NaN where both are zero. [degree]

    Examples
    --------
    >>> wind_from_direction(np.array([0.0, -5.0]), np.array([-5.0, 0.0]))
    array([ 0., 90.])
    """
    u, v = np.asarray(u, dtype=float), np.asarray(v, dtype=float)
    direction = np.degrees(np.arctan2(-u, -v)) % 360.0
    direction = np.where(direction >= 360.0, 0.0, direction)  # -1e-15 % 360 rounds up to 360
    return np.where((u == 0) & (v == 0), np.nan, direction)


def wind_components(speed: Floats, direction: Floats) -> tuple[Floats, Floats]:
    """
    Wind toward east and toward north from speed and the direction that it blows from.

    Parameters
    ----------
    speed : array
        Never negative. [m s-1]
    direction : array
        Degrees clockwise from north that the wind blows from. Ignored in a calm. [degree]

    Returns
    -------
    u, v : array
        [m s-1]

    Examples
    --------
    >>> u, v = wind_components(np.array([10.0]), np.array([225.0]))
    >>> u.round(4), v.round(4)
    (array([7.0711]), array([7.0711]))
    """
    speed, direction = np.broadcast_arrays(
        np.asarray(speed, dtype=float), np.asarray(direction, dtype=float)
    )
    u, v = np.empty(speed.shape), np.empty(speed.shape)
    rows = max(1, _PIECE // max(1, speed[:1].size)) if speed.ndim else 1
    # In pieces: of a large file the intermediate arrays would be half of all memory.
    for piece in (slice(k, k + rows) for k in range(0, len(speed), rows)) if speed.ndim else ((),):
        moving = speed[piece] != 0
        angle = np.radians(np.where(moving, direction[piece], 0.0))
        u[piece] = -speed[piece] * np.sin(angle) + 0.0
        v[piece] = -speed[piece] * np.cos(angle) * moving + 0.0
    return u, v


_PIECE = 1 << 18  # cells


def _kind(name: str) -> tuple[Any, Any]:
    """Return the dtype of a variable of the stack and the value that stands for a missing one."""
    return _KINDS.get(name, (np.float64, np.nan))


_KINDS: Mapping[str, tuple[Any, Any]] = {
    "level_flag": (np.uint32, 0),
    "time": ("datetime64[ns]", np.datetime64("NaT")),
    "station": (np.object_, ""),
    "source": (np.object_, ""),
}
_NEEDED = {
    "wind": ("eastward_wind", "northward_wind"),
    "direction": ("eastward_wind", "northward_wind"),
    "temperature": ("air_temperature",),
    "humidity": ("dew_point_temperature",),
    "pressure": ("air_pressure",),
}
_SAME_UNIT = {
    "m s-1": ("m s-1", "m/s", "m s**-1", "meter / second", "meter_per_second"),
    "m": ("m", "meter", "metre", "gpm"),
    "K": ("K", "kelvin"),
    "Pa": ("Pa", "pascal"),
    "1": ("1", "", "dimensionless"),
    "degree_north": ("degree_north", "degrees_north", "degree", "degrees"),
    "degree_east": ("degree_east", "degrees_east", "degree", "degrees"),
}
_PINT = {"degree_north": "degree", "degree_east": "degree", "1": "dimensionless", "m s-1": "m/s"}
