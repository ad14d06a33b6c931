"""Errors that many readings share (a lot's strength, a meter's offset, the model): what each does to the constants."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.composition import entries_at
from reconcile.chemistry.prediction import u_of_model
from reconcile.chemistry.temperature import U_KNOWN_DH, U_MISSING_DH
from reconcile.chemistry.uncertainty import ROOT3
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted, inverse
from reconcile.fitter.least_squares import normal
from reconcile.fitter.library_constants import u_constant
from reconcile.fitter.model import Found, Shape, per_enthalpy
from reconcile.records.arrays import BoolArray, FloatArray
from reconcile.records.substances import Form

READING = "reading"
SOURCES = (READING, "meter", "strength", "titrant", "temperature", "activity model", "other constants")


@dataclass(frozen=True)
class Common:
    """One error: its source, its effect on every reading per unit (n,) [pH], and its standard uncertainty.

    own : whether it is of a constant of the studied acid itself, held at the library's value
    """

    source: str
    effect: FloatArray
    u: float
    own: bool = False


def is_titrant(form: Form) -> bool:
    """Whether a form is a strong acid or base that brings no weak one."""
    return bool({"H+", "OH-"} & set(form.ions)) and not form.acids


def taking_variance(evidence: Evidence, found: Found) -> FloatArray:
    """Variance of each reading from amounts that were taken for it alone, (n,) [pH^2].

    A solution made by itself has every amount to itself; within a titration series only what was added of the titrant.
    """
    cases, record = evidence.cases, evidence.record
    titrant = np.array([is_titrant(form) for form in evidence.records.forms], bool)[cases.form]
    in_series = (evidence.series != "")[cases.reading]
    dosed = np.nan_to_num(evidence.records.solutions.u_amount[evidence.origin])
    u = np.where(in_series, np.where(titrant, dosed, 0.0), record.u_taking[evidence.origin])
    entry = np.nan_to_num(found.answers.entry)
    return np.bincount(cases.reading, (entry * u) ** 2, cases.readings).astype(float)


def common_errors(
    evidence: Evidence, found: Found, shape: Shape, acids: AcidTable, seen: BoolArray, known: bool
) -> list[Common]:
    """Every shared error of some readings.

    Parameters
    ----------
    evidence, found
        n readings and the engine's answer at the fit.
    acids : AcidTable
        Constants with their uncertainties.
    seen : ndarray of bool (k,)
        Parameters found from the readings.
    known : bool
        Whether the library holds the studied acid, so that steps not sought are held at its values.
    """
    out = [*_lots(evidence, found), *_series(evidence, found), *_meters(evidence, found.ph)]
    marked = evidence.records.solutions.without_effect
    if len(marked):
        allowance = float(evidence.settings["substances.without_effect_allowance"])
        held = marked[np.asarray(evidence.records.readings_solution, np.intp)[evidence.index]]
        if np.any(held):
            out.append(Common("declared without effect", np.asarray(held, float), allowance))
    out.append(Common("temperature", np.nan_to_num(found.d_temperature) * evidence.u_temperature, 1.0))
    out.append(Common("activity model", found.d_model, u_of_model(evidence.medium.model, evidence.settings)))
    out += _constants(evidence, found, acids)
    apart = per_enthalpy(evidence.temperature, shape)
    first = int(acids.first[evidence.medium.studied])
    mean = np.array([shape.kelvin - 273.15])
    for step in range(shape.steps):
        if not seen[shape.steps + step]:  # an enthalpy that is not sought moves warm and cold readings apart
            unknown = not known or np.isnan(acids.rows[first + step].dh_kj_mol)
            u = U_MISSING_DH if unknown else U_KNOWN_DH
            out.append(Common("temperature", found.slopes[:, step] * apart, u))
        if known and not seen[step]:
            u = float(u_constant(acids, np.array([first + step]), mean)[0])
            out.append(Common("other constants", found.slopes[:, step], u, own=True))
    return out


def _lots(evidence: Evidence, found: Found) -> Iterable[Common]:
    """A lot's strength is wrong in every reading alike; amounts of one form that name no lot count as one lot."""
    records, record, cases = evidence.records, evidence.record, evidence.cases
    lots = len(records.lots)
    link, entry = entries_at(record.chain_start, evidence.origin)
    lot = record.chain_lot[link]
    form = cases.form[entry]
    key = np.where(lot < lots, lot, lots + form)
    slope = np.nan_to_num(found.answers.entry)[entry]
    for one in np.unique(key).tolist():
        mine = key == one
        of_form = records.forms[int(form[mine][0])] if one >= lots else records.forms[int(records.lots.form[one])]
        effect = np.bincount(cases.reading[entry[mine]], slope[mine], cases.readings)
        source = "titrant" if is_titrant(of_form) else "strength"
        yield Common(source, effect.astype(float), float(record.u_lot[lot[mine][0]]))


