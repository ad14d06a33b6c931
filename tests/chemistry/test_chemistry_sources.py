"""Every value of the package's chemical tables has a source, a unit and an uncertainty."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

import reconcile
from reconcile.chemistry.activity import ACTIVITY_MODELS
from reconcile.records.settings import BY_NAME, SETTINGS

PACKAGE = Path(reconcile.__file__).parent
# table -> its values, each with the column of its uncertainty; units: a column "unit", or the unit in the column's name
TABLES: dict[str, dict[str, str]] = {
    "chemistry/acids.csv": {"pKa_25C_I0": "u_pKa"},
    "chemistry/ion_pairs.csv": {"log_K_25C": "u_log_K", "dH_kJ_mol": "u_dH_kJ_mol"},
    "chemistry/ion_sizes.csv": {"size_angstrom": "u_size_angstrom"},
    "chemistry/interactions.csv": {"epsilon": "u_epsilon"},
    "chemistry/truesdell_jones.csv": {"size_angstrom": "u_size_angstrom", "linear_kg_mol": "u_linear_kg_mol"},
    "chemistry/pka_equations.csv": {"inverse": "u_pKa", "constant": "u_pKa", "linear": "u_pKa", "log10": "u_pKa"},
    "chemistry/solubility.csv": {"g_per_kg": "u_g_per_kg"},
    "records/standards.csv": {"ph": "u"},
}
DIMENSIONLESS = {"pKa_25C_I0", "ph"}
NOT_CHEMICAL = {"records/columns.csv", "records/problems.csv", "records/ions.csv", "records/forms.csv"}
"""Tables of words, of charges counted from formulas, and of molar masses computed from them (tested elsewhere)."""


def rows(name: str) -> list[dict[str, str]]:
    with (PACKAGE / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_no_table_of_the_package_is_forgotten() -> None:
    found = {str(p.relative_to(PACKAGE)) for room in ("chemistry", "records") for p in (PACKAGE / room).rglob("*.csv")}
    assert found == set(TABLES) | NOT_CHEMICAL


@pytest.mark.parametrize("name", sorted(TABLES))
def test_every_value_has_source_unit_and_uncertainty(name: str) -> None:
    table = rows(name)
    assert table
    for number, row in enumerate(table, start=2):
        where = f"{name}:{number}"
        assert row["source"].strip(), where
        assert len(row["source"]) > 10, where
        for value, uncertainty in TABLES[name].items():
            if not row[value]:
                continue
            float(row[value])
            assert float(row[uncertainty]) > 0.0, f"{where}: {value}"
            named = value in DIMENSIONLESS or any(
                unit in value for unit in ("_kJ_mol", "_angstrom", "_kg_mol", "g_per_kg")
            )
            assert named or row.get("unit", "").strip(), f"{where}: {value} has no unit"


@pytest.mark.parametrize("name", sorted(TABLES))
def test_every_row_says_whether_its_value_was_seen(name: str) -> None:
    for row in rows(name):
        if "verified" in row:
            assert row["verified"] in ("seen", "memory", "equation", "derived", "library"), row
            if row["verified"] == "memory" and name != "chemistry/acids.csv":
                assert "memory" in row["source"], row


def test_enthalpies_that_are_missing_cost_uncertainty() -> None:
    from reconcile.chemistry.acids import acid_table
    from reconcile.chemistry.temperature import U_KNOWN_DH, U_MISSING_DH

    table = acid_table()
    for row, u in zip(table.rows, table.u_dh, strict=True):
        assert u == (U_MISSING_DH if row.dh_kj_mol != row.dh_kj_mol else U_KNOWN_DH)


def test_every_activity_model_has_source_range_and_uncertainty() -> None:
    for model in ACTIVITY_MODELS.values():
        assert model.source
        assert model.coefficient
        assert model.highest > 0.0
        u = model.u_coefficient
        assert u in BY_NAME if isinstance(u, str) else u > 0.0
        if isinstance(u, str):
            assert float(BY_NAME[u].default) > 0.0


def test_every_number_of_the_settings_has_unit_and_reason() -> None:
    for setting in SETTINGS:
        assert setting.reason, setting.name
        if isinstance(setting.default, (int, float)) and not isinstance(setting.default, bool):
            assert setting.unit, setting.name
