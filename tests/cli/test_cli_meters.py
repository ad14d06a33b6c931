"""reconcile meters as whole commands: what it prints and writes, and its exit codes."""

from __future__ import annotations

import csv
import json
from datetime import date, timedelta
from pathlib import Path

import pytest
from command_line import Run

CALIBRATIONS = "calibrations.csv"


def write_calibrations(folder: Path, fall: float = 0.05, rows: int = 30) -> str:
    """One meter whose slope falls from 99 % by `fall` % a day, calibrated every third day of a made-up quarter."""
    lines = ["Meter,Probe,Calibrated at,Slope (%),Offset (mV)"]
    for i in range(rows):
        day = 3 * i
        slope = 99.0 - fall * day + 0.2 * ((i % 3) - 1)
        lines.append(f"M-1,E-1,{date(2025, 1, 6) + timedelta(days=day)} 08:00,{slope:.1f},{1.0 + 0.5 * (i % 2):.1f}")
    (folder / CALIBRATIONS).write_text("\n".join(lines) + "\n", encoding="utf-8")
    return CALIBRATIONS


def test_it_writes_the_folder_and_prints_the_gist(run: Run, tmp_path: Path) -> None:
    done = run("meters", write_calibrations(tmp_path))
    assert done.code == 0
    there = "reports/calibrations_meters"
    assert {
        f"{there}/meters.html",
        f"{there}/manifest.json",
        f"{there}/lines.csv",
        f"{there}/crossings.csv",
    } <= done.files
    assert f"{there}/plots/calibrations_1.png" in done.files
    assert "30 calibrations of 1 meter and 1 probe" in done.out
    assert "does not extend a calibration interval" in done.out
    assert "A flag is a lead for the quality unit, not a disposition." in done.out
    assert done.err == ""


def test_json_prints_only_json(run: Run, tmp_path: Path) -> None:
    """99 - 0.05 d is 95 after 80 days, put in."""
    done = run("meters", write_calibrations(tmp_path), "--json", "--out", "there")
    found = json.loads(done.out)
    assert found["meters"] == ["M-1"]
    line = next(x for x in found["lines"] if x["quantity"] == "slope")
    low, high = line["rate_interval95"]
    assert low < 30 * -0.05 < high
    assert line["calibrations"] == 30
    cross = next(x for x in found["crossings"] if x["limit"] == 95)
    assert cross["judged"] is False
    assert cross["earliest"] < cross["at"] < cross["latest"]
    assert "does not extend" in found["notice"]
    with (tmp_path / "there" / "lines.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert float(rows[0]["rate_30d"]) == pytest.approx(line["rate"], rel=1e-5)


def test_strict_minds_a_calibration_outside_the_limits(run: Run, tmp_path: Path) -> None:
    """From 99 % by 0.12 % a day to 88.6 %: below the 90 % of the settings at the end."""
    assert run("meters", write_calibrations(tmp_path), "--strict", "--out", "fine").code == 0
    done = run("meters", write_calibrations(tmp_path, fall=0.12), "--strict", "--out", "low")
    assert done.code == 3
    assert "slope below 90 %" in done.out


def test_limits_come_from_the_settings(run: Run, tmp_path: Path) -> None:
    (tmp_path / "site.toml").write_text("[meters]\nslope_low_percent = 98.0\n", encoding="utf-8")
    done = run("meters", write_calibrations(tmp_path), "--settings", "site.toml", "--strict")
    assert done.code == 3
    assert "slope below 98 %" in done.out


def test_a_report_is_replaced_only_when_told_to(run: Run, tmp_path: Path) -> None:
    name = write_calibrations(tmp_path)
    assert run("meters", name, "--out", "there").code == 0
    again = run("meters", name, "--out", "there")
    assert again.code == 2
    assert "--replace" in again.err
    assert run("meters", name, "--out", "there", "--replace").code == 0


def test_a_refused_file_leaves_nothing_behind(run: Run, tmp_path: Path) -> None:
    (tmp_path / "shapes.csv").write_text("colour,shape\nred,round\n", encoding="utf-8")
    done = run("meters", "shapes.csv")
    assert (done.code, done.out) == (1, "")
    assert "no heading row was recognised" in done.err
    assert "Nothing was written" in done.err
    assert done.files == {"shapes.csv"}


def test_over_five_percent_set_aside_is_incomplete(run: Run, tmp_path: Path) -> None:
    lines = ["Read at,Known solution,Meter,Temperature (°C),pH"]
    for i in range(24):
        lines.append(f"2025-03-{1 + i:02d} 09:00,phosphate,M-{i % 4 + 1},25.0,{'see print' if i in (3, 7) else 6.86}")
    (tmp_path / "checks.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    done = run("meters", "checks.csv")
    assert done.code == 4
    assert "2 of 24 rows were set aside" in done.out
    assert "the record holds no calibrations" in done.out


def test_the_sample_is_made_by_its_script_and_shows_what_was_planted(run: Run, tmp_path: Path) -> None:
    from openpyxl import load_workbook

    from sample_data import make_meter_room

    committed = Path(make_meter_room.__file__).parent / "meter_room.xlsx"
    make_meter_room.main(tmp_path)

    def cells(path: Path) -> list[list[tuple[object, ...]]]:
        return [list(sheet.iter_rows(values_only=True)) for sheet in load_workbook(path)]

    assert cells(committed) == cells(tmp_path / "meter_room.xlsx")
    found = json.loads(run("meters", str(committed), "--json").out)
    (step,) = found["steps"]
    assert (step["subject"], step["quantity"]) == ("Bench 3", "offset")
    assert step["interval95"][0] < 12.0 < step["interval95"][1]
    rate = next(x for x in found["between_calibrations"] if x["meter"] == "Bench 4")
    assert rate["interval95"][0] < 0.006 < rate["interval95"][1]
    assert rate["interval95"][0] > 0
    ahead = next(x for x in found["crossings"] if x["subject"] == "Bench 1" and x["limit"] == 90)
    assert ahead["earliest"] < "2025-10-27" < ahead["latest"]  # 98.8 - 0.03 d is 90 after 293 days
