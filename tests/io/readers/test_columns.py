"""A good table broken one way at a time, in every dress, and what the numbers settle."""

from __future__ import annotations

import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from backveer.io.readers.columns import understand
from backveer.io.readers.errors import (
    Contradiction,
    MissingColumn,
    ReadError,
    TooFewLevels,
    UnknownUnit,
)
from backveer.io.readers.reading import Hints
from backveer.io.readers.text import read_tables
from backveer.profiles.air import standard_height
from backveer.profiles.flags import BIT

HEAD = "Height AGL (m),Speed (m/s),Dir (deg)\n"
ROWS = "10,3,200\n50,5,210\n100,7,225\n200,9,240\n"
PLACE = "# Latitude: 58.41 N\n# Elevation: 52 m\n# Launch: 2031-05-14 23:15 UTC\n"


def drafts(text, **hints):
    tables = read_tables("night.csv", text.encode(), nameless=bool(hints.get("columns")))
    return [understand(table, Hints(**hints)) for table in tables]


def draft(text, **hints):
    (one,) = drafts(text, **hints)
    return one


def why(result, column):
    return next(c for c in result.columns if c.column == column)


def before(rows, cell):
    return "".join(f"{cell},{row}\n" for row in rows.split())


def u_v(speed, direction):
    angle = np.radians(direction)
    return -np.asarray(speed) * np.sin(angle), -np.asarray(speed) * np.cos(angle)


# --- the good table -----------------------------------------------------------------------------


def test_the_good_table():
    result = draft(PLACE + HEAD + ROWS)
    assert result.levels["height"].tolist() == [[10, 50, 100, 200]]
    assert result.levels["altitude"].tolist() == [[62, 102, 152, 252]]
    u, v = u_v([3, 5, 7, 9], [200, 210, 225, 240])
    np.testing.assert_allclose(result.levels["eastward_wind"][0], u, atol=1e-12)
    np.testing.assert_allclose(result.levels["northward_wind"][0], v, atol=1e-12)
    assert result.profile["latitude"] == 58.41
    assert result.profile["time"] == np.datetime64("2031-05-14T23:15")
    assert result.remarks == []
    assert {c.why for c in result.columns} == {"name and unit in the header"}
    assert [c.unit for c in result.columns] == ["m", "m/s", "deg"]


# --- broken one way at a time -------------------------------------------------------------------

