"""Criteria from TOML: the shipped ones, what a file adds, and what is refused."""

from __future__ import annotations

import pytest

from backveer.io.readers.errors import ReadError
from backveer.io.readers.shear_rules import read_rules
from backveer.profiles.low_level_shear import KNOT, KNOT_PER_100_FEET

GOOD = """
[[rule]]
name = "aerodrome"
authority = "the aerodrome"
metric = "vector_difference"
threshold = "25 kt"
top = "1500 ft"
"""


def test_shipped_rules_are_si_and_say_where_they_come_from():
    rules = {rule.name: rule for rule in read_rules()}
    assert len(rules) == 5
    assert all(rule.source and rule.verified and rule.wording for rule in rules.values())
    # South African CAR 174.04.10, seen: 15 kt or more, runway level to 500 m (1600 ft).
    alert = rules["15 kt or more along the path"]
    assert (alert.threshold, alert.unit) == (pytest.approx(15 * KNOT), "kt")
    assert alert.top == pytest.approx(487.68)
    assert rules["10 kt per 100 ft over more than 200 ft"].threshold == pytest.approx(
        10 * KNOT_PER_100_FEET
    )


def test_each_shipped_threshold_is_that_of_its_source():
    kt, ft = KNOT, 0.3048
    told = {
        rule.name: (rule.metric, rule.threshold, rule.top / ft, rule.depth / ft, rule.strict)
        for rule in read_rules()
    }
    assert told == {
        # Checks V3 and V4, seen in national law: 15 kt (7.5 m/s), runway level to 1600 ft.
        "15 kt or more along the path": ("headwind_change", 15 * kt, pytest.approx(1600), 0, False),
        # V8, seen in a training text of the authority: 20 kt within 2000 ft.
        "gain or loss of 20 kt": ("headwind_change", 20 * kt, pytest.approx(2000), 0, False),
        # V9, second hand: 10 kt per 100 ft in a layer more than 200 ft thick.
        "10 kt per 100 ft over more than 200 ft": (
            "shear",
            pytest.approx(10 * KNOT_PER_100_FEET),
            pytest.approx(2000),
            pytest.approx(200),
            False,
        ),
        # V10, second hand: above 15 kt.
        "severe, more than 15 kt": ("headwind_change", 15 * kt, pytest.approx(2000), 0, True),
        # V2b, from memory: above 12 kt per 100 ft.
        "severe, more than 12 kt per 100 ft": (
            "shear",
            pytest.approx(12 * KNOT_PER_100_FEET),
            pytest.approx(2000),
            pytest.approx(100),
            True,
        ),
    }


def test_a_file_adds_replaces_or_stands_alone(tmp_path):
    path = tmp_path / "rules.toml"
    path.write_text(GOOD)
    assert [rule.name for rule in read_rules(str(path))][-1] == "aerodrome"
    assert len(read_rules(str(path))) == 6
    path.write_text("only = true\n" + GOOD)
    assert [rule.name for rule in read_rules(str(path))] == ["aerodrome"]
    path.write_text(GOOD.replace("aerodrome", "gain or loss of 20 kt", 1))
    assert len(read_rules(str(path))) == 5


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        ('metric = "vector_difference"', 'metric = "gust"', "metric 'gust' is not known"),
        ('"25 kt"', '"25"', "threshold = '25' is not in kt or m/s"),
        ('"25 kt"', '"25 kt/100 ft"', "is not in kt or m/s"),
        ('"1500 ft"', '"1500"', "top = '1500' is not in ft or m"),
        ('"25 kt"', '"0 kt"', "must be greater than zero"),
        ('authority = "the aerodrome"', "", "authority is missing"),
        ("[[rule]]", "[rules]", "only \\[\\[rule\\]\\] tables"),
        ("[[rule]]", "[[rule]]\nheight = 3", "height is not understood"),
        ("[[rule]]", "[[rule", "not TOML"),
        ('top = "1500 ft"', 'top = "1500 ft"\nstrict = 1', "strict is neither"),
    ],
)
def test_refusals_name_the_rule_and_the_remedy(tmp_path, old, new, words):
    path = tmp_path / "rules.toml"
    path.write_text(GOOD.replace(old, new))
    with pytest.raises(ReadError, match=words):
        read_rules(str(path))


def test_no_such_file(tmp_path):
    with pytest.raises(ReadError, match="No such file"):
        read_rules(str(tmp_path / "none.toml"))
