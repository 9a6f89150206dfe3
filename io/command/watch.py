"""
Watch a folder: give each file once it has come to rest, and again whenever it changes.

A file counts as whole when its size and its time of change are the same at two looks, one interval
apart: a writer that pauses longer than that is read too early, fails or gives less, and is read
again when it goes on. Looking (polling) works on every system and over a network, where
notifications do not.
"""

from __future__ import annotations

import os
import stat
import time
from collections.abc import Callable, Iterator
from pathlib import Path

Signature = tuple[int, int, int]


def settled(
    folder: Path,
    interval: float,
    *,
    scans: int | None = None,
    sleep: Callable[[float], None] = time.sleep,
) -> Iterator[list[Path]]:
    """
    Give, look by look, the files that have come to rest since they were last given.

    Parameters
    ----------
    folder
        Whose files are watched: not its subfolders, nor names that begin with a dot.
    interval
        Between two looks. [s]
    scans
        Number of looks; without end when left out.
    sleep
        What waits.

    Yields
    ------
    list of Path
        In order of name, so that the order of arrival within one look does not matter. Empty when
        nothing has changed.

    Notes
    -----
    A folder that vanishes is waited for: it may be on a network.
    """
    given: dict[str, Signature] = {}
    before: dict[str, Signature] = {}
    look = 0
    while scans is None or look < scans:
        if look:
            sleep(interval)
        now = _signatures(folder)
        rested = sorted(
            name
            for name, signature in now.items()
            if before.get(name) == signature and given.get(name) != signature
        )
        given = {name: signature for name, signature in given.items() if name in now}
        given |= {name: now[name] for name in rested}
        before = now
        look += 1
        yield [folder / name for name in rested]


def _signatures(folder: Path) -> dict[str, Signature]:
    found: dict[str, Signature] = {}
    try:
        with os.scandir(folder) as entries:
            for entry in entries:
                if entry.name.startswith("."):
                    continue
                try:
                    # A link to a pipe or a device would hang the reader: only plain files.
                    said = entry.stat()
                except OSError:
                    continue  # gone between the two calls, or a broken link
                if stat.S_ISREG(said.st_mode):
                    found[entry.name] = (said.st_size, said.st_mtime_ns, said.st_ino)
    except OSError:
        return {}
    return found
