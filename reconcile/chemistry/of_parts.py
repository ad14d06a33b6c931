"""The prediction for one solution given in words, once its parts are made up."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from reconcile.chemistry.notices import Notice, notices
from reconcile.chemistry.predict import predict_ph
from reconcile.chemistry.water import DENSITY_20C, HIGH_C, LOW_C
from reconcile.records.parts import Composition
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings

if TYPE_CHECKING:
    from reconcile.chemistry.trail import Trail


@dataclass(frozen=True)
class PredictedParts:
    """The prediction for one solution given in words.

    composition : the parts once made up
    prediction : Prediction of one row
    settings : with which it was made
    notices : what it cannot see of the solution
    """

    composition: Composition
    prediction: Prediction
    settings: Settings
    notices: tuple[Notice, ...] = ()

    @property
    def molality(self) -> list[float]:
        """How much of each part there is [mol/kg]."""
        scale = 1.0 if self.composition.unit == "mol/kg" else 1.0 / DENSITY_20C
        return [amount * scale for amount in self.composition.amounts]

    def trail(self) -> Trail | None:
        """The calculation behind it, for a reviewer; None where no pH was reached."""
        if str(self.prediction.status[0]) == "not_solved":
            return None
        from reconcile.chemistry.trail import trail

        forms = [part.form for part in self.composition.parts]
        return trail(forms, self.molality, float(self.prediction.temperature_c[0]), self.settings)


def predict_composition(composition: Composition, at: float, settings: Settings) -> PredictedParts:
    """The predicted pH of parts once made up, with the uncertainties that the settings give to their amounts."""
    if not LOW_C <= at <= HIGH_C:
        words = (("name", "the temperature"), ("low", f"{LOW_C:g} °C"), ("high", f"{HIGH_C:g} °C"))
        raise InputProblems([Problem("at-out-of-range", Place(""), f"{at:g} °C", words)])
    strength = settings["uncertainty.lot_strength_percent"] / 100.0 / 3.0**0.5
    taking = settings["uncertainty.preparation_percent"] / 100.0 / 3.0**0.5
    prediction = predict_ph(
        [part.form.name for part in composition.parts],
        np.array([composition.amounts]),
        at,
        unit=composition.unit,
        settings=settings,
        u_amounts=np.full((1, len(composition.parts)), (strength**2 + taking**2) ** 0.5),
    )
    found = PredictedParts(composition, prediction, settings)
    said = notices([part.form for part in composition.parts], found.molality, prediction, 0, settings)
    return replace(found, notices=said)
