"""Uncertainty of pH by Monte Carlo: every input drawn, every draw solved (JCGM 101).

First order suffices wherever the pH curve is straight over the spread; it is not near equivalence and where nothing
buffers. Draws are the same for every solution and from run to run, so that a solution alone gives what it gives among
others.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import Chunk, Contents, FormTable, entries_at, pad
from reconcile.chemistry.engine import Answers
from reconcile.chemistry.pair_rows import laid_out
from reconcile.chemistry.pair_solve import solve_pairs
from reconcile.chemistry.pair_table import Pair
from reconcile.chemistry.pairs import Layout
from reconcile.chemistry.solve import solve
from reconcile.chemistry.temperature import LN10, U_PKW, Solvent, solvent
from reconcile.chemistry.water import HIGH_C, LOW_C, ZERO_CELSIUS
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.substances import ions

ROWS_TOGETHER = 8192
SEED = 20240229
TEMPERATURE, WATER, MODEL, PAIRS, STEPS, AMOUNTS = 0, 1, 2, 3, 100, 100_000
"""First column of the draws for each kind of input: pairs and ionization steps by their index, then amounts."""


@dataclass(frozen=True)
class Errors:
    """What is uncertain in n solutions, beside the constants.

    entry, factor : IntArray (t,)   contribution, and which of its solution's independent errors moves it (from 0)
    u : FloatArray (t,)             by how much, relative to the amount, per standard deviation of that error
    u_temperature : FloatArray (n,) [K]
    u_model : float                 of the activity model's coefficient
    """

    entry: IntArray
    factor: IntArray
    u: FloatArray
    u_temperature: FloatArray
    u_model: float


@cache
def column(number: int, draws: int) -> FloatArray:
    """Standard normal draws of one input (draws,): one from each of as many equally likely slices, in random order."""
    rng = np.random.default_rng([SEED, number])
    at = (rng.permutation(draws) + rng.random(draws)) / draws
    return _normal_quantile(at)


def _normal_quantile(p: FloatArray) -> FloatArray:
    """Standard normal quantile, by Newton on the distribution function from a rational start.

    References
    ----------
    Abramowitz and Stegun 1964, equation 26.2.23 (start); math.erfc for the distribution function.
    """
    from math import erfc

    tail = np.minimum(p, 1.0 - p)
    t = np.sqrt(-2.0 * np.log(tail))
    x = t - (2.515517 + 0.802853 * t + 0.010328 * t**2) / (1.0 + 1.432788 * t + 0.189269 * t**2 + 0.001308 * t**3)
    for _ in range(3):
        beyond = np.array([0.5 * erfc(v / 2.0**0.5) for v in x])
        x = x + (beyond - tail) * np.sqrt(2.0 * np.pi) * np.exp(0.5 * x**2)
    return np.where(p < 0.5, -x, x)


def draw_ph(
    contents: Contents,
    rows: IntArray,
    forms: FormTable,
    acids: AcidTable,
    model: ActivityModel,
    errors: Errors,
    strength: FloatArray,
    draws: int,
) -> FloatArray:
    """pH of some solutions with every input drawn from its distribution.

    Parameters
    ----------
    contents, forms, acids, model
        n solutions, as for engine.run.
    rows : ndarray of int (r,)
        Solutions to draw for.
    errors : Errors
        Of the n solutions.
    strength : ndarray (n,)
        Their ionic strength [mol/kg], at which the activity model's error is reckoned.
    draws : int

    Returns
    -------
    ndarray (r, draws)
        NaN where a draw was not solved.

    References
    ----------
    JCGM 101:2008, section 7; McKay, Beckman and Conover 1979, Technometrics 21:239 (one draw from every slice).
    """
    out = np.empty((len(rows), draws))
    together = max(1, ROWS_TOGETHER // draws)
    for begin in range(0, len(rows), together):
        some = rows[begin : begin + together]
        for first in range(0, draws, ROWS_TOGETHER):
            which = np.arange(first, min(first + ROWS_TOGETHER, draws))
            ph = _solved(contents, some, forms, acids, model, errors, strength, draws, which)
            out[begin : begin + len(some), which] = ph
    return out


def spread(
    contents: Contents,
    rows: IntArray,
    forms: FormTable,
    acids: AcidTable,
    model: ActivityModel,
    errors: Errors,
    answers: Answers,
    draws: int,
) -> FloatArray:
    """Root mean square of the error of predicted pH, from draws (r,) [pH].

    Parameters
    ----------
    contents, rows, forms, acids, model, errors, draws
        As for draw_ph.
    answers : Answers
        Of the n solutions.

    Notes
    -----
    What first order says of each draw, whose mean square is known, serves as control: with c the slope of the square on
    the control's over the draws, c (known - mean of control) is added to the mean square, so that the draws have only
    the bend of the curve to show and a few hundred do the work of many thousands.

    References
    ----------
    JCGM 101:2008, section 7; Owen 2013, Monte Carlo theory, methods and examples, section 8.9 (control variates).
    """
    ph = draw_ph(contents, rows, forms, acids, model, errors, answers.ionic_strength, draws)
    straight, known = _first_order(contents, rows, acids, errors, answers, draws)
    off = ph - answers.ph[rows, None]
    good = np.isfinite(off)
    count = np.maximum(good.sum(axis=1), 1)
    square, control = np.where(good, np.nan_to_num(off) ** 2, 0.0), np.where(good, straight**2, 0.0)
    mean, mean_control = square.sum(axis=1) / count, control.sum(axis=1) / count
    about = np.where(good, control - mean_control[:, None], 0.0)
    slope = (about * square).sum(axis=1) / np.maximum((about**2).sum(axis=1), 1e-300)
    found = mean + slope * (known - mean_control)
    return np.asarray(np.sqrt(np.where(found > 0.25 * mean, found, mean)))


def _columns(number: IntArray, draws: int) -> FloatArray:
    """Draws of some inputs, (t, draws)."""
    different, which = np.unique(number, return_inverse=True)
    return np.array([column(int(one), draws) for one in different]).reshape(-1, draws)[which]


def _summed(values: FloatArray, place: IntArray, count: int) -> FloatArray:
    """Rows of `values` added up by place, (count, ...)."""
    out = np.zeros((count, *values.shape[1:]))
    if len(place):
        order = np.argsort(place, kind="stable")
        begins = np.flatnonzero(np.concatenate([[True], np.diff(place[order]) > 0]))
        out[place[order][begins]] = np.add.reduceat(values[order], begins, axis=0)
    return out


def _relative(contents: Contents, entry: IntArray, errors: Errors, draws: int) -> FloatArray:
    """Relative error of the amount of some contributions in every draw (e, draws)."""
    position = np.full(len(contents.form), -1, np.intp)
    position[entry] = np.arange(len(entry))
    some = np.flatnonzero(position[errors.entry] >= 0)
    moved = errors.u[some, None] * _columns(AMOUNTS + errors.factor[some], draws)
    return _summed(moved, position[errors.entry[some]], len(entry))


def _first_order(
    contents: Contents, rows: IntArray, acids: AcidTable, errors: Errors, answers: Answers, draws: int
) -> tuple[FloatArray, FloatArray]:
    """What first order says of every draw (r, draws) [pH], and its variance (r,) [pH^2]; pKw and pairs left out."""
    number = np.full(len(contents), -1, np.intp)
    number[rows] = np.arange(len(rows))
    owner = np.repeat(number, np.diff(contents.start))[errors.entry]
    some = np.flatnonzero(owner >= 0)
    # one error may move several contributions of a solution: its loads add up before they are squared
    pair, which = np.unique(np.stack([owner[some], errors.factor[some]], axis=1), axis=0, return_inverse=True)
    load = np.bincount(which.ravel(), errors.u[some] * answers.entry[errors.entry[some]], len(pair))
    at, row = entries_at(answers.constants.start, rows)
    q = answers.constants.column[at]
    of_constants = answers.constants.value[at] * acids.u_at(q, contents.temperature_c[rows[row]] + ZERO_CELSIUS)
    each = np.arange(len(rows))
    loads = np.concatenate(
        [
            load,
            of_constants,
            answers.d_temperature[rows] * errors.u_temperature[rows],
            answers.d_model[rows] * errors.u_model,
        ]
    )
    place = np.concatenate([pair[:, 0], row, each, each])
    inputs = np.concatenate(
        [AMOUNTS + pair[:, 1], STEPS + q, np.full(len(rows), TEMPERATURE), np.full(len(rows), MODEL)]
    )
    straight = _summed(loads[:, None] * _columns(inputs, draws), place, len(rows))
    return straight, np.bincount(place, loads**2, len(rows)).astype(float)


def _solved(
    contents: Contents,
    rows: IntArray,
    forms: FormTable,
    acids: AcidTable,
    model: ActivityModel,
    errors: Errors,
    strength: FloatArray,
    draws: int,
    which: IntArray,
) -> FloatArray:
    """pH (r, len(which)) of some solutions and some draws."""
    entry, place = entries_at(contents.start, rows)
    count = len(which)
    amount = contents.amount[entry, None] * np.maximum(1.0 + _relative(contents, entry, errors, draws)[:, which], 0.0)
    solution = (place[:, None] * count + np.arange(count)).ravel()
    form = np.repeat(contents.form[entry], count)
    order = np.argsort(solution, kind="stable")
    whole = len(rows) * count
    start = np.concatenate([[0], np.cumsum(np.bincount(solution, minlength=whole))]).astype(np.intp)
    warm = contents.temperature_c[rows, None] + errors.u_temperature[rows, None] * column(TEMPERATURE, draws)[which]
    temperature = np.clip(warm, LOW_C, HIGH_C).ravel()
    drawn = Contents(
        start,
        form[order],
        amount.ravel()[order],
        temperature,
        np.repeat(contents.open_co2[rows], count),
    )
    water = solvent(temperature)
    chunk, padding = pad(drawn, np.arange(whole), forms, acids, water, model)
    draw = np.tile(which, len(rows))
    d_c = model.exponent(chunk.a, chunk.b, np.repeat(strength[rows], count), np.array(4.5))[4]
    shift = d_c * errors.u_model * column(MODEL, draws)[draw]
    _disturb(chunk, acids, water, shift, draws, draw)
    ph, found, fine = solve(chunk, model)
    held, lay, pairs = laid_out(chunk, padding, drawn, forms, acids, water, fine)
    if lay is not None:
        _disturb_pairs(lay, pairs, acids, water.temperature_c[held] + ZERO_CELSIUS, shift[held], draws, draw[held])
        ph[held] = solve_pairs(lay, model, ph[held], found[held])[0]
    return ph.reshape(len(rows), count)


def _disturb(chunk: Chunk, acids: AcidTable, water: Solvent, shift: FloatArray, draws: int, draw: IntArray) -> None:
    """Move the constants of every row by their errors, and by a change `shift` of D."""
    chunk.kw *= np.exp(LN10 * (shift - U_PKW * column(WATER, draws)[draw]))
    hydrogen = np.exp(LN10 * shift)
    chunk.hydrogen = hydrogen if chunk.hydrogen is None else chunk.hydrogen * hydrogen
    kelvin = water.temperature_c + ZERO_CELSIUS
    which = acids.by_step[2]
    for slot in chunk.slots:
        for step in range(len(slot.k)):
            q = which[step].take(slot.acid)
            u = acids.u_at(q, kelvin)
            different, place = np.unique(q, return_inverse=True)
            drawn = np.array([column(STEPS + int(one), draws) for one in different])
            error = np.where(q >= 0, u, 0.0) * drawn[place.ravel(), draw]
            squares = (slot.charge - step - 1) ** 2 - (slot.charge - step) ** 2
            slot.k[step] *= np.exp(LN10 * (shift * squares - error))


def _disturb_pairs(
    lay: Layout,
    pairs: tuple[Pair, ...],
    acids: AcidTable,
    kelvin: FloatArray,
    shift: FloatArray,
    draws: int,
    draw: IntArray,
) -> None:
    """Move the constants of pairs by their errors and a change `shift` of D; their parts have been moved already."""
    first = int(np.count_nonzero(lay.pair < 0))
    numbers = {pair.name: number for number, pair in enumerate(acids.pairs)}
    for index, pair in enumerate(pairs, start=first):
        squares = lay.z[index] ** 2 - pair.hydroxide
        squares -= sum(n * ions()[metal].charge ** 2 for metal, n in pair.metals.items())
        for (acid, lost), n in pair.states.items():
            squares -= n * (acids.charge[acids.index[acid]] - lost) ** 2
        error = pair.u_at(kelvin) * column(PAIRS + numbers[pair.name], draws)[draw]
        lay.lgc[index] += shift * squares + error
