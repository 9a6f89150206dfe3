"""The printed answer of what a turbine meets: in one profile, and in many."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence

import numpy as np

from backveer.io.words.cautions import TURBINE
from backveer.io.words.findings import level_findings
from backveer.io.words.page import (
    bullet,
    name_of,
    pairs_of,
    place_of,
    section,
    table,
    time_of,
    wrapped,
)
from backveer.io.words.safe import safe
from backveer.io.words.units import NAMED, Unit, Units, plainly, with_error
from backveer.profiles.classes import complete_record, usual_interval
from backveer.profiles.expected_veer import (
    NORMAL_EXPONENT_OFFSHORE,
    NORMAL_EXPONENT_ONSHORE,
    ExpectedVeer,
)
from backveer.profiles.labels import Floats
from backveer.profiles.rotor import Rotor
from backveer.profiles.stack import Stack

DEGREE = Unit("deg", 1.0)
NUMBER = Unit("", 1.0)
DENSITY = Unit("kg/m3", 1.0)


def rotor_text(
    stack: Stack,
    told: Rotor,
    expected: ExpectedVeer | None,
    row: int,
    *,
    remarks: Sequence[str] = (),
    units: str = "si",
) -> str:
    """
    Write what each turbine meets in one profile.

    Parameters
    ----------
    stack, told, expected
        Profiles and answers, in the same order.
    row
        Which profile, from 0.
    remarks
        How it was read; what its levels show follows.
    units
        ``"si"`` or ``"aviation"``.
    """
    shown = NAMED[units]
    when = "" if np.isnat(stack.time[row]) else f", {time_of(stack.time[row])}"
    blocks = [f"{name_of(stack, row)}{when}\n{place_of(stack, row)}"]
    for place in range(len(told.turbine)):
        blocks.append(_turbine(told, expected, row, place, shown))
    said = [*remarks, *level_findings(stack.select(row))[0]]
    if said:
        blocks.append(section("Remarks", [bullet(safe(remark, 400)) for remark in said]))
    return "\n\n".join(blocks)


def caution() -> str:
    """Write the caution."""
    return wrapped("Caution: " + TURBINE)


def heading(told: Rotor, place: int, units: Units) -> str:
    """Write what a turbine is called and how large it is."""
    hub, diameter = float(told.hub_height[place]), float(told.rotor_diameter[place])
    low, high = hub - 0.5 * diameter, hub + 0.5 * diameter
    metre = units.height
    return (
        f"{safe(str(told.turbine[place]), 40)}: hub {plainly(hub, metre)} {metre.name}, rotor "
        f"{plainly(diameter, metre)} {metre.name}, from {plainly(low, metre)} to "
        f"{plainly(high, metre)} {metre.name}"
    )


def _turbine(told: Rotor, expected: ExpectedVeer | None, row: int, place: int, units: Units) -> str:
    def of(name: str) -> float:
        return float(getattr(told, name)[row, place])

    def number(name: str, unit: Unit, places: int, sign: bool = False) -> str:
        return plainly(of(name), unit, places, sign)

    speed, metre = units.speed, units.height
    pairs: list[tuple[str, str]] = []
    if np.isfinite(of("hub_speed")):
        wind = f"{number('hub_speed', speed, 2)} {speed.name}"
        if np.isfinite(of("hub_direction")):
            wind += f" from {of('hub_direction'):03.0f} deg"
        pairs.append(("wind at the hub", wind))
    covered = f"{100 * of('coverage'):.0f} % of the rotor"
    if np.isfinite(of("covered_base")):
        covered += (
            f", from {number('covered_base', metre, 0)} to {number('covered_top', metre, 0)} "
            f"{metre.name}"
        )
    pairs.append(("covered", covered))
    if np.isfinite(of("veer")):
        turn = with_error(of("veer"), of("veer_error"), DEGREE, sign=True)
        pairs += [
            ("veer", f"{turn} deg ({_rate(of('veer_rate'), units)}), {_sense(told, row, place)}"),
            (
                "  lower, upper half",
                f"{number('veer_lower_half', DEGREE, 1, True)}, "
                f"{number('veer_upper_half', DEGREE, 1, True)} deg",
            ),
            ("  steepest inside", _rate(of("steepest_veer_rate"), units)),
        ]
    if np.isfinite(of("shear_exponent")) or np.isfinite(of("shear_exponent_tips")):
        power = "not determined"
        if np.isfinite(of("shear_exponent")):
            power = with_error(of("shear_exponent"), of("shear_exponent_error"), NUMBER)
        pairs.append(
            (
                "shear exponent",
                f"by regression {power}, between the ends "
                f"{number('shear_exponent_tips', NUMBER, 2)} (the "
                f"standards' normal profiles have {NORMAL_EXPONENT_ONSHORE:.2f} on land "
                f"and {NORMAL_EXPONENT_OFFSHORE:.2f} at sea: for information)",
            )
        )
        length = (
            f"{of('roughness_length'):.2g} m (effective)"
            if np.isfinite(of("roughness_length"))
            else f"not determined, because {told.roughness_why[row, place]}"
        )
        pairs.append(("roughness length", length))
    if np.isfinite(of("equivalent_speed")):
        pairs += [
            (
                "equivalent speed",
                f"{number('equivalent_speed', speed, 2)} {speed.name}, with veer "
                f"{number('equivalent_speed_with_veer', speed, 2)} (exact); "
                f"{number('equivalent_speed_segments', speed, 2)}, "
                f"{number('equivalent_speed_with_veer_segments', speed, 2)} by {told.segments} "
                f"segments",
            ),
            (
                "  over hub speed",
                f"{number('equivalent_speed_ratio', NUMBER, 4)}; flux of kinetic energy "
                f"{number('energy_flux_ratio', NUMBER, 3)}, with veer "
                f"{number('energy_flux_ratio_with_veer', NUMBER, 3)}",
            ),
        ]
    density = told.air_density_from[row, place]
    if np.isfinite(of("air_density")):
        text = f"{number('air_density', DENSITY, 3)} kg/m3, from {density}"
        if np.isfinite(of("density_normalised_speed")):
            text += (
                f"; hub speed at 1.225 kg/m3 {number('density_normalised_speed', speed, 2)} "
                f"{speed.name}"
            )
    else:
        text = str(density)
    pairs.append(("air density", text))
    if np.isfinite(of("turbulence_intensity")):
        pairs.append(("turbulence", f"{100 * of('turbulence_intensity'):.1f} % at the hub"))
    if np.isfinite(of("nose_height")):
        pairs.append(
            (
                "jet nose",
                f"{number('nose_speed', speed, 1)} {speed.name} at "
                f"{number('nose_height', metre, 0)} {metre.name}, inside the rotor; "
                f"{number('nose_falloff', speed, 1)} {speed.name} less at its top "
                f"({plainly(of('shear_above_nose'), units.shear, 2, True)} {units.shear.name})",
            )
        )
    if told.extrapolated[row, place]:
        pairs.append(("extrapolated", "above the highest level, by the fitted Ekman model"))
    if told.why[row, place]:
        pairs.append(("note", str(told.why[row, place])))
    lines = pairs_of(pairs)
    if expected is not None:
        lines += ["", *_expected(expected, told, row, place, units)]
    return section(heading(told, place, units), lines)


def _rate(value: float, units: Units) -> str:
    # The unit of a rate is stored as degrees per 100 m.
    return f"{plainly(100.0 * value, units.rate, 1, True)} {units.rate.name}"


def _sense(told: Rotor, row: int, place: int) -> str:
    veer, error = float(told.veer[row, place]), float(told.veer_error[row, place])
    if np.isfinite(error) and abs(veer) < error:
        return "steady within its error"
    return "veering" if veer > 0 else "backing" if veer < 0 else "steady"


def _expected(expected: ExpectedVeer, told: Rotor, row: int, place: int, units: Units) -> list[str]:
    title = "  Beside a neutral layer over even ground (drag law and Ekman family)"
    if not np.isfinite(expected.expected[row, place]):
        why = expected.why[row, place] or "no data"
        return [title, *pairs_of([("  expected veer", f"not determined, because {why}")])]
    speed = units.speed
    turn = with_error(
        float(expected.expected[row, place]), float(expected.expected_error[row, place]), DEGREE,
        sign=True,
    )  # fmt: skip
    beyond = with_error(
        float(expected.anomaly[row, place]), float(expected.anomaly_error[row, place]), DEGREE,
        sign=True,
    )  # fmt: skip
    pairs = [
        (
            "  expected veer",
            f"{turn} deg: geostrophic wind "
            f"{plainly(float(expected.geostrophic_speed[row, place]), speed, 1)} {speed.name} "
            f"({expected.geostrophic_from[row, place]}), roughness length "
            f"{float(expected.roughness_length[row, place]):.2g} m "
            f"({expected.roughness_from[row, place]})",
        ),
        ("  measured beyond", f"{beyond} deg (a place to look, no verdict)"),
        (
            "  shear exponent",
            f"{plainly(float(expected.expected_shear_exponent[row, place]), NUMBER, 2)} by the "
            f"neutral logarithmic law, measured "
            f"{plainly(float(told.shear_exponent_tips[row, place]), NUMBER, 2)}",
        ),
    ]
    if np.isfinite(expected.fitted[row, place]):
        fitted = plainly(float(expected.fitted[row, place]), DEGREE, 1, True)
        pairs.append(("  fitted spiral", f"{fitted} deg between the same heights"))
    return [title, *pairs_of(pairs)]


def record_text(
    stack: Stack, stamp: str, utc_offset: float | None, remarks: Sequence[str]
) -> tuple[str, int]:
    """
    Write what record the answers are of, and return how many profiles a complete one would have.

    Parameters
    ----------
    stack
        Profiles.
    stamp
        Whether times are at the ``"begin"`` or the ``"end"`` of their interval.
    utc_offset
        Hours that the clock of the tables is ahead of UTC.
    remarks
        What was left out on the way.
    """
    count = stack.profile_count
    known = stack.time[~np.isnat(stack.time)]
    stations = len(np.unique(stack.station.astype(str)))
    called = name_of(stack, 0) if stations == 1 else f"{stations} stations"
    if not known.size:
        lines = [f"{called}: {count} profiles, at no known time"]
        complete = count
    else:
        complete = max(complete_record(stack.time).size, count) if stations == 1 else count
        step = usual_interval(stack.time)
        every = "" if np.isnat(step) else f", every {step / np.timedelta64(60, 's'):g} min"
        lines = [
            f"{called}, {place_of(stack, 0)}" if stations == 1 else called,
            f"{count} profiles from {time_of(known.min())} to {time_of(known.max())}{every}; "
            f"{100 * count / complete:.1f} % of a complete record",
            f"Times stand at the {stamp} of their interval (--stamp); hours, months and seasons go "
            f"by its beginning, in UTC{'' if not utc_offset else f'{utc_offset:+g} h'}",
        ]
    return "\n".join(wrapped(safe(line, 400)) for line in [*lines, *remarks]), complete


#: Quantity, what it is called, unit, decimals.
_ROWS = (
    ("hub_speed", "hub speed", "speed", 2),
    ("veer", "veer", "deg", 1),
    ("veer_lower_half", "  lower half", "deg", 1),
    ("veer_upper_half", "  upper half", "deg", 1),
    ("steepest_veer_rate", "  steepest rate", "rate", 1),
    ("shear_exponent", "shear exponent", "", 3),
    ("equivalent_speed_ratio", "equivalent / hub speed", "", 4),
    ("energy_flux_ratio", "energy flux ratio", "", 3),
    ("energy_flux_ratio_with_veer", "  with veer", "", 3),
    ("air_density", "air density", "kg/m3", 3),
    ("turbulence_intensity", "turbulence intensity", "", 3),
    ("shear_above_nose", "shear above a nose", "shear", 2),
)


def rotor_summary(
    stack: Stack,
    told: Rotor,
    expected: ExpectedVeer | None,
    place: int,
    complete: int,
    *,
    units: str = "si",
) -> str:
    """
    Write what one turbine meets in many profiles.

    Parameters
    ----------
    stack, told, expected
        Profiles and answers, in the same order.
    place
        Which turbine, from 0.
    complete
        Profiles of a complete record, for the data recovery.
    units
        ``"si"`` or ``"aviation"``.
    """
    shown = NAMED[units]
    head = [["", "unit", "count", "recovery", "mean", "5 %", "median", "95 %"]]
    rows = []
    for name, called, kind, places in _ROWS:
        unit, factor = _unit(kind, shown)
        values = getattr(told, name)[:, place] * factor
        row = _statistics(values, unit, places, complete)
        if row is not None:
            rows.append([called, unit.name, *row])
    if expected is not None:
        for name, called in (("expected", "expected veer"), ("anomaly", "  measured beyond")):
            row = _statistics(getattr(expected, name)[:, place], DEGREE, 1, complete)
            if row is not None:
                rows.append([called, "deg", *row])
    lines = table(head, rows, "llrrrrrr") if rows else ["  nothing is determined"]
    count = told.veer.shape[0]
    noses = int(np.count_nonzero(np.isfinite(told.nose_height[:, place])))
    lines.append("")
    lines.append(wrapped(f"A jet nose inside the rotor in {noses} of {count} profiles.", "  "))
    if told.extrapolated[:, place].any():
        more = int(np.count_nonzero(told.extrapolated[:, place]))
        lines.append(
            wrapped(f"Extrapolated above the highest level by the Ekman model: {more}.", "  ")
        )
    origins = Counter(told.air_density_from[:, place].tolist())
    for origin, number in origins.most_common(2):
        lines.append(wrapped(f"Air density in {number}: {origin}.", "  "))
    reasons = Counter(
        reason for why in told.why[:, place].tolist() if why for reason in why.split("; ")
    )
    if reasons:
        lines.append("  Notes, and in how many profiles:")
        lines += table([], [[str(n), why] for why, n in reasons.most_common(6)], "rl")
    return section(heading(told, place, shown), lines)


def _unit(kind: str, units: Units) -> tuple[Unit, float]:
    """Return the unit of a row and what its stored values are multiplied with first."""
    if kind == "speed":
        return units.speed, 1.0
    if kind == "rate":
        return units.rate, 100.0
    if kind == "shear":
        return units.shear, 1.0
    return Unit(kind, 1.0), 1.0


def _statistics(values: Floats, unit: Unit, places: int, complete: int) -> list[str] | None:
    known = values[np.isfinite(values)]
    if not known.size:
        return None
    low, middle, high = np.percentile(known, [5.0, 50.0, 95.0])
    share = min(known.size / complete, 1.0) if complete else float("nan")
    return [
        str(known.size),
        f"{100 * share:.1f} %",
        *(plainly(float(x), unit, places) for x in (known.mean(), low, middle, high)),
    ]