BROKEN = {
    "a lone speed": (HEAD.replace(" (m/s)", "") + ROWS, UnknownUnit, '"Speed".*--unit "Speed=kt"'),
    "a lone height": (HEAD.replace(" (m)", "") + ROWS, UnknownUnit, '--unit "Height AGL=ft"'),
    "an unknown unit": (
        HEAD.replace("m/s", "furlong/h") + ROWS,
        UnknownUnit,
        r'furlong/h is no unit.*--unit "Speed \(furlong/h\)=UNIT"',
    ),
    "an unknown unit in the units row": (
        "Height AGL,Speed,Dir\nm,furlong/h,deg\n" + ROWS,
        UnknownUnit,
        'furlong/h is no unit.*--unit "Speed=UNIT"',
    ),
    "two speeds": (
        "Height AGL (m),Speed (m/s),Wind speed (kt),Dir (deg)\n10,3,6,200\n50,5,10,210\n",
        Contradiction,
        r'"Speed \(m/s\)" and "Wind speed \(kt\)" both claim.*--column wind_speed=',
    ),
    "no direction": (
        "Height AGL (m),Speed (m/s)\n10,3\n50,5\n",
        MissingColumn,
        "a wind speed and no direction.*--column wind_from_direction",
    ),
    "no speed": (
        "Height AGL (m),Dir (deg)\n10,3\n50,5\n",
        MissingColumn,
        "a wind direction and no speed.*--column wind_speed",
    ),
    "no wind": (
        "Height AGL (m),Temp (C)\n10,3\n50,5\n",
        MissingColumn,
        r"no wind among the columns.*Height AGL \(m\), Temp \(C\)",
    ),
    "no height and no pressure": (
        "Speed (m/s),Dir (deg)\n3,200\n5,210\n",
        MissingColumn,
        "no height and no pressure.*--column height=",
    ),
    "one level": (HEAD + "10,3,200\n", TooFewLevels, "a single level is no profile"),
    "name and units row": (
        HEAD.replace("m/s", "kt") + "m,m/s,deg\n" + ROWS,
        Contradiction,
        r'"Speed \(kt\)": the name says kt, the units row m/s',
    ),
    "a unit of something else": (
        HEAD.replace("m/s", "hPa") + ROWS,
        Contradiction,
        "hPa is no unit of the wind speed",
    ),
    "latitude 95": (
        "Latitude: 95 N\n" + HEAD + ROWS,
        Contradiction,
        "latitude 95 .*outside -90 to 90.*--latitude",
    ),
    "latitude east": ("Latitude: 58 E\n" + HEAD + ROWS, Contradiction, "is no latitude"),
    "an O in no language": (
        "Longitude: 3,05 O\n" + HEAD + ROWS,
        Contradiction,
        "Ost.*Oeste.*--longitude",
    ),
    "altitudes without elevation": (
        HEAD.replace("Height AGL", "Altitude MSL") + ROWS,
        MissingColumn,
        "elevation of the site is not known.*--elevation",
    ),
    "a height from nowhere": (
        "Elevation: 55 m\nHeight (m),Speed (m/s),Dir (deg)\n60,3,200\n85,5,210\n100,7,220\n",
        Contradiction,
        "may be above ground or above sea level.*--column height=.*--column altitude=",
    ),
    "all directions impossible": (
        HEAD + "10,3,400\n50,5,372\n",
        Contradiction,
        r"line 2: .*every value is outside 0-360 degrees",
    ),
    "magnetic north": (
        HEAD.replace("(deg)", "(deg mag)") + ROWS,
        UnknownUnit,
        "magnetic north.*--unit",
    ),
    "no numbers": (
        HEAD + "10,3,north\n50,5,west\n100,7,west\n",
        Contradiction,
        '"Dir .deg.*" holds no numbers',
    ),
    "heights that repeat": (
        HEAD + "".join(f"{z},3,{d}\n" for z in (10, 50, 100) for d in (200, 210, 220)),
        MissingColumn,
        "nothing tells profiles apart.*--column time=",
    ),
    "day or month": (
        "Date," + HEAD + before(ROWS, "05/06/2031"),
        Contradiction,
        'day and month of column "Date" cannot be told.*--unit "Date=DD/MM/YYYY"',
    ),
    "day or month in metadata": (
        "Date: 05/06/2031 12:00 UTC\n" + HEAD + ROWS,
        Contradiction,
        "day and month .*--time",
    ),
    "u and v against speed": (
        "Height AGL (m),u (m/s),v (m/s),Speed (m/s),Dir (deg)\n10,3,4,10,37\n50,5,0,9,90\n",
        Contradiction,
        "speed and direction disagree with u and v",
    ),
    "radians or degrees": (
        HEAD.replace(" (deg)", "") + "10,3,2.1\n50,5,3.2\n100,7,3.3\n",
        UnknownUnit,
        '"Dir" is not known',
    ),
    "a temperature between scales": (
        "Height AGL (m),T,Speed (m/s),Dir (deg)\n0,20,3,200\n86,19,5,210\n907,15,7,225\n",
        UnknownUnit,
        '"T" is not known',
    ),
    "sensor numbers": (
        "Time,WS1 (m/s),WD1 (deg),WS2 (m/s),WD2 (deg)\n2031-05-14T00:00Z,10,200,12,210\n",
        MissingColumn,
        "may count sensors.*--unit height=m",
    ),
    "a wide table of one height": (
        "Time,WS40 (m/s),WD40 (deg)\n2031-05-14T00:00Z,10,200\n2031-05-14T00:10Z,10,200\n",
        TooFewLevels,
        "single height",
    ),
}


@pytest.mark.parametrize("name", BROKEN)
def test_broken_in_one_way(name):
    text, kind, words = BROKEN[name]
    with pytest.raises(ReadError) as caught:
        drafts(text)
    assert type(caught.value) is kind
    assert re.search(words, str(caught.value)), str(caught.value)
    assert "\n" not in str(caught.value)


# --- hints --------------------------------------------------------------------------------------


def test_hints_override_and_fill():
    text = PLACE + HEAD.replace(" (m/s)", "") + ROWS
    for name in ("Speed", "wind_speed"):
        result = draft(text, units={name: "kt"}, latitude=-30.0, elevation=100.0, station="X")
        np.testing.assert_allclose(
            np.hypot(result.levels["eastward_wind"], result.levels["northward_wind"])[0],
            np.array([3, 5, 7, 9]) * 1852 / 3600,
        )
        assert result.profile["latitude"] == -30.0
        assert result.levels["altitude"][0, 0] == 110.0
        assert result.profile["station"][0] == "X"
        assert why(result, "Speed").why == "name in the header, unit given with --unit"


def test_a_hint_settles_two_speeds():
    text = "Height AGL (m),Speed (m/s),Wind speed (kt),Dir (deg)\n10,3,6,200\n50,5,10,210\n"
    result = draft(text, columns={"wind_speed": "Wind speed (kt)"})
    assert why(result, "Speed (m/s)").read_as is None
    assert np.hypot(
        result.levels["eastward_wind"][0, 0], result.levels["northward_wind"][0, 0]
    ) == pytest.approx(6 * 1852 / 3600)


