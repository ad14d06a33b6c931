"""Carbon dioxide that a solution may have taken up from the air unrecorded: its share in the uncertainty of pH."""

from __future__ import annotations

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.composition import CARBONIC, Contents, FormTable
from reconcile.chemistry.engine import Answers, solved_ph
from reconcile.chemistry.temperature import LN10
from reconcile.chemistry.uncertainty import ROOT3
from reconcile.chemistry.water import DENSITY_20C
from reconcile.records.arrays import FloatArray
from reconcile.records.settings import Settings
from reconcile.records.substances import package_forms

CARBON_DIOXIDE = next(form for form in package_forms() if form.name == "carbon dioxide")
STRAIGHT = 0.02
"""pH that all of it could move at most, up to which the slope at the recorded solution serves."""


def taken_up(contents: Contents, settings: Settings) -> FloatArray:
    """Most carbon dioxide that each solution may have taken up [mol/kg] (n,); 0 where it stands open to air."""
    most = settings["uncertainty.carbon_dioxide_umol_kg"] * 1e-6
    return np.where(contents.open_co2 > 0.0, 0.0, most)


def with_gas(contents: Contents, gas: FloatArray, form: int) -> Contents:
    """The same solutions with carbon dioxide [mol/kg] (n,) as the last contribution of each."""
    count = len(contents)
    row = np.repeat(np.arange(count), np.diff(contents.start))
    order = np.argsort(np.concatenate([row, np.arange(count)]), kind="stable")
    return Contents(
        contents.start + np.arange(count + 1),
        np.concatenate([contents.form, np.full(count, form, np.intp)])[order],
        np.concatenate([contents.amount, gas])[order],
        contents.temperature_c,
        contents.open_co2,
    )


def share_of_gas(
    contents: Contents,
    forms: FormTable,
    acids: AcidTable,
    model: ActivityModel,
    settings: Settings,
    answers: Answers,
    gas_form: int,
) -> FloatArray:
    """Share of carbon dioxide taken up in the uncertainty of pH.

    Parameters
    ----------
    contents, forms, acids, model
        n solutions, as for engine.run.
    settings : Settings
        How much may have been taken up: uncertainty.carbon_dioxide_umol_kg.
    answers : Answers
        Of the solutions as recorded.
    gas_form : int
        Index of the form that carbon dioxide is.

    Returns
    -------
    ndarray (n,)
        Standard uncertainty [pH]: the change that the most taken up makes, over sqrt 3; 0 where the solution stands
        open to air.

    Notes
    -----
    Any amount up to the most counts as equally likely, and pH is predicted without it, so that the root mean square of
    the error is the largest error over sqrt 3. Where it may move pH far, the solution is solved again with the gas in
    it: where nothing buffers, the slope at the start says nothing of the end.

    References
    ----------
    JCGM 100:2008, 4.3.7 and F.2.4.5 (a one-sided error that is not corrected for).
    """
    gas = taken_up(contents, settings)
    lost = _protons_lost(answers.ph, contents.temperature_c, acids)
    straight = gas * answers.d_titrant * DENSITY_20C
    share = np.nan_to_num(lost * straight) / ROOT3
    with np.errstate(invalid="ignore"):
        far = np.flatnonzero(2.0 * straight > STRAIGHT)  # at most two protons of each molecule go into the balance
    if not len(far):
        return share
    entry = np.concatenate([np.arange(contents.start[i], contents.start[i + 1]) for i in far]).astype(np.intp)
    start = np.concatenate([[0], np.cumsum(np.diff(contents.start)[far])]).astype(np.intp)
    some = Contents(
        start, contents.form[entry], contents.amount[entry], contents.temperature_c[far], contents.open_co2[far]
    )
    ph = solved_ph(with_gas(some, gas[far], gas_form), forms, acids, model)
    share[far] = np.nan_to_num(np.abs(ph - answers.ph[far])) / ROOT3
    return share


def _protons_lost(ph: FloatArray, temperature_c: FloatArray, acids: AcidTable) -> FloatArray:
    """Protons that a molecule of carbon dioxide loses at a pH (n,), activity coefficients left out."""
    first = int(acids.first[acids.index[CARBONIC]])
    one = np.exp(LN10 * np.clip(ph - acids.pka_at(np.array(first), temperature_c), -20.0, 20.0))
    two = one * np.exp(LN10 * np.clip(ph - acids.pka_at(np.array(first + 1), temperature_c), -20.0, 20.0))
    return np.asarray((one + 2.0 * two) / (1.0 + one + two))
