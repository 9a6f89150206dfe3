"""One profile under every name and in every unit: the same stack, to the rounding of the file."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from backveer.io.readers.columns import understand
from backveer.io.readers.errors import Contradiction, UnknownUnit
from backveer.io.readers.reading import Hints
from backveer.io.readers.table import Table
from backveer.profiles.hydrostatics import hypsometric_pressure
from backveer.profiles.stack import Stack, wind_components

ELEVATION = 212.0
HEIGHT = np.array([10.0, 55.0, 140.0, 330.0, 610.0, 950.0, 1390.0, 2210.0])
ALTITUDE = HEIGHT + ELEVATION
TEMPERATURE = 287.3 - 0.0068 * ALTITUDE + np.array([0.0, 0.3, 0.9, 0.4, -0.2, 0.1, 0.6, 0.0])
DEW_POINT = TEMPERATURE - np.array([2.0, 2.5, 3.0, 3.5, 1.0, 0.5, 8.0, 12.0])
PRESSURE = hypsometric_pressure(ALTITUDE, TEMPERATURE, DEW_POINT, base_pressure=98750.0)
SPEED = np.array([3.1, 5.2, 7.9, 10.4, 12.2, 12.9, 11.7, 14.3])
DIRECTION = np.array([338.0, 343.5, 351.0, 357.2, 2.4, 11.0, 14.5, 21.0])
U, V = wind_components(SPEED, DIRECTION)

# By quantity: names that say what it is (English, German, French, Spanish, signs), then units.
NAMES = {
    "height": (
        HEIGHT,
        ["Height AGL", "z_agl", "Höhe über Grund", "hauteur sol", "Altura sobre el suelo"],
        {"m": 1.0, "km": 1000.0, "ft": 0.3048, "hft": 30.48},
    ),
    "altitude": (
        ALTITUDE,
        ["Altitude MSL", "alt_msl", "Höhe ü. NN", "Altitude au-dessus du niveau de la mer", "msnm"],
        {"m": 1.0, "km": 1000.0, "feet": 0.3048, "ft": 0.3048},
    ),
    "pressure": (
        PRESSURE,
        ["Pressure", "pres", "Luftdruck", "Pression", "Presión atmosférica", "P"],
        {"hPa": 100.0, "mbar": 100.0, "Pa": 1.0, "kPa": 1000.0, "inHg": 3386.389, "mb": 100.0},
    ),
    "speed": (
        SPEED,
        ["Wind speed", "ws", "wspd", "FF", "Windgeschwindigkeit", "Vitesse du vent",
         "Velocidad del viento", "WIND_SPEED"],
        {"m/s": 1.0, "m s-1": 1.0, "m.s-1": 1.0, "ms-1": 1.0, "kt": 1852 / 3600, "kn": 1852 / 3600,
         "knots": 1852 / 3600, "km/h": 1 / 3.6, "kmh": 1 / 3.6, "mph": 0.44704, "ft/s": 0.3048},
    ),
    "direction": (
        DIRECTION,
        ["Wind direction", "wd", "wdir", "DD", "drct", "Windrichtung", "Direction du vent",
         "Dirección del viento"],
        {"deg": 1.0, "°": 1.0, "degrees": 1.0, "rad": 180.0 / np.pi},
    ),
    "u": (U, ["u", "Eastward wind", "u_wind", "Zonalwind"], {"m/s": 1.0, "kt": 1852 / 3600}),
    "v": (V, ["v", "Northward wind", "v_wind", "Meridionalwind"], {"m/s": 1.0, "kt": 1852 / 3600}),
}  # fmt: skip
TEMPERATURES = ["°C", "degC", "C", "K", "F", "celsius", "deg C"]
SIGNS = {
    "bracket": "{name} ({unit})",
    "square": "{name} [{unit}]",
    "comma": "{name}, {unit}",
    "underscore": "{name}_{unit}",
    "in": "{name} in {unit}",
    "row": "{name}",
}


def temperature_in(unit: str, kelvin: np.ndarray) -> np.ndarray:
    if unit == "K":
        return kelvin
    return (kelvin - 273.15) * 1.8 + 32.0 if unit == "F" else kelvin - 273.15


def table(columns: list[tuple[str, str, np.ndarray]], order=slice(None), **more) -> Table:
    """Build a table from names, units of a units row, and numbers."""
    units = tuple(unit for _, unit, _ in columns)
    return Table(
        source="night.csv",
        header=tuple(name for name, _, _ in columns),
        units=units if any(units) else (),
        columns=tuple(np.asarray(values)[order] for _, _, values in columns),
        lines=np.arange(7, 7 + len(columns[0][2])),
        metadata=more.get("metadata", (("Latitude", "58.41 N"), ("Elevation", "212 m"))),
        remarks=(),
        encoding="utf-8",
        delimiter=",",
        decimal=".",
    )


def stack(read: Table, hints: Hints | None = None) -> Stack:
    draft = understand(read, hints or Hints())
    return Stack.of(**draft.levels, **draft.profile)


@st.composite
def dressed(draw):
    """Draw one column of each kind, each under one of its names, in one of its units, any order."""
    shapes = st.sampled_from(sorted(SIGNS))
    wind = draw(st.sampled_from([("speed", "direction"), ("u", "v")]))
    vertical = draw(st.sampled_from(["height", "altitude"]))
    columns = []
    for quantity in (vertical, "pressure", *wind):
        values, names, units = NAMES[quantity]
        unit = draw(st.sampled_from(sorted(units)))
        columns.append((draw(st.sampled_from(names)), unit, values / units[unit]))
    for values, names in (
        (TEMPERATURE, ["Temperature", "temp", "Lufttemperatur", "Température", "Temperatura", "T"]),
        (DEW_POINT, ["Dew point", "Td", "Taupunkt", "Point de rosée", "Punto de rocío", "dwpt"]),
    ):
        unit = draw(st.sampled_from(TEMPERATURES))
        columns.append((draw(st.sampled_from(names)), unit, temperature_in(unit, values)))
    shape = draw(shapes)
    if shape == "underscore":  # a sign such as "m s-1" or "°" is not written behind one
        columns = [(n, u.replace(" ", "").replace("°C", "degC").replace("°", "deg"), x)
                   for n, u, x in columns]  # fmt: skip
    named = [
        (SIGNS[shape].format(name=name, unit=unit), unit if shape == "row" else "", values)
        for name, unit, values in columns
    ]
    descending = draw(st.booleans())
    return table(draw(st.permutations(named)), slice(None, None, -1) if descending else slice(None))


@settings(max_examples=150, deadline=None)
@given(dressed())
def test_names_units_and_order_change_nothing(read):
    got = stack(read)
    assert got.height.shape == (1, len(HEIGHT))
    for name, expected, tolerance in (
        ("height", HEIGHT, 1e-6),
        ("altitude", ALTITUDE, 1e-6),
        ("air_pressure", PRESSURE, 1e-5),
        ("air_temperature", TEMPERATURE, 1e-9),
        ("dew_point_temperature", DEW_POINT, 1e-9),
        ("eastward_wind", U, 1e-9),
        ("northward_wind", V, 1e-9),
    ):
        np.testing.assert_allclose(getattr(got, name)[0], expected, atol=tolerance, err_msg=name)


# A unit that the numbers settle: the same profile, each column in turn without its unit.
SETTLED = [
    ("pres", PRESSURE / unit, name)
    for name, unit in (("hPa", 100.0), ("Pa", 1.0), ("kPa", 1000.0), ("inHg", 3386.389))
]


def plain(**replaced) -> list[tuple[str, str, np.ndarray]]:
    columns = {
        "altitude_msl": ("m", ALTITUDE),
        "pres": ("hPa", PRESSURE / 100.0),
        "temp": ("degC", TEMPERATURE - 273.15),
        "dwpt": ("degC", DEW_POINT - 273.15),
        "wspd": ("m/s", SPEED),
        "wdir": ("deg", DIRECTION),
    }
    columns.update(replaced)
    return [(name, *column) for name, column in columns.items()]


@pytest.mark.parametrize(("name", "values", "unit"), SETTLED)
def test_the_scale_of_a_pressure_is_settled_by_magnitude(name, values, unit):
    draft = understand(table(plain(**{name: ("", values)})), Hints())
    reading = next(column for column in draft.columns if column.column == name)
    assert (reading.read_as, reading.unit) == ("air_pressure", unit)
    assert "magnitude" in reading.why
    np.testing.assert_allclose(draft.levels["air_pressure"][0], PRESSURE)


@pytest.mark.parametrize(("unit", "factor"), [("m", 1.0), ("ft", 0.3048), ("km", 1000.0)])
def test_feet_and_metres_are_told_apart_by_the_hypsometric_equation(unit, factor):
    draft = understand(table(plain(altitude_msl=("", ALTITUDE / factor))), Hints())
    assert draft.columns[0].unit == unit
    assert "hypsometric equation" in draft.columns[0].why
    np.testing.assert_allclose(draft.levels["height"][0], HEIGHT, atol=1e-6)


@pytest.mark.parametrize(
    ("unit", "values"),
    [
        ("degC", TEMPERATURE - 273.15),
        ("K", TEMPERATURE),
        ("degF", temperature_in("F", TEMPERATURE)),
    ],
)
@pytest.mark.parametrize("height", ["m", ""])
def test_the_unit_of_a_temperature_is_settled(unit, values, height):
    read = table(plain(temp=("", values), altitude_msl=(height, ALTITUDE)))
    draft = understand(read, Hints())
    assert draft.columns[2].unit == unit
    np.testing.assert_allclose(draft.levels["air_temperature"][0], TEMPERATURE)


@pytest.mark.parametrize("name", ["temp", "dwpt", "rh", "pres", "availability"])
def test_a_column_without_a_value_and_without_a_unit_does_no_harm(name):
    columns = [column for column in plain() if column[0] != name]
    draft = understand(table([*columns, (name, "", np.full(len(HEIGHT), np.nan))]), Hints())
    np.testing.assert_allclose(draft.levels["height"][0], HEIGHT)


@pytest.mark.parametrize(
    ("name", "read_as", "why"),
    [
        ("Elapsed time", "elapsed_time", "no answer hangs on it"),
        ("RH (%)", None, "holds no numbers"),
        ("Availability", None, "holds no numbers"),
    ],
)
def test_words_in_a_column_that_no_answer_needs_do_no_harm(name, read_as, why):
    words = np.array([f"00:0{i}:30" for i in range(len(HEIGHT))], dtype=object)
    columns = [column for column in plain() if column[0] != "dwpt"]
    draft = understand(table([*columns, (name, "", words)]), Hints())
    assert draft.columns[-1].read_as == read_as
    assert why in draft.columns[-1].why
    np.testing.assert_allclose(draft.levels["height"][0], HEIGHT)


def test_words_in_a_column_that_is_needed_are_an_error_with_line():
    words = np.full(len(HEIGHT), "calm", dtype=object)
    with pytest.raises(Contradiction, match='column "wspd" holds no numbers') as caught:
        understand(table(plain(wspd=("m/s", words))), Hints())
    assert caught.value.line == 7


def test_the_elevation_of_a_wide_table_must_be_a_number():
    words = np.array(["high", "low"], dtype=object)
    two = np.array([5.0, 6.0])
    columns = [
        (f"{q}_{z} ({u})", "", two) for z in (40, 80) for q, u in (("ws", "m/s"), ("wd", "deg"))
    ]
    with pytest.raises(Contradiction, match='column "elev" holds no numbers'):
        understand(table([*columns, ("elev", "", words)], metadata=()), Hints())


@pytest.mark.parametrize(
    "replaced",
    [
        {"wspd": ("", SPEED * 0.0), "u": ("m/s", U), "v": ("m/s", V)},
        {"wspd": ("kt", SPEED * 0.0), "u": ("", U), "v": ("", V)},
        {"wspd": ("", SPEED), "u": ("m/s", U * 0.0), "v": ("m/s", V * 0.0)},
        {"temp": ("", TEMPERATURE - 273.15), "pres": ("hPa", np.tile([900.0, 901.0], 4))},
    ],
)
def test_numbers_that_settle_no_unit_leave_it_to_the_user(replaced):
    with pytest.raises(UnknownUnit, match="the data do not settle it"):
        understand(table(plain(**replaced)), Hints())
