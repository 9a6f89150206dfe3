"""Everything that meets the outside world: files, words, pictures, the command line."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from backveer.io.readers.door import read

__all__ = ["read"]


def __getattr__(name: str) -> Any:
    """Load the readers when they are first asked for, so that the package stays light."""
    if name == "read":
        from backveer.io.readers.door import read

        return read
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
