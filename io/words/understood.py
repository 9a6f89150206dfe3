"""How a file was understood, in print."""

from __future__ import annotations

import textwrap

import numpy as np

from backveer.io.readers.reading import FileReading
from backveer.io.words.findings import level_findings
from backveer.io.words.page import WIDTH, bullet, cut, place_of, time_of, wrapped
from backveer.io.words.safe import safe
from backveer.profiles.stack import Stack


def reading_text(file: FileReading) -> str:
    """Write how one file was understood: each column, what it was read as, its unit, and why."""
    stack = file.stack
    levels = np.isfinite(stack.height).sum(axis=1)
    lines = [safe(file.source), _described(stack, levels), ""]
    rows = [("column", "read as", "unit", "why")]
    for column in file.columns:
        rows.append(
            (
                safe(column.column, 30),
                column.read_as or "not used",
                safe(column.unit or "", 12),
                safe(column.why),
            )
        )
    widths = [min(max(len(row[i]) for row in rows), limit) for i, limit in enumerate((24, 22, 8))]
    room = WIDTH - sum(widths) - 6
    for row in rows:
        why = textwrap.wrap(row[3], max(room, 18)) or [""]
        first = "  ".join(cut(row[i], widths[i]).ljust(widths[i]) for i in range(3))
        lines.append(f"{first}  {why[0]}".rstrip())
        lines += [" " * (sum(widths) + 6) + more for more in why[1:]]
    remarks = list(dict.fromkeys(file.remarks))
    counted = level_findings(stack)
    if stack.profile_count == 1:
        remarks += counted[0]
    else:
        remarks += [
            f"{sum(bool(found) for found in counted)} of {stack.profile_count} profiles have "
            "levels with findings"
        ] * any(counted)
    if remarks:
        lines.append("")
        lines += [bullet(safe(remark, 400)) for remark in remarks]
    return "\n".join(lines)


def _described(stack: Stack, levels: np.ndarray) -> str:
    if stack.profile_count == 0:
        return "no profile"
    name = safe(str(stack.station[0]))
    where = f"{name}: {place_of(stack, 0)}" if name else place_of(stack, 0)
    times = stack.time[~np.isnat(stack.time)]
    if stack.profile_count == 1:
        when = f", {time_of(times[0])}" if times.size else ""
        return wrapped(f"{where}{when}; {levels[0]} levels")
    span = f", {time_of(times.min())} to {time_of(times.max())}" if times.size else ""
    few, many = int(levels.min()), int(levels.max())
    each = f"{few}" if few == many else f"{few} to {many}"
    more = len(set(stack.station.tolist())) - 1
    others = f" and {more} more" * bool(more)
    return wrapped(f"{where}{others}; {stack.profile_count} profiles{span}, of {each} levels")
