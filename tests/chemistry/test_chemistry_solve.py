"""The solver's last resort, sets of alike rows, and chunks of mixed shapes."""

from __future__ import annotations

import numpy as np
import pytest

from reconcile.chemistry import engine, solve
from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import ACTIVITY_MODELS
from reconcile.chemistry.composition import Contents, form_table, pad
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.chemistry.temperature import solvent
from reconcile.records.substances import catalogue


def wide_mixtures(count: int, seed: int) -> tuple[list[str], np.ndarray, np.ndarray]:
    """Mixtures over the whole library, from traces to beyond the range of the models."""
    rng = np.random.default_rng(seed)
    names = [f.name for f in catalogue().forms]
    amounts = np.zeros((count, len(names)))
    for row in range(count):
        some = rng.choice(len(names), rng.integers(1, 5), replace=False)
        amounts[row, some] = 10.0 ** rng.uniform(-7.0, 0.7, len(some))
    return names, amounts, rng.uniform(0.0, 100.0, count)


@pytest.mark.parametrize("model", sorted(ACTIVITY_MODELS))
def test_everything_in_the_library_is_solved(model: str) -> None:
    names, amounts, t = wide_mixtures(3000, 1)
    found = predict_ph(names, amounts, t, activity_model=model)
    assert np.isfinite(found.ph).all()
    assert np.isfinite(found.u).all()
    assert np.all((found.ph > -2.0) & (found.ph < 15.5))


@pytest.mark.parametrize("model", sorted(ACTIVITY_MODELS))
def test_the_last_resort_finds_the_same_answers(model: str, monkeypatch: pytest.MonkeyPatch) -> None:
    names, amounts, t = wide_mixtures(60, 2)
    usual = predict_ph(names, amounts, t, activity_model=model)
    monkeypatch.setattr(solve, "STEPS", 0)
    last = predict_ph(names, amounts, t, activity_model=model)
    inside = usual.ionic_strength < 0.5  # beyond it the slope of D has a corner, and halving is still exact
    assert last.ph[inside] == pytest.approx(usual.ph[inside], abs=1e-8)
    assert last.ph == pytest.approx(usual.ph, abs=1e-6)


def test_rows_of_every_shape_in_many_chunks(monkeypatch: pytest.MonkeyPatch) -> None:
    names, amounts, t = wide_mixtures(400, 3)
    whole = predict_ph(names, amounts, t)
    monkeypatch.setattr(engine, "CHUNK", 37)
    parts = predict_ph(names, amounts, t)
    for name in ("ph", "u", "ionic_strength", "d_temperature", "d_titrant"):
        assert getattr(parts, name) == pytest.approx(getattr(whole, name), rel=1e-9, abs=1e-12)
    assert np.array_equal(parts.contributions.row, whole.contributions.row)
    assert np.array_equal(parts.constants.column, whole.constants.column)
    assert parts.constants.value == pytest.approx(whole.constants.value, rel=1e-7, abs=1e-12)


def test_alike_rows_are_found_bit_for_bit() -> None:
    rows = np.array([[1.0, 2.0], [3.0, 4.0], [1.0, 2.0], [1.0, 2.0 + 1e-15], [3.0, 4.0]])
    first, which = solve.rows_alike(rows)
    assert first.tolist() == [0, 1, 3]
    assert which.tolist() == [0, 1, 0, 2, 1]


def test_rows_that_share_a_hash_are_kept_apart(monkeypatch: pytest.MonkeyPatch) -> None:
    class Nothing:
        def integers(self, low: int, high: int, size: int, kind: type) -> np.ndarray:
            return np.full(size, 2**63 - 1, kind)  # every column counts alike: swapped values collide

    monkeypatch.setattr(solve.np.random, "default_rng", lambda seed: Nothing())
    rows = np.array([[1.0, 2.0], [2.0, 1.0], [1.0, 2.0], [2.0, 1.0]])
    first, which = solve.rows_alike(rows)
    assert np.array_equal(rows[first][which], rows)


def test_identical_rows_are_solved_once(monkeypatch: pytest.MonkeyPatch) -> None:
    solved: list[int] = []
    inner = engine.solve

    def counting(chunk, model):
        solved.append(len(chunk))
        return inner(chunk, model)

    monkeypatch.setattr(engine, "solve", counting)
    rows = np.tile([[0.1, 0.05], [0.1, 0.02]], (500, 1))
    found = predict_ph(["acetic acid", "NaOH"], rows)
    assert sum(solved) == 2
    assert found.ph[::2] == pytest.approx(np.full(500, found.ph[0]), abs=0.0)
    assert len(found.contributions.row) == 2000


def test_a_pad_of_rows_without_acids() -> None:
    forms = form_table(forms_named(["NaCl", "acetic acid"]), acid_table())
    contents = Contents(np.array([0, 1, 1, 2]), np.array([0, 1]), np.array([0.1, 0.2]), np.full(3, 25.0), np.zeros(3))
    chunk, _ = pad(contents, np.arange(3), forms, acid_table(), solvent(np.full(3, 25.0)), ACTIVITY_MODELS["davies"])
    assert len(chunk.slots) == 1
    assert chunk.slots[0].total.tolist() == [0.0, 0.0, 0.2]
    assert chunk.square.tolist() == [0.2, 0.0, 0.0]
