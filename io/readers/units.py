"""
Accepted spellings of units, and what they are in SI.

A spelling counts only beside a kind of quantity: ``ms`` is m/s where a speed is meant and
milliseconds where a time is; ``C`` is a temperature and nothing else. Case tells nothing.
"""

from __future__ import annotations

import math
import re
import unicodedata
from dataclasses import dataclass
from functools import lru_cache

from backveer.profiles.low_level_shear import FOOT, KNOT

__all__ = ["FOOT", "KNOT", "Unit", "kinds_of", "parse", "reference_of", "spellings_of"]

MILE = 1609.344  # m, exact: ISO 80000-3:2019, annex B
INCH_OF_MERCURY = 3386.389  # Pa, at 0 degrees C: NIST SP 811, 2008, appendix B
MILLIMETRE_OF_MERCURY = 133.3224  # Pa: NIST SP 811, 2008, appendix B


@dataclass(frozen=True)
class Unit:
    """
    A unit: ``si = factor * value + offset``.

    Attributes
    ----------
    sign
        As told to people.
    kind
        What it measures: ``speed``, ``length``, ``level`` (flight level), ``pressure``,
        ``temperature``, ``angle``, ``fraction``, ``mass ratio``, ``decibel``, ``duration``,
        ``one``.
    factor, offset
        To SI (radians are turned into degrees).
    """

    sign: str
    kind: str
    factor: float
    offset: float = 0.0


# Spellings as `_bare` leaves them: no case, blanks, dots, stars, carets, underscores.
_TABLE: tuple[tuple[Unit, str], ...] = (
    (
        Unit("m/s", "speed", 1.0),
        "m/s ms-1 ms m/sec mps ms^-1 meters/second meterspersecond metrespersecond meterpersecond "
        "metrepersecond m/seg meterprosekunde metres/seconde metrosporsegundo metresparseconde",
    ),
    (Unit("cm/s", "speed", 0.01), "cm/s cms-1 cm/sec"),
    (
        Unit("kt", "speed", KNOT),
        "kt kts kn knot knots knoten noeud noeuds nœud nœuds nudo nudos nd nds",
    ),
    (
        Unit("km/h", "speed", 1.0 / 3.6),
        "km/h kmh kmh-1 kph km/hr km/std kmhr-1 kilometersperhour kilometresperhour",
    ),
    (Unit("mph", "speed", MILE / 3600.0), "mph mi/h mih-1 milesperhour miles/hour"),
    (Unit("ft/s", "speed", FOOT), "ft/s fts-1 fps ft/sec feetpersecond"),
    (Unit("ft/min", "speed", FOOT / 60.0), "ft/min fpm ftmin-1 feetperminute"),
    (
        Unit("m", "length", 1.0),
        "m meter meters metre metres metro metros mtr m'",
    ),
    (Unit("gpm", "length", 1.0), "gpm mgpm geopotentialmeters geopotentialmetres"),
    (Unit("km", "length", 1000.0), "km kilometer kilometers kilometre kilometres"),
    (Unit("ft", "length", FOOT), "ft feet foot fuss fuß pieds pied pies pie ft'"),
    (Unit("hft", "length", 100.0 * FOOT), "hft 100ft hundredsfeet hundredsoffeet"),
    (Unit("kft", "length", 1000.0 * FOOT), "kft 1000ft"),
    (Unit("FL", "level", 100.0 * FOOT), "fl flightlevel flugflache flugfläche niveaudevol"),
    (Unit("Pa", "pressure", 1.0), "pa pascal pascals"),
    (
        Unit("hPa", "pressure", 100.0),
        "hpa mb mbar mbars millibar millibars hectopascal hectopascals hektopascal",
    ),
    (Unit("kPa", "pressure", 1000.0), "kpa kilopascal kilopascals"),
    (Unit("bar", "pressure", 1e5), "bar"),
    (Unit("inHg", "pressure", INCH_OF_MERCURY), "inhg inchhg inchesofmercury inchesmercury"),
    (Unit("mmHg", "pressure", MILLIMETRE_OF_MERCURY), "mmhg torr"),
    (
        Unit("degC", "temperature", 1.0, 273.15),
        "c degc degreec degreesc celsius degcelsius degreescelsius degreecelsius centigrade gradc "
        "celcius gradcelsius degréscelsius",
    ),
    (Unit("K", "temperature", 1.0), "k degk kelvin kelvins degreesk"),
    (
        Unit("degF", "temperature", 5.0 / 9.0, 459.67 * 5.0 / 9.0),
        "f degf degreesf fahrenheit degfahrenheit degreesfahrenheit",
    ),
    (
        Unit("deg", "angle", 1.0),
        "deg degs degree degrees degt degtrue degreestrue degreetrue truedeg degreetn degtn grad "
        "grados degré degrés degre degres gradoverdadero degn degreenorth degreesnorth degreen "
        "degreesn dege degreeeast degreeseast degreee degreese degreesfromnorth degfromnorth "
        "ddeg truedegrees",
    ),
    (Unit("rad", "angle", 180.0 / math.pi), "rad rads radian radians radiant"),
    (Unit("gon", "angle", 0.9), "gon"),
    (Unit("%", "fraction", 0.01), "% pct percent prozent porcentaje pourcent %rh percentrh"),
    (Unit("g/kg", "mass ratio", 1e-3), "g/kg gkg-1 gkg gperkg gramsperkilogram"),
    (Unit("kg/kg", "mass ratio", 1.0), "kg/kg kgkg-1 kgkg kgperkg"),
    (Unit("g/g", "mass ratio", 1.0), "g/g gg-1"),
    (Unit("dB", "decibel", 1.0), "db decibel decibels dbz"),
    (Unit("s", "duration", 1.0), "s sec secs second seconds sekunde sekunden seg segundos seconde "
     "secondes"),
    (Unit("min", "duration", 60.0), "min mins minute minutes minuten minutos"),
    (Unit("h", "duration", 3600.0), "h hr hrs hour hours std stunden heure heures hora horas"),
    (Unit("ms", "duration", 1e-3), "ms millisecond milliseconds msec"),
    (Unit("1", "one", 1.0), "1 - fraction unitless dimensionless none ratio 0-1 0..1"),
)  # fmt: skip

