"""What one column can be, from its name and its unit alone."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace

from backveer.io.readers.errors import Contradiction, UnknownUnit
from backveer.io.readers.spellings import Spellings, cuts, spellings, words_of
from backveer.io.readers.units import (
    Unit,
    is_magnetic,
    kinds_of,
    parse,
    reference_of,
    spellings_of,
)

NAME_AND_UNIT = "name and unit in the header"

KINDS: Mapping[str, tuple[str, ...]] = {
    "wind_speed": ("speed",),
    "wind_from_direction": ("angle",),
    "wind_to_direction": ("angle",),
    "eastward_wind": ("speed",),
    "northward_wind": ("speed",),
    "upward_air_velocity": ("speed",),
    "wind_speed_deviation": ("speed",),
    "wind_error": ("speed",),
    "air_pressure": ("pressure", "level"),
    "flight_level": ("level",),
    "height": ("length",),
    "altitude": ("length", "level"),
    "geopotential_height": ("length",),
    "some_height": ("length", "level"),
    "some_altitude": ("length", "level"),
    "air_temperature": ("temperature",),
    "dew_point_temperature": ("temperature",),
    "dew_point_depression": ("temperature",),
    "relative_humidity": ("fraction",),
    "mixing_ratio": ("mass ratio",),
    "specific_humidity": ("mass ratio",),
    "availability": ("fraction",),
    "carrier_to_noise_ratio": ("decibel",),
    "latitude": ("angle",),
    "longitude": ("angle",),
    "elevation": ("length",),
    "elapsed_time": ("duration",),
    "time": ("duration",),
    "date": (),
    "clock": (),
    "station": (),
    "launch": (),
    "level_flag": (),
    "source": (),
}
"""What a column can be, and the kinds of unit that it can have."""

BY_HEIGHT = (
    "wind_speed",
    "wind_from_direction",
    "eastward_wind",
    "northward_wind",
    "upward_air_velocity",
    "wind_speed_deviation",
    "availability",
    "carrier_to_noise_ratio",
    "air_temperature",
    "dew_point_temperature",
    "relative_humidity",
    "air_pressure",
)
"""What a wide table can have a column a height of."""

REFERENCES = {"ground": "height", "sea": "altitude", "geopotential": "geopotential_height"}


@dataclass(frozen=True)
class Claim:
    """
    What one column is taken for.

    Attributes
    ----------
    column
        Place in the table, from 0.
    name
        As written.
    quantity
        One of :data:`KINDS`, None where the column is not used.
    unit
        None where it is not known (yet).
    why
        How it was recognised.
    height
        Of a column of a wide table, as written in its name.
    height_unit
        The unit of that.
    """

    column: int
    name: str
    quantity: str | None
    unit: Unit | None
    why: str
    height: float | None = None
    height_unit: Unit | None = None


@dataclass(frozen=True)
class _Match:
    """What a name can stand for."""

    quantities: tuple[str, ...]
    height: float | None = None
    height_unit: str | None = None
    note: str = ""


def claim_of(place: int, name: str, row: str, words: bool) -> list[Claim]:
    """Give what one column can be, the likeliest first; one that is not used, if it is nothing."""
    bare, said, comments = brackets(name)
    match, tail = _match(bare, comments, said or row)
    if not match.quantities:
        why = match.note or "name not known"
        return [Claim(place, name, None, None, why)]
    unit_text = said or tail
    found: list[Claim] = []
    for quantity in match.quantities:
        if words and quantity in ("air_temperature", "launch") and "time" in match.quantities:
            continue
        claim = _with_unit(place, name, quantity, unit_text, row, match)
        if claim is not None:
            found.append(claim)
    if not found:
        first = match.quantities[0]
        text = unit_text or row
        if unit_text and kinds_of(unit_text) and row and _unit(first, row):
            raise _disagree(name, unit_text, row)
        raise Contradiction(
            f'column "{name}": {text} is no unit of {plain(first)}',
            f'Correct the header, or say --unit "{name}=UNIT" ({signs(first)})',
        )
    return found


def _with_unit(
    place: int, name: str, quantity: str, unit_text: str, row: str, match: _Match
) -> Claim | None:
    """Return the claim with its unit, None where the unit is one of something else."""
    kinds = KINDS[quantity]
    unit = None
    why = "name in the header"
    if "time" in (quantity,) and unit_text and parse(unit_text, "duration"):
        quantity, kinds = "elapsed_time", ("duration",)
    if kinds and quantity != "time":
        for text in (unit_text, row):
            if text and is_magnetic(text) and "angle" in kinds:
                raise UnknownUnit(
                    f'column "{name}" is counted from magnetic north, whose deviation is not known',
                    f'Turn it to true north, or take it as it is with --unit "{name}=deg"',
                )
        of_name, of_row = _unit(quantity, unit_text), _unit(quantity, row)
        if (unit_text and kinds_of(unit_text) and of_name is None) or (
            not unit_text and row and kinds_of(row) and of_row is None
        ):
            return None
        if of_name and of_row and of_name.sign != of_row.sign:
            raise _disagree(name, unit_text, row)
        unit = of_name or of_row
        if unit is None and row.strip() not in ("", "-", "1", "none") and not kinds_of(row):
            raise UnknownUnit(
                f'column "{name}": {row.strip()} is no unit that is known here',
                f'Say --unit "{name}=UNIT" ({signs(quantity)})',
            )
        if of_name:
            why = NAME_AND_UNIT
        elif of_row:
            why = "name in the header, unit in the units row"
        reference = reference_of(unit_text) or reference_of(row)
        if quantity in ("some_height", "some_altitude") and reference:
            quantity = REFERENCES[reference]
        elif (quantity, reference) in (("height", "sea"), ("altitude", "ground")):
            raise Contradiction(
                f'column "{name}": the name and the unit count from different levels',
                f'Say --column height="{name}" or --column altitude="{name}"',
            )
        if unit is not None and unit.kind == "level":
            quantity = "air_pressure"
            why += ", by the standard atmosphere"
    if quantity == "flight_level":
        quantity, unit = "air_pressure", parse("FL", "level")
        why = "name in the header, by the standard atmosphere"
    known = spellings()
    if match.note == "implied":
        implied = known.implied["".join(words_of(name))]
        unit = unit or parse(implied[1], *kinds)
        why = "name, which holds the unit"
    height_unit = parse(match.height_unit, "length") if match.height_unit else None
    return Claim(place, name, quantity, unit, why, match.height, height_unit)


def _unit(quantity: str, text: str) -> Unit | None:
    return parse(text, *KINDS[quantity]) if text else None


def _disagree(name: str, unit_text: str, row: str) -> Contradiction:
    return Contradiction(
        f'column "{name}": the name says {unit_text.strip("_ ")}, the units row {row.strip()}',
        f'Say which holds with --unit "{name}={row.strip(" []()")}"',
    )


def brackets(name: str) -> tuple[str, str, tuple[str, ...]]:
    """Split a name into what stands outside brackets, a unit in them, and other words in them."""
    unit = ""
    comments = []
    for content in re.findall(r"[\[({<]([^\])}>]*)[\])}>]", name):
        text = content.strip()
        if not unit and (kinds_of(text) or is_magnetic(text)):
            unit = text
        elif text:
            comments.append(text)
    bare = re.sub(r"[\[({<][^\])}>]*[\])}>]", " ", name).strip()
    return bare, unit, tuple(comments)


def _match(bare: str, comments: tuple[str, ...], unit_text: str) -> tuple[_Match, str]:
    """Look a name up with what stands in its brackets, whole, or less the unit at its end."""
    for said in (" ".join((bare, *comments)), bare) if comments else (bare,):
        match = _lookup(said, bool(unit_text))
        if match.quantities:
            if said is bare and comments and not unit_text and not _harmless(comments):
                # What stands there in brackets should be a unit, and is none that is known.
                needing = KINDS[match.quantities[0]]
                if needing:
                    raise UnknownUnit(
                        f'column "{bare} ({comments[0]})": {comments[0]} is no unit known here',
                        f'Say --unit "{bare} ({comments[0]})=UNIT" ({signs(match.quantities[0])})',
                    )
            return match, ""
        for cut in cuts(said):
            head, tail = said[: cut.start()], said[cut.end() :]
            kinds = kinds_of(tail)
            if not kinds and not is_magnetic(tail):
                continue
            shorter = _lookup(head, True)
            fitting = tuple(
                quantity
                for quantity in shorter.quantities
                if is_magnetic(tail)
                or kinds & set(KINDS[quantity])
                or (_unit(quantity, tail) is not None)
            )
            if fitting:
                return replace(shorter, quantities=fitting), tail
    return _lookup(bare, bool(unit_text)), ""


def _harmless(comments: tuple[str, ...]) -> bool:
    known = spellings()
    words = {word for text in comments for word in words_of(text)}
    harmless = known.ignored | known.height | {"min", "m", "s", "h", "utc", "gps", "agl", "msl"}
    return all(word in harmless or word[0].isdecimal() for word in words)


def _lookup(name: str, has_unit: bool) -> _Match:
    """Say what the words of a name stand for."""
    known = spellings()
    words = words_of(name)
    if not words:
        return _Match(())
    joined = "".join(words)
    if joined in known.implied:
        return _Match((known.implied[joined][0],), note="implied")
    if not has_unit and joined in known.needs_unit:
        return _Match((), note="the name says too little without a unit")
    found = known.find(known.columns, words)
    if found:
        return _Match(found)
    words = _without_interval(words)
    numbers = [place for place, word in enumerate(words) if word[0].isdecimal()]
    height, height_unit = None, None
    if len(numbers) == 1:
        place = numbers[0]
        height = float(words[place].replace(",", "."))
        after = words[place + 1 : place + 2]
        rest = words[:place] + words[place + 1 :]
        if after and parse(after[0], "length") is not None:
            height_unit = after[0]
            rest = words[:place] + words[place + 2 :]
        words = rest
    elif numbers:
        return _Match(())
    found, note = _statistic(words, known)
    if not found and height is not None:
        trimmed = tuple(word for word in words if word not in known.height)
        found, note = _statistic(trimmed, known)
    if height is not None:
        found = tuple(quantity for quantity in found if quantity in BY_HEIGHT)
    return _Match(found, height, height_unit, note)


def _statistic(words: tuple[str, ...], known: Spellings) -> tuple[tuple[str, ...], str]:
    """Look up words among which one may name a statistic; a deviation is one of the speed."""
    found = known.find(known.columns, words) if words else ()
    if found:
        return found, ""
    spread = tuple(word for word in words if word not in known.deviation)
    if len(spread) < len(words):
        of = known.find(known.columns, spread) if spread else ("wind_speed",)
        if of and of[0] == "wind_speed":
            return ("wind_speed_deviation",), ""
        return (), f"a deviation of {plain(of[0])}, which is not used" if of else ""
    mean = tuple(word for word in words if word not in known.other)
    if len(mean) < len(words):
        odd = next(word for word in words if word in known.other)
        return (), f'"{odd}": not the quantity itself'
    return (), ""


def _without_interval(words: tuple[str, ...]) -> tuple[str, ...]:
    """Leave out "10 min", which is an average and neither a height nor a minimum."""
    for place in range(len(words) - 1):
        if words[place] in ("1", "2", "5", "10", "15", "30", "60") and words[place + 1] in (
            "min", "mins", "minute", "minutes", "minuten", "minutos", "mn",
        ):  # fmt: skip
            return words[:place] + words[place + 2 :]
    return words


def signs(quantity: str) -> str:
    """Return the signs of the units that a quantity can have."""
    return spellings_of(*KINDS[quantity])


def plain(quantity: str) -> str:
    """Say a quantity in words."""
    words = {
        "wind_speed": "the wind speed",
        "wind_from_direction": "the wind direction",
        "some_height": "the height",
        "some_altitude": "the altitude",
        "air_temperature": "the temperature",
        "air_pressure": "the pressure",
        "dew_point_temperature": "the dew point",
    }
    return words.get(quantity, "the " + quantity.replace("_", " "))
