"""A progress bar on standard error, on a terminal only, for work that takes long."""

from __future__ import annotations

import contextlib
import sys
from collections.abc import Callable, Iterator


@contextlib.contextmanager
def progress(what: str, total: int | None) -> Iterator[Callable[[int], None]]:
    """
    Show a bar while the block runs; it is wiped when the block ends, whichever way.

    Parameters
    ----------
    what
        What is being done.
    total
        Steps there are; None where that is not known.

    Yields
    ------
    advance
        To be called with the number of steps done.
    """
    # Pipes and files get no bar, and do not wait for rich to be imported.
    if not sys.stderr.isatty():
        yield lambda _steps: None
        return
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    with Progress(
        TextColumn("{task.description}"),
        BarColumn(),
        TimeRemainingColumn(),
        console=Console(stderr=True),
        transient=True,
    ) as bar:
        task = bar.add_task(what, total=total)
        yield lambda steps: bar.advance(task, steps)
