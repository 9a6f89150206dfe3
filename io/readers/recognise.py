"""
Which column is what, and why: from the names and the units row alone.

What the names leave open (a unit, what a height is counted from) is settled later from the
numbers. The spellings are data (spellings.toml). An archive repeats one header in thousands of
files, so the answer is kept by the exact header.
"""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

from backveer.io.readers.errors import Contradiction, MissingColumn, UnknownUnit
from backveer.io.readers.names import (
    BY_HEIGHT,
    KINDS,
    REFERENCES,
    Claim,
    brackets,
    claim_of,
    plain,
    signs,
)
from backveer.io.readers.spellings import cuts, words_of
from backveer.io.readers.units import Unit, parse, reference_of, spellings_of

READ_AS = tuple(name for name in KINDS if not name.startswith("some_") and name != "flight_level")
"""What ``--column`` can name."""


@lru_cache(maxsize=1024)
def recognise(
    header: tuple[str, ...],
    units: tuple[str, ...],
    of_words: tuple[bool, ...],
    said_columns: tuple[tuple[str, str], ...] = (),
    said_units: tuple[tuple[str, str], ...] = (),
) -> tuple[Claim, ...]:
    """
    Take each column for something.

    Parameters
    ----------
    header, units
        Of the table; ``units`` may be empty.
    of_words
        Of each column, whether it holds words or times rather than numbers.
    said_columns, said_units
        What the user says: header by what it is, unit by header or by what it is.

    Raises
    ------
    MissingColumn
        The user names a column that is not there.
    UnknownUnit
        A unit that is not known.
    Contradiction
        Name and units row disagree, or two columns claim the same.
    """
    rows = units if units else ("",) * len(header)
    candidates = [
        claim_of(place, name, row, words)
        for place, (name, row, words) in enumerate(zip(header, rows, of_words, strict=True))
    ]
    candidates = _as_said(candidates, header, rows, said_columns)
    claims = _components(candidates)
    claims = _wide_or_not(claims)
    claims = _units_as_said(claims, said_units, said_columns)
    return tuple(_one_claim_each(claims, {quantity for quantity, _ in said_columns}))


def find_column(header: tuple[str, ...], said: str, option: str) -> int:
    """
    Return the place of a column that the user names.

    Raises
    ------
    MissingColumn
        If there is none, listing those there are.
    """
    for same in (str, str.strip, lambda text: "".join(words_of(text))):
        places = [place for place, name in enumerate(header) if same(name) == same(said)]
        if len(places) == 1:
            return places[0]
    raise MissingColumn(
        f'{option} names a column "{said}" that is not there',
        f"The columns are: {', '.join(header)}",
    )


def _as_said(
    claims: list[list[Claim]],
    header: tuple[str, ...],
    rows: tuple[str, ...],
    said: tuple[tuple[str, str], ...],
) -> list[list[Claim]]:
    """Let what the user says of columns hold."""
    for quantity, name in said:
        if quantity not in READ_AS:
            raise MissingColumn(
                f"--column {quantity}=...: nothing is called {quantity}",
                f"It can be: {', '.join(READ_AS)}",
            )
        place = find_column(header, name, f"--column {quantity}=...")
        kinds = KINDS[quantity]
        _, in_brackets, _ = brackets(header[place])
        tails = (header[place][cut.end() :] for cut in cuts(header[place]))
        texts = (in_brackets, *tails, rows[place])
        unit = next((u for u in (parse(t, *kinds) for t in texts if t) if u), None)
        claims[place] = [Claim(place, header[place], quantity, unit, "named with --column")]
        for other, candidates in enumerate(claims):
            if other == place:
                continue
            kept = [claim for claim in candidates if claim.quantity != quantity]
            if quantity in ("height", "altitude", "geopotential_height"):
                vague = ("some_height", "some_altitude")
                kept = [claim for claim in kept if claim.quantity not in vague]
            claims[other] = kept or [
                replace(
                    candidates[0],
                    quantity=None,
                    unit=None,
                    why=f"another column is {plain(quantity)} by --column",
                )
            ]
    return claims


def _components(claims: list[list[Claim]]) -> list[Claim]:
    """Tell u and v from a speed with that sign, by whether both are there."""
    all_can_be = [{claim.quantity for claim in candidates} for candidates in claims]
    east = [i for i, can in enumerate(all_can_be) if "eastward_wind" in can]
    north = [i for i, can in enumerate(all_can_be) if "northward_wind" in can]
    both = bool(east) and bool(north)
    settled = []
    for place, candidates in enumerate(claims):
        component = [c for c in candidates if c.quantity in ("eastward_wind", "northward_wind")]
        if component and len(candidates) > len(component):
            if both:
                settled.append(component[0])
                continue
            speeds = [c for c in candidates if c.quantity == "wind_speed"]
            direction = any(
                "wind_from_direction" in can for i, can in enumerate(all_can_be) if i != place
            )
            if speeds and direction:
                said = f"{speeds[0].why}; beside a direction it is a speed"
                settled.append(replace(speeds[0], why=said))
                continue
            settled.append(component[0])
            continue
        settled.append(candidates[0])
    return settled