def test_a_hint_settles_a_height():
    text = "Elevation: 55 m\nHeight (m),Speed (m/s),Dir (deg)\n60,3,200\n85,5,210\n100,7,220\n"
    above_ground = draft(text, columns={"height": "Height (m)"}).levels
    above_sea = draft(text, columns={"altitude": "Height (m)"}).levels
    assert above_ground["height"][0, 0] == 60
    assert above_sea["height"][0, 0] == 5


@pytest.mark.parametrize(
    ("hints", "words"),
    [
        ({"columns": {"wind_speed": "FF"}}, r'"FF" that is not there.*Height AGL \(m\), Speed'),
        ({"columns": {"gust": "Speed (m/s)"}}, "nothing is called gust.*wind_speed"),
        ({"units": {"FF": "kt"}}, r'"FF" that is not there.*Dir \(deg\)'),
        ({"units": {"wind_speed": "furlong"}}, "no unit of the wind speed.*kt"),
        ({"time": "soon"}, "--time soon is no date"),
    ],
)
def test_a_hint_that_does_not_fit(hints, words):
    with pytest.raises(ReadError, match=words):
        draft(HEAD + ROWS, **hints)


def test_the_order_of_the_date_by_a_hint():
    text = "Date," + HEAD + before(ROWS, "05/06/2031")
    assert draft(text, units={"Date": "DD/MM/YYYY"}).profile["time"] == np.datetime64("2031-06-05")
    assert draft(text, units={"Date": "MM/DD/YYYY"}).profile["time"] == np.datetime64("2031-05-06")


# --- languages ----------------------------------------------------------------------------------

LANGUAGES = {
    "en": (
        "Station: X\nLatitude: 58.41 N\nLongitude: 3.05 W\nElevation: 52 m\n"
        "Launch: 2031-05-14 23:15 UTC",
        "Height above ground (m);Pressure (hPa);Temperature (C);Relative humidity (%);"
        "Wind speed (m/s);Wind direction (deg)",
    ),
    "de": (
        "Station: X\nBreite: 58,41 N\nLänge: 3°03'W\nStationshöhe: 52 m\n"
        "Start: 14.05.2031 23:15 UTC",
        "Höhe über Grund [m];Luftdruck [hPa];Lufttemperatur [°C];Relative Feuchte [%];"
        "Windgeschwindigkeit [m/s];Windrichtung [Grad]",
    ),
    "fr": (
        "Station : X\nLatitude : 58,41 N\nLongitude : 3,05 O\nAltitude de la station : 52 m\n"
        "Lâcher : 14/05/2031 23:15 UTC",
        "Hauteur au-dessus du sol (m);Pression (hPa);Température (°C);Humidité relative (%);"
        "Vitesse du vent (m/s);Direction du vent (°)",
    ),
    "es": (
        "Estación: X\nLatitud: 58,41 N\nLongitud: 3,05 O\nElevación: 52 m\n"
        "Lanzamiento: 2031-05-14T23:15Z",
        "Altura sobre el suelo (m);Presión (hPa);Temperatura (°C);Humedad relativa (%);"
        "Velocidad del viento (m/s);Dirección del viento (°)",
    ),
    "signs": (
        "stn: X\nlat: 58.41\nlon: -3.05\nelev: 170.6037 ft\ntime: 2031-05-15T00:15+01:00",
        "z_agl_m;p_hPa;t_C;rh_pct;ff_ms;dd_deg",
    ),
}
LANGUAGE_ROWS = "10;1003;11.5;80;3.5;231\n90;993.5;11;77;7.25;238\n270;972;9.5;70;9;244\n"


@pytest.mark.parametrize("language", LANGUAGES)
def test_every_language_says_the_same(language):
    preamble, header = LANGUAGES[language]
    rows = LANGUAGE_ROWS if language == "signs" else LANGUAGE_ROWS.replace(".", ",")
    said = draft(f"{preamble}\n{header}\n{rows}")
    reference = draft("\n".join(LANGUAGES["en"]) + "\n" + LANGUAGE_ROWS.replace(".", ","))
    assert said.levels.keys() == reference.levels.keys()
    for name, values in reference.levels.items():
        np.testing.assert_allclose(said.levels[name], values, rtol=1e-6, err_msg=name)
    assert said.profile["station"][0] == "X"
    for name, value in {"latitude": 58.41, "longitude": -3.05, "elevation": 52.0}.items():
        assert said.profile[name] == pytest.approx([value], abs=1e-4)
    assert said.profile["time"] == np.datetime64("2031-05-14T23:15")


