"""Activity models against what is published, as a table of RMS and worst: python tests/bench/models_compared.py

Nothing here asserts, and nothing in the package is fitted to these tables; it prints. Rows are models, with the ways of
pKa(T) and of ion pairs beside them; columns are sets of published values. "-l" prints every point of the default model.
"""

from __future__ import annotations

import argparse
import csv
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from reconcile.chemistry.activity import ACTIVITY_MODELS, SIZE_HYDROGEN, SIZE_HYDROXIDE
from reconcile.chemistry.ion_data import interaction, truesdell_jones_ions
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.temperature import debye_hueckel
from reconcile.records.settings import BY_NAME, Settings

PUBLISHED = Path(__file__).parents[1] / "published"
NBS = "NBS/NIST and DIN 19266 table"
STANDARDS = (
    *("phthalate", "phosphate_1_1", "phosphate_1_3.5", "borax", "tetroxalate", "tartrate_sat", "citrate", "carbonate"),
)
HOT = ("phthalate", "phosphate_1_1", "borax")
SERIES = (
    *("KCl_HCl", "KHP_NaOH", "KH2PO4_NaOH", "BORAX_HCl", "BORAX_NaOH", "BORIC_KCl_NaOH", "NaHCO3_NaOH"),
    "Na2HPO4_NaOH",
)
DESERVING = ("KCl_HCl", "KHP_NaOH")
"""Round-value series that the notes on the reference tables name as checks that deserve 0.02 to 0.03."""
# Kielland 1937, table I, from memory: sizes of the strong ions of the salts below [angstrom]
SIZES = {"H+": SIZE_HYDROGEN, "OH-": SIZE_HYDROXIDE, "Na+": 4.25, "K+": 3.0, "Cl-": 3.0, "Li+": 6.0}
SALTS = {
    "HCl": ("H+", "Cl-"),
    "NaCl": ("Na+", "Cl-"),
    "KCl": ("K+", "Cl-"),
    "NaOH": ("Na+", "OH-"),
    "KOH": ("K+", "OH-"),
    "LiCl": ("Li+", "Cl-"),
}


@dataclass(frozen=True)
class Point:
    """One published pH: the series, the recipe, and its value."""

    series: str
    components: Mapping[str, float]
    unit: str
    temperature_c: float
    ph: float
    tolerance: float
    source: str


