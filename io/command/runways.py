"""What ``--runway`` means: a true heading, or a designator with the magnetic variation."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import NamedTuple

import click

_OPTION = "--runway"
_SIDES = {"L": "R", "R": "L", "C": "C", "": ""}


class Runway(NamedTuple):
    """One end of a runway: its name, and the true heading of an aircraft that lands on it."""

    name: str
    heading: float


def runways(texts: Sequence[str], variation: float | None) -> tuple[Runway, ...]:
    """
    Understand what was given, and add the other end of each runway.

    Parameters
    ----------
    texts
        True headings in three digits, or designators where ``variation`` is given.
    variation
        Magnetic variation, east positive. [degree]

    Raises
    ------
    click.BadParameter
        For what could be either, or neither: a heading that is wrong by the variation, or by a
        factor of ten, can hurt.

    Examples
    --------
    >>> runways(["268"], None)
    (Runway(name='268', heading=268.0), Runway(name='088', heading=88.0))
    >>> runways(["09L"], -3.0)
    (Runway(name='09L', heading=87.0), Runway(name='27R', heading=267.0))
    """
    if variation is not None and not texts:
        raise click.UsageError("--magnetic-variation is of no use without --runway")
    ends: dict[str, Runway] = {}
    for text in texts:
        word = text.strip().upper()
        both = _of_heading(word) if variation is None else _of_designator(word, variation)
        ends |= {end.name: end for end in both if end.name not in ends}
    return tuple(ends.values())


def _of_heading(word: str) -> tuple[Runway, Runway]:
    if re.fullmatch(r"\d{3}", word) and 1 <= int(word) <= 360:
        heading = int(word)
        other = (heading + 180) % 360 or 360
        return Runway(word, float(heading)), Runway(f"{other:03d}", float(other))
    if re.fullmatch(r"\d{1,2}[LRC]?", word):
        raise click.BadParameter(
            f"{word!r} may be a designator, which is magnetic, or part of a heading. Give the true "
            "heading in three digits, such as 268, or add --magnetic-variation",
            param_hint=_OPTION,
        )
    raise click.BadParameter(
        f"{word!r} is no true heading. Give three digits from 001 to 360", param_hint=_OPTION
    )


def _of_designator(word: str, variation: float) -> tuple[Runway, Runway]:
    match = re.fullmatch(r"(\d{1,2})([LRC]?)", word)
    if match and 1 <= int(match[1]) <= 36:
        number, side = int(match[1]), match[2]
        other = (number + 18) % 36 or 36
        return (
            Runway(f"{number:02d}{side}", _true(number, variation)),
            Runway(f"{other:02d}{_SIDES[side]}", _true(other, variation)),
        )
    if re.fullmatch(r"\d{3}", word):
        raise click.BadParameter(
            f"{word!r} is a heading, and with --magnetic-variation a designator such as 27 or 09L "
            "is meant. Give that, or give the true heading without the variation",
            param_hint=_OPTION,
        )
    raise click.BadParameter(
        f"{word!r} is no designator. Give a number from 01 to 36, with L, R or C if it has one",
        param_hint=_OPTION,
    )


def _true(number: int, variation: float) -> float:
    return (10.0 * number + variation) % 360.0 or 360.0


def height(text: str, option: str, least: float, most: float) -> float:
    """
    Understand a height with its unit, ``2000ft`` or ``600 m``, as metres.

    Raises
    ------
    click.BadParameter
        Without a unit, which is never guessed, or outside the limits.

    Examples
    --------
    >>> height("2000ft", "--top", 30.0, 3000.0)
    609.6
    """
    match = re.fullmatch(r"\s*(\d+(?:\.\d+)?)\s*(ft|m)\s*", text)
    if match is None:
        raise click.BadParameter(
            f"{text!r} is no height with its unit. Write it as 2000ft or 600m", param_hint=option
        )
    value = float(match[1]) * (0.3048 if match[2] == "ft" else 1.0)
    if not least * (1 - 1e-9) <= value <= most * (1 + 1e-9):
        raise click.BadParameter(
            f"{text!r} is outside {least:.0f} m to {most:.0f} m "
            f"({least / 0.3048:.0f} to {most / 0.3048:.0f} ft)",
            param_hint=option,
        )
    return value
