"""The table of acids: what it refuses, what it marks, and its constants against temperature."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from reconcile.chemistry.acids import acid_table, build, read_acids
from reconcile.chemistry.composition import form_table
from reconcile.chemistry.temperature import U_MISSING_DH, u_at
from reconcile.records.substances import catalogue, ions

PUBLISHED = Path(__file__).parents[1] / "published"


def pka(acid: str, step: int, temperature_c: float) -> float:
    table = acid_table()
    return float(table.pka_at(table.first[table.index[acid]] + step - 1, np.array(temperature_c)))


def emf_rows() -> list[dict[str, str]]:
    with (PUBLISHED / "pka_temperature.csv").open(encoding="utf-8", newline="") as file:
        return [r for r in csv.DictReader(file) if r["acid"] != "water" and float(r["temperature_C"]) <= 60.0]


# acid, step: largest difference from the emf data and why it is not smaller
WIDE = {
    ("sulfuric acid", 2): 0.08,  # sources differ by 0.07 at 25 °C
    ("oxalic acid", 1): 0.03,
    ("oxalic acid", 2): 0.05,  # calorimetric dCp against the emf equation
    ("phosphoric acid", 3): 0.05,  # published values of pK3 differ by 0.05
    ("lactic acid", 1): 0.03,
    ("boric acid", 1): 0.03,
}


@pytest.mark.parametrize("row", emf_rows(), ids=lambda r: f"{r['acid']}-{r['step']}-{r['temperature_C']}")
def test_pka_against_temperature(row: dict[str, str]) -> None:
    """Published pK(T) of emf cells; the source of each value is in the csv (some from memory, as it says)."""
    tolerance = WIDE.get((row["acid"], int(row["step"])), 0.03)
    found = pka(row["acid"], int(row["step"]), float(row["temperature_C"]))
    assert found == pytest.approx(float(row["pKa"]), abs=tolerance)


def test_at_25_c_the_constants_are_the_tables_own() -> None:
    table = acid_table()
    assert table.p + table.q / 298.15 + table.r * np.log(298.15) == pytest.approx(table.pka, abs=1e-10)


def test_every_form_of_the_library_can_be_predicted() -> None:
    forms = catalogue().forms
    assert len(form_table(forms, acid_table()).charge) == len(forms)


def test_every_form_is_neutral() -> None:
    """Strong ions, acids at their protons removed, H+ and OH- of one formula unit: no net charge."""
    table = acid_table()
    for form in catalogue().forms:
        charge = sum(ions()[ion].charge * n for ion, n in form.ions.items())
        if form.acid:
            charge += form.acid_units * (table.charge[table.index[form.acid]] - form.protons_removed)
        assert charge == pytest.approx(0.0, abs=1e-9), form.name


def test_weak_values_are_marked() -> None:
    table = acid_table()
    marked = {(r.acid, r.step) for r, weak in zip(table.rows, table.weak, strict=True) if weak}
    # reference notes: EDTA, NTA, PIPES and POPSO first steps, hydrogen sulfide second step
    assert {("EDTA", 1), ("NTA", 1), ("PIPES", 1), ("POPSO", 1), ("hydrogen sulfide", 2)} <= marked
    assert ("acetic acid", 1) not in marked


def test_uncertainty_grows_away_from_25_c_and_faster_without_enthalpy() -> None:
    t = np.array([25.0, 35.0, 45.0])
    known = u_at(np.full(3, 0.01), np.full(3, 0.5), np.full(3, 20.0), t)
    missing = u_at(np.full(3, 0.01), np.full(3, U_MISSING_DH), np.full(3, 150.0), t)
    assert known[0] == missing[0] == pytest.approx(0.01)
    assert known[0] < known[1] < known[2]
    assert np.all(missing[1:] > 3.0 * known[1:])


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ({"step": 2}, "steps of acetic acid"),
        ({"u": 0.0}, "positive uncertainty"),
        ({"source": ""}, "no source"),
        ({"pka": float("nan")}, "pKa"),
    ],
)
def test_a_table_that_cannot_be_is_refused(change: dict[str, object], says: str) -> None:
    row = acid_table().of("acetic acid")[0]
    with pytest.raises(ValueError, match=says):
        build([replace(row, **change)])


def test_constants_that_do_not_ascend_are_refused() -> None:
    first, second, third = acid_table().of("phosphoric acid")
    with pytest.raises(ValueError, match="do not ascend"):
        build([replace(first, pka=9.0), second, third])


def test_a_file_without_its_columns_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "some.csv"
    path.write_text("acid,step\nacetic acid,1\n", encoding="utf-8")
    with pytest.raises(ValueError, match="columns missing"):
        read_acids(path)


def test_a_form_of_an_unknown_acid_is_refused() -> None:
    with pytest.raises(ValueError, match="table of acids does not hold"):
        form_table([catalogue().by_name["acetic acid"]], build(acid_table().of("carbonic acid")))
