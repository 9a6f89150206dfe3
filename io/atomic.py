"""Write a file so that a reader sees the old one or the new one, never half of either."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Iterator, Sequence
from pathlib import Path


class WriteError(Exception):
    """An output that cannot be written; its text is one line that names the file and the remedy."""


@contextlib.contextmanager
def replacing(path: str | os.PathLike[str]) -> Iterator[Path]:
    """
    Give a temporary path beside ``path``; on success it takes that name, on failure it goes.

    Parameters
    ----------
    path
        The output that the user named. Its folder must exist: nothing is made outside it.

    Raises
    ------
    WriteError
        If the folder does not exist, cannot be written, or the disk is full.

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     with replacing(Path(folder) / "answer.txt") as temporary:
    ...         _ = temporary.write_text("42")
    ...     (Path(folder) / "answer.txt").read_text()
    '42'
    """
    target = Path(path)
    if target.is_dir():
        raise WriteError(f"{target}: is a folder. Name a file in it.")
    if not target.parent.is_dir():
        raise WriteError(f"{target}: the folder {target.parent} does not exist. Make it first.")
    temporary = None
    try:
        # The suffix is kept, because writers choose their format by it.
        handle, name = tempfile.mkstemp(
            prefix=f".{target.stem[:40]}-", suffix=target.suffix, dir=target.parent
        )
        os.close(handle)
        temporary = Path(name)
        yield temporary
        descriptor = os.open(temporary, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
        temporary.chmod(_mode_of(target))
        temporary.replace(target)
        temporary = None
    except OSError as error:
        raise WriteError(
            f"{target}: cannot be written ({error.strerror or error}). "
            "Check the folder's permissions and the space on the disk."
        ) from error
    finally:
        if temporary is not None:
            temporary.unlink(missing_ok=True)


def suffix_among(path: str | os.PathLike[str], suffixes: Sequence[str]) -> str:
    """
    Return the suffix by which ``path`` says its format, in lower case.

    Raises
    ------
    WriteError
        If it says none of the formats that can be written.
    """
    suffix = Path(path).suffix.lower()
    if suffix not in suffixes:
        choice = f"{', '.join(suffixes[:-1])} or {suffixes[-1]}"
        raise WriteError(f"{path}: no format is known by that name. End it in {choice}.")
    return suffix


def _mode_of(target: Path) -> int:
    """Return the permissions of the file that is replaced, or those a new file would get."""
    if target.exists():
        return target.stat().st_mode & 0o777
    mask = os.umask(0)
    os.umask(mask)
    return 0o666 & ~mask
