"""What was read, and how it was understood."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

from backveer.io.readers.errors import ReadError

if TYPE_CHECKING:  # the command line asks for Hints before it needs numpy
    from backveer.profiles.stack import Stack


@dataclass(frozen=True)
class Hints:
    """
    What the user says to fill or override what a file lacks.

    Attributes
    ----------
    latitude, longitude, elevation
        Degrees north, degrees east, m above mean sea level.
    station
        Name of the station.
    time
        ISO 8601 time of the profile; UTC where it names no zone.
    units
        Unit by column header, or by what the column is (``wind_speed``, ``height``, ...), as
        written on the command line.
    columns
        Column header by what it is to be read as (``wind_speed``, ``air_pressure``, ...).
    """

    latitude: float | None = None
    longitude: float | None = None
    elevation: float | None = None
    station: str | None = None
    time: str | None = None
    units: Mapping[str, str] = field(default_factory=dict)
    columns: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True)
class ColumnReading:
    """How one column was understood; ``read_as`` and ``unit`` are None for one left unused."""

    column: str
    read_as: str | None
    unit: str | None
    why: str


@dataclass(frozen=True, eq=False)
class FileReading:
    """
    One input, understood.

    Attributes
    ----------
    source
        The file as the user named it.
    stack
        Its profiles, quality-checked.
    columns
        Each column of the file.
    remarks
        What was left out, repaired or assumed, each a sentence without a full stop.
    digest
        SHA-256 of the input's bytes, uncompressed, in hexadecimal; empty where it was not kept.
    """

    source: str
    stack: Stack
    columns: tuple[ColumnReading, ...]
    remarks: tuple[str, ...]
    digest: str = ""


@dataclass(frozen=True, eq=False)
class Reading:
    """Several inputs: what was read, and what could not be."""

    files: tuple[FileReading, ...]
    failures: tuple[ReadError, ...]

    @property
    def stack(self) -> Stack:
        """All profiles, file after file."""
        if len(self.files) == 1:
            return self.files[0].stack
        from backveer.profiles.stack import Stack

        return Stack.concatenate(file.stack for file in self.files)