def _wide_or_not(claims: list[Claim]) -> list[Claim]:
    """Take numbers in names for heights only where several heights share one quantity."""
    heights = {c.height for c in claims if c.height is not None and c.quantity in BY_HEIGHT}
    if not heights:
        return claims
    winds = {
        c.height
        for c in claims
        if c.height is not None
        and c.quantity in ("wind_speed", "eastward_wind", "wind_from_direction")
    }
    if len(heights) >= 2 and winds:
        return claims
    plain_winds = any(
        c.height is None and c.quantity in ("wind_speed", "eastward_wind") for c in claims
    )
    if plain_winds:
        return [
            replace(c, quantity=None, unit=None, why="a number in the name, of one height only")
            if c.height is not None
            else c
            for c in claims
        ]
    return claims


def _units_as_said(
    claims: list[Claim],
    said: tuple[tuple[str, str], ...],
    said_columns: tuple[tuple[str, str], ...],
) -> list[Claim]:
    """Let what the user says of units hold: by header, or by what the column is."""
    header = tuple(claim.name for claim in claims)
    for name, text in said:
        meant = [place for place, claim in enumerate(claims) if claim.quantity == name]
        if name == "height":
            of_names = [p for p, c in enumerate(claims) if c.height is not None]
            for place in of_names:
                length = parse(text, "length")
                if length is None:
                    raise UnknownUnit(
                        f"--unit {name}={text}: no unit of height that is known here",
                        f"It can be: {spellings_of('length')}",
                    )
                claims[place] = replace(claims[place], height_unit=length)
            vague = [p for p, c in enumerate(claims) if c.quantity == "some_height"]
            meant = meant or vague
            if of_names and not meant:
                continue
        if not meant:
            meant = [find_column(header, name, f"--unit {name}=...")]
        for place in meant:
            claim = claims[place]
            quantity = claim.quantity
            if quantity is None:
                raise MissingColumn(
                    f'--unit "{name}={text}": the column is not used ({claim.why})',
                    f'Say what it is with --column NAME="{name}"',
                )
            kinds = KINDS[quantity]
            if quantity in ("time", "date", "clock"):
                claims[place] = replace(claim, unit=Unit(text, "time", 1.0))
                continue
            unit = parse(text, *kinds)
            if unit is None:
                raise UnknownUnit(
                    f"--unit {name}={text}: no unit of {plain(quantity)} that is known here",
                    f"It can be: {signs(quantity)}" if kinds else "Leave it out",
                )
            said_why = claim.why if claim.why.startswith("named with") else "name in the header"
            why = f"{said_why}, unit given with --unit"
            reference = reference_of(text)
            if quantity in ("some_height", "some_altitude") and reference:
                quantity = REFERENCES[reference]
            if unit.kind == "level":
                quantity = "air_pressure"
            claims[place] = replace(claim, quantity=quantity, unit=unit, why=why)
    return claims


_MANY = frozenset({"station", "source"})  # a second one does no harm and is left aside


_FIRST = frozenset({"latitude", "longitude", "elapsed_time", "launch", "time", "date", "clock"})


def _one_claim_each(claims: list[Claim], said: set[str]) -> list[Claim]:
    """Refuse two columns that claim the same."""
    taken: dict[tuple[str, float | None, str], Claim] = {}
    result = []
    for claim in claims:
        if claim.quantity is None:
            result.append(claim)
            continue
        unit = claim.height_unit.sign if claim.height_unit else ""
        key = (claim.quantity, claim.height, unit)
        before = taken.setdefault(key, claim)
        if before is claim:
            result.append(claim)
        elif claim.quantity in _MANY | _FIRST:
            result.append(
                replace(claim, quantity=None, unit=None, why=f'"{before.name}" says this already')
            )
        else:
            quantity = claim.quantity
            option = {"some_height": "height", "some_altitude": "altitude"}.get(quantity, quantity)
            raise Contradiction(
                f'the columns "{before.name}" and "{claim.name}" both claim to be '
                f"{plain(quantity)}",
                f'Say which with --column {option}="{before.name}"',
            )
    return result
