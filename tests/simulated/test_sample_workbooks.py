"""The sample workbooks: made by their scripts, the same each time, read whole, and true to what stands beside them."""

import csv
import json
import re
from pathlib import Path

import numpy as np
import pytest
from openpyxl import load_workbook

import reconcile
from reconcile.auditor.audit import audit
from reconcile.chemistry.predict import predict_records, repredictor
from reconcile.importer.read import read_books
from reconcile.records.settings import Settings
from sample_data import make_published_buffers, make_solution_room

SAMPLES = Path(make_solution_room.__file__).parent
TRUTH = json.loads((SAMPLES / "solution_room_truth.json").read_text(encoding="utf-8"))


def cells(path):
    return {sheet.title: list(sheet.iter_rows(values_only=True)) for sheet in load_workbook(path)}


@pytest.mark.parametrize(
    ("script", "name"),
    [(make_solution_room, "solution_room.xlsx"), (make_published_buffers, "published_buffers.xlsx")],
)
def test_scripts_make_the_committed_workbooks_and_the_same_bytes_twice(script, name, tmp_path):
    for folder in ("one", "other"):
        (tmp_path / folder).mkdir()
        script.main(tmp_path / folder)
    assert (tmp_path / "one" / name).read_bytes() == (tmp_path / "other" / name).read_bytes()
    assert cells(tmp_path / "one" / name) == cells(SAMPLES / name)
    if script is make_solution_room:
        made = json.loads((tmp_path / "one" / "solution_room_truth.json").read_text(encoding="utf-8"))
        assert made == TRUTH


def test_solution_room_is_read_whole_and_sets_aside_what_its_truth_says():
    records = read_books([SAMPLES / "solution_room.xlsx"])
    assert records.rows_read == 300 + 48  # 300 of batches, one check a week on each of six meters
    assert len(set(records.solutions.batch) - {""}) in (119, 120)  # one batch rests on a substance that nobody knows
    assert sorted(s.place.row for s in records.set_aside) == [item["row"] for item in TRUTH["set_aside"]]
    assert len(set(records.readings["meter"])) == 6


def test_planted_subjects_stand_in_the_workbook_and_meet_enough_others():
    """Each planted meter has read, and each planted lot was read on, at least four others: nothing is confounded."""
    records = read_books([SAMPLES / "solution_room.xlsx"])
    meters, rows = records.readings["meter"], np.where(records.readings["known"] == "", records.readings.row, 0)
    lots = [{str(records.lots.name[i]) for i in records.lots_of_reading(n)} for n in range(len(rows))]
    for planted in TRUTH["planted"]:
        if planted["kind"] == "reading_slip":
            batch, meter, row = planted["subject"]
            index = int(np.flatnonzero(rows == int(row))[0])
            assert (records.readings["batch"][index], meters[index]) == (batch, meter)
        elif planted["kind"].startswith("meter"):
            mine = [lot for m, lot in zip(meters, lots, strict=True) if m == planted["subject"]]
            assert len(mine) >= 40
            assert len(set().union(*mine)) >= 15
        else:
            used = [m for m, lot in zip(meters, lots, strict=True) if planted["subject"] in lot]
            assert len(used) >= 20
            assert len(set(used)) >= 5


def test_the_audit_names_exactly_what_was_planted():
    audit = reconcile.audit(SAMPLES / "solution_room.xlsx")
    planted = {
        (p["kind"], *([p["subject"]] if isinstance(p["subject"], str) else p["subject"])) for p in TRUTH["planted"]
    }
    found = {(f.kind, *((f.subject,) if isinstance(f.subject, str) else f.subject)) for f in audit.findings}
    assert found == planted
    assert sum(len(f.impact) for f in audit.findings if f.subject == "Bench 5") > 0
    slip = next(p for p in TRUTH["planted"] if p["kind"] == "reading_slip")
    check = next(f.next_check for f in audit.findings if f.kind == "reading_slip")
    meant = [float(ph) for ph in re.findall(r"pH (\d+\.\d\d) \(u", check)]
    assert meant == pytest.approx([slip["pH"], slip["pH"] + slip["estimate"]], abs=0.03)  # the slip holds, or the entry
    checks = [f.next_check for f in audit.findings if f.subject_type == "meter"]
    assert not any(f"batch {name}" in check for check in checks for name in ("borax", "phosphate", "phthalate"))


def test_implied_amounts_are_the_true_ones_but_for_what_the_adjusting_meter_was_off():
    audit = reconcile.audit(SAMPLES / "solution_room.xlsx")
    opens, solved = audit.records.open_amounts, audit.records.solved
    true = {row["batch"]: row["mol_per_litre"] for row in TRUTH["adjusted"]}
    assert set(opens.batch) == set(true)
    sound = 0
    for k, batch in enumerate(opens.batch):
        per_unit = float(opens.per_unit[opens.owner == k][0])
        off = (solved.amount[k] * per_unit - true[batch]) / (solved.u[k] * per_unit)
        if audit.records.readings["meter"][solved.reading[k]] in ("Bench 1", "Bench 4", "Hatch"):
            sound += 1
            assert abs(off) < 3.0
    assert sound >= 4


def test_published_tables_are_used_whole():
    with (SAMPLES / "published_buffers_source.csv").open(encoding="utf-8", newline="") as file:
        source = {row["number"]: row for row in csv.DictReader(file)}
    records = read_books([SAMPLES / "published_buffers.xlsx"])
    assert len(records.readings) == records.rows_read == len(source)
    assert not any(records.readings["meter"])
    assert not len(records.lots)
    for batch, ph, celsius in zip(
        records.readings["batch"], records.readings["ph"], records.readings["temperature"], strict=True
    ):
        assert (ph, celsius) == (float(source[batch]["pH"]), float(source[batch]["temperature_C"]))
    with (SAMPLES / "published_allowances.csv").open(encoding="utf-8", newline="") as file:
        allowed = list(csv.DictReader(file))
    assert {row["series"] for row in allowed} <= {row["series"] for row in source.values()}
    assert all(row["reason"] for row in allowed)


def test_published_tables_lie_within_what_is_allowed_them_and_raise_no_finding():
    # values and tolerances: the published tables, each row's source in published_buffers_source.csv
    records, settings = read_books([SAMPLES / "published_buffers.xlsx"]), Settings()
    prediction = predict_records(records, settings)
    counted = np.isin(prediction.status, ["ok", "outside_model"])
    deviation = np.abs(records.readings["ph"] - prediction.ph)
    assert np.all(deviation[counted] <= records.readings["u_reading"][counted] + 0.005)
    found = audit(records, prediction, repredictor(records, settings), settings)
    assert [(f.kind, f.subject) for f in found.findings] == []
    assert found.evidence.sum() > 600
