"""Small records for whole commands, and what a command left behind."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

Run = Callable[..., "Outcome"]


@dataclass(frozen=True)
class Outcome:
    """What a command left: exit code, standard output, standard error, and the files in the folder."""

    code: int
    out: str
    err: str
    files: frozenset[str]


READINGS = "readings.csv"
RECIPES = "recipes.csv"


def write_record(folder: Path, bad: dict[int, str] | None = None, rows: int = 24, meters: int = 4) -> list[str]:
    """A small clean record as two CSV files: acetate buffers, each read once; `bad` puts other text for a pH.

    0.05 mol/L acetic acid with 0.05 mol/L sodium acetate has pH 4.66 at 25 °C: pKa 4.756 less the Debye-Hückel term of
    about 0.09 at I = 0.05 (Harris, Quantitative Chemical Analysis, appendix G; Davies' equation by hand).
    """
    readings, recipes = ["Batch,Meter,Temperature (°C),pH"], ["Batch,Substance,Amount,Unit"]
    for i in range(rows):
        ph = (bad or {}).get(i, f"{4.66 + 0.01 * (i % 3 - 1):.2f}")
        readings.append(f"B-{i:02d},M-{i % meters + 1},25.0,{ph}")
        recipes += [f"B-{i:02d},acetic acid,50,mM", f"B-{i:02d},sodium acetate,50,mM"]
    (folder / READINGS).write_text("\n".join(readings) + "\n", encoding="utf-8")
    (folder / RECIPES).write_text("\n".join(recipes) + "\n", encoding="utf-8")
    return [READINGS, RECIPES]
