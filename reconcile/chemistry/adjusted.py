"""Amounts that a record leaves to a pH, solved from that pH through the engine."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace

import numpy as np

from reconcile.chemistry.amount_sought import Entry, Sought, answers_at, find_amounts, sought
from reconcile.chemistry.composition import form_table
from reconcile.chemistry.engine import Answers
from reconcile.chemistry.of_records import Record, laid_out, predict_rows
from reconcile.chemistry.prediction import u_of_model
from reconcile.chemistry.settling import Job, anchors, jobs_of
from reconcile.chemistry.uncertainty import ROOT3
from reconcile.chemistry.usual_amounts import amount_notes, usual_amounts
from reconcile.chemistry.water import DENSITY_20C, co2_solubility
from reconcile.records.adjusting import Solved
from reconcile.records.arrays import FloatArray, Triplets
from reconcile.records.book import BatchRecords
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings

LABEL_C = 25.0
"""Temperature that a stock's pH is taken to be stated at where it is not said [°C]; labels mean it so."""
LEAST = 1e-12
"""Amount in place of none at all, so that its logarithm has a slope."""


@dataclass
class _Found:
    """What is known so far of the open amounts (k,); fields as in Solved."""

    amount: FloatArray
    u: FloatArray
    ph: FloatArray
    u_ph: FloatArray
    temperature_c: FloatArray
    weight: FloatArray
    d_model: FloatArray
    d_temperature: FloatArray
    reading: list[int]
    constants: dict[int, dict[tuple[str, int], float]]
    contributions: dict[int, dict[int, float]]

    @classmethod
    def nothing(cls, k: int) -> _Found:
        a, b, c, d, e, f, g, h = (np.full(k, np.nan) for _ in range(8))
        return cls(a, b, c, d, e, f, g, h, [-1] * k, {}, {})


def with_adjustments(records: BatchRecords, settings: Settings) -> BatchRecords:
    """The record with every open amount solved that a reading or a stated pH settles.

    Parameters
    ----------
    records : BatchRecords
        As read; amounts solved before are solved anew.
    settings : Settings
        Activity model, temperatures and uncertainties.

    Returns
    -------
    BatchRecords
        With `solved`, and with finite amounts in place of those left open. An amount that nothing settles, or for which
        no amount of the titrant gives the pH, stays NaN, and the readings that rest on it are not solved.

    Notes
    -----
    The pH that settles an amount is taken as it stands. Its uncertainty, that of everything else in the solution, and
    how both carry on to other solutions, come with it (JCGM 100:2008, 5.1; implicit differentiation of
    pH(x, theta) = pH: d ln x / d theta = -(dpH/d theta) / (dpH/d ln x)).
    """
    opens = records.open_amounts
    if not len(opens):
        return records
    jobs = jobs_of(records)
    found = _Found.nothing(len(opens))
    waiting = list(jobs)
    while waiting:
        known = {k for k in range(len(opens)) if np.isfinite(found.amount[k])}
        ready = [job for job in waiting if job.needs <= known]
        if not ready:
            break
        waiting = [job for job in waiting if job not in ready]
        _settle(records, settings, [job for job in ready if job.reading >= 0], found)
        _settle_stated(records, settings, [job for job in ready if job.reading < 0], found)
    solved = _solved(records, found, jobs)
    usual, low, high, like, odd = usual_amounts(records, solved)
    solved = replace(solved, usual=usual, usual_low=low, usual_high=high, like=like, odd=odd)
    kept = tuple(note for note in records.notes if note.code not in ("amount-odd", "amount-none"))
    return replace(_filled(records, solved), notes=(*kept, *amount_notes(records, solved)))


def _filled(records: BatchRecords, solved: Solved) -> BatchRecords:
    """The record with some amounts filled in."""
    opens, amount = records.open_amounts, np.array(records.solutions.amount, np.float64)
    x = solved.amount[opens.owner]
    amount[opens.contribution] = opens.per_unit * np.where(x == 0.0, LEAST, x)
    return replace(records, solutions=replace(records.solutions, amount=amount), solved=solved)


def _solved(records: BatchRecords, found: _Found, jobs: list[Job]) -> Solved:
    k, c = len(records.open_amounts), len(records.solutions.solution)
    names = sorted({name for some in found.constants.values() for name in some})
    place = {name: i for i, name in enumerate(names)}
    anchor, adjusted = anchors(records, jobs)
    return Solved(
        amount=found.amount, u=found.u, ph=found.ph, u_ph=found.u_ph, temperature_c=found.temperature_c,
        reading=np.array(found.reading, np.intp), usual=np.full(k, np.nan), usual_low=np.full(k, np.nan),
        usual_high=np.full(k, np.nan), like=np.zeros(k, np.intp), odd=np.zeros(k, bool), anchor=anchor,
        adjusted=adjusted, weight=found.weight,
        constants=_triplets({j: {place[n]: v for n, v in some.items()} for j, some in found.constants.items()}, k,
                            len(names)),
        constant_names=tuple(names), contributions=_triplets(found.contributions, k, c),
        d_model=found.d_model, d_temperature=found.d_temperature,
    )  # fmt: skip


