"""What ``--sources`` cites is what the docstrings of the science cite."""

from __future__ import annotations

import importlib
import inspect
import re
import unicodedata

import pytest

from backveer.io.words.sources import SOURCES, Source, sources_text


@pytest.mark.parametrize("source", SOURCES, ids=lambda source: source.number)
def test_every_publication_is_in_the_modules_that_it_is_cited_for(source: Source):
    text = " ".join(
        inspect.getsource(importlib.import_module(f"backveer.profiles.{module}"))
        for module in source.modules
    )
    plain = unicodedata.normalize("NFKD", text)
    for publication in source.publications:
        if publication.startswith("common practice"):
            continue
        author = re.match(r"[\w.\-]+( Meteorological Society)?", publication)
        assert author is not None
        assert author[0].rstrip(",:") in plain, publication
        year = re.search(r", (\d{4}):", publication)
        if year:
            assert year[1] in plain, publication
        pages = re.search(r"\d+-\d+(?=\s*\(|$)", publication)
        if pages and "WMO" not in publication:
            assert pages[0] in plain, publication


def test_every_number_has_a_method_an_equation_and_a_publication():
    text = sources_text()
    for source in SOURCES:
        assert source.method
        assert source.equation
        assert source.publications
    assert text.count("method: ") == len(SOURCES)
    assert max(len(line) for line in text.splitlines()) <= 80


@pytest.mark.parametrize(
    ("number", "module", "constant", "written"),
    [
        ("f and", "earth", "OMEGA", "7.292115e-5"),
        ("temperature gradient", "air", "GAS_CONSTANT", "287.05"),
        ("geostrophic wind of", "geostrophic", "FREE_AIR_DEPTH", "1500 m"),
        ("Ekman", "ekman", "TOP", "3 km"),
        ("wind maximum", "low_level_jet", "LEAST_RATIO", "1.25"),
        ("wind maximum", "low_level_jet", "HIGHEST_NOSE", "1500 m"),
        ("standard error", "wind_error", "FLOOR", "0.1 and 3"),
        ("inversions", "inversions", "THINNEST_GAP", "100 m"),
    ],
)
def test_numbers_in_the_words_are_those_of_the_code(number, module, constant, written):
    source = next(source for source in SOURCES if source.number.startswith(number))
    assert written in f"{source.method} {source.equation}"
    value = getattr(importlib.import_module(f"backveer.profiles.{module}"), constant)
    first = float(re.match(r"[\d.]+(e-?\d+)?", written)[0])  # type: ignore[index]
    assert value == pytest.approx(first * (1000.0 if "km" in written else 1.0), rel=1e-4)
