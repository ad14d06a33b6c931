"""Sensitivities of pH by implicit differentiation of the charge balance together with the ionic strength."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import SIZE_HYDROGEN, SIZE_HYDROXIDE, ActivityModel
from reconcile.chemistry.balance import Balance, activity, free_ions
from reconcile.chemistry.composition import Chunk, Contents, FormTable, Padding
from reconcile.chemistry.fractions import Found, fractions, spread
from reconcile.chemistry.ion_data import TITRANT, strong_ions
from reconcile.chemistry.pair_slopes import Solution, adjoint
from reconcile.chemistry.specific import interaction_slopes
from reconcile.chemistry.temperature import LN10, Solvent
from reconcile.chemistry.water import DENSITY_20C, ZERO_CELSIUS, co2_solubility
from reconcile.records.arrays import BoolArray, FloatArray, IntArray


@dataclass(frozen=True)
class Slopes:
    """Slopes of the pH of m solutions.

    d_temperature [1/K], d_model, d_pkw, d_titrant [L/mol] : (m,)
    entry : FloatArray (e,)           dpH/d ln(amount) of each contribution of the chunk
    constant_value, constant : (m, cells), with `constant` -1 where a cell holds none
    degree, degree_acid : (m, slots), with `degree_acid` -1 where a slot holds no acid
    of_pairs : FloatArray (m,)        square of the share of the pairs' constants in the uncertainty [pH^2]
    """

    d_temperature: FloatArray
    d_model: FloatArray
    d_pkw: FloatArray
    d_titrant: FloatArray
    entry: FloatArray
    constant_value: FloatArray
    constant: IntArray
    degree: FloatArray
    degree_acid: IntArray
    of_pairs: FloatArray


def slopes(
    chunk: Chunk,
    padding: Padding,
    contents: Contents,
    forms: FormTable,
    acids: AcidTable,
    water: Solvent,
    model: ActivityModel,
    ph: FloatArray,
    strength: FloatArray,
    solution: Solution | None = None,
) -> Slopes:
    """Slopes of pH with respect to everything that the balance rests on, at its answer.

    Parameters
    ----------
    chunk, padding, contents, forms, acids, water, model
        As they were solved; `water` has one entry for each row of the chunk.
    ph, strength : ndarray (m,)
        The answer: pH [-] and ionic strength [mol/kg]; NaN rows give NaN slopes.
    solution : Solution, optional
        Where pairs take part; the chunk is then what its layout leaves to be counted by fractions.

    Returns
    -------
    Slopes

    Notes
    -----
    With F the charge balance and G the ionic strength equation, both 0 at the answer, for any parameter p
    dpH/dp = -(F_p G_I - F_I G_p) / (F_pH G_I - F_I G_pH).

    References
    ----------
    JCGM 100:2008, section 5.1 (sensitivity coefficients); implicit function theorem.
    """
    act = activity(chunk, model, strength)
    h, oh, raised = free_ions(chunk, act, ph)
    found = fractions(chunk, act, ph, raised)

    by_i, by_t, by_c = _activity_slopes(chunk, model, water, strength, h, oh, found)
    f_ph, s_ph = -(h + oh), oh - h
    for slot, x in zip(chunk.slots, found, strict=True):
        lost = [np.array(float(j)) for j in range(len(x.f))]
        var = spread(x, lost, lost)
        cov = spread(x, lost, [(slot.charge - j) ** 2 for j in range(len(x.f))])
        f_ph = f_ph - slot.total * var
        s_ph = s_ph + slot.total * cov
    f_ph, g_ph = LN10 * f_ph, -0.5 * LN10 * s_ph
    f_i, g_i = by_i[0], 1.0 - 0.5 * by_i[1]
    with np.errstate(divide="ignore", invalid="ignore"):
        inverse = 1.0 / (f_ph * g_i - f_i * g_ph)
    on_charge, on_squares = -g_i * inverse, -0.5 * f_i * inverse  # dpH = on_charge F_p + on_squares (sum m z^2)_p
    paired = None
    if solution is not None:
        closed = np.zeros_like(ph)
        paired = adjoint(solution, model, ph, strength, Balance(closed, closed, f_ph, f_i, g_ph, g_i))
        on_charge, on_squares = paired.on_charge, paired.on_squares

    constant_value, constant, warming = _constants(chunk, found, acids, water, on_charge, on_squares)
    d_temperature = (constant_value * warming).sum(axis=1)
    d_pkw, d_model = LN10 * oh * (on_charge - on_squares), on_charge * by_c[0] + on_squares * by_c[1]
    if paired is not None:
        first_cell = np.cumsum([0, *(len(slot.k) for slot in chunk.slots)])[:-1].tolist()
        d_temperature += paired.fill_constants(constant_value, warming, first_cell) + paired.temperature(water)
        by_a, by_coefficient = paired.activity_slopes(model, water, strength)
        d_temperature, d_model, d_pkw = d_temperature + by_a, d_model + by_coefficient, d_pkw + paired.on_pkw()
    d_temperature = d_temperature + d_pkw * water.d_pkw + on_charge * by_t[0] + on_squares * by_t[1]
    opened = contents.open_co2[padding.rows] > 0.0
    if opened.any():
        solubility, slope = co2_solubility(water.temperature_c)
        for slot, x in zip(chunk.slots, found, strict=True):
            air = np.where(x.closed > 0.0, 0.0, slot.total * slope / solubility)
            d_temperature = d_temperature + air * (on_charge * (slot.charge - x.lost) + on_squares * x.squares)

    by_ion = None
    if model.pairwise:
        by_ion = interaction_slopes(chunk, forms, acids, h, oh, found, on_charge, on_squares)
    if paired is not None:
        by_ion = paired.on_metals() + (0.0 if by_ion is None else by_ion + paired.on_interactions())
    effect = _effects(chunk, padding, found, on_charge, on_squares)
    if paired is not None:
        for a, acid in enumerate(paired.layout.acids):
            if padding.place[acid] < len(padding.columns):
                effect[:, padding.place[acid]] = paired.on_total[a]
    entry = _entries(padding, contents, forms, effect, on_charge, on_squares, by_ion)
    d_titrant = on_charge + on_squares
    if by_ion is not None:
        d_titrant = d_titrant + by_ion[:, strong_ions().index(TITRANT)]
    degree = np.zeros((len(chunk), len(chunk.slots)))
    degree_acid = np.full(degree.shape, -1, np.intp)
    for number, (slot, x) in enumerate(zip(chunk.slots, found, strict=True)):
        has = slot.acid < len(acids.names)
        steps = np.append(acids.steps, 1).take(slot.acid)
        whole = np.where(x.closed > 0.0, 1.0, sum(x.f, np.zeros_like(ph)))
        degree[:, number] = x.lost / whole / steps
        degree_acid[:, number] = np.where(has, slot.acid, -1)
    if paired is not None:
        paired.fill_degree(degree)
    return Slopes(
        d_temperature,
        d_model,
        d_pkw,
        d_titrant / DENSITY_20C,
        entry,
        constant_value,
        constant,
        degree,
        degree_acid,
        np.zeros(len(chunk)) if paired is None else paired.u_squared(water.temperature_c + ZERO_CELSIUS),
    )


Pair = tuple[FloatArray, FloatArray]


def _response(chunk: Chunk, h: FloatArray, oh: FloatArray, found: list[Found], e: list[list[FloatArray]]) -> Pair:
    """Slopes of charge and of the sum of m z^2 when D changes by e: [hydrogen, hydroxide], then a list a slot."""
    charge, squares = h * e[0][0] - oh * e[0][1], h * e[0][0] + oh * e[0][1]
    for slot, x, d in zip(chunk.slots, found, e[1:], strict=True):
        z = [slot.charge - j for j in range(len(x.f))]
        moved = [c * c * slope for c, slope in zip(z, d, strict=True)]
        charge = charge + slot.total * spread(x, z, moved)
        squares = squares + slot.total * spread(x, [c * c for c in z], moved)
    return LN10 * charge, LN10 * squares


def _activity_slopes(
    chunk: Chunk,
    model: ActivityModel,
    water: Solvent,
    strength: FloatArray,
    h: FloatArray,
    oh: FloatArray,
    found: list[Found],
) -> tuple[Pair, Pair, Pair]:
    """Slopes of charge and sum of m z^2 in ionic strength, in temperature through A and B, in the coefficient."""

    def three(size: FloatArray, linear: FloatArray | float = 0.0) -> tuple[FloatArray, FloatArray, FloatArray]:
        _, d_i, d_a, d_b, d_c = model.exponent(chunk.a, chunk.b, strength, size, linear)
        return d_i, d_a * water.d_a + d_b * water.d_b, d_c

    if not model.sized:
        one = np.ones_like(h)
        charge, squares = _response(chunk, h, oh, found, [[one, one], *([one] * len(x.f) for x in found)])
        d_i, d_t, d_c = three(np.array(0.0))
        return (charge * d_i, squares * d_i), (charge * d_t, squares * d_t), (charge * d_c, squares * d_c)
    hydrogen, hydroxide = three(np.array(SIZE_HYDROGEN)), three(np.array(SIZE_HYDROXIDE))
    states = [three(slot.size, slot.linear if model.linear else 0.0) for slot in chunk.slots]
    i, t, c = (
        _response(chunk, h, oh, found, [[hydrogen[n], hydroxide[n]], *(list(s[n]) for s in states)]) for n in range(3)
    )
    return i, t, c


def _constants(
    chunk: Chunk,
    found: list[Found],
    acids: AcidTable,
    water: Solvent,
    on_charge: FloatArray,
    on_squares: FloatArray,
) -> tuple[FloatArray, IntArray, FloatArray]:
    """dpH/dpKa of every cell, which constant each cell holds, and dpKa/dT of each."""
    cells = sum(len(slot.k) for slot in chunk.slots)
    value = np.zeros((len(chunk), cells))
    which = np.full(value.shape, -1, np.intp)
    warm = np.zeros(value.shape)
    kelvin = water.temperature_c + ZERO_CELSIUS
    cell = 0
    terms, edge, which_constant = acids.by_step
    inverse, beyond = 1.0 / kelvin, len(acids.names) + 1
    for slot, x in zip(chunk.slots, found, strict=True):
        tail, tail_lost, tail_squares = (np.zeros(len(chunk)) for _ in range(3))
        for step in range(len(slot.k), 0, -1):
            share = x.f[step]
            tail = tail + share
            tail_lost = tail_lost + step * share
            tail_squares = tail_squares + (slot.charge - step) ** 2 * share
            slope = (
                LN10
                * slot.total
                * (
                    on_charge * (tail_lost - x.closed * x.lost * tail)
                    - on_squares * (tail_squares - x.closed * x.squares * tail)
                )
            )
            has = slot.k[step - 1] > 0.0
            q = which_constant[step - 1].take(slot.acid)
            column = slot.acid + beyond * (water.temperature_c > edge.take(slot.acid))
            warming = (terms.r[step - 1].take(column) - terms.q[step - 1].take(column) * inverse) * inverse
            warming += terms.t[step - 1].take(column) + terms.w[step - 1].take(column) * water.d_pkw
            value[:, cell + step - 1] = slope
            which[:, cell + step - 1] = q
            warm[:, cell + step - 1] = np.where(has, warming, 0.0)
        cell += len(slot.k)
    return value, which, warm


def _effects(
    chunk: Chunk, padding: Padding, found: list[Found], on_charge: FloatArray, on_squares: FloatArray
) -> FloatArray:
    """dpH of one mol/kg of each acid, (m, acids of the chunk + 1); the last column, of 0, is for none."""
    m = len(chunk)
    effect = np.zeros((m, len(padding.columns) + 1))
    everyone = np.arange(m)
    for slot, x in zip(chunk.slots, found, strict=True):
        column = padding.place.take(slot.acid)
        free: BoolArray = x.closed > 0.0
        effect[everyone, column] = np.where(free, on_charge * (slot.charge - x.lost) + on_squares * x.squares, 0.0)
    effect[:, -1] = 0.0
    return effect


def _entries(
    padding: Padding,
    contents: Contents,
    forms: FormTable,
    effect: FloatArray,
    on_charge: FloatArray,
    on_squares: FloatArray,
    by_ion: FloatArray | None,
) -> FloatArray:
    """dpH/d ln(amount) of every contribution, through its strong ions and its acids."""
    row, entry = padding.row, padding.entry
    form = contents.form[entry]
    per_mole = on_charge[row] * forms.charge[form] + on_squares[row] * forms.square[form]
    for w in range(len(forms.acid)):
        acid = forms.acid[w][form]
        column = padding.place[acid]  # -1, for none, finds the last place, which is that of none
        per_mole = per_mole + forms.units[w][form] * effect[row, column]
    if by_ion is not None:
        per_mole = per_mole + np.einsum("ei,ei->e", forms.brings[form], by_ion[row])
    return contents.amount[entry] * per_mole