def _triplets(cells: dict[int, dict[int, float]], rows: int, columns: int) -> Triplets:
    flat = [(j, column, value) for j, some in sorted(cells.items()) for column, value in sorted(some.items())]
    row, column = (np.array([one[i] for one in flat], np.intp) for i in (0, 1))
    return Triplets(row, column, np.array([value for _, _, value in flat], np.float64), (rows, columns))


# -- settled by readings --------------------------------------------------------------------------------------------


def _settle(records: BatchRecords, settings: Settings, jobs: list[Job], found: _Found) -> None:
    """Solve what readings settle."""
    if not jobs:
        return
    opens, solutions = records.open_amounts, records.solutions
    record = laid_out(_so_far(records, found, jobs), settings)
    owner = np.full(len(solutions.solution), -1, np.intp)
    owner[opens.contribution] = opens.owner
    per_unit = np.zeros(len(owner))
    per_unit[opens.contribution] = opens.per_unit
    tried = [(job, k) for job in jobs for k in job.opens]
    entries: list[list[Entry]] = []
    for job, k in tried:
        s = int(records.readings_solution[job.reading])
        density = 1.0 if solutions.per_kg_water[s] else DENSITY_20C
        some: list[Entry] = []
        for c in range(int(record.start[s]), int(record.start[s + 1])):
            mine = owner[c] in job.opens
            unit = per_unit[c] / density if owner[c] == k else 0.0
            some.append((int(solutions.form[c]), 0.0 if mine else float(record.amount[c]), float(unit)))
        entries.append(some)
    reading = np.array([job.reading for job, _ in tried], np.intp)
    ph, at = records.readings["ph"][reading].astype(float), record.temperature_c[reading]
    amount = _amounts(record, entries, ph, at)
    for job in jobs:
        _choose(job, tried, amount, found)
    rows = np.array([job.reading for job in jobs], np.intp)
    partly = laid_out(_so_far(records, found, jobs), settings)
    there = predict_rows(partly, (), np.full(len(rows), -1, np.intp), rows)
    by_row = _by_row(there)
    u_reading = _u_reading(records, rows, settings)
    for i, job in enumerate(jobs):
        constants, contributions = by_row[i]
        slope = sum(contributions.get(c, 0.0) for c in np.flatnonzero(np.isin(owner, job.opens)).tolist())
        u_t = float(there.d_temperature[i] * partly.u_temperature[rows[i]])
        for k in job.opens:
            found.ph[k], found.temperature_c[k] = float(records.readings["ph"][rows[i]]), float(there.temperature_c[i])
            found.u_ph[k], found.reading[k] = float(np.hypot(u_reading[i], u_t)), int(rows[i])
            if found.amount[k] == 0.0 or not np.isfinite(found.amount[k]) or slope == 0.0:
                continue
            found.weight[k] = 1.0 / slope
            found.d_model[k], found.d_temperature[k] = float(there.d_model[i]), float(there.d_temperature[i])
            found.constants[k], found.contributions[k] = constants, contributions
            u_rest = float(np.sqrt(max(there.u[i] ** 2 - u_t**2, 0.0)))
            found.u[k] = abs(found.amount[k] / slope) * float(np.hypot(found.u_ph[k], u_rest))


def _so_far(records: BatchRecords, found: _Found, jobs: list[Job]) -> BatchRecords:
    """The record with what is known; the links of what is being solved are left out."""
    solved = _solved(records, found, [])
    weight = solved.weight.copy()
    weight[[k for job in jobs for k in job.opens]] = np.nan
    return _filled(records, replace(solved, weight=weight))


def _amounts(record: Record, entries: list[list[Entry]], ph: FloatArray, at: FloatArray) -> FloatArray:
    forms = record.records.forms
    signed = np.array([all(not forms[f].acids for f, _, unit in some if unit) for some in entries], bool)
    air = np.zeros(len(ph))
    if record.settings["prediction.open_to_air"]:
        air = np.nan_to_num(co2_solubility(at)[0] * record.settings["prediction.co2_partial_pressure_atm"])
    wanted = sought(entries, ph, at, air, signed)
    return find_amounts(wanted, form_table(forms, record.acids), record.acids, record.model)


def _choose(job: Job, tried: list[tuple[Job, int]], amount: FloatArray, found: _Found) -> None:
    """Of alternatives, the first that takes a positive amount; else the first that gives the pH at all."""
    mine = {k: float(x) for (one, k), x in zip(tried, amount.tolist(), strict=True) if one is job}
    finite = [k for k in job.opens if np.isfinite(mine[k])]
    used = next((k for k in finite if mine[k] >= 0.0), finite[0] if finite else -1)
    for k in job.opens:
        found.amount[k] = mine[k] if k == used else np.nan if used < 0 else 0.0


