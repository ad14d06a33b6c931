"""Invented records of one acid: dilutions, partly neutralised solutions and titrations, their pH by the simulator."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from builders import Row, workbook

from tests.simulated.chemistry_of_truth import KG_WATER_PER_LITRE, acids, solve_ph

READINGS = ("Batch", "Series", "Titrant added (mL)", "Known solution", "Meter", "Temperature (°C)", "pH")
RECIPES = ("Batch", "Substance", "Lot", "Amount", "Unit", "Made up to", "Made up to unit")
SERIES = ("Series", "Substance", "Lot", "Amount", "Unit", "Start volume (mL)", "Titrant", "Titrant lot",
          "Titrant strength (mol/L)")  # fmt: skip
STOCKS = ("Lot", "Substance", "Strength", "Unit", "Tolerance (%)")
METERS = ("Meter", "Accuracy (pH)", "Resolution (pH)")
STEPS = {"one": "acetic acid", "two": "succinic acid", "close": "adipic acid", "amine": "Tris", "ammonia": "ammonia"}


@dataclass(frozen=True)
class Truth:
    """The acid as it really is: constants of an acid of the table, shifted; actual over stated strength; the meter.

    acid : acid of the table whose constants, charge and enthalpy it has; shift by step from 1
    ion : charge of the unchanging ions that a formula unit brings (+1 for a sodium salt, -1 for a hydrochloride)
    """

    acid: str = "acetic acid"
    shift: Mapping[int, float] | None = None
    ion: float = 0.0
    factor: float = 1.0
    offset: float = 0.0
    noise: float = 0.01
    decimals: int = 3

    @property
    def pka(self) -> list[float]:
        """Constants at 25 °C and I = 0."""
        shift = self.shift or {}
        return [float(v) + shift.get(j + 1, 0.0) for j, v in enumerate(acids()[self.acid].pka)]

    def ph(
        self, amount: Any, base: Any, celsius: Any = 25.0, also: Mapping[str, Any] | None = None, salt: Any = 0.0
    ) -> np.ndarray[Any, Any]:
        """pH without noise: stated amount of the acid and of strong base (negative: acid) [mol/L], n solutions.

        also : further acids of the table, fully protonated [mol/L]; salt : 1:1 electrolyte [mol/L]
        """
        also = also or {}
        names = [self.acid, *also]
        n = max(np.size(v) for v in (amount, base, celsius, salt, *also.values()))
        acid = np.broadcast_to(np.asarray(amount, float) * self.factor, (n,)) / KG_WATER_PER_LITRE
        others = [np.broadcast_to(np.asarray(v, float), (n,)) / KG_WATER_PER_LITRE for v in also.values()]
        strong = np.broadcast_to(np.asarray(base, float), (n,)) / KG_WATER_PER_LITRE
        electrolyte = np.broadcast_to(np.asarray(salt, float), (n,)) / KG_WATER_PER_LITRE
        charge = strong + self.ion * acid
        squares = np.abs(strong) + abs(self.ion) * acid + 2.0 * electrolyte
        shift = {(self.acid, step): by for step, by in (self.shift or {}).items()}
        celsius = np.broadcast_to(np.asarray(celsius, float), (n,))
        totals = np.stack([acid, *others], axis=1)
        return np.asarray(solve_ph(totals, names, charge, squares, celsius, pka_shift=shift))

    def read(self, ph: np.ndarray[Any, Any], rng: np.random.Generator) -> list[float]:
        """What the meter shows."""
        shown = ph + self.offset + self.noise * rng.standard_normal(len(ph))
        return [round(float(v), self.decimals) for v in shown]


@dataclass
class Made:
    """A record being made: rows of each sheet."""

    seed: int = 1

    def __post_init__(self) -> None:
        self.rng = np.random.default_rng(self.seed)
        self.readings: list[Row] = [READINGS]
        self.recipes: list[Row] = [RECIPES]
        self.series: list[Row] = [SERIES]
        self.stocks: list[Row] = [STOCKS]
        self.more: dict[str, list[Row]] = {}

    def titration(
        self, truth: Truth, name: str, series: str = "T1", *, conc: float = 0.05, volume: float = 50.0,
        titrant: str = "sodium hydroxide", strength: float = 0.1, added: Sequence[float] = tuple(range(1, 25, 2)),
        celsius: float = 25.0, meter: str = "M-1",
    ) -> Made:  # fmt: skip
        """A series: `volume` mL of `conc` mol/L acid, strong base (or hydrochloric acid) added [mL]."""
        v = np.asarray(added, float)
        sign = -1.0 if "chlor" in titrant else 1.0
        ph = truth.ph(conc * volume / (volume + v), sign * strength * v / (volume + v), celsius)
        for x, shown in zip(v.tolist(), truth.read(ph, self.rng), strict=True):
            self.readings.append((None, series, x, None, meter, celsius, shown))
        self.series.append((series, name, None, 1000.0 * conc, "mM", volume, titrant, None, strength))
        return self

    def solutions(
        self, truth: Truth, name: str, rows: Sequence[tuple[float, float]], *, celsius: Any = 25.0, meter: str = "M-1",
        also: Mapping[str, float] | None = None, prefix: str = "B", form: Mapping[str, str] | None = None,
    ) -> Made:  # fmt: skip
        """Solutions made singly, (acid, strong base) [mol/L] each; a negative base is hydrochloric acid."""
        amount, base = np.array(rows, float).reshape(-1, 2).T
        ph = truth.ph(amount, base, celsius, also)
        temperatures = np.broadcast_to(np.asarray(celsius, float), (len(amount),)).tolist()
        for i, shown in enumerate(truth.read(ph, self.rng)):
            batch = f"{prefix}-{i + 1:02d}"
            self.readings.append((batch, None, None, None, meter, temperatures[i], shown))
            self.recipes.append((batch, name, "A-1", amount[i], "mol/L", None, None))
            if base[i]:
                strong = "sodium hydroxide" if base[i] > 0 else "hydrochloric acid"
                self.recipes.append((batch, strong, "N-1" if base[i] > 0 else "H-1", abs(base[i]), "mol/L", None, None))
            for acid, some in (also or {}).items():
                self.recipes.append((batch, (form or {}).get(acid, acid), None, some, "mol/L", None, None))
        return self

    def reading(self, **cells: Any) -> Made:
        """One more row of the readings, by field."""
        keys = ("batch", "series", "added", "known", "meter", "celsius", "ph")
        self.readings.append(tuple(cells.get(key) for key in keys))
        return self

    def sheet(self, name: str, *rows: Row) -> Made:
        """A further sheet, its heading row first."""
        self.more[name] = list(rows)
        return self

    def write(self, folder: Path) -> Path:
        """The workbook."""
        sheets: dict[str, Sequence[Row]] = {"Readings": self.readings}
        for title, rows in (("Recipes", self.recipes), ("Series", self.series), ("Stocks", self.stocks)):
            if len(rows) > 1:
                sheets[title] = rows
        return workbook(folder / "record.xlsx", {**sheets, **self.more})
