"""First-order uncertainty against Monte Carlo: python tests/bench/budget_drawn.py [recipes] [draws]

Nothing here asserts; it prints, for random recipes of the library's usual substances, the ratio of the stated u to the
spread of as many draws (JCGM 101), and how the ratio depends on what the amounts can do to pH.
"""

from __future__ import annotations

import sys

import numpy as np
from speed_prediction import SUBSTANCES, engine_contents, recipes

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import activity_model
from reconcile.chemistry.composition import form_table
from reconcile.chemistry.engine import run
from reconcile.chemistry.monte_carlo import Errors, draw_ph
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.chemistry.prediction import u_of_model
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.settings import Settings

U_AMOUNT, U_TEMPERATURE = 0.006, 0.3


def drawn(count: int, draws: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """First-order u without carbon dioxide, spread of the draws about the prediction, share of the amounts."""
    amounts, temperature = recipes(count, count, 11)
    settings = Settings()
    acids, model = acid_table(), activity_model(settings["prediction.activity_model"])
    forms = form_table(forms_named(SUBSTANCES), acids)
    contents = engine_contents(amounts / DENSITY_20C, temperature)
    answers = run(contents, forms, acids, model)
    found = predict_ph(SUBSTANCES, amounts, temperature, u_amounts=U_AMOUNT, u_temperature=U_TEMPERATURE)
    first = {k: v for k, v in found.budget.items() if k != "carbon dioxide"}
    place = np.concatenate([np.arange(n) for n in np.diff(contents.start)])
    errors = Errors(
        np.arange(len(contents.form)),
        place,
        np.full(len(contents.form), U_AMOUNT),
        np.full(count, U_TEMPERATURE),
        u_of_model(model, settings),
    )
    ph = draw_ph(contents, np.arange(count), forms, acids, model, errors, answers.ionic_strength, draws)
    spread = np.sqrt(np.mean((ph - answers.ph[:, None]) ** 2, axis=1))
    return np.sqrt(sum(v**2 for v in first.values())), spread, found.budget["strength"]


if __name__ == "__main__":
    count, draws = (int(v) for v in (*sys.argv[1:], "200", "100000")[:2])
    u, spread, share = drawn(count, draws)
    ratio = u / spread
    print(f"{count} recipes, {draws} draws each; u over the spread of the draws")
    for low, high in ((0.0, 0.02), (0.02, 0.05), (0.05, 0.08), (0.08, 0.12), (0.12, 0.2), (0.2, 10.0)):
        here = (share > low) & (share <= high)
        if here.any():
            some = ratio[here]
            print(
                f"  amounts' share {low:g} to {high:g} pH: {here.sum():4} recipes, {some.min():.3f} to {some.max():.3f}"
            )
    print(f"  within 5 %: {np.mean(np.abs(ratio - 1.0) <= 0.05):.3f}")