def test_an_o_is_east_in_german():
    text = f"Länge: 13,4 O\nBreite: 52 N\n{LANGUAGES['de'][1]}\n{LANGUAGE_ROWS.replace('.', ',')}"
    assert draft(text).profile["longitude"] == 13.4


# --- dress --------------------------------------------------------------------------------------

TRUE = {
    "height": np.array([12.0, 100.0, 279.0, 558.0, 896.0, 1338.0]),
    "pressure": np.array([1003.2, 992.7, 971.6, 939.6, 901.9, 854.4]),
    "temperature": np.array([284.55, 284.15, 282.75, 280.85, 278.35, 276.05]),
    "speed": np.array([5.1, 8.9, 11.6, 13.0, 12.8, 12.1]),
    "direction": np.array([231.0, 238.0, 244.0, 251.0, 256.0, 260.0]),
}
DRESS = {
    "height": (
        ["Height AGL", "z_agl", "Höhe über Grund", "Hauteur sol", "Altura sobre el suelo"],
        {"m": 1.0, "ft": 0.3048, "km": 1000.0, "hft": 30.48},
    ),
    "pressure": (
        ["Pressure", "p", "Luftdruck", "Pression", "PRES", "Presión"],
        {"hPa": 1.0, "mb": 1.0, "Pa": 0.01, "kPa": 10.0, "inHg": 33.86389},
    ),
    "temperature": (
        ["Temp", "T", "Lufttemperatur", "Température", "air_temperature", "TEMPERATURA"],
        {"C": (1.0, 273.15), "K": (1.0, 0.0), "degF": (5 / 9, 459.67 * 5 / 9)},
    ),
    "speed": (
        ["Wind speed", "WSPD", "ff", "Windgeschw.", "Vitesse du vent", "speed wind", "WindSpeed"],
        {"m/s": 1.0, "kt": 1852 / 3600, "km/h": 1 / 3.6, "mph": 0.44704, "ms-1": 1.0},
    ),
    "direction": (
        ["Wind dir", "dd", "WDIR", "Windrichtung", "Direction du vent", "drct"],
        {"deg": 1.0, "°": 1.0, "rad": 180 / np.pi},
    ),
}
STYLES = ["{name} ({unit})", "{name} [{unit}]", "{name}_{unit}", "{name}, {unit}", "row"]


@st.composite
def dresses(draw):
    columns = []
    for quantity in draw(st.permutations(list(DRESS))):
        names, units = DRESS[quantity]
        name, unit = draw(st.sampled_from(names)), draw(st.sampled_from(list(units)))
        factor = units[unit]
        scale, offset = factor if isinstance(factor, tuple) else (factor, 0.0)
        columns.append((name, unit, (TRUE[quantity] - offset) / scale))
    style = draw(st.sampled_from(STYLES))
    delimiter = draw(st.sampled_from([";", "\t", "|"]))
    header = [
        name if style == "row" else style.format(name=name, unit=unit) for name, unit, _ in columns
    ]
    lines = [delimiter.join(header)]
    if style == "row":
        lines.append(delimiter.join(unit for _, unit, _ in columns))
    rows = zip(*(values for _, _, values in columns), strict=True)
    rows = [delimiter.join(f"{value:.9f}" for value in row) for row in rows]
    if draw(st.booleans()):
        rows.reverse()
    return PLACE + "\n".join(lines + rows) + "\n"


@settings(max_examples=150, deadline=None)
@given(dresses())
def test_the_dress_changes_nothing(text):
    result = draft(text)
    u, v = u_v(TRUE["speed"], TRUE["direction"])
    expected = {
        "height": TRUE["height"],
        "altitude": TRUE["height"] + 52,
        "air_pressure": TRUE["pressure"] * 100,
        "air_temperature": TRUE["temperature"],
        "eastward_wind": u,
        "northward_wind": v,
    }
    assert result.levels.keys() == expected.keys()
    for name, values in expected.items():
        np.testing.assert_allclose(result.levels[name][0], values, rtol=1e-6, err_msg=name)


# --- what the numbers settle --------------------------------------------------------------------


@pytest.mark.parametrize(("factor", "sign"), [(1.0, "hPa"), (100.0, "Pa"), (0.1, "kPa")])
def test_the_scale_of_pressure_by_magnitude(factor, sign):
    rows = "".join(f"{p * factor},3,200\n" for p in (1003.0, 950.0, 900.0))
    result = draft("Pressure,Speed (m/s),Dir (deg)\n" + rows)
    assert result.levels["air_pressure"][0, 1] == pytest.approx(95000)
    said = why(result, "Pressure")
    assert (said.unit, said.why) == (
        sign,
        f"name in the header, unit by magnitude (largest {1003 * factor:g})",
    )


