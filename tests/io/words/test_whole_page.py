"""Whole pages of one invented statement whose every number is set here, in both units."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from backveer.io.readers.reading import ColumnReading, FileReading, Reading
from backveer.io.words.text import statement_text
from backveer.profiles.boundary_layer import BoundaryLayer
from backveer.profiles.earth import Coriolis
from backveer.profiles.ekman import EkmanFit
from backveer.profiles.geostrophic import Geostrophic
from backveer.profiles.stack import Stack
from backveer.profiles.statement import Settings, Statement
from backveer.profiles.thermal_wind import ThermalWind
from backveer.profiles.turning import Turning

SIZES = {"level": 3, "layer": 2, "inversion": 2, "evidence": 3, "candidate": 1}


def answer(kind: Any, **known: Any) -> Any:
    """One profile's answer in which only what is given here is determined."""
    filled: dict[str, Any] = {}
    for field in dataclasses.fields(kind):
        label = field.metadata.get("variable")
        if label is None:
            if field.name in known:
                filled[field.name] = known[field.name]
            continue
        shape = (1, *(SIZES[name] for name in label.dims[1:]))
        words = field.type == "Words"
        value = known.get(field.name, "" if words else False if field.type == "Bools" else np.nan)
        filled[field.name] = np.broadcast_to(
            np.asarray(value, dtype=object if words else None), shape
        )
    return kind(**filled)


def invented(**changes: Any) -> Statement:
    parts: dict[str, Any] = {
        "stack": Stack.of(
            height=[[10.0, 100.0, 600.0]],
            eastward_wind=[[3.0, 6.0, 12.0]],
            northward_wind=[[4.0, 8.0, 5.0]],
            latitude=58.41,
            longitude=-3.05,
            elevation=52.0,
            station=np.array(["Harrow Skerry"], dtype=object),
            time=np.array(["2031-05-14T11:15"], dtype="M8[ns]"),
        ),
        "wind_error": np.array([0.3]),
        "coriolis": answer(
            Coriolis, coriolis_parameter=1.242e-4, inertial_period=50590.0, applies=True
        ),
        "turning": answer(
            Turning, total=30.52, error=2.1, sense="veering", base=10.0, top=600.0,
            layer_base=[10.0, 100.0], layer_top=[100.0, 600.0], layer_turning=[0.4, 30.12],
            layer_error=[2.0, 1.6], layer_rate=[0.44, 6.02], layer_sense=["steady", "veering"],
            layer_speed_change=[5.0, 3.0],
        ),
        "ekman": answer(
            EkmanFit, model="partial slip", scale_height=301.0, scale_height_error=22.0,
            eddy_viscosity=5.63, eddy_viscosity_error=0.82, geostrophic_eastward_wind=12.0,
            geostrophic_eastward_wind_error=0.4, geostrophic_northward_wind=5.0,
            geostrophic_northward_wind_error=0.4, cross_isobar_angle=24.0,
            cross_isobar_angle_error=3.0, rms=0.42, top=600.0, verdict="weakly determined",
            why="the profile ends at 2.0 scale heights",
        ),
        "geostrophic": answer(
            Geostrophic, evidence_from=["", "fit", "free air"],
            evidence_eastward=[np.nan, 12.0, np.nan], evidence_northward=[np.nan, 5.0, np.nan],
            evidence_error=[np.nan, 0.4, np.nan], chosen="fit",
            evidence_why=["", "", "the profile has no wind above the boundary layer"],
            departure_along=[-7.0, -3.0, 0.04], departure_across=[2.0, 4.0, -0.02],
            departure_error=0.5, friction_velocity_why="the depth is not known",
        ),
        "thermal_wind": answer(
            ThermalWind, layer_base_pressure=[100000.0, 97000.0],
            layer_top_pressure=[97000.0, 93100.0], layer_base_height=[10.0, 260.0],
            layer_top_height=[260.0, 600.0], layer_advection=[np.nan, 1.5e-4],
            layer_error=[np.nan, 3.1e-5], layer_temperature_gradient_eastward=[np.nan, 3e-5],
            layer_temperature_gradient_northward=[np.nan, -4e-5], layer_sense=["", "warm"],
            layer_why=["the levels around this layer are too far apart", ""],
        ),
        "boundary_layer": answer(
            BoundaryLayer, depth_why="there is no temperature", inversion_base=[10.0, np.nan],
            inversion_top=[150.0, np.nan], inversion_strength=[1.23, np.nan],
            inversion_kind=["surface-based", ""], jet_height=600.0, jet_speed=13.0,
            jet_why="the wind is strongest at the highest level searched",
        ),
        "settings": Settings(),
    }  # fmt: skip
    return Statement(**(parts | changes))


