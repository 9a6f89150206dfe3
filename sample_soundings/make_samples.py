"""
Makes the sample soundings: ``python sample_soundings/make_samples.py [FOLDER]``.

Everything is invented. The wind comes from a column of air in which friction, Coriolis force and a
given geostrophic wind act on each other through day and night; temperature, humidity and the
hydrostatic pressure are laid beside it, then the noise and the resolution of an instrument. The
seed is fixed, and running it again gives the same bytes.
"""

from __future__ import annotations

import gzip
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import numpy as np

# Its stream is frozen for good, while that of numpy's newer generators may change.
Random = np.random.RandomState

KNOT = 1852.0 / 3600.0  # m/s, by definition
FOOT = 0.3048  # m, by definition
VON_KARMAN = 0.40
DRY_AIR = 287.05  # J kg-1 K-1
STEADY = {"spin_up": 600.0, "step": 10800.0}  # hours and seconds
NORTH = {"latitude": 58.41, "longitude": -3.05, "elevation": 52.0}  # Harrow Skerry
SOUTH = {"latitude": -47.90, "longitude": -61.20, "elevation": 23.0}  # Punta Escarcha
TROPICS = {"latitude": 3.20, "longitude": -31.40, "elevation": 8.0}  # Morvanne


# The air ------------------------------------------------------------------------------------------


def toward(direction: Any, speed: Any) -> Any:
    """Wind as east + i north from the direction it blows from (degrees) and its speed."""
    return -1j * np.exp(-1j * np.radians(direction)) * speed


def columns_of_air(
    hours: Any,
    latitude: float,
    geostrophic: Callable[[float, Any], Any],
    mixing_depth: Callable[[float], float],
    roughness: float,
    spin_up: float = 72.0,
    step: float = 600.0,
) -> tuple[Any, Any]:
    """
    Wind of a column of air at the given hours: dW/dt = -i f (W - Wg) + d/dz (K dW/dz).

    K = kappa u* z exp(-z / mixing depth) and a little background. Implicit steps [s]; long ones let
    what the start left swinging die out, and give the steady wind. Returns the heights of the
    model [m] and the wind, complex, shape (hour, height).
    """
    f = 2.0 * 7.292115e-5 * np.sin(np.radians(latitude))
    edges = np.exp(np.linspace(np.log(2.0 * roughness), np.log(4000.0), 91))
    z, depth = np.sqrt(edges[1:] * edges[:-1]), np.diff(edges)
    wind = geostrophic(hours[0], z) * np.minimum(1.0, 0.3 + z / 800.0)
    kept, time = [], hours[0] - spin_up
    while len(kept) < len(hours):
        u_star = VON_KARMAN * abs(wind[0]) / np.log(z[0] / roughness)
        inner = edges[1:-1]
        mixing = VON_KARMAN * u_star * inner * np.exp(-inner / mixing_depth(time)) + 0.03
        exchange = mixing / np.diff(z)
        drag = VON_KARMAN * u_star / np.log(z[0] / roughness)
        out = np.zeros((z.size, z.size), dtype=complex)
        out[np.arange(z.size), np.arange(z.size)] = 1.0 / step + 1j * f
        for here, there in ((slice(0, -1), slice(1, None)), (slice(1, None), slice(0, -1))):
            rows, columns = np.arange(z.size)[here], np.arange(z.size)[there]
            out[rows, rows] += exchange / depth[here]
            out[rows, columns] -= exchange / depth[here]
        out[0, 0] += drag / depth[0]
        time += step / 3600.0
        wind = np.linalg.solve(out, wind / step + 1j * f * geostrophic(time, z))
        if time >= hours[len(kept)] - 1e-6:
            kept.append(wind)
    return z, np.array(kept)


def at(z: Any, model_height: Any, wind: Any, geostrophic: Any) -> Any:
    """Wind of the model at the heights z; geostrophic above the model's friction."""
    log = np.log(np.maximum(z, model_height[0]))
    inside = np.interp(log, np.log(model_height), wind.real) + 1j * np.interp(
        log, np.log(model_height), wind.imag
    )
    return np.where(z < 3000.0, inside, geostrophic)


