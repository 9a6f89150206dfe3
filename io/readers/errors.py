"""
What can be wrong with an input, as a family.

::

    ReadError
    ├── NotFound         no such file, a directory, a broken link, no permission
    ├── Damaged          truncated or corrupt bytes, a broken archive
    ├── NotATable        empty, binary, HTML, JSON, header only: nothing to read as a table
    ├── UnknownUnit      a unit that the data cannot settle, or a spelling that is not known
    ├── MissingColumn    no wind, no height and no pressure, nothing to tell profiles apart
    ├── Contradiction    two columns claim the same, units disagree, latitude 95
    └── TooFewLevels     a single level is no profile

Each says what is wrong, where, and what to do.
"""

from __future__ import annotations


class ReadError(Exception):
    """
    An input that cannot be read.

    Parameters
    ----------
    problem
        What is wrong, without a full stop at its end.
    remedy
        What to do about it, one sentence, without a full stop at its end.
    source
        The file as the user named it; the outer reader fills it in.
    line
        Line of the file, from 1.
    """

    def __init__(
        self, problem: str, remedy: str, source: str | None = None, line: int | None = None
    ) -> None:
        super().__init__(problem)
        self.problem = problem
        self.remedy = remedy
        self.source = source
        self.line = line

    def __reduce__(self) -> tuple[object, ...]:
        """Cross between processes with all four fields."""
        return (type(self), (self.problem, self.remedy, self.source, self.line))

    def __str__(self) -> str:
        place = self.source or "input"
        if self.line is not None:
            place += f", line {self.line}"
        return f"{place}: {self.problem}. {self.remedy}."


class NotFound(ReadError):
    """No such file, a directory, a broken link, no permission."""


class Damaged(ReadError):
    """Truncated or corrupt bytes, a broken archive."""


class NotATable(ReadError):
    """Empty, binary, HTML, JSON, header only: nothing to read as a table."""


class UnknownUnit(ReadError):
    """A unit that the data cannot settle, or a spelling that is not known."""


class MissingColumn(ReadError):
    """No wind, no height and no pressure, nothing to tell profiles apart."""


class Contradiction(ReadError):
    """Two columns claim the same, units disagree, a latitude of 95."""


class TooFewLevels(ReadError):
    """A single level is no profile."""
