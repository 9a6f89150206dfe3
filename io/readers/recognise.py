"""
Which column is what, and why: from the names and the units row alone.

What the names leave open (a unit, what a height is counted from) is settled later from the
numbers. The spellings are data (spellings.toml). An archive repeats one header in thousands of
files, so the answer is kept by the exact header.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import lru_cache
from importlib import resources
from typing import Any

from backveer.io.readers.errors import Contradiction, MissingColumn, UnknownUnit
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

READ_AS = tuple(name for name in KINDS if not name.startswith("some_") and name != "flight_level")
"""What ``--column`` can name."""

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

_REFERENCES = {"ground": "height", "sea": "altitude", "geopotential": "geopotential_height"}


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


class _Spellings:
    """The data of spellings.toml, made ready for looking up."""

    def __init__(self) -> None:
        import tomllib

        text = resources.files("backveer.io.readers").joinpath("spellings.toml").read_text("utf-8")
        data = tomllib.loads(text)
        words: dict[str, list[str]] = data["words"]
        self.ignored = frozenset(words["ignored"])
        self.deviation = frozenset(words["deviation"])
        self.other = frozenset(words["other"])
        self.height = frozenset(words["height"])
        self.needs_unit = frozenset(words["needs_unit"])
        self.implied: dict[str, tuple[str, str]] = {
            key: (quantity, unit) for key, (quantity, unit) in data["implied"].items()
        }
        self.columns = self._table(data["columns"])
        self.metadata = self._table(data["metadata"])
        self.language: dict[str, set[str]] = {}
        for part in ("columns", "metadata"):
            for spelled in data[part].values():
                for language, phrases in spelled.items():
                    for phrase in phrases:
                        if language != "signs":
                            self.language.setdefault("".join(words_of(phrase)), set()).add(language)

    def _table(self, part: dict[str, dict[str, list[str]]]) -> dict[Any, tuple[str, ...]]:
        table: dict[Any, tuple[str, ...]] = {}
        for quantity, spelled in part.items():
            for phrases in spelled.values():
                for phrase in phrases:
                    for key in self.keys(words_of(phrase)):
                        if quantity not in table.get(key, ()):
                            table[key] = (*table.get(key, ()), quantity)
        return table

    def keys(self, words: tuple[str, ...]) -> tuple[Any, ...]:
        """Ways to look words up: written together, in any order, without the little words."""
        kept = tuple(word for word in words if word not in self.ignored) or words
        return ("".join(words), "".join(kept), frozenset(kept))

    def find(self, table: dict[Any, tuple[str, ...]], words: tuple[str, ...]) -> tuple[str, ...]:
        for key in self.keys(words):
            if key in table:
                return table[key]
        return ()


@lru_cache(maxsize=1)
def spellings() -> _Spellings:
    """Return the accepted names, read once."""
    return _Spellings()


def words_of(name: str) -> tuple[str, ...]:
    """
    Words of a name: without case, accents and punctuation, digits apart from letters.

    Examples
    --------
    >>> words_of("Windgeschw. in 40m"), words_of("Höhe_über NN"), words_of("WS40")
    (('windgeschw', 'in', '40', 'm'), ('hohe', 'uber', 'nn'), ('ws', '40'))
    """
    text = unicodedata.normalize("NFKD", name.casefold())
    text = "".join(c for c in text if not unicodedata.combining(c)).replace("œ", "oe")
    return tuple(re.findall(r"[^\W\d_]+|\d+(?:[.,]\d+)?", text))


def metadata_key(key: str) -> str | None:
    """
    Return what a metadata key names, None where that is not known.

    Examples
    --------
    >>> metadata_key("Stationshöhe"), metadata_key("Latitude (deg)"), metadata_key("Pilot")
    ('elevation', 'latitude', None)
    """
    known = spellings()
    bare = re.sub(r"[\[({][^\])}]*[\])}]", " ", key)
    for text in (key, bare, *(bare[: cut.start()] for cut in reversed(_cuts(bare)))):
        found = known.find(known.metadata, words_of(text)) if text.strip() else ()
        if found:
            return found[0]
    return None


def languages(names: tuple[str, ...]) -> frozenset[str]:
    """
    Return the languages that the names give away: those that share no word with another.

    Examples
    --------
    >>> sorted(languages(("Longitude", "Pression (hPa)"))), sorted(languages(("Longitude",)))
    (['fr'], [])
    """
    known = spellings()
    found: set[str] = set()
    for name in names:
        bare = re.sub(r"[\[({][^\])}]*[\])}]", " ", name)
        spoken = known.language.get("".join(words_of(bare)), set())
        if len(spoken) == 1:
            found |= spoken
    return frozenset(found - {"en"}) or frozenset(found)


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
        _claim(place, name, row, words)
        for place, (name, row, words) in enumerate(zip(header, rows, of_words, strict=True))
    ]
    candidates = _as_said(candidates, header, rows, said_columns)
    claims = _components(candidates)
    claims = _wide_or_not(claims)
    claims = _units_as_said(claims, said_units, said_columns)
    return tuple(_one_claim_each(claims, {quantity for quantity, _ in said_columns}))


def _claim(place: int, name: str, row: str, words: bool) -> list[Claim]:
    """Give what one column can be, the likeliest first; one that is not used, if it is nothing."""
    bare, said, comments = _brackets(name)
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
            f'column "{name}": {text} is no unit of {_plain(first)}',
            f'Correct the header, or say --unit "{name}=UNIT" ({_signs(first)})',
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
                f'Say --unit "{name}=UNIT" ({_signs(quantity)})',
            )
        if of_name:
            why = NAME_AND_UNIT
        elif of_row:
            why = "name in the header, unit in the units row"
        reference = reference_of(unit_text) or reference_of(row)
        if quantity in ("some_height", "some_altitude") and reference:
            quantity = _REFERENCES[reference]
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


def _brackets(name: str) -> tuple[str, str, tuple[str, ...]]:
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
                        f'Say --unit "{bare} ({comments[0]})=UNIT" ({_signs(match.quantities[0])})',
                    )
            return match, ""
        for cut in _cuts(said):
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


def _cuts(text: str) -> list[re.Match[str]]:
    """Places where a unit may begin, the longest unit first."""
    cuts = list(re.finditer(r"[\s_,;/.:|-]+(?=[^\s_,;/.:|-])|(?<=\d)(?=[^\W\d_])", text))
    return [cut for cut in cuts if cut.start() > 0]


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


def _statistic(words: tuple[str, ...], known: _Spellings) -> tuple[tuple[str, ...], str]:
    """Look up words among which one may name a statistic; a deviation is one of the speed."""
    found = known.find(known.columns, words) if words else ()
    if found:
        return found, ""
    spread = tuple(word for word in words if word not in known.deviation)
    if len(spread) < len(words):
        of = known.find(known.columns, spread) if spread else ("wind_speed",)
        if of and of[0] == "wind_speed":
            return ("wind_speed_deviation",), ""
        return (), f"a deviation of {_plain(of[0])}, which is not used" if of else ""
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
        _, in_brackets, _ = _brackets(header[place])
        tails = (header[place][cut.end() :] for cut in _cuts(header[place]))
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
                    why=f"another column is {_plain(quantity)} by --column",
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
                    f"--unit {name}={text}: no unit of {_plain(quantity)} that is known here",
                    f"It can be: {_signs(quantity)}" if kinds else "Leave it out",
                )
            said_why = claim.why if claim.why.startswith("named with") else "name in the header"
            why = f"{said_why}, unit given with --unit"
            reference = reference_of(text)
            if quantity in ("some_height", "some_altitude") and reference:
                quantity = _REFERENCES[reference]
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
                f"{_plain(quantity)}",
                f'Say which with --column {option}="{before.name}"',
            )
    return result


def _signs(quantity: str) -> str:
    return spellings_of(*KINDS[quantity])


def _plain(quantity: str) -> str:
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
