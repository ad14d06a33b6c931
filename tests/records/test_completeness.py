"""When a record counts as incomplete (the limits are those of the commands' exit code 4)."""

from __future__ import annotations

from pathlib import Path

import reconcile
from reconcile.records.book import BatchRecords
from reconcile.records.completeness import shortfalls


def record(folder: Path, rows: list[str]) -> BatchRecords:
    """Check readings of a published standard buffer: each row is "meter,pH" or a whole line."""
    lines = ["Known solution,Meter,pH", *(f"phosphate,{row}" for row in rows)]
    file = folder / "checks.csv"
    file.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return reconcile.read(file)


def test_a_complete_record_has_no_shortfall(tmp_path: Path) -> None:
    assert shortfalls(record(tmp_path, ["M-1,6.86"] * 20)) == ()


def test_five_percent_exactly_is_still_complete(tmp_path: Path) -> None:
    assert shortfalls(record(tmp_path, ["M-1,6.86"] * 19 + ["M-1,?"])) == ()


def test_over_five_percent_is_not(tmp_path: Path) -> None:
    (text,) = shortfalls(record(tmp_path, ["M-1,6.86"] * 18 + ["M-1,?", "M-1,"]))
    assert text.startswith("2 of 20 rows")


def test_under_twenty_rows_the_share_is_not_judged(tmp_path: Path) -> None:
    assert shortfalls(record(tmp_path, ["M-1,6.86"] * 17 + ["M-1,?", "M-1,"])) == ()


def test_a_meter_lost_altogether_from_three_rows_on(tmp_path: Path) -> None:
    assert shortfalls(record(tmp_path, ["M-1,6.86"] * 5 + ["M-2,", "M-2,?"])) == ()
    lost = shortfalls(record(tmp_path, ["M-1,6.86"] * 5 + ["M-2,", "M-2,?", "M-2,none"]))
    assert lost == ("Every row of meter M-2 was set aside (3 rows).",)


def test_a_lot_lost_altogether(tmp_path: Path) -> None:
    """Lots A and B share their rows set aside; A is also used elsewhere, so only B is lost."""
    readings = ["Batch,pH", *(f"B-{i},4.66" for i in range(4)), *(f"C-{i},?" for i in range(3))]
    recipes = ["Batch,Substance,Lot,Amount,Unit"]
    recipes += [f"B-{i},{name},A,50,mM" for i in range(4) for name in ("acetic acid", "sodium acetate")]
    recipes += [f"C-{i},{name},{lot},50,mM" for i in range(3) for name, lot in (("acetic acid", "A"), ("NaCl", "B"))]
    (tmp_path / "readings.csv").write_text("\n".join(readings) + "\n", encoding="utf-8")
    (tmp_path / "recipes.csv").write_text("\n".join(recipes) + "\n", encoding="utf-8")
    found = shortfalls(reconcile.read(tmp_path / "readings.csv", tmp_path / "recipes.csv"))
    assert found == ("Every row of lot B was set aside (3 rows).",)
