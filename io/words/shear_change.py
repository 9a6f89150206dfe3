"""One line about a profile that has just come, and what it changes."""

from __future__ import annotations

import numpy as np

from backveer.io.words.safe import safe
from backveer.io.words.shear_table import groups_of, minute, strongest_columns
from backveer.io.words.units import Units
from backveer.profiles.shear_statement import ShearStatement


def latest(said: ShearStatement) -> int:
    """Return the row of the latest profile; the last row where no profile has a time."""
    known = ~np.isnat(said.stack.time)
    if not known.any():
        return said.stack.profile_count - 1
    return int(np.flatnonzero(known)[np.argmax(said.stack.time[known])])


def change_line(said: ShearStatement, row: int, before: frozenset[str] | None, units: Units) -> str:
    """
    Write one line about a profile that has just come, and what it changes.

    Parameters
    ----------
    said, row
        The answers, and which profile.
    before
        Names of the rules that the profile before it met; None where there was none.
    units
        What people read.
    """
    one = said.select(row)
    stack = one.stack
    when = "time not known" if np.isnat(stack.time[0]) else f"{minute(stack.time[0])} UTC"
    name = safe(str(stack.station[0] or stack.source[0]), 40)
    if one.shear.why[0]:
        return f"{when}  {name}  not determined, because {one.shear.why[0]}"
    text = strongest_columns(one, units)[0]
    number, term, layer = text[:9].strip(), text[10:18].strip(), text[19:].strip()
    parts = (
        ["no shear larger than its error"]
        if number.startswith("<")
        else [f"{number} {units.shear.name} {term}, {layer} {units.height.name}"]
    )
    met = met_rules(one)
    if before is None:
        parts.append(f"met: {'; '.join(sorted(met))}" if met else "no criterion met")
    else:
        for words, names in (("now met", met - before), ("no longer met", before - met)):
            if names:
                parts.append(f"{words}: {'; '.join(sorted(names))}")
        if met == before:
            parts.append(f"still {len(met)} met" if met else "still no criterion met")
    group = groups_of(one)[0]
    if group:
        parts.append(f"candidate {group}")
    return f"{when}  {name}  " + "; ".join(safe(part, 400) for part in parts)


def met_rules(one: ShearStatement) -> frozenset[str]:
    """Return the names of the rules that the first profile meets."""
    return frozenset(
        rule.name for rule, yes in zip(one.settings.rules, one.criteria.met[0], strict=True) if yes
    )
