"""The report page: the statement's own JSON, escaped, self-contained, small."""

from __future__ import annotations

import base64
import hashlib
import json
import re

import numpy as np
import pytest

from backveer.io.atomic import WriteError
from backveer.io.readers.errors import UnknownUnit
from backveer.io.readers.reading import ColumnReading, FileReading, Reading
from backveer.io.report.page import page, write_report
from backveer.io.words.record import profile_records
from backveer.profiles import quality
from backveer.profiles.stack import Stack
from backveer.profiles.statement import statement

HOSTILE = "</script><script>alert(1)</script>\u2028<!--"


@pytest.fixture(scope="module")
def parts():
    z = np.linspace(10, 3000, 300)
    w = 12 * (1 - np.exp(-(1 + 1j) * z / 220)) + 0.2 * np.sin(z / 37)
    stack = quality.check(
        Stack.of(
            height=z,
            eastward_wind=[w.real],
            northward_wind=[w.imag],
            latitude=[58.41],
            station=[HOSTILE],
        )
    )
    column = ColumnReading(HOSTILE, "wind_speed", "m/s", HOSTILE)
    file = FileReading(HOSTILE, stack, (column,), (HOSTILE,), digest="ab" * 32)
    reading = Reading((file,), (UnknownUnit(HOSTILE, "Say which", source="b.csv"),))
    return reading, statement(stack)


def data_of(text):
    found = re.findall(r'<script type="application/json" id="data">(.*?)</script>', text, re.S)
    assert len(found) == 1
    return json.loads(found[0])


def test_it_carries_the_very_json(parts):
    reading, said = parts
    data = data_of(page(reading, said))
    assert data["profiles"] == json.loads(json.dumps(list(profile_records(reading, said))))
    assert data["inputs"] == [{"source": HOSTILE, "sha256": "ab" * 32}]
    assert data["failures"][0]["problem"] == HOSTILE
    assert data["flags"]["1"] == "wind_missing"
    assert any("do not replace official" in text for text in data["cautions"])


def test_nothing_from_a_file_is_markup(parts):
    text = page(*parts)
    assert HOSTILE not in text
    assert "<script>alert" not in text
    assert text.count("</script>") == 4


def test_nothing_is_fetched_and_the_policy_names_what_runs(parts):
    text = page(*parts)
    assert not re.search(r"""(?:src|href)=["'](?!#)""", text)
    policy = re.search(r'Content-Security-Policy" content="([^"]*)"', text)[1]
    assert policy.startswith("default-src 'none'")
    for script in re.findall(r"<script>(.*?)</script>", text, re.S):
        digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
        assert f"'sha256-{digest}'" in policy


def test_it_is_small_and_speaks_without_scripts(parts):
    text = page(*parts)
    assert len(text.encode()) < 1_000_000
    printed = re.search(r"<pre>(.*?)</pre>", text, re.S)[1]
    assert "Turning and strengthening with height" in printed
    assert "Caution" in printed


def test_it_is_written_whole_or_not_at_all(parts, tmp_path):
    path = tmp_path / "report.html"
    write_report(str(path), *parts)
    assert path.read_text(encoding="utf-8").startswith("<!doctype html>")
    with pytest.raises(WriteError, match="does not exist"):
        write_report(str(tmp_path / "none" / "report.html"), *parts)
    assert [entry.name for entry in tmp_path.iterdir()] == ["report.html"]