def noise(random: Any, z: Any, error: float, length: float) -> Any:
    """One component's noise with the given standard error, correlated over ``length`` in height."""
    drawn = random.standard_normal(len(z)) * error
    for i, step in enumerate(np.diff(z)):
        share = np.exp(-step / length)
        drawn[i + 1] = share * drawn[i] + np.sqrt(1.0 - share**2) * drawn[i + 1]
    return drawn


def wind_noise(random: Any, z: Any, error: float, length: float) -> Any:
    """Noise of both components, as east + i north."""
    east = noise(random, z, error, length)
    return east + 1j * noise(random, z, error, length)


def vapour_pressure(temperature: Any) -> Any:
    """Saturation vapour pressure [Pa] over water, Magnus form with the constants of WMO-No. 8."""
    celsius = temperature - 273.15
    return 611.2 * np.exp(17.62 * celsius / (243.12 + celsius))


def dew_point(temperature: Any, humidity: Any) -> Any:
    """Dew point [K] from temperature [K] and relative humidity [0-1]."""
    log = np.log(humidity * vapour_pressure(temperature) / 611.2)
    return 243.12 * log / (17.62 - log) + 273.15


def pressure(z: Any, temperature: Any, humidity: Any, surface: float, latitude: float) -> Any:
    """Hydrostatic pressure [Pa] of moist air, from the pressure at the first level."""
    s2 = np.sin(np.radians(latitude)) ** 2
    gravity = 9.7803253359 * (1.0 + 0.00193185265241 * s2) / np.sqrt(1.0 - 0.00669437999013 * s2)
    gravity = gravity * (6356766.0 / (6356766.0 + z)) ** 2
    p = np.full(len(z), surface)
    for _ in range(4):  # humidity makes the density depend on the pressure a little
        share = humidity * vapour_pressure(temperature) / p
        virtual = temperature / (1.0 - 0.378 * share)
        rate = gravity / (DRY_AIR * virtual)
        p[1:] = surface * np.exp(-np.add.accumulate(0.5 * (rate[1:] + rate[:-1]) * np.diff(z)))
    return p


def air(
    z: Any,
    random: Any,
    surface_temperature: float,
    mixed_depth: float,
    lid: float,
    ground_cooling: float = 0.0,
    moisture: float = 0.75,
) -> tuple[Any, Any]:
    """
    Temperature [K] and relative humidity of a usual sounding.

    A well-mixed layer with a ``lid`` [K] on it, 6.5 K/km above up to 11 km, and ``ground_cooling``
    [K] as a surface inversion that dies out over 70 m.
    """
    mixed = np.minimum(z, mixed_depth)
    temperature = surface_temperature - 0.0085 * mixed
    temperature = temperature + lid * np.clip((z - mixed_depth) / 180.0, 0.0, 1.0)
    above = np.clip(z, mixed_depth + 180.0, 11000.0) - mixed_depth - 180.0
    temperature = temperature - 0.0062 * above - ground_cooling * np.exp(-z / 70.0)
    humidity = np.where(
        z < mixed_depth,
        moisture + 0.15 * z / mixed_depth,
        (moisture + 0.15) * (0.45 + 0.55 * np.exp(-(z - mixed_depth) / 250.0)),
    )
    humidity = humidity * np.exp(-z / 15000.0) + noise(random, z, 0.01, 300.0)
    return temperature + noise(random, z, 0.05, 100.0), np.clip(humidity, 0.03, 0.99)


def ascent(random: Any, first: float, spacing: float, count: int) -> Any:
    """Heights [m] of a balloon that rises a little unevenly."""
    steps = spacing * (1.0 + 0.12 * noise(random, np.arange(count) * spacing, 1.0, 400.0))
    return first + np.concatenate([[0.0], np.add.accumulate(np.maximum(steps, 0.3 * spacing))[:-1]])


# The dress ----------------------------------------------------------------------------------------


def number(value: float, decimals: int, comma: bool = False) -> str:
    """Write a number at the resolution of its instrument."""
    text = f"{round(float(value), decimals) + 0.0:.{decimals}f}"
    return text.replace(".", ",") if comma else text


def direction_of(wind: Any) -> Any:
    """Direction that the wind blows from, in (0, 360]. [degree]"""
    angle = np.degrees(np.arctan2(-wind.real, -wind.imag)) % 360.0
    return np.where(angle < 0.05, 360.0, angle)