def _series(evidence: Evidence, found: Found) -> Iterable[Common]:
    """What was taken at the start of a titration series is wrong in all its readings alike."""
    cases, forms = evidence.cases, evidence.records.forms
    u = np.nan_to_num(evidence.records.solutions.u_amount[evidence.origin])
    slope = np.nan_to_num(found.answers.entry)
    series = evidence.series[cases.reading]
    for name in dict.fromkeys(s for s in evidence.series.tolist() if s):
        for form in np.unique(cases.form[series == name]).tolist():
            if not is_titrant(forms[form]):
                mine = (series == name) & (cases.form == form)
                effect = np.bincount(cases.reading[mine], slope[mine], cases.readings)
                yield Common("strength", effect.astype(float), float(u[mine].max()))


def meter_accuracy(evidence: Evidence, meter: str) -> float:
    """Stated accuracy of a meter as a half-width [pH]; the settings' where none is stated."""
    table = evidence.records.meters
    for name, value in zip(table["meter"].tolist(), table["accuracy"].tolist(), strict=True):
        if name == meter and np.isfinite(value) and value > 0.0:
            return float(value)
    return float(evidence.settings["uncertainty.meter_accuracy"])


def _meters(evidence: Evidence, ph: FloatArray) -> Iterable[Common]:
    meters = evidence.records.readings["meter"][evidence.index]
    span = float(evidence.settings["uncertainty.meter_span_percent"]) / 100.0 / ROOT3
    for name in dict.fromkeys(meters.tolist()):
        mine = (meters == name).astype(float)
        yield Common("meter", mine, meter_accuracy(evidence, name) / ROOT3)
        yield Common("meter", mine * (np.nan_to_num(ph) - 7.0), span)


def _constants(evidence: Evidence, found: Found, acids: AcidTable) -> Iterable[Common]:
    """Constants of the other acids in the solutions, and that of water."""
    constants, n = found.answers.constants, len(evidence)
    row = np.repeat(np.arange(n), np.diff(constants.start))
    first, steps = int(acids.first[evidence.medium.studied]), int(acids.steps[evidence.medium.studied])
    others = (constants.column < len(acids.pka)) & ~((constants.column >= first) & (constants.column < first + steps))
    mean = np.array([float(evidence.temperature.mean())])
    for q in np.unique(constants.column[others]).tolist():
        mine = constants.column == q
        effect = np.bincount(row[mine], constants.value[mine], n).astype(float)
        yield Common("other constants", effect, float(u_constant(acids, np.array([q]), mean)[0]))
    yield Common("other constants", found.answers.u_constants, 1.0)  # of pKw alone, see model.without_uncertainty


@dataclass(frozen=True)
class Budget:
    """Covariance of the parameters by source, (k, k) each; their sum is the whole."""

    parts: dict[str, FloatArray]

    @property
    def whole(self) -> FloatArray:
        return np.asarray(np.stack(list(self.parts.values())).sum(axis=0), float)

    def shares(self, along: FloatArray) -> list[tuple[str, float]]:
        """Standard uncertainties by source of a combination of parameters (k,), the largest first."""
        found = [(name, float(along @ part @ along)) for name, part in self.parts.items()]
        found = [(name, max(variance, 0.0) ** 0.5) for name, variance in found]
        return sorted(found, key=lambda item: -item[1])


def budget(evidence: Evidence, fitted: Fitted, errors: Iterable[Common]) -> Budget:
    """What every error does to the parameters of a single case.

    Notes
    -----
    A shared error of effect g moves the estimate by C J' W g, with C the covariance of the fit and W its weights.

    References
    ----------
    JCGM 100:2008, 5.2 (correlated input quantities) and F.1.2.3 (effects common to several observations).
    """
    weight = np.where(fitted.data.kept, 1.0 / fitted.data.variance, 0.0)
    spread = fitted.covariance[0] @ (fitted.jacobian * weight[:, None]).T
    parts = {name: np.zeros_like(fitted.covariance[0]) for name in SOURCES}
    parts[READING] = fitted.covariance[0]
    for error in errors:
        shift = spread @ np.nan_to_num(error.effect) * error.u
        parts[error.source] = parts.get(error.source, 0.0) + np.outer(shift, shift)
    return Budget(parts)


def extended(evidence: Evidence, fitted: Fitted, also: BoolArray) -> FloatArray:
    """The fit's normal matrix over the parameters seen and some more, inverted: what would be if these were free."""
    matrix, _ = normal(evidence.cases, fitted.data, fitted.residual, fitted.jacobian)
    return np.asarray(inverse(matrix, (fitted.seen[0] | also)[None])[0])
