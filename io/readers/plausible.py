"""
What each quantity can be, and which numbers stand for a missing one.

A code is told from a value by the quantity: 999.9 is a pressure in hPa and no direction. A number
that can be neither is refused and counted.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from backveer.io.readers.units import Unit

# Codes of the trade for a missing number: common practice, no source.
CODES = frozenset(
    sign * code
    for code in (99.0, 99.9, 99.99, 999.0, 999.9, 999.99, 9999.0, 9999.9, 9999.99, 99999.0, 99999.9,
                 999999.0, 9999999.0, 888.0, 8888.0, 88888.0, 7777.0, 777.7, 6999.0, 32767.0,
                 32768.0, 1e20, 1e30, 1e35, 1e36, 9.96921e36, 2147483647.0, 2147483648.0)
    for sign in (1.0, -1.0)
)  # fmt: skip


@dataclass(frozen=True)
class Limits:
    """
    What is possible, in SI, generously; and how far from all else a code stands.

    Attributes
    ----------
    low, high
        What lies outside is a code or impossible.
    gap
        A code inside the limits is one where no other value comes as close; None: never.
    refuse
        Whether an impossible value is refused here; otherwise the quality check flags it.
    said
        The limits in words.
    """

    low: float
    high: float
    gap: float | None = None
    refuse: bool = False
    said: str = ""


_SPEED_GAP = 25.0  # m/s between the strongest wind and the next: no jet is as lonely
_TEMPERATURE_GAP = 20.0  # K between neighbouring values of a sounding
LIMITS = {
    "wind_speed": Limits(0.0, 150.0, _SPEED_GAP, True, "is negative or above 150 m/s"),
    "wind_from_direction": Limits(0.0, 360.0, None, True, "is outside 0-360 degrees"),
    "wind_to_direction": Limits(0.0, 360.0, None, True, "is outside 0-360 degrees"),
    "eastward_wind": Limits(-150.0, 150.0, _SPEED_GAP),
    "northward_wind": Limits(-150.0, 150.0, _SPEED_GAP),
    "upward_air_velocity": Limits(-60.0, 60.0, 30.0),
    "wind_speed_deviation": Limits(0.0, 60.0, 30.0, True, "is negative or above 60 m/s"),
    "air_pressure": Limits(1.0, 1.2e5),
    "height": Limits(-600.0, 8e4),
    "altitude": Limits(-600.0, 8e4),
    "geopotential_height": Limits(-600.0, 8e4),
    "air_temperature": Limits(150.0, 345.0, _TEMPERATURE_GAP),
    "dew_point_temperature": Limits(100.0, 345.0, _TEMPERATURE_GAP),
    "dew_point_depression": Limits(0.0, 60.0, None, True, "is negative or above 60 K"),
    "relative_humidity": Limits(0.0, 1.1, None, True, "is outside 0-110 %"),
    "mixing_ratio": Limits(0.0, 0.06, None, True, "is negative or above 60 g/kg"),
    "specific_humidity": Limits(0.0, 0.06, None, True, "is negative or above 60 g/kg"),
    "availability": Limits(0.0, 1.005, None, True, "is outside 0-100 %"),
    "carrier_to_noise_ratio": Limits(-80.0, 80.0, 30.0),
    "latitude": Limits(-90.0, 90.0, None, True, "is outside -90 to 90 degrees"),
    "longitude": Limits(-180.0, 360.0, None, True, "is outside -180 to 360 degrees"),
    "elevation": Limits(-600.0, 9000.0, None, True, "is outside -600 to 9000 m"),
    "elapsed_time": Limits(-86400.0, 1e7),
    "wind_error": Limits(0.0, 50.0, None, True, "is negative or above 50 m/s"),
}


@dataclass(frozen=True, eq=False)
class Clean:
    """A column in SI, and what was taken out of it."""

    values: NDArray[np.float64]
    codes: int
    impossible: NDArray[np.bool_] | None


def clean(raw: NDArray[np.float64], quantity: str, unit: Unit) -> Clean:
    """
    Return a column in SI, without missing codes and impossible values.

    Parameters
    ----------
    raw
        As written, any shape, NaN where missing.
    quantity
        One of :data:`LIMITS`.
    unit
        In which it is written.

    Examples
    --------
    >>> from backveer.io.readers.units import parse
    >>> clean(np.array([999.9, 850.0, 9999.0]), "air_pressure", parse("hPa", "pressure")).values
    array([99990., 85000.,    nan])
    >>> clean(np.array([360.0, 372.0, 999.0]), "wind_from_direction", parse("deg", "angle")).values
    array([360.,  nan,  nan])
    """
    limits = LIMITS[quantity]
    factor, offset = unit.factor, unit.offset
    if quantity == "dew_point_depression":
        offset = 0.0  # a difference of temperatures
    values = raw if factor == 1.0 and offset == 0.0 else raw * factor + offset
    if values.size == 0:
        return Clean(values, 0, None)
    low, high = _extremes(raw)
    inside = limits.low <= low * factor + offset and high * factor + offset <= limits.high
    if low != low or (inside and low not in CODES and high not in CODES):
        return Clean(values, 0, None)
    raw = raw.copy()
    codes = 0
    while low == low:
        found = None
        for code in (low, high):
            if code in CODES and _stands_out(raw, code, limits, factor, offset):
                found = code
                break
        if found is None:
            break
        where = raw == found
        codes += int(np.count_nonzero(where))
        raw[where] = np.nan
        low, high = _extremes(raw)
    values = raw * factor + offset
    with np.errstate(invalid="ignore"):
        outside = (values < limits.low) | (values > limits.high)
        # What is written as 360 deg may come out of radians a little above it.
        outside &= ~(np.abs(values - limits.high) <= 1e-3 * abs(limits.high))
    if outside.any():
        # A code may hide between impossible values.
        hidden = outside & np.isin(raw, list(CODES))
        codes += int(np.count_nonzero(hidden))
        outside &= ~hidden
        values[hidden] = np.nan
        if limits.refuse:
            values[outside] = np.nan
            return Clean(values, codes, outside if outside.any() else None)
        if not np.isfinite(values).all():
            values[np.isinf(values)] = np.nan
    return Clean(values, codes, None)


def without_codes(raw: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the finite values that are no code in any quantity, to judge a scale by."""
    values: NDArray[np.float64] = raw[np.isfinite(raw)]
    if values.size and (float(values.min()) in CODES or float(values.max()) in CODES):
        kept = values[~np.isin(values, list(CODES))]
        return kept if kept.size else values
    return values


def _extremes(raw: NDArray[np.float64]) -> tuple[float, float]:
    """Lowest and highest, NaN where there is none."""
    return float(np.fmin.reduce(raw, axis=None)), float(np.fmax.reduce(raw, axis=None))


def _stands_out(
    raw: NDArray[Any], code: float, limits: Limits, factor: float, offset: float
) -> bool:
    """Say whether a number that may be a code is impossible, or far from all others."""
    if not limits.low <= code * factor + offset <= limits.high:
        return True
    if limits.gap is None:
        return False
    others = raw[np.isfinite(raw) & (raw != code)]
    if others.size == 0:
        return False
    return float(np.abs(others - code).min()) * abs(factor) > limits.gap
