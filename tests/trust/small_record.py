"""A small record of acetate buffers as two CSV files, with meters that read off by what a test asks."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

READINGS, RECIPES = "readings.csv", "recipes.csv"
NOISE = (0.0, 0.01, -0.01, 0.0, -0.01, 0.01, 0.0)
"""Errors of reading that come round again and again [pH]."""


def write_record(
    folder: Path, off: Mapping[str, float] | None = None, rows: int = 48, meters: int = 4, remark: str = ""
) -> list[str]:
    """Names of the files written; each batch is read once, its meter reads `off` [pH] too high.

    0.05 mol/L acetic acid with 0.05 mol/L sodium acetate has pH 4.66 at 25 °C: pKa 4.756 less the Debye-Hückel term of
    about 0.09 at I = 0.05 (Harris, Quantitative Chemical Analysis, appendix G; Davies' equation by hand).
    """
    readings = ["Batch,Read at,Meter,Temperature (°C),pH,Remark"]
    recipes = ["Batch,Substance,Lot,Amount,Unit"]
    for i in range(rows):
        meter = f"M-{i % meters + 1}"
        ph = 4.66 + NOISE[i % len(NOISE)] + (off or {}).get(meter, 0.0)
        readings.append(f"B-{i:02d},2025-03-{i // 4 + 1:02d} 09:{i % 4}0,{meter},25.0,{ph:.2f},{remark}")
        lot = "A" if i % 3 else "B"
        recipes += [f"B-{i:02d},acetic acid,HA-{lot},50,mM", f"B-{i:02d},sodium acetate,NA-{lot},50,mM"]
    (folder / READINGS).write_text("\n".join(readings) + "\n", encoding="utf-8")
    (folder / RECIPES).write_text("\n".join(recipes) + "\n", encoding="utf-8")
    return [READINGS, RECIPES]
