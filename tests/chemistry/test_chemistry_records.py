"""Predictions for the readings of a record, and for supposed changes to it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from builders import READINGS_HEAD, RECIPES_HEAD, STOCKS_HEAD, records_from_rows

from reconcile.chemistry import engine
from reconcile.chemistry.predict import predict_ph, predict_records, repredictor
from reconcile.records.book import BatchRecords
from reconcile.records.results import Change, Prediction
from reconcile.records.settings import Settings
from reconcile.records.standards import standard_ph
from reconcile.records.substances import catalogue

ROOT3 = np.sqrt(3.0)
HEAD = (*READINGS_HEAD, "Known solution", "Reference temperature (°C)")
READINGS = [
    HEAD,
    ("2026-03-02 09:00", "B1", "M1", 25.0, 4.66, None, None),
    ("2026-03-02 09:10", "B1", "M2", 25.0, 4.67, None, None),
    ("2026-03-02 09:20", "B1", "M1", 37.0, 4.66, None, None),
    ("2026-03-02 09:30", "B2", "M1", None, 7.02, None, None),
    ("2026-03-02 09:40", "B2", "M1", 31.0, 7.05, None, 25.0),
    ("2026-03-02 09:50", None, "M1", 25.0, 4.01, "phthalate", None),
    ("2026-03-02 10:00", "B3", "M1", 25.0, 8.1, None, None),
]
RECIPES = [
    RECIPES_HEAD,
    ("B1", "acetic acid", "A1", 50, "mM", None, None),
    ("B1", "sodium acetate", "S1", 50, "mM", None, None),
    ("B2", "potassium dihydrogen phosphate", "P1", 25, "mM", None, None),
    ("B2", "disodium hydrogen phosphate", "P2", 25, "mM", None, None),
    ("B3", "Tris", "T1", 6.057, "g", 1, "L"),
    ("B3", "hydrochloric acid", "H1", 25, "mL", 1, "L"),
]
STOCKS = [
    STOCKS_HEAD,
    ("A1", "acetic acid", None, None, None, None, 1.0),
    ("S1", "sodium acetate", None, None, None, None, 2.0),
    ("P1", "potassium dihydrogen phosphate", None, None, None, None, 1.0),
    ("P2", "disodium hydrogen phosphate", None, None, None, None, 1.0),
    ("T1", "Tris", None, None, None, None, 0.5),
    ("H1", "hydrochloric acid", 1.0, "mol/L", None, None, 0.5),
]


@pytest.fixture(scope="module")
def records() -> BatchRecords:
    return records_from_rows(READINGS, RECIPES, STOCKS)


@pytest.fixture(scope="module")
def prediction(records: BatchRecords) -> Prediction:
    return predict_records(records, Settings({"uncertainty.carbon_dioxide_umol_kg": 0.0}))


def same(one: Prediction, other: Prediction, rows: list[int]) -> None:
    """Bit for bit the same values in `other` as in the given rows of `one`."""
    for name in ("ph", "u", "ionic_strength", "buffer_capacity", "temperature_c", "d_temperature", "d_model"):
        assert np.array_equal(getattr(other, name), getattr(one, name)[rows], equal_nan=True), name
    assert other.status.tolist() == one.status[rows].tolist()
    for share in one.budget:
        assert np.array_equal(other.budget[share], one.budget[share][rows], equal_nan=True), share
    assert np.array_equal(other.contributions.dense(), one.contributions.dense()[rows])


def contribution(records: BatchRecords, substance: str) -> int:
    """Index of the one contribution of a substance."""
    forms = [records.forms[i].name for i in records.solutions.form]
    assert forms.count(substance) == 1
    return forms.index(substance)


def test_readings_have_the_ph_of_their_recipe_at_their_temperature(
    records: BatchRecords, prediction: Prediction
) -> None:
    assert len(records.readings) == len(READINGS) - 1
    acetate = predict_ph(["acetic acid", "sodium acetate"], [[0.05, 0.05]] * 2, [25.0, 37.0])
    assert prediction.ph[[0, 1, 2]] == pytest.approx(acetate.ph[[0, 0, 1]], abs=1e-10)
    tris = predict_ph(["Tris", "HCl"], [6.057 / records_mass(records, "Tris base"), 0.025])
    assert prediction.ph[6] == pytest.approx(tris.ph[0], abs=1e-4)
    assert prediction.status.tolist() == ["ok"] * 7


def records_mass(records: BatchRecords, name: str) -> float:
    return next(f.molar_mass for f in records.forms if f.name == name)


def test_temperatures_are_the_reference_then_the_own_then_the_rooms(prediction: Prediction) -> None:
    assert prediction.temperature_c.tolist()[:5] == [25.0, 25.0, 37.0, 22.0, 25.0]
    # half-widths 0.5 K, and 2 K for the room (settings), over the root of 3
    u = prediction.budget["temperature"][[3, 4]] / np.abs(prediction.d_temperature[[3, 4]])
    assert u == pytest.approx([2.0 / ROOT3, 0.5 / ROOT3])


def test_a_known_solution_reads_its_certified_value(records: BatchRecords, prediction: Prediction) -> None:
    certified = standard_ph("phthalate", 25.0)
    assert certified is not None
    assert prediction.ph[5] == pytest.approx(certified[0])
    assert prediction.u[5] == prediction.budget["certificate"][5] == pytest.approx(certified[1])
    assert prediction.status[5] == "ok"
    assert not np.any(prediction.contributions.row == 5)
    assert not np.any(prediction.constants.row == 5)
    assert all(prediction.budget[name][5] == 0.0 for name in prediction.budget if name != "certificate")


def test_shares_of_lots_and_of_taking(records: BatchRecords, prediction: Prediction) -> None:
    slopes = prediction.contributions.dense()[0]
    acid, salt = contribution(records, "acetic acid"), contribution(records, "sodium acetate")
    lots = np.array([0.01, 0.02]) / ROOT3  # stated tolerances, half-widths
    expected = np.hypot(slopes[acid] * lots[0], slopes[salt] * lots[1])
    assert prediction.budget["strength"][0] == pytest.approx(expected, rel=1e-9)
    taken = np.hypot(np.nan_to_num(records.solutions.u_amount[[acid, salt]]), 0.003 / ROOT3)
    assert prediction.budget["taking"][0] == pytest.approx(np.hypot(*(slopes[[acid, salt]] * taken)), rel=1e-9)
    assert prediction.u[0] ** 2 == pytest.approx(sum(share[0] ** 2 for share in prediction.budget.values()))


def test_one_lot_in_both_halves_of_a_buffer_cancels() -> None:
    """A stock buffer diluted: both contributions rest on one lot, and its strength hardly moves pH."""
    apart = records_from_rows(READINGS, RECIPES, STOCKS)
    solutions, lot = apart.solutions, int(apart.solutions.lot[contribution(apart, "acetic acid")])
    chain = solutions.chain_lot.copy()
    chain[solutions.chain_contribution == contribution(apart, "sodium acetate")] = lot
    together = replace(apart, solutions=replace(solutions, chain_lot=chain))
    one = predict_records(together, Settings()).budget["strength"][0]
    assert one < 0.1 * predict_records(apart, Settings()).budget["strength"][0]


def test_each_solution_at_each_temperature_is_solved_once(
    records: BatchRecords, monkeypatch: pytest.MonkeyPatch
) -> None:
    solved: list[int] = []
    inner = engine.solve

    def counting(chunk, model):
        solved.append(len(chunk))
        return inner(chunk, model)

    monkeypatch.setattr(engine, "solve", counting)
    predict_records(records, Settings({"uncertainty.carbon_dioxide_umol_kg": 0.0}))
    assert sum(solved) == 6  # B1 at 25 and 37, B2 at 22 and 25, the known solution, B3


def test_a_record_without_readings() -> None:
    empty = records_from_rows([HEAD, ("2026-03-02", "B9", "M1", 25.0, 7.0, None, None)], RECIPES, STOCKS)
    assert len(empty.readings) == 0
    assert len(predict_records(empty, Settings())) == 0


def test_an_unchanged_reading_is_predicted_identically(records: BatchRecords, prediction: Prediction) -> None:
    repredict = repredictor(records, Settings())
    none = Change(np.array([6, 0, 5]), np.zeros(0, np.intp))
    factor_one = Change(np.arange(7), np.arange(len(records.solutions.form)), factor=np.ones(6))
    first, second = repredict([none, factor_one])
    same(prediction, first, [6, 0, 5])
    same(prediction, second, list(range(7)))
    assert repredict([]) == []


def test_another_form_in_a_bottle(records: BatchRecords) -> None:
    rows, acid = np.array([0, 2]), np.array([contribution(records, "acetic acid")])
    (found,) = repredictor(records, Settings())([Change(rows, acid, form="formic acid")])
    expected = predict_ph(["formic acid", "sodium acetate"], [[0.05, 0.05]] * 2, [25.0, 37.0])
    assert found.ph == pytest.approx(expected.ph, abs=1e-10)
    assert found.contributions.shape == (2, len(records.solutions.form))


def test_a_factor_and_equal_mass(records: BatchRecords) -> None:
    tris, acid = contribution(records, "Tris base"), contribution(records, "hydrochloric acid")
    assert records.solutions.by_mass[tris]
    row = np.array([6])
    changes = [
        Change(row, np.array([acid]), factor=np.array([1.15])),
        Change(row, np.array([tris]), form="Tris hydrochloride", at_equal_mass=True),
        Change(row, np.array([tris]), form="Tris hydrochloride"),
        Change(row, np.array([tris, acid]), factor=np.array([0.5, 0.9])),
    ]
    found = [float(p.ph[0]) for p in repredictor(records, Settings())(changes)]
    mol = records.solutions.amount[tris]
    salt = mol * records_mass(records, "Tris base") / predict_mass("Tris hydrochloride")
    names = ["Tris", "Tris hydrochloride", "HCl"]
    rows = [[mol, 0, 0.025 * 1.15], [0, salt, 0.025], [0, mol, 0.025], [mol / 2, 0, 0.0225]]
    assert found == pytest.approx(predict_ph(names, rows).ph, abs=1e-9)


def predict_mass(name: str) -> float:
    return catalogue().by_name[name].molar_mass


def test_carbon_dioxide_taken_up(records: BatchRecords, prediction: Prediction) -> None:
    changes = [Change(np.array([6]), np.zeros(0, np.intp), dissolved_co2=m) for m in (1e-4, 1e-3)]
    found = [float(p.ph[0]) for p in repredictor(records, Settings())(changes)]
    assert prediction.ph[6] > found[0] > found[1]


def test_more_carbon_dioxide_lost_than_there_is_is_not_solved(records: BatchRecords) -> None:
    (found,) = repredictor(records, Settings())([Change(np.array([6]), np.zeros(0, np.intp), dissolved_co2=-1e-3)])
    assert found.status.tolist() == ["not_solved"]


def test_a_change_beyond_the_library_is_the_callers_mistake(records: BatchRecords) -> None:
    with pytest.raises(ValueError, match="no form of the library"):
        repredictor(records, Settings())([Change(np.array([0]), np.array([0]), form="unobtainium")])


def test_many_changes_are_one_run(records: BatchRecords, monkeypatch: pytest.MonkeyPatch) -> None:
    calls: list[int] = []
    inner = engine.pad

    def counting(contents, rows, *rest):
        calls.append(len(rows))
        return inner(contents, rows, *rest)

    monkeypatch.setattr(engine, "pad", counting)
    acid = np.array([contribution(records, "acetic acid")])
    changes = [Change(np.array([0, 1, 2]), acid, form=f.name) for f in catalogue().forms]
    found = repredictor(records, Settings())(changes)
    assert len(calls) == 1
    assert calls[0] == 2 * len(changes)  # readings 0 and 1 are one solution at one temperature
    assert all(len(p) == 3 and p.ph[0] == p.ph[1] for p in found)


def test_rows_of_a_bad_temperature_are_not_solved() -> None:
    rows = [HEAD, ("2026-03-02 09:00", "B1", "M1", 105.0, 4.66, None, None), READINGS[1]]
    found = predict_records(records_from_rows(rows, RECIPES, STOCKS), Settings())
    assert found.status.tolist() == ["not_solved", "ok"]
