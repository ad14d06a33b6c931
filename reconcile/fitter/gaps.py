"""Where readings are missing: what one more, at a degree of neutralisation that none has, would do to the interval."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np

from reconcile.chemistry.composition import form_table
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.fitter.apparent import apparent_shift, neutralised
from reconcile.fitter.cases import Cases, forms_joined
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted, inverse
from reconcile.fitter.least_squares import normal
from reconcile.fitter.model import Shape, found_at, per_enthalpy
from reconcile.fitter.profile import Interval
from reconcile.fitter.scatter import quantile_t
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.pka_results import Gap
from reconcile.records.substances import Form, catalogue

RANGES = ((10.0, 30.0), (30.0, 70.0), (70.0, 90.0))
"""Percent neutralised: the useful window of a step, its middle and the two sides of it."""
WORTH = 0.7
"""A gap is told when one reading in it would leave at most this share of the interval."""
USEFUL = 0.4
"""Width of an interval above which one more reading settles nothing."""
TRIED = 161
STRONG = ("sodium hydroxide", "hydrochloric acid")
HARMLESS = {"corrosive"}
"""Hazard word with which a gap is still told; any other word, or a gas given off with acid, keeps it unsaid."""


def may_be_told(forms: Iterable[Form]) -> bool:
    """Whether nothing in the solutions has a hazard word beyond corrosive, or gives off a gas with acid."""
    return all(set(form.hazard.split()) <= HARMLESS and not form.gas_with_acid for form in forms)


def gaps(
    evidence: Evidence, fitted: Fitted, shape: Shape, degrees: FloatArray, intervals: Sequence[Interval]
) -> tuple[Gap, ...]:
    """The ranges of neutralisation without a reading, the most telling first.

    Parameters
    ----------
    evidence, fitted, shape
        The n readings and their fit.
    degrees : ndarray (n, s)
        Share of each step neutralised in every reading.
    intervals : sequence of Interval
        The 95 % interval of every step.

    Returns
    -------
    tuple of Gap

    Notes
    -----
    A supposed reading of a solution of the readings' median concentration in the middle of the range, as noisy as the
    others, adds h h'/v to the normal matrix, h being its slopes; the interval shrinks as its standard uncertainty and t
    quantile do. Nothing is said of how such a solution might come about.

    References
    ----------
    Atkinson, Donev and Tobias 2007, Optimum Experimental Designs, with SAS, section 9.1 (information of one more
    observation).
    """
    rows, ph, degree = _supposed(evidence, fitted, shape)
    matrix, _ = normal(evidence.cases, fitted.data, fitted.residual, fitted.jacobian)
    variance = float(np.median(fitted.data.variance[fitted.data.kept]))
    inside = (ph > evidence.settings["status.electrode_low_ph"]) & (ph < evidence.settings["status.electrode_high_ph"])
    left = float(fitted.freedom[0])
    t_then = float(quantile_t(np.array([left + 1.0]))[0])
    kept, found = fitted.data.kept, []
    for step in np.flatnonzero(fitted.seen[0][shape.pka]).tolist():
        width = float(intervals[step].high[0] - intervals[step].low[0])
        for low, high in RANGES:
            percent = 100.0 * degrees[kept, step]
            if np.any((percent >= low) & (percent <= high)):
                continue
            there = np.flatnonzero(inside & (100.0 * degree[:, step] >= low) & (100.0 * degree[:, step] <= high))
            if not len(there):
                continue
            middle = there[np.argmin(np.abs(100.0 * degree[there, step] - 0.5 * (low + high)))]
            more = matrix + rows[middle][None, :, None] * rows[middle][None, None, :] / variance
            u_then = float(np.sqrt(inverse(more, fitted.seen)[0, step, step]))
            after = 2.0 * t_then * u_then
            if after > min(WORTH * width, USEFUL):
                continue
            found.append(Gap(step + 1, low, high, width if np.isfinite(width) else None, after))
    return tuple(sorted(found, key=lambda gap: (gap.after / (gap.before or np.inf), gap.step, gap.low)))


def _supposed(evidence: Evidence, fitted: Fitted, shape: Shape) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Slopes (m, k), pH (m,) and degrees (m, s) of supposed solutions from fully protonated to fully neutralised."""
    medium, cases = evidence.medium, evidence.cases
    amount, charge = _amounts(evidence)
    kept = np.flatnonzero(fitted.data.kept)
    middle = int(kept[np.argsort(amount[kept], kind="stable")[len(kept) // 2]])
    one = cases.of_readings(np.array([middle]), np.array([1]))
    # what a strong base would have to bring, from the charge that the solution's other ions leave to the acid
    own = amount[middle]
    ends = np.array([-shape.charge - 0.1, shape.steps - shape.charge + 0.1]) * own
    wanted = np.linspace(ends[0], ends[1], TRIED) - charge[middle]
    strong = form_table([catalogue().by_name[name] for name in STRONG], medium.acids)
    strong = replace(strong, acid=np.full((len(medium.forms.acid), 2), -1), units=np.zeros((len(medium.forms.acid), 2)))
    forms = forms_joined(medium.forms, strong)
    count = len(one.form)
    form = np.tile(np.append(one.form, 0), (TRIED, 1))
    form[:, -1] = len(medium.forms.charge) + (wanted < 0.0)
    dose = np.tile(np.append(one.amount, 0.0), (TRIED, 1))
    dose[:, -1] = np.abs(wanted)
    mean = shape.kelvin - ZERO_CELSIUS
    supposed = Cases(
        np.array([0, TRIED], np.intp),
        ((count + 1) * np.arange(TRIED + 1)).astype(np.intp),
        form.ravel().astype(np.intp),
        dose.ravel(),
        np.full(TRIED, mean),
        np.full(TRIED, float(one.open_co2[0])),
    )
    found = found_at(replace(medium, forms=forms), supposed, shape, fitted.theta)
    rows = np.zeros((TRIED, shape.size))
    rows[:, shape.pka] = found.slopes
    rows[:, shape.dh] = found.slopes * per_enthalpy(supposed.temperature_c, shape)[:, None]
    rows[:, shape.strength], rows[:, shape.offset] = found.d_strength, 1.0
    shift = apparent_shift(
        medium.model, shape.charge, shape.steps, supposed.temperature_c, np.nan_to_num(found.ionic_strength, nan=0.01)
    )
    degree = neutralised(np.nan_to_num(found.ph, nan=-9.0), fitted.theta[0, shape.pka] + shift)
    return np.nan_to_num(rows), np.nan_to_num(found.ph, nan=-9.0), degree


def _amounts(evidence: Evidence) -> tuple[FloatArray, FloatArray]:
    """Of every reading: molality of the studied acid, and net charge of the strong ions [mol/kg]."""
    medium, cases = evidence.medium, evidence.cases
    units = np.where(medium.forms.acid == medium.studied, medium.forms.units, 0.0).sum(axis=0)
    acid = np.bincount(cases.reading, cases.amount * units[cases.form], cases.readings)
    charge = np.bincount(cases.reading, cases.amount * medium.forms.charge[cases.form], cases.readings)
    return acid.astype(float), charge.astype(float)


def composition(evidence: Evidence) -> tuple[FloatArray, FloatArray]:
    """Of every reading: molality of the studied acid [mol/kg], and mol of strong base per mol of acid as weighed."""
    medium, cases = evidence.medium, evidence.cases
    acid, _ = _amounts(evidence)
    place: IntArray = medium.place[cases.form]
    brought = np.where(place >= 0, 0.0, cases.amount * medium.forms.charge[cases.form])
    strong = np.array([bool({"H+", "OH-"} & set(form.ions)) for form in evidence.records.forms], bool)[cases.form]
    base = np.bincount(cases.reading, np.where(strong, brought, 0.0), cases.readings)
    with np.errstate(divide="ignore", invalid="ignore"):
        return acid, np.where(acid > 0.0, base / acid, np.nan)
