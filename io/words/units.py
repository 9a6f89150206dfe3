"""
The units that people read: chosen by name, converted at the last moment, rounded by the error.

SI stays inside; ``--units aviation`` shows knots and feet. Both conversions are exact (ISO
80000-3:2019, annex B): 1 kt = 1852/3600 m/s, 1 ft = 0.3048 m.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

from backveer.profiles.low_level_shear import FOOT, KNOT


@dataclass(frozen=True)
class Unit:
    """A unit that people read: its name and what one of it is in SI."""

    name: str
    size: float
    zero: float = 0.0

    def of(self, value: float) -> float:
        """Convert from SI."""
        return (value - self.zero) / self.size


@dataclass(frozen=True)
class Units:
    """What each quantity is shown in."""

    speed: Unit
    height: Unit
    rate: Unit
    shear: Unit
    strengthening: Unit
    pressure: Unit = Unit("hPa", 100.0)
    temperature: Unit = Unit("deg C", 1.0, 273.15)
    advection: Unit = Unit("K/h", 1.0 / 3600.0)
    gradient: Unit = Unit("K/100 km", 1e-5)


SI = Units(
    speed=Unit("m/s", 1.0),
    height=Unit("m", 1.0),
    rate=Unit("deg/100 m", 1.0),  # stored in deg per 100 m
    shear=Unit("m/s/30 m", 1.0 / 30.0),
    strengthening=Unit("m/s/100 m", 0.01),
)
AVIATION = Units(
    speed=Unit("kt", KNOT),
    height=Unit("ft", FOOT),
    rate=Unit("deg/1000 ft", 100.0 / (1000.0 * FOOT)),
    shear=Unit("kt/100 ft", KNOT / (100.0 * FOOT)),
    strengthening=Unit("kt/100 ft", KNOT / (100.0 * FOOT)),
)
NAMED = {"si": SI, "aviation": AVIATION}
DEGREE = Unit("deg", 1.0)
EXACT = 1e-6  # of a value: an error under this is none


def decimals(error: float) -> int:
    """
    Return the decimals that an error supports: one figure of it, two if it begins with a one.

    Examples
    --------
    >>> [decimals(e) for e in (17.0, 3.2, 0.14, 0.08)]
    [0, 0, 2, 2]
    """
    if not (error > 0 and math.isfinite(error)):
        return 1
    exponent = math.floor(math.log10(error))
    leading = error / 10.0**exponent
    return min(max(0, -exponent + (1 if leading < 2 else 0)), 6)


def with_error(value: float, error: float, unit: Unit, sign: bool = False) -> str:
    """
    Write a value and its error in a unit, rounded by the error.

    Examples
    --------
    >>> with_error(5.144, 0.2572, AVIATION.speed)
    '10.0 ± 0.5'
    >>> with_error(25.04, 6.1, Unit("deg", 1.0), sign=True)
    '+25 ± 6'
    >>> with_error(45.0, 1e-6, Unit("deg", 1.0))
    '45.0'
    >>> with_error(float("nan"), 1.0, SI.speed)
    'not determined'

    An error that is a rounding of the machine (the angle of a spiral without slip is 45 degrees by
    its equation) is not written.
    """
    if not math.isfinite(value):
        return "not determined"
    shown = unit.of(value)
    plus = "+" if sign else ""
    if not math.isfinite(error) or error < EXACT * abs(value):
        return f"{_unsigned_zero(shown, 1):{plus}.1f}"
    spread = error / unit.size
    places = decimals(spread)
    return f"{_unsigned_zero(shown, places):{plus}.{places}f} ± {spread:.{places}f}"


def plainly(value: float, unit: Unit, places: int = 0, sign: bool = False) -> str:
    """
    Write a value in a unit with a fixed number of decimals; a dash where there is none.

    Examples
    --------
    >>> plainly(304.8, AVIATION.height), plainly(float("nan"), SI.height)
    ('1000', '-')
    """
    if not math.isfinite(value):
        return "-"
    return f"{_unsigned_zero(unit.of(value), places):{'+' if sign else ''}.{places}f}"


def _unsigned_zero(value: float, places: int) -> float:
    """Keep a rounded zero from showing a minus."""
    return 0.0 if abs(value) < 0.5 * 10.0**-places else value
