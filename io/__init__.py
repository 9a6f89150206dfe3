"""Everything that meets the outside world: files, words, pictures, the command line."""

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
