"""
From a file as the instrument wrote it to a stack of profiles.

Modules
-------
assembly               From the lines under a header to tables: columns, line numbers, and what
                       was left out
cells                  what one cell of a table says: a number, a missing mark, a clock time, a
                       word
columns                From a table and what the user says to profiles: recognise, settle, put
                       together
dialect                how the cells of a text table are told apart: delimiter, decimal mark,
                       fixed columns
door                   the door: from the names that the user gives to checked profiles
encoding               From bytes to UTF-8 bytes, or to the word for what they are instead of
                       text
errors                 what can be wrong with an input, as a family
files                  From what the user names to bytes
height_row             tables whose heights stand in a row of their own, made into one header
                       with heights in its names
heights_from_pressure  heights from pressure: hypsometric where there is temperature, otherwise
                       of the standard atmosphere
layout                 where in a text file the table stands: its header, its units row, its
                       first row
levels                 From columns in SI to the variables of a stack: wind, dew point, heights
long_table             long tables: one row a level, one profile or many
moments                dates and times as people write them, to UTC
names                  what one column can be, from its name and its unit alone
place_and_time         where and when: from metadata lines, columns and what the user says
plausible              what each quantity can be, and which numbers stand for a missing one
preamble               what stands around a table: comments, metadata lines, rules, units
profiles_apart         which rows of a long table are one profile, and in which order its levels
                       stand
radial                 long tables of line-of-sight velocities, as a scanning lidar writes them
reading                what was read, and how it was understood
recognise              which column is what, and why: from the names and the units row alone
row_places             time and place of each row, where columns say them
series                 files of a day each become one record in time order: duplicates, gaps and
                       clocks that changed
settle                 what the numbers settle where the names leave it open: units by physics
                       and magnitude
shear_rules            criteria for low-level wind shear: from TOML to rules
spellings              accepted names of columns and metadata (spellings.toml), and how a name
                       is looked up
table                  what a text file says before anyone knows what its columns mean
text                   From the bytes of a text file to its tables
turbine_file           turbines kept in a file: name, hub height and rotor diameter
units                  accepted spellings of units, and what they are in SI
wide_table             wide tables: one row a time, columns by height, as lidars and masts write
                       them
"""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from backveer.io.readers.door import read
    from backveer.io.readers.reading import Hints
else:

    def __getattr__(name):
        """Load the readers when they are first asked for, so that the package stays light."""
        if name == "read":
            from backveer.io.readers.door import read

            return read
        if name == "Hints":
            from backveer.io.readers.reading import Hints

            return Hints
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


__all__ = ["Hints", "read"]