@pytest.mark.parametrize(("factor", "sign"), [(1.0, "m"), (1 / 0.3048, "ft"), (0.001, "km")])
def test_feet_or_metres_by_the_hypsometric_equation(factor, sign):
    z = np.array([10.0, 300.0, 900.0, 1500.0])
    p = 101325 * (1 - 2.25577e-5 * z) ** 5.25588  # ISO 2533, troposphere
    rows = "".join(f"{a * factor:.6f},{b:.1f},3,200\n" for a, b in zip(z, p, strict=True))
    result = draft("Height AGL,Pressure (Pa),Speed (m/s),Dir (deg)\n" + rows)
    np.testing.assert_allclose(result.levels["height"][0], z, rtol=1e-5)
    assert why(result, "Height AGL").unit == sign
    assert why(result, "Height AGL").why.endswith("unit by the hypsometric equation")


@pytest.mark.parametrize(
    ("scale", "offset", "sign"), [(1, 273.15, "degC"), (5 / 9, 255.372, "degF")]
)
def test_celsius_or_fahrenheit_by_the_thickness(scale, offset, sign):
    z = np.array([10.0, 500.0, 1500.0, 3000.0])
    t = 283.0 - 0.0065 * z
    p = 100000 * (t / t[0]) ** (9.80665 / (287.05287 * 0.0065))
    rows = "".join(
        f"{a},{b:.1f},{(c - offset) / scale:.2f},3,200\n" for a, b, c in zip(z, p, t, strict=True)
    )
    result = draft("Height AGL (m),Pressure (Pa),T,Speed (m/s),Dir (deg)\n" + rows)
    np.testing.assert_allclose(result.levels["air_temperature"][0], t, atol=0.01)
    assert why(result, "T").unit == sign


@pytest.mark.parametrize(("factor", "sign"), [(1.0, "m/s"), (3600 / 1852, "kt"), (3.6, "km/h")])
def test_knots_or_metres_per_second_by_u_and_v(factor, sign):
    rows = "".join(
        f"{z},{u},{v},{np.hypot(u, v) * factor:.2f},{np.degrees(np.arctan2(-u, -v)) % 360:.1f}\n"
        for z, u, v in ((10, 3, 4), (50, 5, 1), (100, 7, -2))
    )
    result = draft("Height AGL (m),u (m/s),v (m/s),Speed,Dir\n" + rows)
    assert why(result, "Speed").unit == sign
    assert result.levels["eastward_wind"].tolist() == [[3, 5, 7]]
    swapped = draft("Height AGL (m),u,v,Speed (" + sign + "),Dir\n" + rows)
    np.testing.assert_allclose(swapped.levels["eastward_wind"], [[3, 5, 7]], rtol=0.002)


def test_a_height_below_the_site_is_above_ground():
    result = draft(PLACE + HEAD.replace(" AGL", "") + ROWS)
    assert result.levels["height"][0, 0] == 10
    assert "begins below the site" in why(result, "Height (m)").why


def test_a_height_that_begins_at_the_site_is_an_altitude():
    rows = "52,3,200\n91,5,210\n147,7,225\n"
    result = draft(PLACE + HEAD.replace(" AGL", "") + rows)
    assert result.levels["height"].tolist() == [[0, 39, 95]]


def test_a_height_on_a_plateau_is_told_by_the_pressure():
    rows = "20,850,3,200\n300,822,5,210\n900,763,7,225\n"
    header = "Height (m),Pressure (hPa),Speed (m/s),Dir (deg)\n"
    result = draft(header + rows)
    assert "by the pressure" in why(result, "Height (m)").why
    assert result.levels["height"][0, 0] == 20
    above = "1500,850,3,200\n1780,822,5,210\n2380,763,7,225\n"
    with pytest.raises(MissingColumn, match="--elevation"):
        draft(header + above)
    assert draft(header + above, elevation=1490.0).levels["height"][0, 0] == 10


def test_v_beside_a_direction_is_a_speed():
    result = draft("Height AGL (m),v (m/s),dd\n10,3,4\n50,5,100\n100,7,200\n")
    assert why(result, "v (m/s)").read_as == "wind_speed"


# --- heights from pressure ----------------------------------------------------------------------


def test_heights_from_pressure_and_temperature():
    text = "Elevation: 55 m\nP (hPa),T (K),Speed (m/s),Dir (deg)\n"
    text += "1000,273.15,3,200\n500,273.15,5,210\n"
    result = draft(text)
    # R T / g ln 2 = 287.05287 * 273.15 / 9.80665 * 0.693147 = 5542 gpm, ISO 2533's constants;
    # as a geometric height some 5 m more.
    assert result.levels["height"][0].tolist() == pytest.approx([0, 5547], abs=3)
    assert result.levels["altitude"][0, 0] == pytest.approx(55)
    assert (result.levels["level_flag"] == BIT["height_from_hypsometric_equation"]).all()
    assert any("lowest level was taken as the surface" in r for r in result.remarks)


