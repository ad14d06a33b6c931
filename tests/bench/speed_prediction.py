"""How fast predictions are, as ratios measured in one run: python tests/bench/speed_prediction.py

Nothing here asserts; it prints. Row by row means scipy.optimize.brentq on the same charge balance, with the ionic
strength iterated to closure inside, to the same accuracy: once written in plain floats, the fastest that Python offers
for one row, and once with the room's own balance for one row. Both are timed on a sample of the rows and scaled to all
of them. Times are those of the processor, so that other work on the machine does not count.
"""

from __future__ import annotations

import math
import resource
import subprocess
import sys
import time
from collections.abc import Sequence

import numpy as np
from scipy.optimize import brentq

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import ACTIVITY_MODELS
from reconcile.chemistry.balance import balance
from reconcile.chemistry.composition import Contents, form_table, pad
from reconcile.chemistry.engine import CHUNK, alike_together
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.chemistry.solve import solve
from reconcile.chemistry.temperature import solvent, water_at
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.settings import Settings

SUBSTANCES = (
    *("acetic acid", "sodium acetate", "NaOH", "hydrochloric acid", "KH2PO4", "Na2HPO4", "Tris", "citric acid"),
    *("trisodium citrate", "NaCl", "KCl", "boric acid", "borax", "NaHCO3", "Na2CO3", "ammonium chloride"),
    *("lactic acid", "glycine", "HEPES", "MES", "imidazole", "formic acid", "succinic acid", "histidine"),
    *("potassium hydrogen phthalate", "EDTA disodium salt dihydrate", "triethanolamine", "sodium sulfate"),
    "oxalic acid",
)
ROWS = 100_000
SAMPLE = 400
SETS = 5_000
WIDTH = 3


def recipes(rows: int, sets: int, seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Amounts [mol/L] (rows, k) of `sets` different sets of three substances, and temperatures [°C]."""
    rng = np.random.default_rng(seed)
    k = len(SUBSTANCES)
    chosen = np.argsort(rng.random((sets, k)), axis=1)[:, :WIDTH][rng.integers(0, sets, rows)]
    amounts = np.zeros((rows, k))
    amounts[np.arange(rows)[:, None], chosen] = 10.0 ** rng.uniform(-3.0, -0.8, (rows, WIDTH))
    return amounts, np.round(rng.uniform(5.0, 50.0, rows), 1)


class OneRow:
    """The charge balance of one solution in plain floats, for brentq."""

    def __init__(self, charge: float, square: float, a: float, kw: float, acids: Sequence[tuple]) -> None:
        self.charge, self.square, self.a, self.kw, self.acids = charge, square, a, kw, acids

    def __call__(self, ph: float) -> float:
        strength = 0.5 * (self.square + abs(self.charge)) + 1e-7
        for _ in range(100):
            root = math.sqrt(strength)
            d = self.a * (root / (1.0 + root) - 0.3 * min(strength, 0.5))
            g = 10.0**d
            h = g * 10.0**-ph
            oh = self.kw * g * 10.0**ph
            excess, squares = self.charge + h - oh, self.square + h + oh
            for z, total, constants in self.acids:
                ratio = 10.0 ** (ph + d * (1.0 - 2.0 * z))
                weight = whole = 1.0
                mean, second = z, z * z
                for j, k in enumerate(constants, start=1):
                    weight *= k * ratio
                    ratio *= g * g
                    whole += weight
                    mean += weight * (z - j)
                    second += weight * (z - j) ** 2
                excess += total * mean / whole
                squares += total * second / whole
            found = 0.5 * squares
            if abs(found - strength) <= 1e-13 * strength:
                return excess
            strength = found
        return excess


def row_by_row(chunk, rows: Sequence[int]) -> tuple[np.ndarray, float]:
    """pH of some rows by brentq, and the time it took [s]."""
    balances = []
    for i in rows:
        acids = [
            (float(s.charge[i]), float(s.total[i]), [float(k) for k in s.k[:, i] if k > 0.0])
            for s in chunk.slots
            if s.total[i] > 0.0
        ]
        balances.append(
            OneRow(float(chunk.strong[i]), float(chunk.square[i]), float(chunk.a[i]), float(chunk.kw[i]), acids)
        )
    begin = time.process_time()
    found = np.array([brentq(balance, -1.0, 15.0, xtol=1e-12) for balance in balances])
    return found, time.process_time() - begin


def own_balance(chunk, model, rows: int) -> float:
    """Time of brentq on the room's own balance, one row at a time [s]."""

    def excess(ph: float, one, trial) -> float:
        for _ in range(100):
            both = balance(one, model, trial * 0.0 + ph, trial)
            found = trial - both.strength
            if abs(found[0] - trial[0]) <= 1e-13 * trial[0]:
                break
            trial = found
        return float(both.excess[0])

    ones = [chunk.take(np.array([i])) for i in range(rows)]
    begin = time.process_time()
    for one in ones:
        brentq(excess, -1.0, 15.0, args=(one, 0.5 * (one.square + np.abs(one.strong)) + 1e-7), xtol=1e-12)
    return time.process_time() - begin


def best_of(times: int, call) -> float:
    """Shortest of several timings [s]."""
    taken = []
    for _ in range(times):
        begin = time.process_time()
        call()
        taken.append(time.process_time() - begin)
    return min(taken)


def engine_contents(amounts: np.ndarray, temperature: np.ndarray) -> Contents:
    row, column = np.nonzero(amounts)
    start = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=len(amounts)))]).astype(np.intp)
    return Contents(start, column, amounts[row, column], temperature, np.zeros(len(amounts)))


