"""Predictions for the readings of a record, and for supposed changes to what its solutions hold."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from reconcile.chemistry.acids import AcidTable, acid_table
from reconcile.chemistry.activity import ActivityModel, activity_model
from reconcile.chemistry.carbon_dioxide import CARBON_DIOXIDE, share_of_gas
from reconcile.chemistry.certified import with_certified
from reconcile.chemistry.composition import Contents, entries_at, form_table
from reconcile.chemistry.drawn import errors_of_record, u_drawn
from reconcile.chemistry.engine import Answers, Ragged, run
from reconcile.chemistry.linked import linked
from reconcile.chemistry.prediction import assemble, regrouped, triplets, u_of_model
from reconcile.chemistry.solve import rows_alike
from reconcile.chemistry.uncertainty import ROOT3, combined, of_independent, of_lots
from reconcile.chemistry.water import DENSITY_20C, co2_solubility
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Change, Prediction
from reconcile.records.settings import Settings
from reconcile.records.substances import Form, catalogue


@dataclass(frozen=True)
class Record:
    """What a record says, laid out for the engine.

    temperature_c, u_temperature : FloatArray (n,)   of every reading
    start : IntArray (s + 1,)                        contributions of solution i are start[i] to start[i + 1]
    amount : FloatArray (c,)                         [mol/kg]
    u_taking : FloatArray (c,)                       relative standard uncertainty of taking and preparing [-]
    chain_start, chain_lot : IntArray (c + 1,), (k,) lots that each contribution rests on
    u_lot : FloatArray (l + c,)                      lots, then one of its own for each contribution that names no lot
    """

    records: BatchRecords
    settings: Settings
    acids: AcidTable
    model: ActivityModel
    temperature_c: FloatArray
    u_temperature: FloatArray
    start: IntArray
    amount: FloatArray
    u_taking: FloatArray
    chain_start: IntArray
    chain_lot: IntArray
    u_lot: FloatArray


def reading_temperatures(records: BatchRecords, settings: Settings) -> tuple[FloatArray, FloatArray]:
    """Temperature that each reading is predicted at [°C], and its standard uncertainty [K].

    The reference temperature where the reading is stated at one, else its own, else the settings' room temperature.
    """
    table = records.readings
    own, reference = np.asarray(table["temperature"], float), np.asarray(table["reference_temperature"], float)
    given = np.where(np.isfinite(reference), reference, own)
    known = np.isfinite(given)
    u = np.where(known, settings["uncertainty.temperature_k"], settings["uncertainty.room_temperature_k"]) / ROOT3
    return np.where(known, given, settings["prediction.room_temperature_c"]), u


def laid_out(records: BatchRecords, settings: Settings) -> Record:
    solutions, lots = records.solutions, records.lots
    count, total = len(solutions.amount), len(lots)
    temperature, u_temperature = reading_temperatures(records, settings)
    molal = np.asarray(solutions.per_kg_water, bool)[solutions.solution]
    default = settings["uncertainty.lot_strength_percent"] / 100.0 / ROOT3
    named = np.bincount(solutions.chain_contribution, minlength=count) > 0
    contribution = np.concatenate([solutions.chain_contribution, np.flatnonzero(~named)]).astype(np.intp)
    lot = np.concatenate([solutions.chain_lot, total + np.flatnonzero(~named)]).astype(np.intp)
    order = np.argsort(contribution, kind="stable")
    preparation = settings["uncertainty.preparation_percent"] / 100.0 / ROOT3
    u_strength = np.asarray(lots.u_strength, float)
    return Record(
        records,
        settings,
        acid_table(settings["prediction.pk_equations"], settings["prediction.ion_pairs"], records.own),
        activity_model(settings["prediction.activity_model"]),
        temperature,
        u_temperature,
        np.searchsorted(solutions.solution, np.arange(len(solutions) + 1)).astype(np.intp),
        np.where(molal, solutions.amount, solutions.amount / DENSITY_20C),
        np.sqrt(np.nan_to_num(solutions.u_amount) ** 2 + preparation**2),
        np.concatenate([[0], np.cumsum(np.bincount(contribution, minlength=count))]).astype(np.intp),
        lot[order],
        np.concatenate([np.where(np.isfinite(u_strength), u_strength, default), np.full(count, default)]),
    )


@dataclass(frozen=True)
class _Supposed:
    """Contributions after the changes: those of u different solutions in order, with what each was in the record.

    origin : IntArray (e,), index of the contribution in the record; -1 for carbon dioxide taken up
    """

    contents: Contents
    origin: IntArray


def _form_indices(records: BatchRecords, changes: Sequence[Change]) -> tuple[list[Form], list[int]]:
    """Forms of the record and those supposed, and the index of each change's form (-1 where it keeps its own)."""
    forms = [*records.forms, CARBON_DIOXIDE]
    place = {form.name: i for i, form in enumerate(records.forms)}
    indices = []
    for change in changes:
        if change.form and change.form not in place:
            form = catalogue(records.own).by_name.get(change.form)
            if form is None:
                raise ValueError(f"no form of the library is called {change.form!r}")
            place[change.form] = len(forms)
            forms.append(form)
        indices.append(place[change.form] if change.form else -1)
    return forms, indices


