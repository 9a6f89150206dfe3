"""
From a file as the instrument wrote it to a stack of profiles.

Modules
-------
door            the door: from names to checked profiles
errors          what can be wrong with an input
files           paths, globs, compression: from a name to bytes
text            from bytes to tables
table           what a text file says before anyone knows what its columns mean
columns         from a table to profiles
spellings       accepted names (spellings.toml), and how a name is looked up
names           what one column can be, from its name and unit
recognise       which column is what, and why
units           accepted spellings of units, and what they are in SI
settle          what the numbers settle where the names leave it open
plausible       what each quantity can be, and which numbers stand for a missing one
moments         dates and times as people write them
place_and_time  where and when: metadata lines and what the user says
heights_from_pressure
                by the hypsometric equation, or of the standard atmosphere
levels          from columns in SI to the variables of a stack
row_places      time and place of each row
profiles_apart  which rows are one profile
long_table      one row a level, one profile or many
wide_table      one row a time, columns by height
reading         what was read, and how it was understood
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