def _by_row(there: Prediction) -> list[tuple[dict[tuple[str, int], float], dict[int, float]]]:
    """dpH/dpKa by constant, and dpH/d ln(amount) by contribution, of every row."""
    out: list[tuple[dict[tuple[str, int], float], dict[int, float]]] = [({}, {}) for _ in range(len(there))]
    t = there.constants
    for i, q, value in zip(t.row.tolist(), t.column.tolist(), t.value.tolist(), strict=True):
        name = there.constant_names[q]
        out[i][0][name] = out[i][0].get(name, 0.0) + value
    t = there.contributions
    for i, c, value in zip(t.row.tolist(), t.column.tolist(), t.value.tolist(), strict=True):
        out[i][1][c] = out[i][1].get(c, 0.0) + value
    return out


def _u_reading(records: BatchRecords, rows: Iterable[int], settings: Settings) -> FloatArray:
    """Standard uncertainty of single readings: the meter's accuracy, the display, the floor of the noise [pH]."""
    stated = {str(m): float(a) for m, a in zip(records.meters["meter"], records.meters["accuracy"], strict=True)}
    default = float(settings["uncertainty.meter_accuracy"])
    out = []
    for i in rows:
        accuracy = stated.get(str(records.readings["meter"][i]), default)
        accuracy = accuracy if np.isfinite(accuracy) and accuracy > 0 else default
        display = np.nan_to_num(records.readings["resolution"][i]) / np.sqrt(12.0)
        out.append(np.sqrt(accuracy**2 / 3.0 + max(display, settings["uncertainty.noise_floor"]) ** 2))
    return np.array(out, np.float64)


# -- settled by a stated pH -----------------------------------------------------------------------------------------


def _settle_stated(records: BatchRecords, settings: Settings, jobs: list[Job], found: _Found) -> None:
    """Solve what the stated pH of a stock settles."""
    if not jobs:
        return
    opens = records.open_amounts
    record = laid_out(records, settings)
    tried = [(job, k) for job in jobs for k in job.opens]
    ph = np.array([opens.stated_ph[k] for _, k in tried])
    said = np.array([opens.stated_at[k] for _, k in tried])
    at = np.where(np.isfinite(said), said, LABEL_C)
    entries: list[list[Entry]] = []
    for job, k in tried:
        parts = np.flatnonzero(opens.part_owner == k)
        some: list[Entry] = []
        for p in parts.tolist():
            form, held, owner = (
                int(opens.part_form[p]),
                float(opens.part_amount[p]) / DENSITY_20C,
                int(opens.part_open[p]),
            )
            if owner == k:
                some.append((form, 0.0, held))
            elif owner < 0:
                some.append((form, held, 0.0))
            elif owner not in job.opens:
                some.append((form, held * float(found.amount[owner]), 0.0))
        entries.append(some)
    amount = _amounts(record, entries, ph, at)
    for job in jobs:
        _choose(job, tried, amount, found)
    forms = record.records.forms
    wanted = sought(entries, ph, at, np.zeros(len(ph)), np.zeros(len(ph), bool))
    table = form_table(forms, record.acids)
    answers = answers_at(wanted, np.where(np.isfinite(amount), amount, 0.0), table, record.acids, record.model)
    half = float(settings["uncertainty.stock_ph"])
    kelvin = np.where(
        np.isfinite(said), settings["uncertainty.temperature_k"], settings["uncertainty.room_temperature_k"]
    )
    for i, (_, k) in enumerate(tried):
        u_t = float(answers.d_temperature[i] * kelvin[i] / ROOT3)
        found.ph[k], found.temperature_c[k], found.u_ph[k] = ph[i], at[i], float(np.hypot(half / ROOT3, u_t))
        if found.amount[k] == 0.0 or not np.isfinite(found.amount[k]):
            continue
        _carry(record, wanted, answers, i, k, found)


def _carry(record: Record, wanted: Sought, answers: Answers, i: int, k: int, found: _Found) -> None:
    """How the counter-ion of a stock follows the stated pH and the library's constants."""
    inside = slice(int(wanted.start[i]), int(wanted.start[i + 1]))
    slope = float(answers.entry[inside][wanted.per_unit[inside] != 0.0].sum())
    if slope == 0.0:
        return
    found.weight[k] = 1.0 / slope
    found.d_model[k], found.d_temperature[k] = float(answers.d_model[i]), float(answers.d_temperature[i])
    some = slice(int(answers.constants.start[i]), int(answers.constants.start[i + 1]))
    column, value = answers.constants.column[some], answers.constants.value[some]
    names = record.acids.constant_names
    found.constants[k] = {names[q]: v for q, v in zip(column.tolist(), value.tolist(), strict=True)}
    u_model = u_of_model(record.model, record.settings) * float(answers.d_model[i])
    u_rest = float(np.sqrt((value * record.acids.u[column]) @ (value * record.acids.u[column]) + u_model**2))
    found.u[k] = abs(found.amount[k] / slope) * float(np.hypot(found.u_ph[k], u_rest))
