"""The optimum against a general curve fitter started at the truth, and against an optimum in 30 digits."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from made_records import Made, Truth
from mpmath import mp, mpf
from scipy.optimize import curve_fit

import reconcile
from reconcile.chemistry.acids import Ionization, acid_table, build
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.temperature import solvent
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.substances import Form, catalogue

AGREE = 2e-6
ADDED = np.arange(2.0, 24.0, 2.0)
NONE: dict[str, Any] = {
    "synonyms": (), "formula": "", "hydrate_of": "", "usual_liquid": "", "hazard": "", "gas_with_acid": "", "note": "",
}  # fmt: skip


def forms(steps: int) -> tuple[Any, list[Form]]:
    """A function from constants to a table that holds the acid under study, and the forms of acid and titrant."""
    acid = Form("acid K", molar_mass=100.0, acid="acid K", protons_removed=0.0, acid_units=1.0, ions={}, **NONE)

    def table(pka: np.ndarray[Any, Any]) -> Any:
        own = [
            Ionization("acid K", "", "", 0, j + 1, float(p), 1.0, float("nan"), float("nan"), "here", "", "")
            for j, p in enumerate(np.sort(pka))
        ]
        return build([*acid_table().rows, *own])

    return table, [acid, catalogue().by_name["sodium hydroxide"]]


@dataclass(frozen=True)
class Case:
    name: str
    truth: Truth
    steps: int
    top: float
    free: tuple[str, ...]


CASES = [
    Case("one step", Truth(), 1, 1.0, ()),
    Case("one step, strength", Truth(factor=1.03), 1, 1.0, ("strength",)),
    Case("one step, offset", Truth(offset=0.05, noise=0.004), 1, 1.25, ("strength", "offset")),
    Case("two steps", Truth("succinic acid"), 2, 2.0, ()),
    Case("two steps, strength", Truth("succinic acid", factor=0.97), 2, 2.0, ("strength",)),
]


@pytest.mark.parametrize("case", CASES, ids=[c.name for c in CASES])
def test_the_same_optimum_as_a_general_curve_fitter(tmp_path: Path, case: Case) -> None:
    added = ADDED * case.top
    made = Made().titration(case.truth, "acid K", added=added.tolist())
    found = reconcile.fit_pka(made.write(tmp_path), acid="acid K", steps=case.steps, free=case.free)
    table, both = forms(case.steps)
    acid = 0.05 * 50.0 / (50.0 + added)
    base = 0.1 * added / (50.0 + added)

    def model(_x: Any, *given: float) -> np.ndarray[Any, Any]:
        left = list(given)
        pka = np.array([left.pop(0) for _ in range(case.steps)])
        factor = np.exp(left.pop(0)) if "strength" in case.free else 1.0
        offset = left.pop(0) if "offset" in case.free else 0.0
        amounts = np.column_stack([acid * factor, base])
        return np.asarray(predict_ph(both, amounts, 25.0, acids=table(pka)).ph + offset)

    true = [*case.truth.pka]
    true += [np.log(case.truth.factor)] if "strength" in case.free else []
    true += [case.truth.offset] if "offset" in case.free else []
    best, covariance = curve_fit(
        model,
        added,
        found.observed,
        true,
        sigma=found.u_reading,
        absolute_sigma=True,
        xtol=1e-14,
        ftol=1e-14,
        gtol=1e-14,
    )
    ours = [step.pka for step in found.steps]
    assert ours == pytest.approx(best[: case.steps].tolist(), abs=AGREE)
    if "strength" in case.free:
        assert np.log(found.strength.value or 0.0) == pytest.approx(best[case.steps], abs=AGREE)
    shares = [{s.source: s.u for s in step.budget}["reading"] for step in found.steps]
    # its covariance rests on slopes by differences, ours on analytic ones
    assert shares == pytest.approx(np.sqrt(np.diag(covariance))[: case.steps].tolist(), rel=0.02)


def test_the_same_optimum_in_thirty_digits(tmp_path: Path) -> None:
    """One step, Davies' equation and the charge balance written out; Newton on the slope of the sum of squares."""
    made = Made(5).titration(Truth(), "acid K", added=ADDED.tolist())
    davies = {"prediction": {"activity_model": "davies"}}
    found = reconcile.fit_pka(made.write(tmp_path), acid="acid K", steps=1, settings=davies)
    water = solvent(np.array([25.0]))
    with mp.workdps(30):
        a, kw = mpf(float(water.a[0])), mpf(10) ** (-mpf(float(water.pkw[0])))
        rows = [
            (
                mpf(float(v)),
                mpf(float(0.05 * 50.0 / (50.0 + v))) / mpf(float(DENSITY_20C)),
                mpf(float(0.1 * v / (50.0 + v))) / mpf(float(DENSITY_20C)),
            )
            for v in ADDED
        ]

        def ph(pka: Any, acid: Any, base: Any) -> Any:
            """pH of one mixture: root of the charge inside, ionic strength by substitution around."""
            strength = base + mpf("1e-4")
            for _ in range(60):
                d = a * (mp.sqrt(strength) / (1 + mp.sqrt(strength)) - mpf(3) / 10 * strength)
                g = mpf(10) ** -d

                def charge(x: Any, g: Any = g) -> Any:
                    h = mpf(10) ** -x
                    anion = acid / (1 + h * g / mpf(10) ** -pka)
                    return base + h / g - kw / h / g - anion

                root = mp.findroot(charge, (mpf(2), mpf(12)), solver="anderson", tol=mpf(10) ** -26)
                h = mpf(10) ** -root
                ions = base + h / g + kw / h / g + acid / (1 + h * g / mpf(10) ** -pka)
                if abs(ions / 2 - strength) < mpf(10) ** -20:
                    return root
                strength = ions / 2
            raise AssertionError("the ionic strength did not settle")

        weights = [1 / mpf(float(u)) ** 2 for u in found.u_reading]

        def slope(pka: Any) -> Any:
            step = mpf(10) ** -8
            total = mpf(0)
            for (_, acid, base), y, w in zip(rows, found.observed, weights, strict=True):
                low, high = ph(pka - step, acid, base), ph(pka + step, acid, base)
                total += w * (mpf(float(y)) - (low + high) / 2) * (high - low) / (2 * step)
            return total

        best = mp.findroot(slope, (mpf("4.74"), mpf("4.78")), solver="secant", tol=mpf(10) ** -8)
    assert found.steps[0].pka == pytest.approx(float(best), abs=AGREE)