def whole(direction: float) -> str:
    """Write a direction in whole degrees, north as 360."""
    return str(round(float(direction)) % 360 or 360)


def table(rows: Sequence[Sequence[str]], delimiter: str, end: str = "\n") -> str:
    """Join cells and rows."""
    return end.join(delimiter.join(row) for row in rows) + end


# The soundings ------------------------------------------------------------------------------------


def ekman_turn() -> bytes:
    """Clean Ekman turn: steady westerly, neutral air, geostrophic wind the same up to 3.5 km."""
    random = Random(101)
    z = ascent(random, 10.0, 24.0, 500)

    def geostrophic(_hour: float, height: Any) -> Any:
        return toward(262.0, 13.0) + (0.0019 + 0.0004j) * np.maximum(height - 3500.0, 0.0)

    model, wind = columns_of_air(
        [0.0], NORTH["latitude"], geostrophic, lambda _hour: 190.0, 0.03, **STEADY
    )
    w = at(z, model, wind[0], geostrophic(0.0, z)) + wind_noise(random, z, 0.22, 60.0)
    temperature, humidity = air(z, random, 284.6, 1250.0, 1.6)
    p = pressure(z, temperature, humidity, 100320.0, NORTH["latitude"])
    dew = dew_point(temperature, humidity)
    head = [
        "# Station: Harrow Skerry",
        "# Latitude: 58.41 N",
        "# Longitude: 3.05 W",
        "# Elevation: 52 m",
        "# Launch: 2031-05-14 11:15 UTC",
        "Elapsed (s),Altitude MSL (m),Pressure (hPa),Temp (C),Dew point (C),"
        "Wind speed (kt),Wind dir (deg)",
    ]
    rows = [
        [
            number((z[i] - z[0]) / 4.9, 0),
            number(z[i] + NORTH["elevation"], 0),
            number(p[i] / 100.0, 1),
            number(temperature[i] - 273.15, 1),
            number(dew[i] - 273.15, 1),
            number(abs(w[i]) / KNOT, 1),
            whole(direction_of(w[i])),
        ]
        for i in range(len(z))
    ]
    return ("\n".join(head) + "\n" + table(rows, ",")).encode()


def _warm_advection(seed: int, place: dict[str, float], count: int) -> tuple[Any, ...]:
    """Give a day on which the air comes from warmer places: the geostrophic wind turns aloft."""
    random = Random(seed)
    z = ascent(random, 10.0, 30.0, count)
    sense = np.sign(place["latitude"])  # the southern hemisphere is the mirror image

    def geostrophic(_hour: float, height: Any) -> Any:
        # the thermal wind points to the right of the wind in the north, to the left in the south
        ground = toward(270.0 - sense * 50.0, 11.0)
        thermal = toward(270.0 - sense * 50.0 + sense * 85.0, 0.0030)
        return ground + thermal * np.minimum(height, 5000.0)

    model, wind = columns_of_air(
        [0.0], place["latitude"], geostrophic, lambda _hour: 150.0, 0.01, **STEADY
    )
    w = at(z, model, wind[0], geostrophic(0.0, z)) + wind_noise(random, z, 0.2, 60.0)
    temperature, humidity = air(z, random, 281.9, 900.0, 2.2, moisture=0.82)
    p = pressure(z, temperature, humidity, 99410.0, place["latitude"])
    return z, w, temperature, humidity, p


def warm_advection_south() -> bytes:
    """Warm advection in the south: the wind backs. Spanish, decimal comma, Latin-1, CRLF."""
    z, w, temperature, humidity, p = _warm_advection(202, SOUTH, 160)
    dew = dew_point(temperature, humidity)
    head = [
        "Estación: Punta Escarcha",
        "Latitud: 47,90 S",
        "Longitud: 61,20 O",
        "Elevación: 23 m",
        "Lanzamiento: 2031-07-09 18:05 UTC",
        "",
        "Altitud (m);Presión (hPa);Temperatura (°C);Punto de rocío (°C);"
        "Dirección del viento (°);Velocidad del viento (m/s)",
    ]
    rows = [
        [
            number(z[i] + SOUTH["elevation"], 0, comma=True),
            number(p[i] / 100.0, 1, comma=True),
            number(temperature[i] - 273.15, 1, comma=True),
            number(dew[i] - 273.15, 1, comma=True),
            whole(direction_of(w[i])),
            number(abs(w[i]), 1, comma=True),
        ]
        for i in range(len(z))
    ]
    return ("\r\n".join(head) + "\r\n" + table(rows, ";", "\r\n")).encode("latin-1")


