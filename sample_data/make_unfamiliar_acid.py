"""Makes unfamiliar_acid.xlsx: titrations, dilutions and half-neutralised solutions of an acid that no library holds.

Run from anywhere: python sample_data/make_unfamiliar_acid.py. Acid K is invented: two steps, pKa 3.92 and 5.71 at 25 °C
and ionic strength 0, no heat of ionization, 146.2 g/mol. Its pH comes from the simulator's own chemistry. Readings have
a noise of 0.01 pH; one of them is typed wrong (row 12: 4.91 for 4.19). The same bytes each time.
"""

from __future__ import annotations

import sys
from collections.abc import Sequence
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
import xlsxwriter

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent))
from tests.simulated import chemistry_of_truth as chemistry  # noqa: E402

ACID, PKA, GRAMS_PER_MOL = "acid K", (3.92, 5.71), 146.2
LIKE = "succinic acid"
"""Acid of the table whose charges it shares; its constants are shifted to those above."""
NOISE, CELSIUS = 0.01, 25.0
SLIP = 10
"""Reading, counted from 0, whose digits are exchanged."""
HEADINGS = {
    "Readings": ("Batch", "Series", "Titrant added (mL)", "Known solution", "Meter", "Temperature (°C)", "pH"),
    "Series": (
        "Series", "Substance", "Lot", "Amount", "Unit", "Start volume (mL)", "Titrant", "Titrant lot",
    ),
    "Recipes": ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit"),
    "Stocks": ("Lot", "Substance", "Strength", "Unit", "Tolerance (%)"),
    "Meters": ("Meter", "Accuracy (pH)", "Resolution (pH)"),
}  # fmt: skip
SERIES = {"T-1": (0.3655, np.arange(0.0, 49.0, 3.0)), "T-2": (0.2924, np.arange(1.0, 40.0, 4.0))}
"""Series -> grams of acid in 50 mL, and titrant added [mL]; 0.1 mol/L sodium hydroxide."""
SINGLE = ((0.05, 0.0), (0.02, 0.0), (0.01, 0.0), (0.04, 0.02), (0.03, 0.045))
"""Solutions made singly: acid and sodium hydroxide [mol/L]."""


def ph(acid: Any, base: Any) -> np.ndarray[Any, Any]:
    """pH of solutions of the acid and sodium hydroxide [mol/L]."""
    table = chemistry.acids()[LIKE]
    shift = {(LIKE, j + 1): pka - float(table.pka[j]) for j, pka in enumerate(PKA)}
    acid, base = np.broadcast_arrays(np.asarray(acid, float), np.asarray(base, float))
    strong = base / chemistry.KG_WATER_PER_LITRE
    celsius = np.full(len(acid), CELSIUS)
    totals = (acid / chemistry.KG_WATER_PER_LITRE)[:, None]
    return np.asarray(chemistry.solve_ph(totals, [LIKE], strong, strong, celsius, pka_shift=shift))


def sheets() -> dict[str, list[Sequence[Any]]]:
    """Rows of every sheet, without headings."""
    rng = np.random.default_rng(20250212)
    out: dict[str, list[Sequence[Any]]] = {name: [] for name in HEADINGS}
    for series, (grams, added) in SERIES.items():
        volume = 50.0 + added
        truth = ph(grams / GRAMS_PER_MOL * 1000.0 / volume, 0.1 * added / volume)
        shown = np.round(truth + NOISE * rng.standard_normal(len(added)), 2)
        out["Readings"] += [
            (None, series, v, None, "Bench 1", CELSIUS, p) for v, p in zip(added.tolist(), shown.tolist(), strict=True)
        ]
        out["Series"].append((series, ACID, "K-07", grams, "g", 50.0, "sodium hydroxide", "NH-3"))
    acid, base = np.array(SINGLE).T
    shown = np.round(ph(acid, base) + NOISE * rng.standard_normal(len(acid)), 2)
    for i, (c, b) in enumerate(SINGLE):
        batch = f"K{i + 1:02d}"
        out["Readings"].append((batch, None, None, None, "Bench 1", CELSIUS, float(shown[i])))
        out["Recipes"].append((batch, ACID, "K-07", round(c * GRAMS_PER_MOL * 0.1, 4), "g", 100.0, "mL"))
        if b:
            out["Recipes"].append((batch, "sodium hydroxide", "NH-3", round(1000.0 * b, 1), "mL", 100.0, "mL"))
    for name, certified in (("phthalate", 4.005), ("phosphate", 6.865)) * 2:  # NBS/NIST table, 25 °C
        reading = round(certified + NOISE * float(rng.standard_normal()), 2)
        out["Readings"].append((None, None, None, name, "Bench 1", CELSIUS, reading))
    row = list(out["Readings"][SLIP])
    whole, digits = f"{row[-1]:.2f}".split(".")
    row[-1] = float(f"{whole}.{digits[::-1]}")
    out["Readings"][SLIP] = tuple(row)
    out["Stocks"].append(("NH-3", "sodium hydroxide", 0.1, "mol/L", 0.5))
    out["Meters"].append(("Bench 1", 0.02, 0.01))
    return out


def main(folder: Path = HERE) -> None:
    """Write the workbook into a folder."""
    book = xlsxwriter.Workbook(str(folder / "unfamiliar_acid.xlsx"))
    book.set_properties({"title": "Titrations of an unfamiliar acid (invented)", "created": datetime(2025, 2, 12)})
    two = book.add_format({"num_format": "0.00"})
    for name, rows in sheets().items():
        sheet = book.add_worksheet(name)
        sheet.write_row(0, 0, HEADINGS[name])
        for i, row in enumerate(rows, 1):
            for j, value in enumerate(row):
                if value is not None:
                    sheet.write(i, j, value, two if HEADINGS[name][j] == "pH" else None)
    book.close()


if __name__ == "__main__":
    main()
