"""Published buffer tables as data: the constants behind them, against critically evaluated ones; sources in the csv."""

from __future__ import annotations

import csv
from pathlib import Path
from typing import Any

import pytest
from builders import workbook

import reconcile
from reconcile.records.pka_results import PkaFit

DATA = Path(__file__).parent / "data"


def table(name: str) -> list[dict[str, str]]:
    with (DATA / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def evaluated(acid: str, step: int) -> float:
    return next(
        float(r["pKa_25C_I0"]) for r in table("evaluated_constants.csv") if r["acid"] == acid and int(r["step"]) == step
    )


def fit(
    folder: Path, series: str, acid: str, most: float = 14.0, name: tuple[str, str] = ("", ""), **about: Any
) -> PkaFit:
    """The fit of one published table up to a pH; `name` puts another name in the place of one substance."""
    rows = [r for r in table("published_titrations.csv") if r["series"] == series and float(r["pH"]) <= most]
    assert len(rows) >= 8
    readings: list[tuple[Any, ...]] = [("Batch", "Temperature (°C)", "pH")]
    recipes: list[tuple[Any, ...]] = [("Batch", "Substance", "Amount", "Unit")]
    for i, r in enumerate(rows):
        batch = f"{series}-{i + 1:02d}"
        readings.append((batch, float(r["temperature_C"]), float(r["pH"])))
        for part in r["components"].split(";"):
            substance, amount = part.split("=")
            recipes.append((batch, name[1] if substance == name[0] else substance, float(amount), r["unit"]))
    book = workbook(folder / "published.xlsx", {"Readings": readings, "Recipes": recipes})
    return reconcile.fit_pka(book, acid=acid, **about)


# series, acid, step, tolerance, highest pH of the table that deserves it and why
TABLES = [
    ("KHP_NaOH", "phthalic acid", 2, 0.02, 14.0),
    ("KH2PO4_NaOH", "phosphoric acid", 2, 0.02, 14.0),
    ("BORAX_NaOH", "boric acid", 1, 0.05, 10.0),  # above, the monomer model reads progressively low (note in the csv)
    ("Walpole_acetate_0.1N", "acetic acid", 1, 0.05, 14.0),  # the older scale lies about 0.04 below the activity scale
    ("Walpole_Gomori_acetate_0.1M", "acetic acid", 1, 0.05, 14.0),
]


@pytest.mark.parametrize(("series", "acid", "step", "tolerance", "most"), TABLES, ids=[t[0] for t in TABLES])
def test_the_constant_behind_a_published_table(
    tmp_path: Path, series: str, acid: str, step: int, tolerance: float, most: float
) -> None:
    found = fit(tmp_path, series, acid, most)
    one = found.steps[step - 1]
    assert one.standing == "found"
    assert one.pka_25c == pytest.approx(evaluated(acid, step), abs=tolerance)
    assert acid in [c.acid for c in found.candidates[:3]]


UNFAMILIAR = [
    ("KHP_NaOH", "potassium hydrogen phthalate", "potassium:1", "phthalic acid", 2, 0.02, 14.0),
    ("KH2PO4_NaOH", "KH2PO4", "potassium:1", "phosphoric acid", 2, 0.02, 14.0),
]


@pytest.mark.parametrize(
    ("series", "substance", "ion", "acid", "step", "tolerance", "most"), UNFAMILIAR, ids=[t[0] for t in UNFAMILIAR]
)
def test_the_same_as_an_unfamiliar_salt(
    tmp_path: Path, series: str, substance: str, ion: str, acid: str, step: int, tolerance: float, most: float
) -> None:
    found = fit(tmp_path, series, "salt K", most, (substance, "salt K"), protons_removed=1, counter_ion=ion, steps=2)
    assert found.steps[step - 1].pka == pytest.approx(evaluated(acid, step), abs=tolerance)
    assert acid in [c.acid for c in found.candidates[:3]]


def test_a_step_that_a_table_does_not_reach_is_held_and_said(tmp_path: Path) -> None:
    found = fit(tmp_path, "KH2PO4_NaOH", "phosphoric acid")
    assert [step.standing for step in found.steps] == ["held", "found", "held"]
    assert found.steps[0].pka is None
    assert "pKa1 is not told by these readings; it is held at the library's 2.148" in found.conclusion