def warm_advection_north() -> bytes:
    """Warm advection, northern hemisphere: the wind veers. German, tabs, decimal comma, BOM."""
    z, w, temperature, humidity, p = _warm_advection(203, NORTH, 130)
    head = [
        "Station: Harrow Skerry",
        "Breite: 58,41 N",
        "Länge: 3,05 W",
        "Stationshöhe: 52 m",
        "Start: 2031-01-22 05:30 UTC",
        "",
        "\t".join(
            (
                "Höhe über Grund [m]",
                "Luftdruck [hPa]",
                "Lufttemperatur [°C]",
                "Relative Feuchte [%]",
                "Windgeschwindigkeit [m/s]",
                "Windrichtung [°]",
            )
        ),
    ]
    rows = [
        [
            number(z[i], 0, comma=True),
            number(p[i] / 100.0, 1, comma=True),
            number(temperature[i] - 273.15, 1, comma=True),
            number(100.0 * humidity[i], 0, comma=True),
            number(abs(w[i]), 1, comma=True),
            whole(direction_of(w[i])),
        ]
        for i in range(len(z))
    ]
    return ("\n".join(head) + "\n" + table(rows, "\t")).encode("utf-8-sig")


def night_jet() -> bytes:
    """Jet on a surface inversion, hours after sunset. Components, feet and knots, a units row."""
    random = Random(304)
    z = ascent(random, 10.0, 16.0, 210)

    def geostrophic(_hour: float, height: Any) -> Any:
        return toward(214.0, 10.5) + 0.0 * height

    def mixing_depth(hour: float) -> float:
        return 260.0 if hour < 0.0 else 14.0  # the sun sets at hour 0

    model, wind = columns_of_air([6.5], NORTH["latitude"], geostrophic, mixing_depth, 0.05, 240.0)
    w = at(z, model, wind[0], geostrophic(0.0, z)) + wind_noise(random, z, 0.15, 40.0)
    temperature, humidity = air(z, random, 287.0, 1100.0, 1.5, ground_cooling=6.0, moisture=0.7)
    p = pressure(z, temperature, humidity, 101450.0, NORTH["latitude"])
    head = [
        "! Harrow Skerry airfield, balloon ascent",
        "! latitude = 58.41",
        "! longitude = -3.05",
        "! elevation = 52 m",
        "! time = 2031-09-23T00:40Z",
        "height_agl|pressure|temperature|rh|u|v",
        "ft|hPa|degC|%|kt|kt",
    ]
    rows = [
        [
            number(z[i] / FOOT, 0),
            number(p[i] / 100.0, 1),
            number(temperature[i] - 273.15, 1),
            number(100.0 * humidity[i], 0),
            number(w[i].real / KNOT, 1),
            number(w[i].imag / KNOT, 1),
        ]
        for i in range(len(z))
    ]
    rows[40][4] = rows[40][5] = "///"  # a telemetry gap
    rows[41][4] = rows[41][5] = "///"
    return ("\n".join(head) + "\n" + table(rows, "|")).encode()


