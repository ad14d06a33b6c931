"""What must hold for every mixture (hypothesis)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reconcile.chemistry.acids import acid_table
from reconcile.chemistry.activity import ACTIVITY_MODELS
from reconcile.chemistry.balance import activity, balance, free_ions, weights
from reconcile.chemistry.composition import Chunk, Contents, form_table, pad
from reconcile.chemistry.predict import forms_named, predict_ph
from reconcile.chemistry.solve import solve
from reconcile.chemistry.temperature import solvent
from reconcile.records.substances import catalogue

NAMES = [form.name for form in catalogue().forms]
MODELS = sorted(ACTIVITY_MODELS)
SOME = settings(max_examples=60, deadline=None, derandomize=True)


@dataclass(frozen=True)
class Mixture:
    names: list[str]
    amounts: list[float]
    temperature: float


@st.composite
def mixtures(draw: st.DrawFn, most: int = 5) -> Mixture:
    names = draw(st.lists(st.sampled_from(NAMES), min_size=1, max_size=most, unique=True))
    amounts = [10.0 ** draw(st.floats(-6.0, -0.7)) for _ in names]
    return Mixture(names, amounts, draw(st.floats(0.0, 100.0)))


def chunk_of(mixture: Mixture, model: str) -> Chunk:
    forms = form_table(forms_named(mixture.names), acid_table())
    t = np.array([mixture.temperature])
    contents = Contents(
        np.array([0, len(mixture.names)]), np.arange(len(mixture.names)), np.array(mixture.amounts), t, np.zeros(1)
    )
    return pad(contents, np.arange(1), forms, acid_table(), solvent(t), ACTIVITY_MODELS[model])[0]


@SOME
@given(mixtures(), st.sampled_from(MODELS))
def test_charge_and_ionic_strength_close_at_the_answer(mixture: Mixture, model: str) -> None:
    chunk = chunk_of(mixture, model)
    ph, strength, solved = solve(chunk, ACTIVITY_MODELS[model])
    assert solved.all()
    found = balance(chunk, ACTIVITY_MODELS[model], ph, strength)
    assert abs(found.excess[0]) <= 1e-8 * abs(found.excess_ph[0])  # within 1e-8 pH of exact closure
    assert abs(found.strength[0]) <= 1e-8 * strength[0]


@SOME
@given(mixtures(), st.sampled_from(MODELS), st.floats(0.0, 14.0), st.floats(1e-7, 2.0))
def test_fractions_are_fractions(mixture: Mixture, model: str, ph: float, strength: float) -> None:
    chunk = chunk_of(mixture, model)
    act = activity(chunk, ACTIVITY_MODELS[model], np.array([strength]))
    at = np.array([ph])
    raised = free_ions(chunk, act, at)[2]
    for i, slot in enumerate(chunk.slots):
        some = np.array([1.0, *(w[0] for w in weights(slot, at, act, raised, i))])
        fractions = some / some.sum()
        assert np.isfinite(fractions).all()
        assert fractions.sum() == pytest.approx(1.0)


@SOME
@given(mixtures(), st.randoms(use_true_random=False))
def test_order_of_components_changes_nothing(mixture: Mixture, random) -> None:
    order = list(range(len(mixture.names)))
    random.shuffle(order)
    one = predict_ph(mixture.names, mixture.amounts, mixture.temperature)
    other = predict_ph([mixture.names[i] for i in order], [mixture.amounts[i] for i in order], mixture.temperature)
    assert other.ph[0] == pytest.approx(one.ph[0], abs=1e-8)
    assert other.u[0] == pytest.approx(one.u[0], rel=1e-6)


@SOME
@given(st.lists(mixtures(3), min_size=2, max_size=8), st.randoms(use_true_random=False))
def test_order_of_rows_changes_nothing_and_a_row_alone_equals_itself(several: list[Mixture], random) -> None:
    names = sorted({name for m in several for name in m.names})
    amounts = np.zeros((len(several), len(names)))
    for row, m in enumerate(several):
        amounts[row, [names.index(n) for n in m.names]] = m.amounts
    t = np.array([m.temperature for m in several])
    together = predict_ph(names, amounts, t)
    order = list(range(len(several)))
    random.shuffle(order)
    shuffled = predict_ph(names, amounts[order], t[order])
    assert shuffled.ph == pytest.approx(together.ph[order], abs=1e-10)
    for row in range(len(several)):
        alone = predict_ph(names, amounts[row], t[row])
        assert alone.ph[0] == pytest.approx(together.ph[row], abs=1e-10)
        assert alone.u[0] == pytest.approx(together.u[row], rel=1e-8)


@SOME
@given(mixtures(), st.floats(-6.0, -1.0))
def test_strong_base_never_lowers_ph_in_the_ideal_model(mixture: Mixture, lg: float) -> None:
    names = [*(n for n in mixture.names if n != "sodium hydroxide"), "sodium hydroxide"]
    amounts = [a for n, a in zip(mixture.names, mixture.amounts, strict=True) if n != "sodium hydroxide"]
    rows = [[*amounts, 0.0], [*amounts, 10.0**lg]]
    found = predict_ph(names, rows, mixture.temperature, activity_model="ideal")
    assert found.ph[1] >= found.ph[0] - 1e-9
    assert np.all(found.d_titrant > 0.0)


@SOME
@given(st.floats(0.0, 100.0), st.sampled_from(MODELS))
def test_pure_water_is_neutral_at_every_temperature(temperature: float, model: str) -> None:
    found = predict_ph([], np.zeros((1, 0)), temperature, activity_model=model)
    half = solvent(np.array([temperature])).pkw[0] / 2.0
    # activities: H+ and OH- differ in ion size in one model, by far less than 1e-4 at this ionic strength
    assert found.ph[0] == pytest.approx(half, abs=1e-4)


@SOME
@given(st.floats(0.2, 5.0), st.floats(0.01, 0.1), st.floats(1.5, 10.0))
def test_scaling_an_ideal_buffer_moves_ph_only_by_the_share_of_free_ions(
    ratio: float, amount: float, scale: float
) -> None:
    """pH = pKa + lg((b + h - oh) / (a - h + oh)): the ratio moves by (h - oh)(1/a + 1/b) at most, in both rows."""
    rows = np.array([[amount, amount * ratio], [amount * scale, amount * ratio * scale]])
    found = predict_ph(["acetic acid", "sodium acetate"], rows, unit="mol/kg", activity_model="ideal")
    h = 10.0**-found.ph
    share = (h * (1.0 / rows[:, 0] + 1.0 / rows[:, 1])).sum() / np.log(10.0)
    assert abs(found.ph[1] - found.ph[0]) <= 1.1 * share
