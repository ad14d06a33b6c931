"""What a prediction costs, as ratios measured in one run: python tests/bench/solve_cost.py [rows]

Nothing here asserts; it prints. First a whole solve (laying out is not part of it) over one evaluation of the same
charge balance, with its slopes, on the same arrays; then how the cost of predict_ph divides among its stages, and its
throughput under every activity model over that under `davies`. Times are those of the processor; the shortest of
several.
"""

from __future__ import annotations

import sys
import time
from collections import defaultdict
from collections.abc import Callable
from typing import Any

import numpy as np
from speed_prediction import SUBSTANCES, best_of, engine_contents, recipes

from reconcile.chemistry import engine, predict, solve
from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import ACTIVITY_MODELS
from reconcile.chemistry.balance import balance
from reconcile.chemistry.composition import form_table, pad
from reconcile.chemistry.engine import CHUNK
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.chemistry.temperature import solvent
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.settings import Settings


def solves_over_balances(model_name: str) -> tuple[float, float, float]:
    """Time of a solve over one balance on all its rows; balances met, in all rows; time of the start alone."""
    amounts, temperature = recipes(CHUNK, CHUNK, 1)
    acids, model = acid_table(ion_pairs="none"), ACTIVITY_MODELS[model_name]
    forms = form_table(forms_named(SUBSTANCES), acids)
    chunk, _ = pad(engine_contents(amounts / DENSITY_20C, temperature), np.arange(CHUNK), forms, acids,
                   solvent(temperature), model)  # fmt: skip
    ph, strength, _ = solve.solve(chunk, model)
    one = best_of(30, lambda: [balance(chunk, model, ph, strength) for _ in range(5)]) / 5.0
    whole = best_of(30, lambda: solve.solve(chunk, model))
    start = best_of(30, lambda: solve._start(chunk, model))
    rows = 0

    def counted(part: Any, *rest: Any) -> Any:
        nonlocal rows
        rows += len(part)
        return balance(part, *rest)

    solve.balance = counted
    try:
        solve.solve(chunk, model)
    finally:
        solve.balance = balance
    return whole / one, rows / CHUNK, start / one


STAGES = (
    (engine, "pad", "laying out"),
    (engine, "solve", "solving"),
    (engine, "slopes", "slopes"),
    (engine, "with_pairs", "ion pairs"),
    (predict, "u_drawn", "draws where pH bends"),
    (predict, "share_of_gas", "carbon dioxide"),
    (predict, "rows_alike", "rows alike"),
    (predict, "assemble", "putting together"),
)


def profile(rows: int) -> None:
    amounts, temperature = recipes(rows, rows, 3)
    taken: dict[str, float] = defaultdict(float)
    inside: list[float] = []  # of each stage that runs, what the stages within it took
    kept: list[tuple[Any, str, Callable[..., Any]]] = []
    for room, name, label in STAGES:
        own = getattr(room, name)

        def timed(*a: Any, _own: Callable[..., Any] = own, _label: str = label, **k: Any) -> Any:
            inside.append(0.0)
            begin = time.process_time()
            try:
                return _own(*a, **k)
            finally:
                own_time = time.process_time() - begin
                taken[_label] += own_time - inside.pop()
                if inside:
                    inside[-1] += own_time

        kept.append((room, name, own))
        setattr(room, name, timed)
    try:
        begin = time.process_time()
        predict_ph(SUBSTANCES, amounts, temperature)
        whole = time.process_time() - begin
    finally:
        for room, name, own in kept:
            setattr(room, name, own)
    print(f"predict_ph, {rows} different recipes of three substances, default settings; shares of {whole:.2f} s:")
    for label, part in taken.items():
        print(f"  {label:24} {part / whole:.2f}")
    print(f"  {'the rest':24} {1.0 - sum(taken.values()) / whole:.2f}")


def models(rows: int) -> None:
    amounts, temperature = recipes(rows, rows, 5)
    print("throughput over that of davies:          predict_ph   predict_ph, no pairs")
    cost: dict[str, list[float]] = {}
    for name in ("davies", *(n for n in ACTIVITY_MODELS if n != "davies")):
        cost[name] = [
            best_of(
                4,
                lambda n=name, p=pairs: predict_ph(
                    SUBSTANCES,
                    amounts,
                    temperature,
                    settings=Settings({"prediction.activity_model": n, "prediction.ion_pairs": p}),
                ),
            )
            for pairs in ("complexes", "none")
        ]
        a, b = (first / own for first, own in zip(cost["davies"], cost[name], strict=True))
        print(f"  {name:38} {a:10.2f} {b:18.2f}")


if __name__ == "__main__":
    rows = int(sys.argv[1]) if len(sys.argv) > 1 else 50_000
    print("a whole solve over one balance of all its rows; balances met (in all rows); the start over one balance")
    for name in ACTIVITY_MODELS:
        whole, met, start = solves_over_balances(name)
        print(f"  {name:20} {whole:6.1f} {met:6.1f} {start:6.1f}")
    profile(rows)
    models(rows)