def tropical() -> bytes:
    """Trade wind close to the equator. French, pressure without height, km/h, compressed."""
    random = Random(405)
    z = ascent(random, 10.0, 70.0, 140)
    # No balance with the Coriolis force to lean on: the shape is given, not computed.
    trade = toward(108.0, 9.0) * (1.0 - 0.55 * np.exp(-z / 180.0))
    westerly = toward(265.0, 14.0) / (1.0 + np.exp(-(z - 6500.0) / 900.0))
    turn = np.exp(-1j * np.radians(14.0) * np.minimum(z / 1500.0, 1.0))
    w = trade * turn * np.exp(-((z / 7000.0) ** 2)) + westerly + wind_noise(random, z, 0.2, 80.0)
    temperature, humidity = air(z, random, 300.4, 620.0, 1.0, moisture=0.78)
    p = pressure(z, temperature, humidity, 101180.0, TROPICS["latitude"])
    dew = dew_point(temperature, humidity)
    head = [
        "# Station : Morvanne",
        "# Latitude : 3,20 N",
        "# Longitude : 31,40 O",
        "# Altitude de la station : 8 m",
        "# Lâcher : 2031-03-02 12:00 UTC",
        "Pression (hPa);Température (°C);Point de rosée (°C);"
        "Direction du vent (°);Vitesse du vent (km/h)",
    ]
    rows = [
        [
            number(p[i] / 100.0, 1, comma=True),
            number(temperature[i] - 273.15, 1, comma=True),
            number(dew[i] - 273.15, 1, comma=True),
            whole(direction_of(w[i])),
            number(abs(w[i]) * 3.6, 1, comma=True),
        ]
        for i in range(len(z))
    ]
    # mtime 0 and no name inside, so that the bytes do not depend on when and where
    return gzip.compress(("\n".join(head) + "\n" + table(rows, ";")).encode(), 9, mtime=0)


def lidar_week() -> bytes:
    """Lidar at the wind farm, ten minutes for a week: jets at night, gaps, weak signals."""
    random = Random(506)
    gates = np.array([40, 60, 80, 100, 119, 140, 160, 180, 200, 220, 260, 300], dtype=float)
    hours = np.arange(1, 1009) / 6.0

    def geostrophic(hour: float, height: Any) -> Any:
        day = hour / 24.0
        speed = 10.5 + 3.0 * np.sin(1.3 * day + 0.4) + 1.2 * np.sin(3.1 * day)
        direction = 225.0 + 38.0 * np.sin(0.9 * day) + 14.0 * day
        return toward(direction, speed) + 0.0 * height

    def mixing_depth(hour: float) -> float:
        sun = max(np.sin(np.pi * ((hour % 24.0) - 6.2) / 12.3), 0.0)  # up from 6.2 to 18.5 UTC
        return float(30.0 + 260.0 * np.clip(1.6 * sun, 0.0, 1.0) ** 0.7)

    model, wind = columns_of_air(hours, NORTH["latitude"], geostrophic, mixing_depth, 0.03)
    start = np.datetime64("2031-09-15T00:00")
    rows = []
    weather = noise(random, hours, 2.5, 9.0)
    for i, hour in enumerate(hours):
        sun = np.clip(np.sin(np.pi * ((hour % 24.0) - 6.2) / 12.3), 0.0, 1.0)
        w = at(gates, model, wind[i], 0.0)
        w = w + wind_noise(random, gates, 0.08 + 0.22 * sun, 120.0)
        signal = -11.0 - 0.028 * gates + weather[i] + noise(random, gates, 0.7, 60.0)
        if 52.0 <= hour < 55.0:
            signal = signal - 11.0  # drizzle and clean air: hours of weak signal
        available = np.clip(np.round(100.0 + 6.0 * (signal + 20.0)), 0, 100)
        available = np.where(signal > -20.0, 100.0, available)
        sigma = np.abs(w) * (0.035 + 0.085 * sun) * (1.0 + 0.15 * random.standard_normal(12))
        lost = signal < -23.5
        # below the threshold the instrument still reports, and what it reports is no wind
        weak = (signal < -22.0) & ~lost
        w = np.where(weak, w + 6.0 * random.standard_normal(12), w)
        direction = direction_of(w)
        time = start + np.timedelta64(round(hour * 60.0), "m")
        if 101.0 < hour <= 109.5 or (i % 173 == 170):
            continue  # a power cut, and single records lost
        cells = [str(time).replace("T", " ")]
        for j in range(len(gates)):
            if lost[j]:
                cells += ["-999", "-999", number(available[j], 0), number(signal[j], 1), "-999"]
            else:
                cells += [
                    number(abs(w[j]), 2),
                    number(direction[j], 1),
                    number(available[j], 0),
                    number(signal[j], 1),
                    number(sigma[j], 2),
                ]
        rows.append(cells)
    names, units = ["time_utc"], [""]
    for gate in gates:
        for name, unit in (
            ("ws", "m/s"),
            ("wd", "deg"),
            ("avail", "%"),
            ("cnr", "dB"),
            ("sigma", "m/s"),
        ):
            names.append(f"{name}_{gate:.0f}")
            units.append(unit)
    head = [
        "# Site: Harrow Skerry wind farm, lidar",
        "# Latitude: 58.44",
        "# Longitude: -3.01",
        "# Elevation: 31 m",
        "# Heights above ground in m, time at the end of the interval",
    ]
    return ("\n".join(head) + "\n" + table([names, units, *rows], ",")).encode()