def _suppose(
    record: Record, changes: Sequence[Change], change: IntArray, solution: IntArray, temperature_c: FloatArray
) -> tuple[_Supposed, list[Form]]:
    """Contents of u solutions, the i-th being `solution[i]` of the record under `change[i]` (-1 for none)."""
    records, count = record.records, len(record.amount)
    forms, supposed = _form_indices(records, changes)
    origin, row = entries_at(record.start, solution)
    form = np.asarray(records.solutions.form, np.intp)[origin]
    amount = record.amount[origin]
    touched = [i for i, c in enumerate(changes) if len(c.contributions)]
    if touched:
        key = np.concatenate([i * count + np.asarray(changes[i].contributions, np.intp) for i in touched])
        factor = np.concatenate([_factors(changes[i]) for i in touched])
        order = np.argsort(key, kind="stable")
        key, factor = key[order], factor[order]
        wanted = change[row] * count + origin
        at = np.minimum(np.searchsorted(key, wanted), len(key) - 1)
        hit = np.flatnonzero((key[at] == wanted) & (change[row] >= 0))
        new = np.array(supposed, np.intp)[change[row[hit]]]
        by_mass = np.array([c.at_equal_mass for c in changes], bool)[change[row[hit]]]
        by_mass &= np.asarray(records.solutions.by_mass, bool)[origin[hit]] & (new >= 0)
        mass = np.array([f.molar_mass for f in forms])
        new = np.where(new >= 0, new, form[hit])
        amount[hit] *= factor[at[hit]] * np.where(by_mass, mass[form[hit]] / mass[new], 1.0)
        form[hit] = new
    taken_up = np.array([c.dissolved_co2 for c in changes] + [0.0])[change]
    extra = np.flatnonzero(taken_up != 0.0)
    if len(extra):
        row = np.concatenate([row, extra])
        order = np.argsort(row, kind="stable")
        origin = np.concatenate([origin, np.full(len(extra), -1, np.intp)])[order]
        form = np.concatenate([form, np.full(len(extra), len(records.forms), np.intp)])[order]
        amount = np.concatenate([amount, taken_up[extra]])[order]
        row = row[order]
    start = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=len(solution)))]).astype(np.intp)
    air = np.zeros(len(solution))
    if record.settings["prediction.open_to_air"]:
        pressure = record.settings["prediction.co2_partial_pressure_atm"]
        air = np.nan_to_num(co2_solubility(temperature_c)[0] * pressure)
    return _Supposed(Contents(start, form, amount, temperature_c, air), origin), forms


def _factors(change: Change) -> FloatArray:
    factor = np.asarray(change.factor, float)
    return factor if len(factor) else np.ones(len(change.contributions))