def test_heights_from_pressure_alone_are_of_the_standard_atmosphere():
    text = "P (hPa),Speed (m/s),Dir (deg)\n1013.25,3,200\n500,5,210\n"
    result = draft(text)
    expected = float(standard_height(50000.0))
    assert result.levels["height"][0].tolist() == pytest.approx([0, expected], rel=2e-3)
    assert (result.levels["level_flag"] == BIT["height_from_standard_atmosphere"]).all()
    assert any("standard atmosphere" in r for r in result.remarks)


def test_flight_levels_are_pressures():
    text = "FL,Speed (kt),Dir (deg)\n10,20,200\n50,30,210\n180,35,220\n"
    with pytest.raises(MissingColumn, match="--elevation"):
        draft(text)
    result = draft(text, elevation=52.0)
    # FL180 is 506.0 hPa, FL50 843.1 hPa: ICAO Doc 7488, tables, from memory.
    assert result.levels["air_pressure"][0, 1:] == pytest.approx([84307, 50600], rel=2e-4)
    assert why(result, "FL").unit == "FL"
    assert result.levels["altitude"][0] == pytest.approx([304.8, 1524.0, 5486.4], rel=2e-3)


@pytest.mark.parametrize(
    ("humidity", "values"),
    [
        ("RH (%)", (50, 60)),
        ("RH", (0.5, 0.6)),
        ("Dew point (C)", (9.26, 11.1)),
        ("Mixing ratio (g/kg)", (7.4, 8.3)),
        ("q (kg/kg)", (0.00735, 0.0082)),
        ("Dew point depression (C)", (10.74, 7.9)),
    ],
)
def test_every_humidity_becomes_a_dew_point(humidity, values):
    text = f"Height AGL (m),P (hPa),T (C),{humidity},Speed (m/s),Dir (deg)\n"
    text += f"10,990,20,{values[0]},3,200\n100,980,19,{values[1]},3,210\n"
    # 9.26 C is the dew point of 20 C at 50 %: MetPy agrees to 0.1 K.
    dew = draft(text).levels["dew_point_temperature"][0]
    assert dew == pytest.approx([273.15 + 9.26, 273.15 + 11.1], abs=0.4)


# --- missing codes and impossible values --------------------------------------------------------


def test_a_code_is_told_from_a_value_by_the_quantity():
    text = "Height AGL (m),P (hPa),T (C),RH (%),Speed (m/s),Dir (deg)\n"
    text += "10,1001.2,12.1,80,3,360\n20,999.9,99.9,99.9,0,0\n30,9999,11.2,999,99,999\n"
    text += "99999,-999,10.9,-99,-999,99.9\n50,996.4,11.0,78,5,210\n"
    levels = draft(text).levels
    assert levels["air_pressure"][0].tolist() == pytest.approx(
        [100120, 99990, np.nan, np.nan, 99640], nan_ok=True
    )
    assert np.isnan(levels["air_temperature"][0]).tolist() == [False, True, False, False, False]
    assert np.isnan(levels["dew_point_temperature"][0, 1:4]).all()
    assert np.isnan(levels["eastward_wind"][0]).tolist() == [False, False, True, True, False]
    assert levels["northward_wind"][0, :2].tolist() == [-3, 0]
    assert np.isnan(levels["height"][0]).tolist() == [False, False, False, True, False]


def test_codes_are_counted():
    result = draft(HEAD + "10,3,200\n50,-999,210\n100,-999,225\n200,9,240\n")
    assert why(result, "Speed (m/s)").why.endswith("2 values are codes for missing")


@pytest.mark.parametrize(
    ("row", "words"),
    [
        ("50,5,372", r'"Dir \(deg\)": 1 value refused.*outside 0-360 degrees \(in line 3\)'),
        ("50,-5,212", r'"Speed \(m/s\)": 1 value refused.*negative.*line 3.*no wind there'),
    ],
)
def test_an_impossible_value_is_refused_and_said(row, words):
    result = draft(HEAD + ROWS.replace("50,5,210", row))
    assert np.isnan(result.levels["eastward_wind"][0]).tolist() == [False, True, False, False]
    assert any(re.search(words, remark) for remark in result.remarks)


def test_a_humidity_of_140_is_refused():
    text = "Height AGL (m),T (C),RH (%),Speed (m/s),Dir (deg)\n10,5,80,3,200\n50,5,140,5,210\n"
    result = draft(text)
    assert np.isnan(result.levels["dew_point_temperature"][0]).tolist() == [False, True]
    assert "no humidity there" in result.remarks[0]