def rows(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def points(name: str, series: str) -> list[Point]:
    """Every row of a table of pH values; `series` names the column that says which series it belongs to."""
    found = []
    for r in rows(name):
        parts = dict(p.split("=") for p in r["components"].split(";"))
        found.append(
            Point(
                r[series],
                {n: float(v) for n, v in parts.items()},
                r["unit"],
                float(r["temperature_C"]),
                float(r["pH"]),
                float(r.get("tolerance") or "nan"),
                r["source"],
            )
        )
    return found


def predicted(some: Sequence[Point], settings: Settings):
    """Prediction of every point, each group of one unit in one call."""
    names = sorted({n for p in some for n in p.components})
    amounts = np.array([[p.components.get(n, 0.0) for n in names] for p in some])
    return predict_ph(names, amounts, [p.temperature_c for p in some], unit=some[0].unit, settings=settings)


def errors(some: Sequence[Point], settings: Settings) -> np.ndarray:
    """Predicted minus published pH."""
    return predicted(some, settings).ph - np.array([p.ph for p in some])


def mean_coefficient_errors(model: str, low: float, high: float) -> np.ndarray:
    """Calculated minus measured lg of mean activity coefficients at 25 °C, low < molality <= high."""
    chosen, out = ACTIVITY_MODELS[model], []
    known = truesdell_jones_ions()
    for r in rows("activity_reference.csv"):
        if r["quantity"] != "mean_activity_coefficient" or r["temperature_C"] != "25":
            continue
        m = float(r["molality"])
        if not low < m <= high:
            continue
        a, _, b, _ = debye_hueckel(np.array([25.0]))
        lg = 0.0
        for ion in SALTS[r["substance"]]:
            size, linear = SIZES[ion], 0.0
            if chosen.linear and ion in known:
                size, linear = known[ion][:2]
            lg -= 0.5 * float(chosen.exponent(a, b, np.array([m]), np.array(size), linear)[0][0])
        if chosen.pairwise:
            cation, anion = SALTS[r["substance"]]
            lg += m * (interaction("H+", 1, anion) if cation == "H+" else interaction(anion, -1, cation))
        out.append(lg - np.log10(float(r["value"])))
    return np.array(out)


def sets() -> dict[str, Callable[[Settings], np.ndarray]]:
    """Name of a set of published values -> errors under some settings."""
    standard = [p for p in points("primary_standards.csv", "standard_id") if p.source.startswith(NBS)]
    usual = [p for p in standard if p.series in STANDARDS and p.temperature_c <= 60.0]
    hot = [p for p in standard if p.series in HOT]
    tables = points("round_value_buffers_25C.csv", "series")
    lime = [p for p in standard if p.series == "calcium_hydroxide_sat"]
    out: dict[str, Callable[[Settings], np.ndarray]] = {
        "standards 0-60 °C": lambda s: errors(usual, s),
        "0-95 °C, three": lambda s: errors(hot, s),
        "deserving series": lambda s: errors([p for p in tables if p.series in DESERVING], s),
    }
    for name in SERIES:
        out[name] = lambda s, name=name: errors([p for p in tables if p.series == name], s)
    out["Ca(OH)2"] = lambda s: errors(lime, s)
    for low, high in ((0.0, 0.1), (0.1, 0.5), (0.5, 1.0)):
        out[f"lg γ±, to {high:g}"] = lambda s, low=low, high=high: mean_coefficient_errors(
            s["prediction.activity_model"], low, high
        )
    return out


def variants() -> list[dict[str, object]]:
    """Settings compared: every model with the other defaults, then the default model with each other choice."""
    model, every = "prediction.activity_model", [{"prediction.activity_model": name} for name in ACTIVITY_MODELS]
    default = BY_NAME[model].default
    for other in ("prediction.pk_equations", "prediction.ion_pairs"):
        if other in BY_NAME:
            setting = BY_NAME[other]
            choices = setting.allowed or (True, False)
            every += [{model: default, other: choice} for choice in choices if choice != setting.default]
    return every


def table() -> None:
    columns = sets()
    print(f"{'':34}" + "".join(f"{name:>20}" for name in columns))
    for changed in variants():
        settings = Settings({k: v for k, v in changed.items() if v != BY_NAME[k].default})
        label = ", ".join(str(v) if k.endswith("model") else f"{k.split('.')[1]} {v}" for k, v in changed.items())
        cells = []
        for measure in columns.values():
            e = measure(settings)
            cells.append(f"{np.sqrt(np.mean(e**2)):.4f} {np.abs(e).max():.3f}")
        print(f"{label:34}" + "".join(f"{cell:>20}" for cell in cells))
    print("each cell: RMS and worst, in pH (the last three in lg of the coefficient)")


def listed() -> None:
    for name, measure in (("primary_standards.csv", "standard_id"), ("round_value_buffers_25C.csv", "series")):
        some = [p for p in points(name, measure) if name != "primary_standards.csv" or p.source.startswith(NBS)]
        for series in dict.fromkeys(p.series for p in some):
            own = [p for p in some if p.series == series]
            e = errors(own, Settings())
            key = (lambda p: p.temperature_c) if measure == "standard_id" else (lambda p: p.ph)
            print(f"{series}: " + " ".join(f"{key(p):g}:{1000 * v:+.0f}" for p, v in zip(own, e, strict=True)))


if __name__ == "__main__":
    asked = argparse.ArgumentParser(description=__doc__)
    asked.add_argument("-l", action="store_true", help="print every point of the default settings, in mpH")
    listed() if asked.parse_args().l else table()
