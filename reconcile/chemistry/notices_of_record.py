"""Notices on the solutions of a record: which of them need a look, and one note for each sort of notice."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from reconcile.chemistry.notices import METALS, POLYOLS, SENTENCES, SOLVENTS, UPTAKE, Notice, notices, solubilities
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.arrays import IntArray
from reconcile.records.book import BatchRecords
from reconcile.records.problems import Problem
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings
from reconcile.records.substances import Form

CODE = "solution-notice"
GASEOUS_OR_GLASS = ("carbonic acid", "hydrofluoric acid")


def _may_call(form: Form) -> bool:
    """Whether a form alone may call for a notice."""
    alone = {one.substance for one in solubilities() if not one.of_acid} | set(SOLVENTS) | set(POLYOLS)
    acids = {one.substance for one in solubilities() if one.of_acid} | set(GASEOUS_OR_GLASS)
    return form.name in alone or bool(acids & set(form.acids)) or bool(set(METALS) & set(form.strong_ions))


def _to_look_at(records: BatchRecords, prediction: Prediction, settings: Settings) -> IntArray:
    """First readings (m,) of the solutions that may call for a notice; the others need no look one by one."""
    _, first = np.unique(np.asarray(records.readings_solution, np.intp), return_index=True)
    solutions = records.solutions
    calls = np.zeros(len(solutions), bool)
    if len(records.forms):
        named = np.array([_may_call(form) for form in records.forms], bool)
        calls = np.bincount(solutions.solution, named[solutions.form], len(solutions)) > 0.0
    strong = prediction.ionic_strength[first] > float(settings["status.outside_model_ionic_strength"])
    gas = prediction.budget.get("carbon dioxide", np.zeros(len(prediction.ph)))[first]
    return np.asarray(first[calls[records.readings_solution[first]] | strong | (gas * 3.0**0.5 > UPTAKE)])


def notices_of_record(
    records: BatchRecords, prediction: Prediction, settings: Settings
) -> dict[int, tuple[Notice, ...]]:
    """Notices on the solutions that a record's readings are of: index of the solution -> its notices, where any.

    prediction : of every reading, as predict_records gives it; the first reading of a solution speaks for it
    """
    solutions = records.solutions
    start = np.searchsorted(solutions.solution, np.arange(len(solutions) + 1))
    scale = np.where(np.asarray(solutions.per_kg_water, bool), 1.0, 1.0 / DENSITY_20C)
    out = {}
    for reading in _to_look_at(records, prediction, settings).tolist():
        solution = int(records.readings_solution[reading])
        inside = slice(int(start[solution]), int(start[solution + 1]))
        forms = [records.forms[int(f)] for f in solutions.form[inside]]
        said = notices(forms, (solutions.amount[inside] * scale[solution]).tolist(), prediction, reading, settings)
        if said:
            out[solution] = said
    return out


def noted(records: BatchRecords, prediction: Prediction, settings: Settings) -> BatchRecords:
    """The record with a note for each sort of notice: how many readings, the first of them, and its sentence."""
    count: dict[str, int] = {}
    example: dict[str, tuple[int, Notice]] = {}
    said = notices_of_record(records, prediction, settings)
    for reading, solution in enumerate(records.readings_solution.tolist()):
        for notice in said.get(solution, ()):
            count[notice.code] = count.get(notice.code, 0) + 1
            example.setdefault(notice.code, (reading, notice))
    kept = tuple(note for note in records.notes if note.code != CODE)
    new = []
    for code in SENTENCES:
        if code in example:
            reading, notice = example[code]
            place = records.place(records.readings, reading)
            new.append(Problem(CODE, place, notice.text.rstrip("."), (("count", str(count[code])),)))
    return replace(records, notes=(*kept, *new))
