"""What stands around a table: comments, metadata lines, rules, units."""

from __future__ import annotations

import re
from collections.abc import Sequence

from backveer.io.readers.cells import MISSING

_COMMENT = re.compile(r"\s*(#+|%+|!+|//(?!/)|;+)\s?")
_RULE = re.compile(r"[-=_*~#]{3}")

# A key is words; the colon of a clock time ends none. No pattern here may look at the same
# blanks twice: a hostile line of a million of them would take hours.
_KEY = r"(?P<key>[^\W\d_](?:[^:=\t;|]|(?<=\d):(?=\d))*?)"
_MARKED = re.compile(_KEY + r"(?:(?<!\d):|:(?!\d)|=)(?P<value>.*)")
_FOLLOWED_BY_NUMBER = re.compile(r"(?P<key>[^\W\d_][^\d:=,;\t|+-]*)(?<=\s)(?P<value>[-+]?\d.*)")
_SEVERAL = re.compile(r"[;,|\t]|\s{2,}")

# Atoms of unit signs, to recognise that a row holds units, not to understand them.
_ATOM = (
    r"(?:[kcmdhnµμ]?m|[mµμn]?s|sec|min|hr?|hrs|days?|kt|kts|kn|kn?ots?|mph|kph"
    r"|hPa|kPa|Pa|mb|mbar|bar|atm|mmHg|inHg"
    r"|(?:deg(?:rees?)?|°|º)[ _]?[CFKNEW]?|degT|celsius|fahrenheit|kelvin|[CFK]|rad|grad"
    r"|h?ft|feet|gpm|gpft|FL|m[kg]|k?g|%|pct|percent|dBZ?|Hz|m?V|[WJN]|pp[mb]"
    r"|met(?:er|re)s?|sec(?:ond)?s?|hours?|minutes?"
    r"|UTC|GMT|Z|LT|local|1|-|none|unitless|dimensionless|counts?|#"
    r"|dd?|mm?|yyyy|ss?|hh?|HHMM(?:SS)?)"
)
_POWERED = rf"{_ATOM}(?:\^?[-−+]?\d|\*\*[-−+]?\d|[²³⁻¹])*"
_UNIT = re.compile(
    rf"{_POWERED}(?:[ ./*·-]?{_POWERED}){{0,3}}(?:[ -]*(?:true|mag|agl|asl|amsl|msl))?",
    re.IGNORECASE,
)
_TIME_FORMAT = re.compile(r"[YMDHSymdhs%:\-/. T]{4,}Z?")
_BRACKETS = re.compile(r"\[.*\]|\(.*\)|\{.*\}")


def uncommented(line: str, delimiter: str | None = None) -> str | None:
    """
    Text of a comment line without its mark, None for a line that is no comment.

    ``#``, ``%``, ``!``, ``//`` (not ``///``, a missing mark) and ``;`` (unless it delimits).

    Examples
    --------
    >>> uncommented("# Station: Harrow Skerry"), uncommented(";4.5", ";"), uncommented("///  5")
    ('Station: Harrow Skerry', None, None)
    """
    match = _COMMENT.match(line)
    if not match or (match.group(1)[0] == ";" and delimiter in (";", None)):
        return None
    # A units row may begin with a percent sign.
    if match.group(1) == "%" and delimiter and line.lstrip()[1:2] == delimiter.strip("\n "):
        return None if delimiter != " " else line[match.end() :]
    return line[match.end() :]


def is_rule(line: str) -> bool:
    """Whether a line only draws a line (``-----``, ``=== ===``) or is blank."""
    return not line.strip(" \t\r\f\v-=_+|*~.,;#") and (
        not line.strip() or _RULE.search(line) is not None
    )


def metadata(line: str, delimiter: str) -> list[tuple[str, str]]:
    """
    Keys and values of a metadata line; the whole line under ``""`` where it has no key.

    Examples
    --------
    >>> metadata("Launch = 2031-05-14 23:15 UTC", ",")
    [('Launch', '2031-05-14 23:15 UTC')]
    >>> metadata("Launch 2031-05-14 23:15 UTC", ",")
    [('Launch', '2031-05-14 23:15 UTC')]
    >>> metadata("Station;Harrow Skerry;;", ";")
    [('Station', 'Harrow Skerry')]
    >>> metadata("lat: 58.4, lon: -3.05", ",")
    [('lat', '58.4'), ('lon', '-3.05')]
    """
    line = line.strip().strip(",;|\t").strip()
    if not line:
        return []
    parts = [part.strip() for part in _SEVERAL.split(line) if part.strip()]
    several = [_MARKED.fullmatch(part) for part in parts]
    found = [match for match in several if match is not None]
    if len(several) == 1 or len(found) < len(several):
        match = _MARKED.fullmatch(line)
        cells = _cells(line, delimiter)
        # "Station;Harrow: the skerry" has its key before the first delimiter.
        if match and not any(mark in match["key"] for mark in delimiter.strip()):
            found = [match]
        elif len(cells) > 1 and cells[0] and not cells[0][0].isdecimal() and len(cells[0]) < 50:
            return [(cells[0].rstrip(" :="), " ".join(cell for cell in cells[1:] if cell))]
        else:
            match = _FOLLOWED_BY_NUMBER.fullmatch(line)
            found = [match] if match else []
            two = [_bare(part) for part in parts]
            if not match and len(two) == 2 and two[0][:1].isalpha() and "," not in line:
                return [(two[0], two[1])]
    pairs = [(_bare(match["key"]), _bare(match["value"].strip(",;|\t"))) for match in found]
    if not pairs or any(len(key) > 60 for key, _ in pairs):
        return [("", _bare(line))]
    return pairs


def _cells(line: str, delimiter: str) -> list[str]:
    if not delimiter.strip() and delimiter != "\t":
        return [line]
    return [_bare(cell) for cell in line.split(delimiter)]


def _bare(text: str) -> str:
    return text.strip().strip("\"'").strip()


def looks_like_units(cells: Sequence[str]) -> bool:
    """
    Whether a row under a header says units.

    Examples
    --------
    >>> looks_like_units(["m", "hPa", "degC", "m/s"]), looks_like_units(["[kg m-3]", ""])
    (True, True)
    >>> looks_like_units(["height", "pressure", "temperature", "speed"])
    False
    """
    said = [cell for cell in cells if cell not in MISSING or cell in ("m", "M", "-")]
    good = sum(
        bool(_BRACKETS.fullmatch(cell) or _UNIT.fullmatch(cell) or _TIME_FORMAT.fullmatch(cell))
        for cell in said
        if len(cell) < 40
    )
    return bool(said) and any(cell != "-" for cell in said) and good >= 0.6 * len(said)