def test_a_cell_that_is_no_number_is_named():
    more = "300,9,240\n400,9,240\n"
    result = draft(HEAD + ROWS.replace("50,5,210", "50,ERR,210") + more)
    assert any('line 3: "ERR"' in remark for remark in result.remarks)


def test_directions_from_minus_180():
    result = draft(HEAD + "10,3,-160\n50,5,-150\n100,7,170\n")
    u, _ = u_v([3, 5, 7], [200, 210, 170])
    np.testing.assert_allclose(result.levels["eastward_wind"][0], u, atol=1e-12)


# --- nothing is dropped in silence --------------------------------------------------------------


def test_unused_columns_are_listed():
    text = "Height AGL (m),Speed (m/s),Gust max (m/s),Dir (deg),Battery (V)\n"
    result = draft(text + "10,3,5,200,12\n50,5,7,210,12\n")
    assert [c.column for c in result.columns if c.read_as is None] == [
        "Gust max (m/s)",
        "Battery (V)",
    ]
    assert all(c.why for c in result.columns)


def test_empty_rows_are_counted():
    result = draft(HEAD + "10,3,200\n///,///,///\n50,5,210\n100,7,220\n")
    assert result.shape == (1, 3)
    assert "1 row holds no values" in result.remarks


# --- long tables --------------------------------------------------------------------------------

SECOND = "10,4,300\n50,6,310\n100,8,325\n200,10,340\n"


@pytest.mark.parametrize(
    "text",
    [
        "Launch," + HEAD + before(ROWS, "1") + before(SECOND, "2"),
        "Time," + HEAD + before(ROWS, "2031-05-14T00:00Z") + before(SECOND, "2031-05-14T06:00Z"),
        "Station," + HEAD + before(ROWS, "A") + before(SECOND, "B"),
        HEAD + ROWS + SECOND,
        # Levels of both profiles side by side.
        "Launch,"
        + HEAD
        + "".join(f"1,{a}\n2,{b}\n" for a, b in zip(ROWS.split(), SECOND.split(), strict=True)),
        # Top down: turned round.
        "Launch,"
        + HEAD
        + before("\n".join(ROWS.split()[::-1]), "1")
        + before("\n".join(SECOND.split()[::-1]), "2"),
    ],
)
def test_many_profiles_are_told_apart(text):
    result = draft(text)
    assert result.shape == (2, 4)
    assert result.levels["height"].tolist() == [[10, 50, 100, 200]] * 2
    u = [u_v([3, 5, 7, 9], [200, 210, 225, 240])[0], u_v([4, 6, 8, 10], [300, 310, 325, 340])[0]]
    np.testing.assert_allclose(result.levels["eastward_wind"], u, atol=1e-12)


def test_profiles_of_different_length_are_padded():
    result = draft("Launch," + HEAD + before(ROWS, "1") + before("20,4,300\n70,6,310", "2"))
    assert np.isnan(result.levels["height"][1]).tolist() == [False, False, True, True]


def test_a_time_at_each_level_is_one_profile():
    stamped = "".join(f"2031-05-14T23:15:{i:02d}Z,{row}\n" for i, row in enumerate(ROWS.split()))
    result = draft("Time," + HEAD + stamped)
    assert result.shape == (1, 4)
    assert result.profile["time"] == np.datetime64("2031-05-14T23:15")


def test_a_single_bad_height_begins_no_profile():
    z = [*range(10, 400, 10)]
    z[20] = 0
    result = draft(HEAD + "".join(f"{height},5,200\n" for height in z))
    assert result.shape[0] == 1


def test_the_first_position_is_the_site():
    rows = "".join(f"{58.4 + i / 100},-3.1,{row}\n" for i, row in enumerate(ROWS.split()))
    result = draft("lat,lon," + HEAD + rows)
    assert (result.profile["latitude"][0], result.profile["longitude"][0]) == (58.4, -3.1)
    assert draft("Latitude: 10 N\nlat,lon," + HEAD + rows).profile["latitude"] == 10


def test_times_without_zone_are_utc_and_said():
    result = draft("Time," + HEAD + before(ROWS, "2031-05-14T00:00"))
    assert result.remarks == ["the times name no zone and were taken as UTC"]
    assert draft("Time UTC," + HEAD + before(ROWS, "2031-05-14T00:00")).remarks == []


