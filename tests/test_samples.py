"""The sample soundings are what their script makes, small, and nothing else."""

from __future__ import annotations

import gzip
import subprocess
import sys
from pathlib import Path

import pytest

FOLDER = Path(__file__).parents[1] / "sample_soundings"
FILES = sorted(
    path.name for path in FOLDER.iterdir() if path.suffix in {".csv", ".tsv", ".txt", ".gz"}
)


@pytest.fixture(scope="module")
def made_again(tmp_path_factory):
    folder = tmp_path_factory.mktemp("samples")
    subprocess.run(
        [sys.executable, FOLDER / "make_samples.py", folder], check=True, capture_output=True
    )
    return folder


def test_the_script_makes_every_sample(made_again):
    assert sorted(path.name for path in made_again.iterdir()) == FILES
    assert len(FILES) >= 6


@pytest.mark.parametrize("name", FILES)
def test_the_script_makes_the_same_bytes(made_again, name):
    committed, again = (FOLDER / name).read_bytes(), (made_again / name).read_bytes()
    if name.endswith(".gz"):  # compressors differ between machines, what they hold does not
        committed, again = gzip.decompress(committed), gzip.decompress(again)
    assert committed == again


def test_every_sample_is_told_in_the_readme():
    text = (FOLDER / "README.md").read_text()
    assert [name for name in FILES if f"`{name}`" not in text] == []


def test_samples_stay_small():
    assert sum((FOLDER / name).stat().st_size for name in FILES) < 1_500_000
