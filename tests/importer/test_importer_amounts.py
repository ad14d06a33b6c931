"""Amounts to final concentrations, each case worked by hand from molar masses, densities and assays.

Molar masses: IUPAC 2021 abridged atomic weights (acetic acid 60.052, sodium acetate 82.034, its trihydrate 136.079,
sodium chloride 58.44, hydrochloric acid 36.458, Tris 121.136). Densities and assays of the bottles: from memory of
general handbooks, invented to two or three digits where so said.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from builders import records_from_rows
from wild_case import aside

from reconcile.records.book import BatchRecords
from reconcile.records.settings import Settings

READ = [("Batch", "pH"), ("B1", 4.7)]
RECIPE = ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit")
STOCK = ("Lot", "Substance", "Strength", "Unit", "Density (g/mL)", "Assay (%)", "Factor", "Made as batch")


def solution(lines: list[tuple[Any, ...]], stocks: list[tuple[Any, ...]] = [], **more: Any) -> BatchRecords:  # noqa: B006
    recipe = [RECIPE, *(("B1", *line) for line in lines)]
    return records_from_rows(READ, recipe, [STOCK, *stocks] if stocks else (), **more)


def amounts(records: BatchRecords) -> list[float]:
    assert aside(records) == set()
    s = records.solutions
    return s.amount[s.solution == 0].tolist()


@pytest.mark.parametrize(
    ("amount", "unit", "expected"),
    [
        (50.0, "mM", 0.05),
        (0.05, "mol/L", 0.05),
        (50000.0, "µM", 0.05),
        (50.0, "mmol/L", 0.05),
        (3.0026, "g/L", 0.05),
        (3002.6, "mg/L", 0.05),
        (3.0026, "mg/mL", 0.05),
        (0.30026, "% w/v", 0.05),
        (0.05, "N", 0.05),
        (50.0, "mEq/L", 0.05),
    ],
)
def test_final_concentrations(amount: float, unit: str, expected: float) -> None:
    records = solution([("acetic acid", None, amount, unit)])
    assert amounts(records) == pytest.approx([expected], rel=1e-5)
    assert not records.solutions.per_kg_water[0]


@pytest.mark.parametrize(
    ("amount", "unit", "expected"),
    [
        (0.05, "mol/kg", 0.05),
        (50.0, "mmol/kg", 0.05),
        (3.0026, "g/kg", 0.05 / (1 - 0.0030026)),
        (0.30026, "% w/w", 0.05 / (1 - 0.0030026)),
        (3002.6, "ppm", 0.05 / (1 - 0.0030026)),
    ],
)
def test_amounts_by_mass_become_mol_per_kilogram_of_water(amount: float, unit: str, expected: float) -> None:
    records = solution([("acetic acid", None, amount, unit)])
    assert amounts(records) == pytest.approx([expected], rel=1e-5)
    assert records.solutions.per_kg_water[0]


def test_mass_and_molal_amounts_together() -> None:
    # 1 kg of solution: 10 g of NaCl; water x kg carries 0.1 mol/kg of acetic acid: 1 = 0.010 + x (1 + 0.0060052)
    water = 0.99 / 1.0060052
    records = solution([("NaCl", None, 1.0, "% w/w"), ("acetic acid", None, 0.1, "mol/kg")])
    assert amounts(records) == pytest.approx([10.0 / 58.44 / water, 0.1], rel=1e-5)


@pytest.mark.parametrize(
    ("amount", "unit", "total", "total_unit"),
    [(2.922, "g", 1.0, "L"), (2922.0, "mg", 1000.0, "mL"), (0.002922, "kg", 1000.0, "mL"), (50.0, "mmol", 1.0, "L")],
)
def test_weighed_and_made_up_to_a_volume(amount: float, unit: str, total: float, total_unit: str) -> None:
    records = solution([("NaCl", "S1", amount, unit, total, total_unit)])
    assert amounts(records) == pytest.approx([0.05], rel=1e-4)
    assert bool(records.solutions.by_mass[0]) == (unit != "mmol")


def test_u_of_weighing_and_of_volumes() -> None:
    records = solution([("NaCl", "S1", 2.922, "g", 1.0, "L")])
    # half-widths 0.1 % and 0.2 % as rectangles: root of the sum of squares over root three
    assert records.solutions.u_amount.tolist() == pytest.approx([np.hypot(0.001, 0.002) / np.sqrt(3)])
    wide = Settings.from_sections({"uncertainty": {"weighing_percent": 0.5, "volume_percent": 0.0}})
    assert solution([("NaCl", "S1", 2.922, "g", 1.0, "L")], settings=wide).solutions.u_amount[0] == pytest.approx(
        0.005 / np.sqrt(3)
    )


def test_weighed_into_a_mass_leaves_the_solutes_out_of_the_water() -> None:
    # 5.844 g of NaCl and 13.6079 g of sodium acetate trihydrate (8.2034 g anhydrous) in 1000 g
    water = (1000 - 5.844 - 8.2034) / 1000
    records = solution([("NaCl", None, 5.844, "g", 1.0, "kg"), ("sodium acetate trihydrate", None, 13.6079, "g")])
    assert amounts(records) == pytest.approx([0.1 / water, 0.1 / water], rel=1e-5)
    assert records.solutions.per_kg_water[0]


def test_weighed_into_stated_water() -> None:
    # added to 1000 mL of water at 20 °C, 998.21 g; the hydrate's own water (13.6079 - 8.2034 g) joins it
    water = (998.21 + 13.6079 - 8.2034) / 1000
    lines = [("sodium acetate trihydrate", None, 13.6079, "g"), ("purified water", None, 1000.0, "mL")]
    assert amounts(solution(lines)) == pytest.approx([0.1 / water], rel=1e-5)


@pytest.mark.parametrize(
    ("strength", "unit", "density", "molarity"),
    [
        (1.0, "M", None, 1.0),
        (0.5, "N", None, 0.5),
        (100.0, "g/L", None, 100.0 / 36.458),
        (37.0, "% w/w", 1.18, 370.0 * 1.18 / 36.458),  # 11.98 mol/L
        (37.0, "% w/v", None, 370.0 / 36.458),
        (1.0, "mol/kg", 1.016, 1.016 / 1.036458),
    ],
)
def test_a_volume_of_a_stock_lot(strength: float, unit: str, density: float | None, molarity: float) -> None:
    records = solution(
        [("hydrochloric acid", "H1", 10.0, "mL", 1.0, "L")], [("H1", "HCl", strength, unit, density, None, None)]
    )
    assert amounts(records) == pytest.approx([molarity / 100], rel=1e-4)
    assert records.solutions.by_mass.tolist() == [False]


def test_a_neat_liquid_by_density_and_assay() -> None:
    # 5 mL of glacial acetic acid, 1.049 g/mL, 99.7 %: 5 * 1.049 * 0.997 / 60.052 mol in 1 L
    stocks = [("A1", "acetic acid", None, None, 1.049, 99.7, None)]
    records = solution([("acetic acid", "A1", 5.0, "mL", 1000.0, "mL")], stocks)
    assert amounts(records) == pytest.approx([5 * 1.049 * 0.997 / 60.052], rel=1e-5)


def test_a_factor_and_an_assay() -> None:
    stocks = [("N1", "NaOH", 0.1, "N", None, None, 1.002), ("S1", "NaCl", None, None, None, 99.5, None)]
    lines = [("sodium hydroxide", "N1", 100.0, "mL", 1.0, "L"), ("sodium chloride", "S1", 5.844, "g")]
    assert amounts(solution(lines, stocks)) == pytest.approx([0.01002, 0.0995], rel=1e-4)


def test_a_weighed_solution_needs_its_density_and_says_so() -> None:
    line = [("hydrochloric acid", "H1", 11.8, "g", 1.0, "L")]
    assert aside(solution(line, [("H1", "HCl", 1.0, "M")])) == {("Recipes", "D2", "unit-needs")}
    known = solution(line, [("H1", "HCl", 1.0, "M", 1.016)])
    assert amounts(known) == pytest.approx([11.8 / 1.016 / 1000], rel=1e-5)
    assert not known.solutions.by_mass[0]


def test_water_up_to_a_volume_gives_the_total() -> None:
    for text in ("q.s. to 500 mL", "qs to 500 mL", "to 500 mL", "ad 500 mL", "up to 0.5 L"):
        assert amounts(solution([("NaCl", None, 2.922, "g"), ("water", None, text, None)])) == pytest.approx(
            [0.1], rel=1e-4
        )
    assert amounts(solution([("NaCl", None, 2.922, "g", 500.0, "mL"), ("water", None, "q.s.", None)])) == pytest.approx(
        [0.1], rel=1e-4
    )


def test_multiples_of_a_stock() -> None:
    stocks = [("N1", "NaCl", 1.5, "M")]
    assert amounts(solution([("NaCl", "N1", "10x", None)], stocks)) == pytest.approx([0.15])
    assert aside(solution([("NaCl", "N1", "0.1x", None)], stocks)) == {("Recipes", "D2", "times-unclear")}


def test_a_strength_written_in_the_name() -> None:
    for name in ("1 M HCl", "HCl 1 M", "HCl (1 M)", "1 M hydrochloric acid"):
        assert amounts(solution([(name, None, 10.0, "mL", 1.0, "L")])) == pytest.approx([0.01])


def test_actual_amounts_go_before_planned_ones() -> None:
    recipe = [
        ("Batch", "Substance", "Planned amount", "Actual amount", "Unit"),
        ("B1", "NaCl", 50.0, 51.0, "mM"),
        ("B1", "acetic acid", 50.0, None, "mM"),
    ]
    assert amounts(records_from_rows(READ, recipe)) == pytest.approx([0.051, 0.05])


PBS = [
    ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit"),
    ("S1", "NaCl", "N7", 1.5, "M", None, None),
    ("S1", "Na2HPO4", "P7", 0.1, "M", None, None),
]


def chained(*lines: tuple[Any, ...], strength: Any = None, unit: Any = None) -> BatchRecords:
    recipe = [*PBS, *(("B1", *line) for line in lines)]
    stocks = [STOCK, ("K1", None, strength, unit, None, None, None, "S1"), ("P7", "Na2HPO4", None, None)]
    return records_from_rows(READ, recipe, stocks)


def test_a_stock_that_is_itself_a_batch() -> None:
    records = chained(("salt stock", "K1", 100.0, "mL", 1.0, "L"))
    assert amounts(records) == pytest.approx([0.15, 0.01])
    assert records.lots.name.tolist() == ["N7", "P7", "K1"]
    s = records.solutions
    chains = [{records.lots.name[k] for k in s.chain_lot[s.chain_contribution == c]} for c in range(2)]
    assert chains == [{"N7", "K1"}, {"P7", "K1"}]
    assert records.lots_of_reading(0) == [0, 2, 1]
    assert amounts(chained(("salt stock", "K1", "10x", None))) == pytest.approx([0.15, 0.01])
    assert amounts(chained(("salt stock", "K1", 1.0, "x"), strength=10.0, unit="x")) == pytest.approx([0.15, 0.01])
    assert amounts(chained(("NaCl", "K1", 150.0, "mM"))) == pytest.approx([0.15, 0.01])


def test_a_cycle_of_stocks_is_found_and_named() -> None:
    recipe = [RECIPE, ("B1", "a", "K1", 10.0, "mL", 1.0, "L"), ("S1", "b", "K2", 10.0, "mL", 1.0, "L")]
    recipe += [("S2", "c", "K1", 10.0, "mL", 1.0, "L")]
    stocks = [STOCK, ("K1", *[None] * 6, "S1"), ("K2", *[None] * 6, "S2")]
    records = records_from_rows(READ, recipe, stocks)
    assert aside(records) == {("Stocks", "A2", "stock-cycle")}
    assert records.set_aside[0].read == "S1 -> S2 -> S1"


@pytest.mark.parametrize(
    ("line", "stock", "sheet", "cell", "code"),
    [
        (("foo acid", None, 1.0, "mM"), None, "Recipes", "B2", "substance-unknown"),
        (("EDTA", None, 1.0, "mM"), None, "Recipes", "B2", "substance-ambiguous"),
        ((None, None, 1.0, "mM"), None, "Recipes", "B2", "substance-missing"),
        (("NaCl", None, None, "mM"), None, "Recipes", "D2", "amount-missing"),
        (("NaCl", None, "lots", "mM"), None, "Recipes", "D2", "amount-not-a-number"),
        (("NaCl", None, -1.0, "mM"), None, "Recipes", "D2", "number-out-of-range"),
        (("NaCl", None, 5.0, None), None, "Recipes", "D2", "unit-missing"),
        (("NaCl", None, 5.0, "spoons"), None, "Recipes", "D2", "unit-unknown"),
        (("NaCl", None, "5 M", "mM"), None, "Recipes", "D2", "unit-conflict"),
        (("NaCl", None, 5.0, "g"), None, "Recipes", "D2", "made-up-to-missing"),
        (("NaCl", None, 5.0, "g", 1.0, None), None, "Recipes", "F2", "unit-missing"),
        (("NaCl", "L9", 5.0, "mL", 1.0, "L"), None, "Recipes", "D2", "lot-unknown"),
        (("NaCl", None, 5.0, "mL", 1.0, "L"), None, "Recipes", "D2", "volume-of-what"),
        (("NaCl", "L9", 5.0, "mL", 1.0, "L"), ("L9", "NaCl"), "Recipes", "D2", "lot-strength-missing"),
        (("NaCl", "L9", 5.0, "g", 1.0, "L"), ("L9", "KCl", None, None), "Recipes", "B2", "lot-other-substance"),
        (("NaCl", "L9", 5.0, "mL", 1.0, "L"), ("L9", "NaCl", 1.0, None), "Stocks", "C2", "unit-missing"),
        (("NaCl", "L9", 5.0, "mL", 1.0, "L"), ("L9", "NaCl", "strong", "M"), "Stocks", "C2", "amount-not-a-number"),
        (("NaCl", "L9", 5.0, "mL", 1.0, "L"), ("L9", "NaCl", 1.0, "mL"), "Stocks", "C2", "strength-unit"),
        (("NaCl", None, "q.s. to 1 L", None), None, "Recipes", "D2", "fill-not-water"),
        (("ethanol", None, 100.0, "g/L"), None, "Recipes", "D2", "solvent-mixed"),
        (("DMSO", None, 1.0, "g/L"), None, "Recipes", "B2", "solvent-mixed"),
        (("aluminium hydroxide gel", None, 2.0, "g/L"), None, "Recipes", "B2", "suspension"),
        (("resin suspension", None, 2.0, "g/L"), None, "Recipes", "B2", "suspension"),
        (("NaCl", None, 2000.0, "g", 1.0, "kg"), None, "Recipes", "D2", "no-water-left"),
    ],
)
def test_a_bad_line_sets_its_readings_aside_and_cites_the_cell(
    line: tuple[Any, ...], stock: tuple[Any, ...] | None, sheet: str, cell: str, code: str
) -> None:
    records = solution([line], [stock] if stock else [])
    assert aside(records) == {(sheet, cell, code)}
    assert records.set_aside[0].batch == "B1"
    assert records.set_aside[0].place.sheet == "Readings"
    assert len(records.solutions) == 0


def test_contradictions_within_a_batch() -> None:
    differs = solution([("NaCl", None, 1.0, "g", 1.0, "L"), ("acetic acid", None, 1.0, "g", 2.0, "L")])
    assert aside(differs) == {("Recipes", "F3", "made-up-to-differs")}
    mixed = solution([("NaCl", None, 50.0, "mM"), ("acetic acid", None, 0.1, "mol/kg")])
    assert aside(mixed) == {("Recipes", "D3", "litre-and-kilogram")}


def test_near_names_and_candidates_are_listed() -> None:
    near = solution([("acetic acidd", None, 1.0, "mM")]).set_aside[0].reason
    assert "acetic acid" in near
    several = solution([("EDTA", None, 1.0, "mM")]).set_aside[0].reason
    assert "EDTA disodium salt dihydrate" in several


def test_a_lot_that_stands_twice_with_other_content() -> None:
    stocks = [("L1", "NaCl", 1.0, "M"), ("L1", "NaCl", 2.0, "M")]
    assert aside(solution([("NaCl", "L1", 5.0, "mL", 1.0, "L")], stocks)) == {("Stocks", "A3", "lot-twice")}
    same = [("L1", "NaCl", 1.0, "M"), ("L1", "NaCl", 1.0, "M")]
    assert amounts(solution([("NaCl", "L1", 5.0, "mL", 1.0, "L")], same)) == pytest.approx([0.005])


def test_one_lot_name_for_two_substances() -> None:
    records = solution([("NaCl", "L1", 5.0, "mM"), ("KCl", "L1", 5.0, "mM")])
    assert records.lots.name.tolist() == ["L1 (sodium chloride)", "L1 (potassium chloride)"]


def test_declared_substances_have_no_contribution() -> None:
    declared = Settings.from_sections({"substances": {"without_effect": ["Green Dye"]}})
    records = solution([("NaCl", "L1", 5.0, "mM"), ("green dye", "D1", "a pinch", None)], settings=declared)
    assert amounts(records) == pytest.approx([0.005])
    assert records.without_effect == ("green dye",)
    assert records.solutions.without_effect.tolist() == [True]
    by_mass = solution([("NaCl", None, 5.0, "g", 1.0, "kg"), ("green dye", None, None, None)], settings=declared)
    assert by_mass.solutions.without_effect.tolist() == [True]
    assert not solution([("NaCl", None, 5.0, "mM")], settings=declared).solutions.without_effect.any()