def test_offsets_are_honoured_and_local_time_is_not_guessed():
    rows = before(ROWS, "2031-05-14T02:00+02:00")
    assert draft("Time," + HEAD + rows).profile["time"] == np.datetime64("2031-05-14T00:00")
    local = "Local time," + HEAD + before(ROWS, "2031-05-14T02:00")
    assert np.isnat(draft(local).profile["time"]).all()
    told = draft(local, units={"Local time": "UTC+2"})
    assert told.profile["time"] == np.datetime64("2031-05-14T00:00")


def test_separate_date_and_time_and_epoch():
    header = "Datum;Uhrzeit;" + HEAD.replace(",", ";")
    rows = "".join(f"14.05.2031;23:15;{row}\n".replace(",", ";") for row in ROWS.split())
    assert draft(header + rows).profile["time"] == np.datetime64("2031-05-14T23:15")
    epoch = int(np.datetime64("2031-05-14T23:15:00").astype("int64"))
    result = draft("Time," + HEAD + before(ROWS, str(epoch)))
    assert result.profile["time"] == np.datetime64("2031-05-14T23:15")


# --- wide tables --------------------------------------------------------------------------------

WIDE = [
    "ws_40 (m/s),wd_40 (deg),ws_80 (m/s),wd_80 (deg)",
    "40m Wind Speed (m/s),40m Wind Direction (deg),80m Wind Speed (m/s),80m Wind Direction (deg)",
    "WS40m [m/s],WD40m [deg],WS80m [m/s],WD80m [deg]",
    "Vh_40m_ms,Dir_40m_deg,Vh_80m_ms,Dir_80m_deg",
    "Wind speed at 40 m (m/s),Wind direction at 40 m (deg),Wind speed at 80 m (m/s),"
    "Wind direction at 80 m (deg)",
    "Windgeschwindigkeit 40m [m/s],Windrichtung 40m [°],Windgeschwindigkeit 80m [m/s],"
    "Windrichtung 80m [°]",
]


@pytest.mark.parametrize("header", WIDE)
def test_wide_tables(header):
    rows = "2031-05-14 00:00,6,200,8,210\n2031-05-14 00:10,7,205,9,999\n"
    result = draft(f"Time UTC,{header}\n{rows}")
    assert result.levels["height"].tolist() == [[40, 80]] * 2
    u, _ = u_v([[6, 8], [7, np.nan]], [[200, 210], [205, 0]])
    np.testing.assert_allclose(result.levels["eastward_wind"], u, atol=1e-12)
    assert result.profile["time"].astype("datetime64[m]").astype(str).tolist() == [
        "2031-05-14T00:00",
        "2031-05-14T00:10",
    ]


def test_a_wide_table_in_feet_out_of_order():
    header = "Time UTC,ws_260ft (kt),wd_260ft (deg),ws_130ft (kt),wd_130ft (deg)\n"
    result = draft(header + "2031-05-14 00:00,10,200,5,180\n")
    assert result.levels["height"][0] == pytest.approx([130 * 0.3048, 260 * 0.3048])
    assert result.levels["northward_wind"][0, 0] == pytest.approx(5 * 1852 / 3600)


def test_availability_signal_and_spread_of_a_wide_table():
    names = "ws,wd,avail,cnr,sigma"
    header = ",".join(f"{name}_{z}" for z in (40, 80) for name in names.split(","))
    units = ",".join(["m/s,deg,%,dB,m/s"] * 2)
    text = f"Time UTC,{header}\n,{units}\n2031-05-14 00:00,6,200,98,-12.5,0.4,8,210,40,-25,0.5\n"
    text += "2031-05-14 00:10,6,200,98,-12.5,0.4,8,210,40,-25,0.5\n"
    levels = draft(text).levels
    assert levels["availability"][0].tolist() == pytest.approx([0.98, 0.40])
    assert levels["carrier_to_noise_ratio"][0].tolist() == [-12.5, -25]
    assert levels["wind_speed_deviation"][0].tolist() == [0.4, 0.5]


def test_heights_without_a_unit_in_names_are_metres_and_said():
    text = "Time UTC,ws_40 (m/s),wd_40 (deg),ws_80 (m/s),wd_80 (deg)\n2031-05-14 00:00,6,200,8,9\n"
    assert "taken as heights above ground in m" in draft(text).remarks[0]
    assert draft("Heights above ground in ft: all\n" + text).levels["height"][0, 0] == 40 * 0.3048
    assert draft(text, units={"height": "ft"}).levels["height"][0, 0] == 40 * 0.3048


def test_a_bare_wide_speed_is_an_error_too():
    text = "Time UTC,ws_40,wd_40,ws_80,wd_80\n2031-05-14 00:00,6,200,8,210\n"
    with pytest.raises(UnknownUnit, match='"ws_40"'):
        draft(text)
    assert draft(text, units={"wind_speed": "kt"}).shape == (1, 2)