def against_row_by_row() -> None:
    amounts, temperature = recipes(ROWS, ROWS, 1)
    acids, model = acid_table(ion_pairs="none"), ACTIVITY_MODELS["davies"]  # what OneRow knows
    alike = Settings({"prediction.activity_model": "davies", "prediction.ion_pairs": "none"})
    forms = form_table(forms_named(SUBSTANCES), acids)
    contents = engine_contents(amounts / DENSITY_20C, temperature)
    sample = np.random.default_rng(2).choice(ROWS, SAMPLE, replace=False)
    whole, _ = pad(contents, sample, forms, acids, solvent(temperature[sample]), model)
    slow, taken = row_by_row(whole, range(SAMPLE))
    one_by_one = taken / SAMPLE * ROWS

    def engine() -> None:
        temperatures, which = np.unique(temperature, return_inverse=True)
        water, order = solvent(temperatures), alike_together(contents, forms, acids)
        for begin in range(0, ROWS, CHUNK):
            some = order[begin : begin + CHUNK]
            chunk, _ = pad(contents, some, forms, acids, water_at(water, which[some]), model)
            solve(chunk, model)

    fast = best_of(3, engine)
    full = best_of(3, lambda: predict_ph(SUBSTANCES, amounts, temperature))
    found = predict_ph(SUBSTANCES, amounts[sample], temperature[sample], settings=alike).ph
    print(f"{ROWS} mixed recipes; brentq timed on {SAMPLE} of them and scaled: {one_by_one:.1f} s")
    print(f"  largest difference in pH over the sample: {np.abs(found - slow).max():.1e}")
    own_sample = 20
    own = own_balance(whole, model, own_sample) / own_sample * ROWS
    print(f"  laying out and solving: {fast:.3f} s, {one_by_one / fast:.0f} times faster")
    print(f"  the same over brentq on the room's own balance, timed on {own_sample}: {own / fast:.0f} times")
    print(f"  predict_ph, with sensitivities and budget: {full:.3f} s, {one_by_one / full:.0f} times faster")


def across_rows() -> None:
    costs = {}
    for rows in (10_000, 100_000, 1_000_000):
        amounts, temperature = recipes(rows, SETS, 3)
        costs[rows] = best_of(3, lambda a=amounts, t=temperature: predict_ph(SUBSTANCES, a, t)) / rows
    print("cost per row of predict_ph, over that at 10^4 rows:")
    for rows, cost in costs.items():
        print(f"  {rows:>9} rows: {cost * 1e6:.2f} µs, ratio {cost / costs[10_000]:.2f}")


def across_sets() -> None:
    def taken(sets: int, seed: int) -> float:
        amounts, temperature = recipes(ROWS, sets, seed)
        return best_of(3, lambda: predict_ph(SUBSTANCES, amounts, temperature))

    alone = [taken(1, seed) for seed in range(10, 34)]
    ratio = taken(SETS, 4) / float(np.mean(alone))
    print(f"{SETS} different sets of substances over one set (mean of {len(alone)}), cost per row: ratio {ratio:.2f}")


def memory() -> None:
    code = (
        "import sys, resource; sys.path.insert(0, sys.argv[1]); import numpy as np;"
        "from reconcile.chemistry.predict import predict_ph; rng = np.random.default_rng(1);"
        "a = rng.uniform(1e-3, 0.1, (1_000_000, 4)); t = rng.uniform(5, 50, 1_000_000);"
        "p = predict_ph(['acetic acid', 'NaOH', 'Na2HPO4', 'citric acid'], a, t); assert np.isfinite(p.ph).all();"
        "print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20)"
    )
    done = subprocess.run([sys.executable, "-c", code, sys.path[0]], capture_output=True, text=True, check=True)
    print(f"peak memory of 10^6 rows of four substances: {float(done.stdout):.2f} GiB")


if __name__ == "__main__":
    against_row_by_row()
    across_sets()
    across_rows()
    memory()
    print(f"(this process: {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20:.2f} GiB)")
