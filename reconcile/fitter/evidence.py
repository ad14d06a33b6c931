"""The readings of a record that bear on the acid under study, laid out for the fit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import activity_model
from reconcile.chemistry.composition import CARBONIC, entries_at, form_table
from reconcile.chemistry.of_records import Record, laid_out
from reconcile.chemistry.uncertainty import ROOT3
from reconcile.chemistry.water import co2_solubility
from reconcile.fitter.cases import Cases, Medium
from reconcile.fitter.further_acids import only
from reconcile.fitter.model import without_uncertainty
from reconcile.records.arrays import BoolArray, FloatArray, IntArray, TextArray
from reconcile.records.book import BatchRecords
from reconcile.records.settings import Settings

LEAST_NOISE = 1e-4
"""Standard deviation below which no reading is taken to be [pH], whatever the settings: no pH meter reaches it."""


@dataclass(frozen=True)
class Evidence:
    """n readings of solutions that hold the studied acid, and what is needed to fit and to judge them.

    index : IntArray (n,)        readings of the record
    status : TextArray (n,)      "used", "void", "adjusted", "outside_electrode_range" or "not_solved"
    cases : Cases                all n readings as one case
    origin : IntArray (c,)       contribution of the record behind every contribution of the cases
    observed, temperature, u_temperature : FloatArray (n,)
    floor, averaged, given : FloatArray (n,)   as in Scatter
    series : TextArray (n,)      name of the titration series, "" for a solution made by itself
    record : Record              what the record says, with lots and their uncertainties
    acids : AcidTable            acids of the medium, with their uncertainties
    """

    records: BatchRecords
    settings: Settings
    medium: Medium
    acids: AcidTable
    index: IntArray
    status: TextArray
    cases: Cases
    origin: IntArray
    observed: FloatArray
    temperature: FloatArray
    u_temperature: FloatArray
    floor: FloatArray
    averaged: FloatArray
    given: FloatArray
    series: TextArray
    record: Record

    def __len__(self) -> int:
        return len(self.index)

    def only(self, keep: BoolArray) -> Evidence:
        """Some of the readings."""
        rows = np.flatnonzero(keep)
        entry, _ = entries_at(self.cases.start, rows)
        return Evidence(
            self.records, self.settings, self.medium, self.acids, self.index[rows], self.status[rows],
            self.cases.of_readings(rows, np.array([len(rows)])), self.origin[entry], self.observed[rows],
            self.temperature[rows], self.u_temperature[rows], self.floor[rows], self.averaged[rows], self.given[rows],
            self.series[rows], self.record,
        )  # fmt: skip


def holds(records: BatchRecords, acid: str) -> BoolArray:
    """Solutions that hold some of an acid, (s,)."""
    brings = np.array([acid in form.acids for form in records.forms], bool)
    found = np.zeros(len(records.solutions), bool)
    if len(brings):
        some = brings[records.solutions.form] & ~(records.solutions.amount == 0.0)
        found[records.solutions.solution[some]] = True
    return found


def met(records: BatchRecords, acids: AcidTable, acid: str) -> AcidTable:
    """Of a table, the acids that the forms of a record bring, with the one under study."""
    return only(acids, [acid, CARBONIC, *(name for form in records.forms for name in form.acids)])


def medium_of(records: BatchRecords, settings: Settings, acids: AcidTable, acid: str) -> Medium:
    """The chemistry that all solutions of a record share, with one acid under study."""
    plain = without_uncertainty(acids)
    model = activity_model(settings["prediction.activity_model"])
    return Medium(form_table(records.forms, plain), plain, plain.index[acid], model)


def layout(record: Record, reading: IntArray, temperature: FloatArray) -> tuple[Cases, IntArray]:
    """Some readings of a record as one case, and the record's contribution behind each of its contributions."""
    solution = np.asarray(record.records.readings_solution, np.intp)[reading]
    origin, _ = entries_at(record.start, solution)
    counts = np.diff(record.start)[solution]
    air = np.zeros(len(reading))
    if record.settings["prediction.open_to_air"]:
        pressure = record.settings["prediction.co2_partial_pressure_atm"]
        air = np.nan_to_num(co2_solubility(temperature)[0] * pressure)
    cases = Cases(
        np.array([0, len(reading)], np.intp),
        np.concatenate([[0], np.cumsum(counts)]).astype(np.intp),
        np.asarray(record.records.solutions.form, np.intp)[origin],
        record.amount[origin],
        temperature,
        air,
    )
    return cases, origin


def evidence(
    records: BatchRecords, settings: Settings, acids: AcidTable, acid: str, noise: float | None = None
) -> Evidence:
    """Every reading of a solution that holds the acid.

    noise : standard deviation of a reading [pH], where it is given; else the record's own statement, or an estimate
    """
    record, acids = laid_out(records, settings), met(records, acids, acid)
    table = records.readings
    index = np.flatnonzero(holds(records, acid)[np.asarray(records.readings_solution, np.intp)])
    temperature = record.temperature_c[index]
    cases, origin = layout(record, index, temperature)
    resolution = np.nan_to_num(np.asarray(table["resolution"], float)[index]) / np.sqrt(12.0)
    averaged = np.asarray(table["averaged"], float)[index]
    stated = np.asarray(table["u_reading"], float)[index] / ROOT3  # a half-width, as everywhere in the record
    if noise is not None:
        stated = np.full(len(index), noise)
    return Evidence(
        records,
        settings,
        medium_of(records, settings, acids, acid),
        acids,
        index,
        _statuses(records, settings, index, cases),
        cases,
        origin,
        np.asarray(table["ph"], float)[index],
        temperature,
        record.u_temperature[index],
        np.maximum(resolution, max(settings["uncertainty.noise_floor"], LEAST_NOISE)),
        np.where(averaged >= 1.0, averaged, 1.0),
        np.where(stated > 0.0, stated, np.nan),
        np.asarray(table["series"], object)[index],
        record,
    )


def _left_open(records: BatchRecords, index: IntArray) -> BoolArray:
    """Readings of solutions with an amount that the record leaves to a pH: that pH is no evidence for constants."""
    held = np.zeros(len(records.solutions), bool)
    held[records.solutions.solution[records.open_amounts.contribution]] = True
    return held[np.asarray(records.readings_solution, np.intp)[index]]


def _statuses(records: BatchRecords, settings: Settings, index: IntArray, cases: Cases) -> TextArray:
    table = records.readings
    ph = np.asarray(table["ph"], float)[index]
    status = np.full(len(index), "used", object)
    outside = (ph < settings["status.electrode_low_ph"]) | (ph > settings["status.electrode_high_ph"])
    status[outside] = "outside_electrode_range"
    unknown = np.bincount(cases.reading, ~np.isfinite(cases.amount), cases.readings) > 0.0
    unknown |= ~((cases.temperature_c >= 0.0) & (cases.temperature_c <= 100.0)) | ~np.isfinite(ph)
    status[unknown] = "not_solved"
    status[_left_open(records, index)] = "adjusted"
    status[table["standing"][index] == "void"] = "void"
    return status