def tower() -> bytes:
    """Tower at the southern airfield, one row a level, six half hours; one calm."""
    random = Random(607)
    heights = np.array([10.0, 20.0, 40.0, 60.0, 80.0, 100.0, 120.0])
    hours = np.array([4.0, 5.0, 6.0, 12.0, 13.0, 14.0])

    def geostrophic(hour: float, height: Any) -> Any:
        return toward(306.0 + 1.5 * hour, 9.5 - 0.15 * hour) + 0.0 * height

    def mixing_depth(hour: float) -> float:
        return 180.0 if 8.0 < hour % 24.0 < 19.0 else 22.0

    model, wind = columns_of_air(hours, SOUTH["latitude"], geostrophic, mixing_depth, 0.02)
    rows = [["station", "time_utc", "z_agl_m", "wind_speed_ms", "wind_from_deg", "temperature_C"]]
    for i, hour in enumerate(hours):
        w = at(heights, model, wind[i], 0.0) + wind_noise(random, heights, 0.1, 30.0)
        night = hour < 8.0
        for j, height in enumerate(heights):
            calm = i == 0 and j == 0
            temperature = (3.1 + 0.02 * height) if night else (7.4 - 0.0095 * height)
            rows.append(
                [
                    "Punta Escarcha",
                    f"2031-07-10T{int(hour):02d}:30Z",
                    number(height, 0),
                    "0.0" if calm else number(abs(w[j]), 1),
                    "0" if calm else whole(direction_of(w[j])),
                    number(temperature + 0.03 * random.standard_normal(), 1),
                ]
            )
    head = ["# Latitude: 47.88 S", "# Longitude: 61.17 W", "# Elevation: 19 m"]
    return ("\n".join(head) + "\n" + table(rows, ",")).encode()


def pilot_balloon() -> bytes:
    """Pilot balloon followed by theodolite: heights, directions, knots and nothing else."""
    random = Random(708)
    z = np.arange(1, 31) * 75.0

    def geostrophic(_hour: float, height: Any) -> Any:
        return toward(301.0, 9.0) + 0.0 * height

    model, wind = columns_of_air(
        [0.0], NORTH["latitude"], geostrophic, lambda _hour: 160.0, 0.03, **STEADY
    )
    w = at(z, model, wind[0], geostrophic(0.0, z)) + wind_noise(random, z, 0.5, 100.0)
    head = [
        "Pilot balloon, Harrow Skerry, single theodolite",
        "Latitude: 58.41 N",
        "Longitude: 3.05 W",
        "Elevation: 52 m",
        "Date: 2031-10-08 09:00 UTC",
        "",
    ]
    rows = [f"{'Height(m)':>10}{'Dir(deg)':>10}{'Speed(kt)':>10}"]
    rows += [
        f"{z[i]:>10.0f}{whole(direction_of(w[i])):>10}{number(abs(w[i]) / KNOT, 0):>10}"
        for i in range(len(z))
    ]
    return ("\n".join(head + rows) + "\n").encode()


SAMPLES: dict[str, Callable[[], bytes]] = {
    "harrow_skerry_ekman.csv": ekman_turn,
    "punta_escarcha_calido.csv": warm_advection_south,
    "harrow_skerry_warm.tsv": warm_advection_north,
    "harrow_skerry_night_jet.txt": night_jet,
    "morvanne_tropiques.csv.gz": tropical,
    "harrow_skerry_lidar_week.csv": lidar_week,
    "punta_escarcha_tower.csv": tower,
    "harrow_skerry_pilot_balloon.txt": pilot_balloon,
}


def main(folder: Path) -> None:
    """Write every sample into the folder."""
    for name, make in SAMPLES.items():
        content = make()
        (folder / name).write_bytes(content)
        print(f"{name}: {len(content)} bytes")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
