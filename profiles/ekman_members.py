"""
All members of the Ekman family fitted to profiles: estimates, errors, and what speaks for each.

In the frame of the northern hemisphere; which member to name, and what can be said of it, is
decided in :mod:`backveer.profiles.ekman`.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from backveer.profiles.ekman_errors import LENGTHS, effective_levels, noise_weights, spread, t95
from backveer.profiles.ekman_moments import (
    Moments,
    Profiles,
    Whitening,
    basis_moments,
    coarse_moments,
    decay,
    whiten,
)
from backveer.profiles.ekman_parameters import describe, quantities, standard_errors
from backveer.profiles.ekman_search import (
    MEMBERS,
    TRIALS,
    WITHOUT_FRICTION,
    ceilings,
    lowest,
    project,
    refine,
    without_friction,
)
from backveer.profiles.grid import ordered_sum

#: What a parameter costs beyond AICc. Without it one profile in five with independent noise is
#: given a shear or a slip that it does not have; with it one in twelve (2000 synthetic profiles).
PRICE = 1.0
#: Twice the logarithm of the likelihood by which a spiral must fit better than a straight hodograph
#: for this not to be looked into.
STRAIGHT = 2.0
#: Twice the logarithm of the likelihood by which a spiral of the other sense must fit better.
WRONG_SENSE = 6.0


@dataclass
class Members:
    """
    The four fits to each profile; arrays (profile, member), unless said otherwise.

    Attributes
    ----------
    answers : list of dict
        A member each, from :func:`backveer.profiles.ekman_parameters.describe`.
    values, errors : array, shape (member, quantity, profile)
        Estimates and standard errors of ``ekman_parameters.QUANTITIES``, each member's own.
    noise
        Standard deviation of a component about the fit. [m s-1]
    rms
        Root of the mean square of the vector residual. [m s-1]
    sound, inside
        Whether the member could be fitted, and its scale height is no end of the range.
    aicc, doubt
        AICc with the effective number of levels, and with all levels: doubt about the member is
        not lessened by there being few effective levels.
    without_friction : array, shape (profile,)
        The better AICc of a constant and of a linear wind.
    unturned : array, shape (profile,)
        The best AICc with a decay that does not turn, where the hodograph is all but a straight
        line; infinite elsewhere.
    wrong_sense : array of bool, shape (profile,)
        Whether a spiral that turns the other way fits clearly better.
    length, levels : array, shape (profile,)
        Noise length [m] and effective number of levels, weighed.
    t : array, shape (member, profile)
        95 % point of the distribution of the estimates over their errors.
    """

    answers: list[Any]
    values: Any
    errors: Any
    noise: Any
    rms: Any
    sound: Any
    inside: Any
    aicc: Any
    doubt: Any
    without_friction: Any
    unturned: Any
    wrong_sense: Any
    length: Any
    levels: Any
    t: Any


def fit_members(data: Profiles, f: Any, floor: Any, known_length: float | None) -> Members:
    """
    Fit all members.

    Parameters
    ----------
    data
        The profiles; those without levels pass through, none of their members sound.
    f : array, shape (profile,)
        Size of the Coriolis parameter. [s-1]
    floor : array, shape (profile,)
        Least standard error of a wind component. [m s-1]
    known_length
        Noise length, where it is known. [m]
    """
    given = LENGTHS if known_length is None else np.array([float(known_length)])
    lengths = np.broadcast_to(given, (len(data.count), given.size))
    with np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore"):
        roof = np.minimum(ceilings(data.unit), TRIALS[-1])
        guess, sheared, right, wrong = _either_sense(data, roof)
        noises = whiten(data, lengths)
        weights = np.ones(lengths.shape)
        if given.size > 1:
            weights = noise_weights(data, noises, guess, sheared)
        length = ordered_sum(weights * lengths)
        levels = ordered_sum(weights * effective_levels(data, lengths))
        noise = whiten(data, length[:, np.newaxis])
        grid, _ = coarse_moments(data, TRIALS[-2:], TRIALS.size // 2 - 1, noise)
        start = [lowest(grid, TRIALS, one, roof[:, m])[0] for m, one in enumerate(MEMBERS)]
        delta = refine(data, noise, np.stack(start, axis=-1))
        sums, by_length = basis_moments(data, delta, noise, noises)
        answers, values, errors, scatter, residual, sound = [], [], [], [], [], []
        for m, member in enumerate(MEMBERS):
            one = project(sums.trial(m), member)
            coefficients = [c[:, 0, 0] for c in one.coefficients]
            answer = describe(member, delta[:, m], coefficients, data.unit, f)
            about = spread(
                member, data, by_length.trial(m), delta[:, m], coefficients, weights, floor
            )
            off, own_noise = standard_errors(member, data, answer, about)
            answers.append(answer)
            values.append(quantities(answer))
            errors.append(off)
            scatter.append(own_noise)
            residual.append(one.residual[:, 0, 0])
            sound.append(one.sound[:, 0, 0] & (data.count > 0))
        squares, nothing = np.stack(residual, -1), np.stack(without_friction(sums), -1)
        rms = np.stack([_rms(data, answer) for answer in answers], -1)
        return Members(
            answers=answers,
            values=np.stack(values),
            errors=np.stack(errors),
            noise=np.stack(scatter, -1),
            rms=rms,
            sound=np.stack(sound, -1),
            inside=(delta > TRIALS[0] * 1.001) & (delta < roof * 0.999),
            aicc=_aicc(squares, data.count, levels, _PARAMETERS),
            doubt=_aicc(squares, data.count, data.count, _PARAMETERS),
            without_friction=_aicc(nothing, data.count, levels, _WITHOUT).min(-1),
            unturned=_unturned(data, noise, rms, levels, roof),
            wrong_sense=2.0 * levels * np.log(right / wrong) > WRONG_SENSE,
            length=length,
            levels=levels,
            t=t95(data.count + levels - _PARAMETERS[:, np.newaxis]),
        )


_PARAMETERS = np.array([member.parameters for member in MEMBERS], dtype=float)
_WITHOUT = np.array([member.parameters for member in WITHOUT_FRICTION], dtype=float)


def _either_sense(data: Profiles, roof: Any) -> tuple[Any, ...]:
    """
    Fit the richest members roughly, by ordinary least squares, to the wind and to its mirror image.

    Returns the scale heights of the two (profile, 2), whether the sheared one may be fitted, and
    the least residual of either for the wind and for its mirror image.
    """
    independent = whiten(data, np.zeros((len(data.count), 1)))
    sums, mirrored = coarse_moments(data, TRIALS[-1:], TRIALS.size // 2 - 1, independent)
    other = Moments(sums.gram, mirrored, sums.wind, sums.log_determinant)
    guess, edges, residuals = [], [], []
    for moments in (sums, other):
        found = [lowest(moments, TRIALS[1::2], MEMBERS[m], roof[:, m]) for m in (1, 3)]
        guess.append(np.stack([one[0] for one in found], axis=-1))
        edges.append(found[1][1])
        residuals.append(np.minimum(found[0][2], found[1][2]))
    least = 1e-12 * sums.wind[:, 0, 0] + 1e-300
    return guess[0], ~edges[0], np.maximum(residuals[0], least), np.maximum(residuals[1], least)


def _unturned(data: Profiles, noise: Whitening, rms: Any, levels: Any, roof: Any) -> Any:
    """
    Fit the family without the turning of its decay where the hodograph is all but a straight line.

    A wind that strengthens with height and keeps its direction is fitted closely by a spiral with a
    shear, to tenths of a metre a second in a log law of 2 km: only what fits better tells them
    apart. A viscosity that varies with height makes a hodograph that no spiral fits closely and
    that is not straight either; so both have to speak against friction.
    """
    there = np.arange(data.z.shape[1]) < data.count[:, np.newaxis]
    count = np.maximum(data.count, 1)
    middle = ordered_sum(np.where(there, data.w, 0.0)) / count
    apart = np.where(there, data.w - middle[:, np.newaxis], 0.0)
    u, v = apart.real, apart.imag
    uu, vv, uv = (ordered_sum(x) / count for x in (u * u, v * v, u * v))
    # The smaller axis of the scatter: the mean square distance from the nearest straight line.
    across = np.maximum(0.5 * (uu + vv) - np.hypot(0.5 * (uu - vv), uv), 0.0)
    gain = levels * np.log(across / (0.5 * rms.min(axis=-1) ** 2))
    unturned = np.full(count.shape, np.inf)
    rows = np.flatnonzero(gain < STRAIGHT)
    if rows.size:
        here = data.at(rows)
        grid, _ = coarse_moments(
            here, TRIALS[-2:], TRIALS.size // 2 - 1, noise.at(rows), turning=False
        )
        least = [lowest(grid, TRIALS, one, roof[rows, m])[2] for m, one in enumerate(MEMBERS)]
        aicc = _aicc(np.stack(least, -1), here.count, levels[rows], _PARAMETERS)
        unturned[rows] = aicc.min(axis=-1)
    return unturned


def _rms(data: Profiles, answer: Any) -> Any:
    z = data.z
    c, s = np.empty_like(z), np.empty_like(z)
    decay(z, answer["scale_height"][:, np.newaxis], c, s)
    square: Any = 0.0
    for part, (a, b) in ((np.real, (c, s)), (np.imag, (s, c))):
        sign = 1.0 if part is np.imag else -1.0
        amplitude = answer["amplitude"][:, np.newaxis]
        fitted = (
            part(answer["geostrophic"])[:, np.newaxis] + part(answer["shear"])[:, np.newaxis] * z
        )
        fitted += amplitude.real * a + sign * amplitude.imag * b
        square = square + (part(data.w) - fitted) ** 2
    there = np.arange(z.shape[1]) < data.count[:, np.newaxis]
    return np.sqrt(ordered_sum(np.where(there, square, 0.0)) / np.maximum(data.count, 1))


def _aicc(residual: Any, count: Any, levels: Any, parameters: Any) -> Any:
    """AICc of members: the scale of the noise is a parameter too, and both components count."""
    k = parameters + 1.0
    numbers = 2.0 * count[:, np.newaxis]
    # Where noise of long correlation leaves few effective levels, a parameter costs at most twice
    # what it costs anyway: more would rule out a shear that is plainly there.
    spare = np.maximum(
        2.0 * levels[:, np.newaxis] - k - 1.0, np.minimum(k + 1.0, numbers - k - 1.0)
    )
    scatter = np.maximum(residual / np.maximum(numbers, 1.0), 1e-12)
    value = numbers * np.log(scatter) + (2.0 + PRICE) * k
    value = value + 2.0 * k * (k + 1.0) / np.maximum(spare, 1.0)
    return np.where(numbers > k + 1.0, value, np.inf)
