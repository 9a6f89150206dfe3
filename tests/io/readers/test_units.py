"""Spellings of units and their SI values."""

from __future__ import annotations

import pytest

from backveer.io.readers.units import FOOT, KNOT, kinds_of, parse, reference_of


@pytest.mark.parametrize(
    ("texts", "kind", "sign", "si_of_one"),
    [
        ("m/s;m s-1;ms-1;m s^-1;m.s-1;m s**-1;m·s⁻¹;ms;[m/s];in m/s;M/S", "speed", "m/s", 1.0),
        # A knot is 1852 m an hour: ISO 80000-3:2019, annex B.
        ("kt;kts;kn;knots;Knoten;nœuds;nudos;(KT);in knots", "speed", "kt", 1852 / 3600),
        ("km/h;kmh;kph;km h-1", "speed", "km/h", 1 / 3.6),
        ("mph;mi/h", "speed", "mph", 0.44704),  # exact: NIST SP 811, 2008, appendix B
        ("ft/s;fps", "speed", "ft/s", 0.3048),
        ("hPa;mb;mbar;MB;millibars", "pressure", "hPa", 100.0),
        ("Pa", "pressure", "Pa", 1.0),
        ("kPa", "pressure", "kPa", 1000.0),
        ("inHg;in Hg", "pressure", "inHg", 3386.389),  # NIST SP 811, 2008, appendix B
        ("C;degC;°C;deg C;º C;celsius", "temperature", "degC", 274.15),
        ("K;kelvin", "temperature", "K", 1.0),
        ("F;degF;°F", "temperature", "degF", 255.927778),  # 1 F is -17.2222 C
        ("m;metres;m AGL;m MSL;Meter", "length", "m", 1.0),
        ("gpm", "length", "gpm", 1.0),
        ("km", "length", "km", 1000.0),
        ("ft;feet;ft AGL;pieds", "length", "ft", 0.3048),
        ("hft", "length", "hft", 30.48),
        ("deg;°;degrees;degrees true;degT;Grad;grados", "angle", "deg", 1.0),
        ("rad", "angle", "rad", 57.29577951),
        ("%;percent", "fraction", "%", 0.01),
        ("g/kg;g kg-1", "mass ratio", "g/kg", 1e-3),
        ("kg/kg", "mass ratio", "kg/kg", 1.0),
        ("dB", "decibel", "dB", 1.0),
    ],
)
def test_spellings(texts, kind, sign, si_of_one):
    for text in texts.split(";"):
        unit = parse(text, kind)
        assert unit is not None, text
        assert unit.sign == sign, text
        assert unit.factor + unit.offset == pytest.approx(si_of_one, rel=1e-8), text


def test_the_exact_units():
    assert (FOOT, KNOT) == (0.3048, 1852 / 3600)


@pytest.mark.parametrize("text", ["furlong", "", "speed", "m/s/s", "10 min"])
def test_what_is_no_unit(text):
    assert kinds_of(text) == frozenset()


def test_a_unit_of_another_kind_is_none():
    assert parse("hPa", "speed") is None
    assert parse("C", "length", "angle") is None


@pytest.mark.parametrize(
    ("text", "reference"),
    [
        ("m AGL", "ground"),
        ("ft_agl", "ground"),
        ("m ASL", "sea"),
        ("m AMSL", "sea"),
        ("m ü NN", "sea"),
        ("gpm", "geopotential"),
        ("m", None),
    ],
)
def test_what_a_height_is_counted_from(text, reference):
    assert reference_of(text) == reference