_BY_SPELLING: dict[str, tuple[Unit, ...]] = {}
for _unit, _spelled in _TABLE:
    for _word in _spelled.split():
        _BY_SPELLING[_word] = (*_BY_SPELLING.get(_word, ()), _unit)

# "1" beside these is no unit of its own: a fraction.
_ONE = {
    "fraction": Unit("1", "fraction", 1.0),
    "mass ratio": Unit("kg/kg", "mass ratio", 1.0),
}

_REFERENCE = re.compile(
    r"(?<![a-z])(?:(?P<ground>agl|above ?ground(?: ?level)?|a\.g\.l\.|uber ?grund)"
    r"|(?P<sea>amsl|asl|msl|mslm|snm|above ?(?:mean ?)?sea ?level|nn|nhn|ub(?:er|\.)? ?nn))$"
)
_MAGNETIC = re.compile(r"(deg(?:rees?)?)?(mag|magnetic|m)$")


def _bare(text: str) -> str:
    """
    Spelling without what carries no meaning.

    Examples
    --------
    >>> _bare("[m s⁻¹]"), _bare("°C"), _bare("m.s^-1"), _bare("in knots"), _bare("km h**-1")
    ('ms-1', 'degc', 'ms-1', 'knots', 'kmh-1')
    """
    text = text.replace("º", "°")  # NFKC would make an o of the ordinal that stands for a degree
    text = unicodedata.normalize("NFKC", text).casefold().strip().strip("[](){}<>").strip()
    text = text.replace("\N{MINUS SIGN}", "-").replace("\N{EN DASH}", "-")
    text = text.replace("°", "deg").replace("˚", "deg")
    text = re.sub(r"^(?:in(?!\s*hg)|en|units?\s*[:=])\s+", "", text)
    text = re.sub(r"\bper\b", "per", text)
    return re.sub(r"[\s_.*^·⋅∙,]+", "", text)


@lru_cache(maxsize=4096)
def _candidates(text: str) -> tuple[Unit, ...]:
    stripped, _ = _without_reference(text)
    bare = _bare(stripped)
    return _BY_SPELLING.get(bare, ())


def _without_reference(text: str) -> tuple[str, str | None]:
    """Split ``m AGL`` into the unit and what it is counted from (``ground`` or ``sea``)."""
    plain = text.strip().strip("[](){}").strip()
    match = _REFERENCE.search(plain.casefold().replace("_", " ").replace("ü", "u"))
    if match is None:
        return text, None
    return plain[: match.start()], "ground" if match["ground"] else "sea"


def reference_of(text: str) -> str | None:
    """
    Return what a unit of height is counted from, where it says so.

    Examples
    --------
    >>> reference_of("m AGL"), reference_of("ft MSL"), reference_of("m"), reference_of("gpm")
    ('ground', 'sea', None, 'geopotential')
    """
    counted_from = _without_reference(text)[1]
    if counted_from is None and any(unit.sign == "gpm" for unit in _candidates(text)):
        return "geopotential"
    return counted_from


def parse(text: str, *kinds: str) -> Unit | None:
    """
    Return the unit that a spelling stands for, if it is one of these kinds.

    Parameters
    ----------
    text
        As written, with or without brackets, "in", or what a height is counted from.
    *kinds
        Kinds that are possible here.

    Examples
    --------
    >>> parse("m s-1", "speed").sign, parse("[kts]", "speed").sign, parse("in knots", "speed").sign
    ('m/s', 'kt', 'kt')
    >>> parse("ms", "speed").sign, parse("m AGL", "length").sign, parse("hPa", "length")
    ('m/s', 'm', None)
    """
    for unit in _candidates(text):
        if unit.kind in kinds:
            return unit
        if unit.kind == "one":
            for kind in kinds:
                if kind in _ONE:
                    return _ONE[kind]
    return None


def kinds_of(text: str) -> frozenset[str]:
    """
    Return the kinds of unit that a spelling can stand for; empty where it is no unit.

    Examples
    --------
    >>> sorted(kinds_of("ms")), sorted(kinds_of("hPa")), sorted(kinds_of("AGL"))
    (['duration', 'speed'], ['pressure'], [])
    """
    return frozenset(unit.kind for unit in _candidates(text))


def is_magnetic(text: str) -> bool:
    """
    Say whether an angle is counted from magnetic north.

    Examples
    --------
    >>> is_magnetic("deg mag"), is_magnetic("°M"), is_magnetic("deg")
    (True, True, False)
    """
    bare = _bare(text)
    return bare.startswith("deg") and _MAGNETIC.fullmatch(bare) is not None


def spellings_of(*kinds: str) -> str:
    """
    Return the signs of the units of these kinds, for a message.

    Examples
    --------
    >>> spellings_of("speed")
    'm/s, cm/s, kt, km/h, mph, ft/s, ft/min'
    """
    return ", ".join(unit.sign for unit, _ in _TABLE if unit.kind in kinds)
