"""From the engine's answers to a Prediction: statuses, budget, and rows given back to everyone who asked for them."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import DAVIES_RANGE, SIZE_HYDROGEN, ActivityModel
from reconcile.chemistry.composition import entries_at
from reconcile.chemistry.engine import Answers, Ragged
from reconcile.chemistry.temperature import debye_hueckel
from reconcile.chemistry.uncertainty import combined, rows_of
from reconcile.records.arrays import FloatArray, IntArray, TextArray, Triplets
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings


def u_of_model(model: ActivityModel, settings: Settings) -> float:
    """Standard uncertainty of the model's uncertain coefficient."""
    u = model.u_coefficient
    return float(settings[u]) if isinstance(u, str) else u


def regrouped(part: Ragged, which: IntArray) -> Ragged:
    """The lists of rows `which`, in that order; a row asked for twice is given twice."""
    if len(which) == len(part.start) - 1 and np.array_equal(which, np.arange(len(which))):
        return part
    entry, _ = entries_at(part.start, which)
    start = np.concatenate([[0], np.cumsum(np.diff(part.start)[which])]).astype(np.intp)
    return Ragged(start, part.column[entry], part.value[entry])


def triplets(part: Ragged, columns: int) -> Triplets:
    """The lists as a sparse matrix."""
    return Triplets(rows_of(part.start), part.column, part.value, (len(part.start) - 1, columns))


def range_of(model: ActivityModel, settings: Settings) -> float:
    """Ionic strength to which a model is taken at its word [mol/kg]."""
    highest = float(settings["status.outside_model_ionic_strength"])
    return min(highest, model.highest) if model.highest < DAVIES_RANGE else highest


def beyond_range(
    strength: FloatArray, temperature_c: FloatArray, model: ActivityModel, settings: Settings
) -> FloatArray:
    """What a model's uncertain coefficient may do to hydrogen ions alone beyond its range [pH] (n,), 0 within.

    One error for all ions cancels in some solutions, such as a weak acid in much salt. Beyond the range ions differ,
    and what their differences leave is taken to be as large as the error of the hydrogen ion itself.
    """
    highest = range_of(model, settings)
    extra = np.zeros(len(strength))
    far = np.flatnonzero(strength > highest)
    if len(far):
        a, _, b, _ = debye_hueckel(temperature_c[far])
        size = np.array(SIZE_HYDROGEN)
        at, limit = (model.exponent(a, b, s, size)[4] for s in (strength[far], np.full(len(far), highest)))
        extra[far] = u_of_model(model, settings) * np.abs(at - limit)
    return extra


def statuses(
    ph: FloatArray, strength: FloatArray, capacity: FloatArray, model: ActivityModel, settings: Settings
) -> TextArray:
    """Status of every row: not_solved, outside_model, pH beyond the electrode's range, unbuffered, too few ions, ok."""
    highest = range_of(model, settings)
    status = np.full(len(ph), "ok", object)
    with np.errstate(invalid="ignore"):
        outside = (ph < settings["status.electrode_low_ph"]) | (ph > settings["status.electrode_high_ph"])
        status[strength < settings["status.electrode_low_ionic_strength"]] = "outside_electrode_range"
        status[capacity * 1000.0 < settings["status.unbuffered_mmol_per_ph"]] = "unbuffered"
        status[outside] = "outside_electrode_range"
        status[strength > highest] = "outside_model"
    status[~np.isfinite(ph)] = "not_solved"
    return status


def assemble(
    answers: Answers,
    solved_at: FloatArray,
    which: IntArray,
    u_temperature: FloatArray,
    shares: Mapping[str, FloatArray],
    contributions: Triplets,
    acids: AcidTable,
    model: ActivityModel,
    settings: Settings,
    gas: FloatArray,
    drawn: FloatArray | None = None,
) -> Prediction:
    """A Prediction of n rows from the answers of u different solutions.

    Parameters
    ----------
    answers : Answers
        Of the u different solutions.
    solved_at : ndarray (u,)
        Their temperatures [°C].
    which : ndarray of int (n,)
        Solution of each row.
    u_temperature : ndarray (n,)
        Standard uncertainty of the temperature of each row [K].
    shares : mapping of str to ndarray (n,)
        Shares of the budget [pH] that rest on amounts: "strength", "taking".
    contributions : Triplets (n, c)
    acids, model, settings
    gas : ndarray (u,)
        Share of carbon dioxide taken up unrecorded [pH].
    drawn : ndarray (u,), optional
        What draws give for all shares but that of carbon dioxide together [pH]; NaN where first order serves.

    Returns
    -------
    Prediction
    """
    u_model = u_of_model(model, settings)
    d_temperature, d_model = answers.d_temperature[which], answers.d_model[which]
    budget = {
        "strength": shares["strength"],
        "taking": shares["taking"],
        "temperature": np.abs(d_temperature) * u_temperature,
        "pKa": answers.u_constants[which],
        "activity model": np.abs(d_model) * u_model,
    }
    if drawn is not None and np.isfinite(drawn).any():
        with np.errstate(divide="ignore", invalid="ignore"):
            scale = drawn[which] / combined(budget)
        budget = {name: np.where(np.isfinite(scale), share * scale, share) for name, share in budget.items()}
    beyond = beyond_range(answers.ionic_strength, solved_at, model, settings)[which]
    budget["activity model"] = np.hypot(budget["activity model"], beyond)
    budget["carbon dioxide"] = gas[which]
    with np.errstate(divide="ignore", invalid="ignore"):
        capacity = 1.0 / answers.d_titrant
    met = np.flatnonzero(np.bincount(answers.constants.column, minlength=len(acids.rows)))
    place = np.zeros(len(acids.rows), np.intp)
    place[met] = np.arange(len(met))
    constants = regrouped(answers.constants, which)
    acid_met = np.flatnonzero(np.bincount(answers.degree.column, minlength=len(acids.names)))
    acid_place = np.zeros(len(acids.names), np.intp)
    acid_place[acid_met] = np.arange(len(acid_met))
    degree = regrouped(answers.degree, which)
    names = acids.constant_names
    return Prediction(
        ph=answers.ph[which],
        status=statuses(answers.ph, answers.ionic_strength, capacity, model, settings)[which],
        u=combined(budget),
        budget=budget,
        ionic_strength=answers.ionic_strength[which],
        buffer_capacity=capacity[which],
        temperature_c=solved_at[which],
        d_temperature=d_temperature,
        d_model=d_model,
        d_titrant=answers.d_titrant[which],
        contributions=contributions,
        constants=triplets(Ragged(constants.start, place[constants.column], constants.value), len(met)),
        constant_names=tuple(names[q] for q in met),
        constant_u=acids.u[met],
        u_model=u_model,
        degree=triplets(Ragged(degree.start, acid_place[degree.column], degree.value), len(acid_met)),
        acid_names=tuple(acids.names[a] for a in acid_met),
    )