def predict_rows(
    record: Record, changes: Sequence[Change], change: IntArray, reading: IntArray, closely: bool = False
) -> Prediction:
    """Prediction of r rows, the i-th being reading[i] under change[i] (-1 for none).

    closely : whether u has what needs further solving: carbon dioxide, and draws where first order does not serve
    """
    records = record.records
    solution = np.asarray(records.readings_solution, np.intp)[reading]
    temperature = record.temperature_c[reading]
    first, which = rows_alike(np.column_stack([change, solution, temperature]).astype(float))
    supposed, forms = _suppose(record, changes, change[first], solution[first], temperature[first])
    contents = supposed.contents
    table = form_table(forms, record.acids)
    answers = run(contents, table, record.acids, record.model)
    own = _own(answers, supposed)
    shares = _shares(record, own, which)
    u_temperature, drawn, gas = record.u_temperature[reading], None, np.zeros(len(first))
    if closely:
        gas = share_of_gas(contents, table, record.acids, record.model, record.settings, answers, len(records.forms))
        u_model = u_of_model(record.model, record.settings)
        chains = record.chain_start, record.chain_lot, record.u_lot, record.u_taking
        errors = errors_of_record(supposed.origin, *chains, u_temperature[first], u_model)
        amounts = np.hypot(shares["strength"], shares["taking"])[first]
        drawn = u_drawn(contents, table, record.acids, record.model, errors, answers, amounts)
    prediction = assemble(
        answers,
        contents.temperature_c,
        which,
        u_temperature,
        shares,
        triplets(regrouped(own, which), len(record.amount)),
        record.acids,
        record.model,
        record.settings,
        gas,
        drawn,
    )
    chain = record.chain_start, record.chain_lot, record.u_lot
    prediction = linked(records, prediction, reading, record.acids, record.u_taking, chain)
    return with_certified(record.records, _with_allowance(record, prediction, solution), solution)


def _with_allowance(record: Record, prediction: Prediction, solution: IntArray) -> Prediction:
    """The same, with the allowance of solutions that hold a substance declared without effect."""
    marked = record.records.solutions.without_effect
    if not len(marked) or not marked[solution].any():
        return prediction
    allowance = np.where(marked[solution], record.settings["substances.without_effect_allowance"], 0.0)
    budget = {**prediction.budget, "declared without effect": allowance}
    return replace(prediction, budget=budget, u=combined(budget))


def _own(answers: Answers, supposed: _Supposed) -> Ragged:
    """Slopes of the record's own contributions, without carbon dioxide taken up."""
    start, kept = supposed.contents.start, supposed.origin >= 0
    if kept.all():
        return Ragged(start, supposed.origin, answers.entry)
    before = np.concatenate([[0], np.cumsum(kept)]).astype(np.intp)
    return Ragged(before[start], supposed.origin[kept], answers.entry[kept])


def _shares(record: Record, own: Ragged, which: IntArray) -> dict[str, FloatArray]:
    """Shares of lots' strengths and of taking the amounts, for every row."""
    u = len(own.start) - 1
    link, entry = entries_at(record.chain_start, own.column)
    row = np.repeat(np.arange(u), np.diff(own.start))
    strength = of_lots(row[entry], record.chain_lot[link], own.value[entry], record.u_lot, u)
    taking = of_independent(own.start, own.value, record.u_taking[own.column])
    return {"strength": strength[which], "taking": taking[which]}


def predict_records(records: BatchRecords, settings: Settings) -> Prediction:
    """Predicted pH of every reading of a record.

    Parameters
    ----------
    records : BatchRecords
        n readings of solutions with c contributions in all.
    settings : Settings
        Activity model, room temperature, open to air, uncertainties, limits of the statuses.

    Returns
    -------
    Prediction
        Arrays (n,), in the order of records.readings; the columns of `contributions` are the c contributions. Readings
        of a known solution get its certified pH and uncertainty, status ok, and no contributions.

    Notes
    -----
    Each different (solution, temperature) is solved once. The share "strength" adds the effects of one lot within a
    reading before squaring; a contribution that names no lot counts as a lot of its own with the settings' tolerance.
    The share "taking" is each contribution's u_amount together with the settings' tolerance of preparation,
    independent of one another.

    References
    ----------
    JCGM 100:2008, equations 10 and 16; JCGM 101:2008 where the pH curve bends within the spread.
    """
    record = laid_out(records, settings)
    reading = np.arange(len(records.readings))
    return _at_anchors(records, predict_rows(record, (), np.full(len(reading), -1, np.intp), reading, closely=True))


def _at_anchors(records: BatchRecords, prediction: Prediction) -> Prediction:
    """The same, with the readings that settled an amount at that pH itself, which the solver met to a rounding."""
    anchor, observed = records.solved.anchor, records.readings["ph"]
    if len(anchor) != len(prediction):
        return prediction
    with np.errstate(invalid="ignore"):
        met = (anchor == np.arange(len(anchor))) & (np.abs(prediction.ph - observed) < 1e-7)
    return replace(prediction, ph=np.where(met, observed, prediction.ph))