COLUMNS = (
    ColumnReading("Höhe", "height", "m", "by its name"),
    ColumnReading("ff", "wind_speed", "kt", "unit in the units row"),
    ColumnReading("dd", "wind_from_direction", "deg", "by its name"),
    ColumnReading("battery", None, None, "no such quantity is known"),
)

PAGE = """\
Harrow Skerry, 2031-05-14 11:15 UTC
58.41 N, 3.05 W, 52 m above sea level
f = +1.242e-04 s-1, inertial period 14.1 h
3 levels with wind, 10 to 600 m above ground
standard error of a wind component 0.3 m/s
Read from skerry.csv: height in m; wind speed in kt; wind direction in deg; 1
column not used

From 10 to 600 m the wind veers by 31 ± 2 deg; its speed is 5.0 m/s at the
lowest level and 13.0 m/s at the highest. Friction turns the surface stress 24 ±
3 deg toward low pressure (weakly determined). The thermal wind shows warm
advection from 260 to 600 m.

Turning and strengthening with height (veering, clockwise, is positive)
  from   to      turning       rate  stronger       rate
     m    m          deg  deg/100 m       m/s  m/s/100 m
    10  100       +0 ± 2       +0.4      +5.0       +5.6  steady
   100  600  +30.1 ± 1.6       +6.0      +3.0       +0.6  veering

Friction: Ekman spiral of constant viscosity
  weakly determined: the profile ends at 2.0 scale heights
  model               partial slip
  scale height        301 ± 22 m
  eddy viscosity      5.6 ± 0.8 m2/s
  geostrophic wind    13.0 ± 0.4 m/s from 247.4 ± 1.8 deg, at the ground
  cross-isobar angle  24 ± 3 deg, surface stress toward low pressure
  misfit (rms)        0.42 m/s, up to 600 m

Distance from geostrophic balance
  geostrophic wind
  fit               13.0 ± 0.4 m/s  from 247.4 ± 1.8 deg  (used below)
  free air          not determined                        the profile has no
                                                          wind above the
                                                          boundary layer

  height  along  across
       m    m/s     m/s
      10   -7.0    +2.0
     100   -3.0    +4.0
     600   +0.0    +0.0
  wind minus geostrophic wind; across: toward low pressure is positive
  standard error of either, near the ground: 0.5 m/s
  friction velocity not determined, because the depth is not known

Temperature advection from the thermal wind (warming is positive)
     layer  above ground       advection  gradient
       hPa             m             K/h  K/100 km
  1000-970        10-260  not determined            the levels around this layer
                                                    are too far apart
   970-931       260-600    +0.54 ± 0.11       5.0  warm

Boundary layer
  depth         not determined, because there is no temperature
  inversion     surface-based, 10 to 150 m, 1.2 K warmer on top
  wind maximum  13.0 m/s at 600 m, falloff not determined, because the wind is
                strongest at the highest level searched: no low-level jet

Remarks
  - "battery" was not used

Caution: These are computations from one profile. They support and do not
replace official aviation warnings, licensed practice and local codes."""


def test_the_whole_page():
    said = invented()
    file = FileReading("skerry.csv", said.stack, COLUMNS, ('"battery" was not used',))
    assert statement_text(said, 0, reading=Reading((file,), ())) == PAGE


AVIATION = """\
3 levels with wind, 33 to 1969 ft above ground
standard error of a wind component 0.6 kt

From 33 to 1969 ft the wind veers by 31 ± 2 deg; its speed is 9.7 kt at the
lowest level and 25.3 kt at the highest. Friction turns the surface stress 24 ±
3 deg toward low pressure (weakly determined). The thermal wind shows warm
advection from 853 to 1969 ft.

Turning and strengthening with height (veering, clockwise, is positive)
  from    to      turning         rate  stronger       rate
    ft    ft          deg  deg/1000 ft        kt  kt/100 ft
    33   328       +0 ± 2         +1.3      +9.7       +3.3  steady
   328  1969  +30.1 ± 1.6        +18.3      +5.8       +0.4  veering
"""


def test_the_first_half_of_the_page_in_aviation_units():
    text = statement_text(invented(), 0, units="aviation")
    assert text.split("inertial period 14.1 h\n")[1].startswith(AVIATION)


def test_within_the_equators_belt_each_subject_declines_once():
    why = "the site lies within 5 degrees of the equator"
    text = statement_text(
        invented(
            coriolis=answer(Coriolis, coriolis_parameter=1e-5, applies=False, why=why),
            ekman=answer(EkmanFit, verdict="not determined", why=why),
            geostrophic=answer(Geostrophic, departure_why=why, friction_velocity_why=why),
        ),
        0,
    )
    for title in ("Friction: Ekman spiral of constant viscosity", "Distance from geostrophic"):
        assert f"{text.split(title)[1]}".split("\n\n")[0].endswith(f"not determined, because {why}")
    assert "+30.1 ± 1.6" in text
