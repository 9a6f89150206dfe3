"""
What the numbers settle where the names leave it open: units by physics and magnitude.

Each rule holds only where no other unit is possible; otherwise it is an error that names the
column and the option.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.errors import Contradiction, UnknownUnit
from backveer.io.readers.names import KINDS, Claim
from backveer.io.readers.plausible import without_codes
from backveer.io.readers.units import Unit, parse, spellings_of
from backveer.profiles.air import DRY_ADIABATIC_LAPSE_RATE, GAS_CONSTANT, standard_height
from backveer.profiles.earth import STANDARD_GRAVITY

Array = NDArray[np.float64]


class Settled(NamedTuple):
    """A unit and how it was settled."""

    unit: Unit
    why: str


class Columns:
    """The columns of a table by quantity, each flat and in the order of the rows."""

    def __init__(self, raw: Mapping[str, Array], claims: Mapping[str, Claim]) -> None:
        self.raw = raw
        self.claims = claims
        self.settled: dict[str, Settled] = {}

    def unit(self, quantity: str) -> Settled:
        """
        Return the unit of a quantity, settling it where it is open.

        Raises
        ------
        UnknownUnit
            The numbers do not settle it.
        """
        if quantity not in self.settled:
            claim = self.claims[quantity]
            if claim.unit is not None:
                self.settled[quantity] = Settled(claim.unit, claim.why)
            else:
                found = _RULES[quantity](self, quantity) if quantity in _RULES else None
                if found is None and not np.isfinite(self.raw[quantity]).any():
                    found = _any_unit(quantity)
                if found is None:
                    raise self.unknown(quantity)
                self.settled[quantity] = Settled(found.unit, f"{claim.why}, {found.why}")
        return self.settled[quantity]

    def known(self, quantity: str) -> Unit | None:
        """Return the unit that the names give, None where they give none."""
        claim = self.claims.get(quantity)
        return None if claim is None else claim.unit

    def values(self, quantity: str) -> Array:
        """Return the column in SI, without anything that is a code anywhere."""
        unit = self.unit(quantity).unit
        raw = self.raw[quantity]
        kept = without_codes(raw)
        if kept.size:
            raw = np.where((raw >= kept.min()) & (raw <= kept.max()), raw, np.nan)
        return raw * unit.factor + unit.offset

    def unknown(self, quantity: str) -> UnknownUnit:
        """Return the error that names the column and the option."""
        claim = self.claims[quantity]
        of = KINDS[quantity]
        signs = spellings_of(*of)
        example = {"speed": "kt", "length": "ft"}.get(of[0], signs.split(", ")[0])
        return UnknownUnit(
            f'the unit of column "{claim.name}" is not known, and the data do not settle it',
            f'Say it with --unit "{claim.name}={example}" ({signs})',
        )


def _any_unit(quantity: str) -> Settled:
    """Return a unit for a column without a single value."""
    kind = KINDS[quantity][0]
    sign = spellings_of(kind).split(", ")[0]
    return Settled(_given(sign, kind), "no value is there, so the unit is of no matter")


def _given(sign: str, kind: str) -> Unit:
    unit = parse(sign, kind)
    assert unit is not None
    return unit


def _largest(columns: Columns, quantity: str) -> float:
    values = without_codes(columns.raw[quantity])
    return float(values.max()) if values.size else float("nan")


def _smallest(columns: Columns, quantity: str) -> float:
    values = without_codes(columns.raw[quantity])
    return float(values.min()) if values.size else float("nan")


def _angle(columns: Columns, quantity: str) -> Settled | None:
    top = _largest(columns, quantity)
    if top != top or top > 6.3:  # 2 pi and rounding
        return Settled(_given("deg", "angle"), f"unit by magnitude (largest {top:g})")
    return None


def _pressure(columns: Columns, quantity: str) -> Settled | None:
    """Settle the scale: the lowest level of a profile lies between 450 and 1150 hPa."""
    top = _largest(columns, quantity)
    for sign, low, high in (
        ("Pa", 45e3, 115e3),
        ("hPa", 450.0, 1150.0),
        ("kPa", 45.0, 115.0),
        ("inHg", 13.3, 34.0),
    ):
        if low <= top <= high:
            return Settled(_given(sign, "pressure"), f"unit by magnitude (largest {top:g})")
    return None


def _temperature(columns: Columns, quantity: str) -> Settled | None:
    top, bottom = _largest(columns, quantity), _smallest(columns, quantity)
    if bottom > 150.0 and top < 345.0:
        return Settled(_given("K", "temperature"), f"unit by magnitude (smallest {bottom:g})")
    if bottom < -100.0 or top > 60.0:  # colder or warmer than air is in degrees C
        if bottom > -170.0 and top < 140.0:
            extreme = bottom if bottom < -100.0 else top
            return Settled(_given("degF", "temperature"), f"unit by magnitude ({extreme:g})")
        return None
    if quantity == "dew_point_temperature" and "air_temperature" in columns.claims:
        unit = columns.unit("air_temperature").unit
        excess = _median(columns.raw[quantity] - columns.raw["air_temperature"])
        if not excess > 0.5:
            return Settled(unit, "unit as the temperature's, below which it stays")
        return None
    return _by_thickness(columns, quantity) or _by_lapse(columns, quantity)


def _by_thickness(columns: Columns, quantity: str) -> Settled | None:
    """Settle degrees C or F by the mean temperature that pressures and heights ask for."""
    z = _some_height(columns)
    if z is None or "air_pressure" not in columns.claims:
        return None
    p = columns.values("air_pressure")
    raw = columns.raw[quantity]
    good = np.isfinite(z) & np.isfinite(p) & np.isfinite(raw) & (p > 0)
    z, p, raw = z[good], p[good], raw[good]
    if z.size < 3:
        return None
    dz, dlnp = np.diff(z), -np.diff(np.log(p))
    if np.sum(np.abs(dz)) < 500.0:
        return None
    wanted = STANDARD_GRAVITY / GAS_CONSTANT * float(np.sum(dz * dlnp) / np.sum(dlnp**2))
    if not wanted > 0.0:
        return None
    mean = float(np.sum(0.5 * (raw[1:] + raw[:-1]) * dlnp**2) / np.sum(dlnp**2))
    units = (_given("degC", "temperature"), _given("degF", "temperature"))
    errors = [abs((mean * u.factor + u.offset) / wanted - 1.0) for u in units]
    better = int(errors[1] < errors[0])
    # Moisture, rounding and gravity make 1.5 %, C and F differ by 7 % at 5 degrees.
    if errors[better] < 0.02 and errors[1 - better] > 0.035:
        return Settled(units[better], "unit by the hypsometric equation")
    return None


def _by_lapse(columns: Columns, quantity: str) -> Settled | None:
    """Settle degrees F where the air would turn over if the numbers were degrees C."""
    z, raw = _some_height(columns), columns.raw[quantity]
    if z is None:
        return None
    good = np.isfinite(z) & np.isfinite(raw)
    if not good.any():
        return None
    low, high = (
        int(np.argmin(np.where(good, z, np.inf))),
        int(np.argmax(np.where(good, z, -np.inf))),
    )
    depth = float(z[high] - z[low])
    # A layer this deep does not cool faster than adiabatic air; in degrees F it seems to.
    if depth > 500.0 and float(raw[low] - raw[high]) > 1.1 * DRY_ADIABATIC_LAPSE_RATE * depth:
        return Settled(_given("degF", "temperature"), "unit by the lapse rate, too steep for degC")
    return None


def _some_height(columns: Columns) -> Array | None:
    """Return a height in m whose unit is given or settled by the pressure, None without one."""
    names = [name for name in _HEIGHTS if name in columns.claims]
    names.sort(key=lambda name: columns.known(name) is None)
    for name in names:
        try:
            return columns.values(name)
        except UnknownUnit:
            continue
    return None


_HEIGHTS = ("height", "altitude", "geopotential_height", "some_height", "some_altitude")


def _height(columns: Columns, quantity: str) -> Settled | None:
    """Settle the unit of a height by the pressure, or by another height."""
    raw = columns.raw[quantity]
    other = next((name for name in _HEIGHTS if columns.known(name) is not None), None)
    if other is not None:
        true, why = columns.values(other), f'unit by column "{columns.claims[other].name}"'
    elif "air_pressure" in columns.claims:
        true = standard_height(columns.values("air_pressure"))
        why = "unit by the hypsometric equation"
    else:
        return None
    unit = height_unit(raw, true)
    return None if unit is None else Settled(unit, why)


def height_unit(raw: Array, true: Array) -> Unit | None:
    """
    Return the unit in which ``raw`` grows as ``true`` does in m, to a quarter; None for none.

    Examples
    --------
    >>> height_unit(np.array([0.0, 1000.0, 3000.0]), np.array([50.0, 355.0, 960.0])).sign
    'ft'
    """
    good = np.isfinite(raw) & np.isfinite(true)
    step, wanted = np.diff(raw[good]), np.diff(true[good])
    total = float(np.sum(wanted**2))
    if total < 50.0**2:
        return None
    ratio = float(np.sum(step * wanted)) / total
    for sign in ("m", "ft", "km", "hft"):
        unit = _given(sign, "length")
        if 0.8 < ratio * unit.factor < 1.25:
            return unit
    return None


def _speed(columns: Columns, quantity: str) -> Settled | None:
    """Settle knots or m/s where speed, and u and v, are there and one of them has a unit."""
    pair = ("eastward_wind", "northward_wind")
    if quantity in pair and (other := columns.known(pair[1 - pair.index(quantity)])):
        return Settled(other, "unit as the other component's")
    if not ({"wind_speed", *pair} <= set(columns.claims)):
        return None
    u, v = (without_far_codes(columns.raw[name]) for name in pair)
    size = np.hypot(u, v)
    speed = without_far_codes(columns.raw["wind_speed"])
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        ratios = np.where((size > 0) & (speed > 0), speed / size, np.nan)
    ratios = ratios[np.isfinite(ratios) & (ratios > 0)]
    if ratios.size == 0:
        return None
    ratio = float(np.median(ratios))  # of the numbers: speed's unit is that of u over it
    of_pair = columns.known(pair[0]) or columns.known(pair[1])
    of_speed = columns.known("wind_speed")
    if quantity == "wind_speed" and of_pair is not None:
        wanted, why = of_pair.factor / ratio, "unit by u and v"
    elif quantity in pair and of_speed is not None:
        wanted, why = of_speed.factor * ratio, "unit by the wind speed"
    else:
        return None
    for sign in ("m/s", "kt", "km/h", "mph", "ft/s"):
        unit = _given(sign, "speed")
        # Neighbours (mph and kt) differ by 13 %.
        if abs(unit.factor / wanted - 1.0) < 0.04:
            return Settled(unit, why)
    return None


def without_far_codes(raw: Array) -> Array:
    """Return a column with what lies beyond any speed taken out."""
    return np.where(np.abs(raw) < 700.0, raw, np.nan)


def _as_the_wind(columns: Columns, quantity: str) -> Settled | None:
    for name in ("wind_speed", "eastward_wind"):
        if name in columns.claims:
            return Settled(columns.unit(name).unit, "unit as the wind's")
    return None


def _fraction(columns: Columns, quantity: str) -> Settled | None:
    top = _largest(columns, quantity)
    if top > 1.5:
        return Settled(_given("%", "fraction"), f"unit by magnitude (largest {top:g})")
    if 0.0 <= top <= 1.1:
        return Settled(_given("1", "fraction"), f"a fraction by magnitude (largest {top:g})")
    return None


def _mass_ratio(columns: Columns, quantity: str) -> Settled | None:
    """Settle g/kg or kg/kg: near the ground air holds 0.1 to 40 g/kg."""
    top = _largest(columns, quantity)
    if top > 0.1:
        return Settled(_given("g/kg", "mass ratio"), f"unit by magnitude (largest {top:g})")
    if 0.0002 < top < 0.05:
        return Settled(_given("kg/kg", "mass ratio"), f"unit by magnitude (largest {top:g})")
    return None


def _always(sign: str, kind: str, why: str) -> Callable[[Columns, str], Settled]:
    return lambda _columns, _quantity: Settled(_given(sign, kind), why)


_RULES: dict[str, Callable[[Columns, str], Settled | None]] = {
    "wind_from_direction": _angle,
    "wind_to_direction": _angle,
    "air_pressure": _pressure,
    "air_temperature": _temperature,
    "dew_point_temperature": _temperature,
    "dew_point_depression": lambda columns, _: (
        Settled(columns.unit("air_temperature").unit, "unit as the temperature's")
        if "air_temperature" in columns.claims
        else None
    ),
    **dict.fromkeys(_HEIGHTS, _height),
    "wind_speed": _speed,
    "eastward_wind": _speed,
    "northward_wind": _speed,
    "upward_air_velocity": _as_the_wind,
    "wind_speed_deviation": _as_the_wind,
    "wind_error": _as_the_wind,
    "relative_humidity": _fraction,
    "availability": _fraction,
    "mixing_ratio": _mass_ratio,
    "specific_humidity": _mass_ratio,
    "carrier_to_noise_ratio": _always("dB", "decibel", "always in dB"),
    "latitude": _always("deg", "angle", "in degrees"),
    "longitude": _always("deg", "angle", "in degrees"),
    "elapsed_time": _always("s", "duration", "taken as s, no answer hangs on it"),
}


class Counted(NamedTuple):
    """What a height is counted from, and why; a remark where that is a rule and no finding."""

    quantity: str
    why: str
    remark: str | None = None


NEAR_SEA = 20.0  # m: up to here the rule by name can do little harm
_FIRST_LEVEL = 200.0  # m: a lowest level above this is no first level above ground


def counted_from(claim: Claim, z: Array, pressure: Array | None, elevation: Any) -> Counted:
    """
    Settle whether a height that does not say it is above ground or above sea level.

    Parameters
    ----------
    claim
        The column, ``some_height`` or ``some_altitude``.
    z
        Its values, shape (profile, level). [m]
    pressure
        The pressure there, None where there is none. [Pa]
    elevation
        Of the site, NaN where not known. [m]

    Raises
    ------
    Contradiction
        Both are possible; the message names the options.

    Notes
    -----
    By ICAO's definitions a height is counted from a level on the ground and an altitude from mean
    sea level (Annex 3, chapter 1, from memory); the numbers overrule the name.
    """
    lowest = _median(np.fmin.reduce(z, axis=-1))
    base = _median(np.asarray(elevation, dtype=float))
    by_name = "height" if claim.quantity == "some_height" else "altitude"
    said = "above ground" if by_name == "height" else "above sea level"
    if base == base and lowest < base - 5.0:
        return Counted("height", f"above ground, for it begins below the site ({base:g} m)")
    if pressure is not None:
        at = _median(standard_height(np.fmax.reduce(pressure, axis=-1)))
        # A day's surface pressure puts the standard height off by up to 300 m.
        if base == base:
            sea, ground = abs(lowest - at), abs(lowest + base - at)
            if sea < 300.0 < ground:
                return Counted("altitude", "above sea level, by the pressure of the lowest level")
            if ground < 300.0 < sea:
                return Counted("height", "above ground, by the pressure of the lowest level")
        if at > 600.0 and lowest < at - 500.0:
            return Counted("height", "above ground, by the pressure of the lowest level")
        if at > 600.0 and abs(lowest - at) < 300.0 and base != base:
            return Counted("altitude", "above sea level, by the pressure of the lowest level")
    if by_name == "altitude":
        return Counted("altitude", f"{said}, as an altitude is")
    if base != base:
        if lowest > _FIRST_LEVEL:
            raise _either(claim, "begins high, and the elevation of the site is not known")
        return Counted("height", f"{said}, as a height is", _remark(claim))
    if _multiples(z, lowest):
        return Counted("height", f"{said}, for it goes in steps of its lowest value")
    round_numbers = bool(np.all(np.isnan(z) | (z % 10.0 == 0)))
    if abs(lowest - base) <= 2.0 and base > NEAR_SEA and not round_numbers:
        return Counted("altitude", "above sea level, for it begins at the site's elevation")
    if base <= NEAR_SEA:
        return Counted("height", f"{said}, as a height is", _remark(claim))
    raise _either(claim, f"begins at {lowest:g} m, and the site lies at {base:g} m")


def _remark(claim: Claim) -> str:
    return (
        f'column "{claim.name}" does not say what it is counted from, it was taken as above ground'
    )


def _either(claim: Claim, because: str) -> Contradiction:
    return Contradiction(
        f'column "{claim.name}" may be above ground or above sea level: it {because}',
        f'Say --column height="{claim.name}" or --column altitude="{claim.name}"',
    )


def _multiples(z: Array, lowest: float) -> bool:
    """Say whether all heights are multiples of the lowest, as those of a timed balloon are."""
    there = z[np.isfinite(z)]
    if there.size < 5 or not lowest > 0:
        return False
    steps = there / lowest
    return bool(np.all(np.abs(steps - np.round(steps)) < 1e-6))


def _median(values: Any) -> float:
    values = np.asarray(values, dtype=float).ravel()
    values = values[np.isfinite(values)]
    return float(np.median(values)) if values.size else float("nan")
