"""The printed tables over time: a row a class, data recovery beside every figure."""

from __future__ import annotations

import numpy as np

from backveer.io.words.page import section, table, wrapped
from backveer.io.words.rotor_text import DEGREE, NUMBER
from backveer.io.words.units import NAMED, Unit, Units, plainly
from backveer.profiles.climatology import Climate
from backveer.profiles.events import Events
from backveer.profiles.joint_table import Joint
from backveer.profiles.rotor_climate import RotorClimate

_MINUTE = 60.0


def climate_text(over: RotorClimate, joint: tuple[str, ...] = (), *, units: str = "si") -> str:
    """
    Write one turbine over time.

    Parameters
    ----------
    over
        Its tables.
    joint
        Which joint tables to write: ``"speed"``, ``"hour"``.
    units
        ``"si"`` or ``"aviation"``.
    """
    unit, factor, places = _shown(over, NAMED[units])
    blocks = [_table(each, over, unit, factor, places) for each in over.tables]
    blocks[0] += "\n" + _direction(over)
    blocks += [_events(each, over, unit, factor) for each in over.events]
    if "speed" in joint:
        blocks.append(_joint(over.by_speed, "speed bin, m/s"))
    if "hour" in joint:
        blocks.append(_joint(over.by_hour, "hour"))
    return "\n\n".join(blocks)


def _direction(over: RotorClimate) -> str:
    told = over.direction
    mean, by_wind = float(told.mean_direction[0]), float(told.wind_weighted_mean_direction[0])
    if not np.isfinite(mean):
        return wrapped("hub direction: no mean, because the vectors cancel or there are none", "  ")
    return wrapped(
        f"hub direction, averaged as vectors: {mean:03.0f} deg, {by_wind:03.0f} deg weighted with "
        f"the wind, steadiness {told.steadiness[0]:.2f} ({int(told.count[0])} values, recovery "
        f"{100 * told.recovery[0]:.0f} %)",
        "  ",
    )


def _shown(over: RotorClimate, units: Units) -> tuple[Unit, float, int]:
    """Return unit, what stored values are multiplied with first, and decimals."""
    if over.unit == "m s-1":
        return units.speed, 1.0, 2
    if over.unit == "degree m-1":
        return units.rate, 100.0, 1
    if over.unit == "degree":
        return DEGREE, 1.0, 1
    if over.unit == "s-1":
        return units.shear, 1.0, 2
    if over.unit == "kg m-3":
        return Unit("kg/m3", 1.0), 1.0, 3
    return NUMBER, 1.0, 3


def _table(each: Climate, over: RotorClimate, unit: Unit, factor: float, places: int) -> str:
    told = np.isfinite(each.confidence)

    def number(value: float) -> str:
        return plainly(float(value) * factor, unit, places)

    at = [int(np.flatnonzero(each.percentile_at == p)[0]) for p in (5.0, 95.0)]
    head = ["speed, m/s" if each.kind == "speed" else each.kind, "count", "recov.", "mean"]
    if told:
        head.append(f"{100 * each.confidence:.0f} % interval")
    head += ["5 %", "median", "95 %", "wind-w.", "energy-w."]
    head += [f"{'<' if x < 0 else '>'} {x * factor / unit.size:g}" for x in each.threshold_at]
    rows = []
    left = 0
    for i, name in enumerate(each.group.tolist()):
        if not each.count[i]:
            left += 1
            continue
        row = [str(name), str(int(each.count[i])), f"{100 * each.recovery[i]:.0f}"]
        row.append(number(each.mean[i]))
        if told:
            ends = number(each.mean_low[i]), number(each.mean_high[i])
            row.append("-" if "-" in ends else f"{ends[0]} to {ends[1]}")
        row += [number(each.percentile[i, at[0]]), number(each.median[i])]
        row += [number(each.percentile[i, at[1]])]
        row += [number(each.wind_weighted_mean[i]), number(each.energy_weighted_mean[i])]
        row += [f"{100 * share:.1f}" for share in each.beyond[i]]
        rows.append(row)
    lines = table([head], rows, "l" + "r" * (len(head) - 1)) if rows else []
    if not rows:
        why = "temperature and wind at two heights are needed" if each.kind == "stability" else ""
        lines = [f"  no value{': ' if why else ''}{why}"]
    elif left:
        lines.append(f"  {left} without a value left out")
    if told:
        reasons = sorted({str(why) for why in each.why.tolist() if why and "interval" in str(why)})
        lines += [wrapped(f"no interval where there are {why}", "  ") for why in reasons]
        if each.kind == "all" and np.isfinite(each.mean_low).any():
            lines.append(
                wrapped(
                    f"intervals by resampling blocks of {each.block_days} "
                    f"{'day' if each.block_days == 1 else 'days'} (seed {each.seed})",
                    "  ",
                )
            )
    called = over.quantity.replace("_", " ")
    of = f" ({unit.name})" if unit.name else ""
    share = "recovery and shares" if each.threshold_at.size else "recovery"
    title = f"{called[0].upper()}{called[1:]}{of} by {each.kind}; {share} in %"
    return section(title, lines)


def _events(each: Events, over: RotorClimate, unit: Unit, factor: float) -> str:
    beyond = "below" if each.threshold < 0 else "above"
    limit = f"{each.threshold * factor / unit.size:g} {unit.name}".strip()
    called = over.quantity.replace("_", " ")
    title = f"How long {called} stays {beyond} {limit}"
    count = len(each.count)
    share = f"data recovery {100 * each.recovery:.1f} %"
    if not count:
        return section(title, [f"  never ({share})"])
    minutes = each.duration / _MINUTE
    low, high = np.percentile(minutes, [50.0, 95.0])
    cut = int(np.count_nonzero(each.cut))
    lines = [
        f"{count} {'time' if count == 1 else 'times'}, median {low:.0f} min, 95 % up to "
        f"{high:.0f} min, longest {minutes.max():.0f} min; {cut} of them touch a gap or an end of "
        f"the record and may have lasted longer ({share})"
    ]
    return section(title, [wrapped(line, "  ") for line in lines])


def _joint(each: Joint, called: str) -> str:
    total = int(each.count.sum())
    if not total:
        return section(f"Veer and {called}", ["  no profile has both"])
    head = [called.split(",")[0], *each.column.tolist(), "count"]
    rows = [
        [
            str(name),
            *(f"{100 * n / total:.1f}" if n else "." for n in each.count[i].tolist()),
            str(int(each.count[i].sum())),
        ]
        for i, name in enumerate(each.row.tolist())
        if each.count[i].any()
    ]
    title = (
        f"Veer (deg) and {called}: per cent of {total} profiles "
        f"(data recovery {100 * each.recovery:.1f} %)"
    )
    return section(title, table([head], rows, "l" + "r" * (len(head) - 1)))
