"""From a fit to what is reported of each step: its standing, values, budget, and the relation known where it is not."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.temperature import GAS_CONSTANT, LN10, U_KNOWN_DH
from reconcile.chemistry.water import ZERO_CELSIUS
from reconcile.fitter.apparent import apparent_shift
from reconcile.fitter.common_errors import Budget, extended
from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted
from reconcile.fitter.library_constants import u_constant
from reconcile.fitter.model import PER_DH, Shape
from reconcile.fitter.profile import Interval
from reconcile.fitter.wording import constant_name, figure, say, uncertainty
from reconcile.records.arrays import FloatArray
from reconcile.records.pka_results import Nuisance, PkaStep, Share

LIMIT_U = 0.10
LIMIT_CORRELATION = 0.99
CLOSE = 2.0
"""Distance of two constants below which their ionizations overlap."""
T25 = 298.15
AT_25 = 0.05
"""Kelvin from 25 °C within which a value is one at 25 °C."""


@dataclass(frozen=True)
class Judged:
    """What the steps are judged by.

    acids : constants with uncertainties; first : index of the studied acid's first constant; known : in the library
    """

    evidence: Evidence
    shape: Shape
    fitted: Fitted
    whole: Fitted
    budget: Budget
    intervals: tuple[Interval, ...]
    ionic_strength: FloatArray
    acids: AcidTable
    known: bool


def correlation(covariance: FloatArray, a: int, b: int) -> float:
    """Correlation of two parameters; 0 where either is not seen."""
    product = float(covariance[a, a] * covariance[b, b])
    return float(covariance[a, b] / np.sqrt(product)) if product > 0.0 else 0.0


def steps(judged: Judged) -> tuple[PkaStep, ...]:
    """Every step with its standing."""
    return tuple(_step(judged, step) for step in range(judged.shape.steps))


def identifiable(judged: Judged, index: int) -> bool:
    """Whether u is at most 0.10 and every correlation with what else is sought under 0.99."""
    fitted = judged.fitted
    if not fitted.seen[0, index]:
        return False
    variance = judged.budget.whole[index, index]
    others = [j for j in np.flatnonzero(fitted.seen[0]).tolist() if j != index]
    close = max((abs(correlation(fitted.covariance[0], index, j)) for j in others), default=0.0)
    return bool(np.sqrt(variance) <= LIMIT_U and close < LIMIT_CORRELATION)


def _step(judged: Judged, step: int) -> PkaStep:
    shape, fitted = judged.shape, judged.fitted
    temperature = shape.kelvin - ZERO_CELSIUS
    library = _library(judged, step)
    if not fitted.free[0, step]:
        value, u = library or (float(fitted.theta[0, step]), 0.0)
        name = constant_name(step + 1, shape.steps)
        relation = say("held", name=name, value=figure(value), u=uncertainty(u))
        return PkaStep(
            step + 1, "held", None, None, None, (None, None), None, None, temperature, library=library,
            relation=relation,
        )  # fmt: skip
    low, high = float(judged.intervals[step].low[0]), float(judged.intervals[step].high[0])
    bounds = (low if np.isfinite(low) else None, high if np.isfinite(high) else None)
    closed = np.isfinite(low) and np.isfinite(high)
    value = float(fitted.theta[0, step])
    along = np.zeros(shape.size)
    along[step] = 1.0
    shares = judged.budget.shares(along)
    u = float(np.sqrt(sum(share**2 for _, share in shares)))
    correlations = _correlations(judged, step)
    if not (closed and identifiable(judged, step)):
        return PkaStep(
            step + 1, "not_identifiable", None, None, None, bounds, None, None, temperature, library=library,
            correlation=correlations, relation=_relation(judged, step, bounds, u),
        )  # fmt: skip
    strength = _informative_strength(judged, step)
    shift = apparent_shift(
        judged.evidence.medium.model, shape.charge, shape.steps, np.array([temperature]), np.array([strength])
    )
    dh, u_dh, origin = _enthalpy(judged, step)
    at_25, u_25 = _at_25(judged, step, dh, u_dh, origin, u)
    rejected = not bool(fitted.data.kept.all())
    with_all = None
    if rejected:
        spread = float(np.sqrt(judged.whole.covariance[0, step, step]))
        with_all = (float(judged.whole.theta[0, step]), spread)
    return PkaStep(
        step=step + 1,
        standing="found",
        pka=value,
        u=u,
        interval95=(low, high),
        bounds=bounds,
        pka_apparent=value + float(shift[0, step]),
        ionic_strength=strength,
        temperature_c=temperature,
        pka_25c=at_25,
        u_25c=u_25,
        dh_kj_mol=dh,
        u_dh=u_dh,
        dh_origin=origin,
        budget=tuple(Share(name, share) for name, share in shares),
        correlation=correlations,
        library=library,
        with_all=with_all,
    )


def _library(judged: Judged, step: int) -> tuple[float, float] | None:
    """The library's constant at the readings' mean temperature, with its standard uncertainty."""
    if not judged.known:
        return None
    acids = judged.acids
    constant = np.array([int(acids.first[judged.evidence.medium.studied]) + step])
    mean = np.array([judged.shape.kelvin - ZERO_CELSIUS])
    return float(acids.pka_at(constant, mean)[0]), float(u_constant(acids, constant, mean)[0])


def _informative_strength(judged: Judged, step: int) -> float:
    """Mean ionic strength of the readings kept, each weighted by what it tells about the step [mol/kg]."""
    kept = judged.fitted.data.kept
    weight = judged.fitted.jacobian[kept, step] ** 2 / judged.fitted.data.variance[kept]
    return float(np.sum(weight * judged.ionic_strength[kept]) / weight.sum())


def _correlations(judged: Judged, step: int) -> dict[str, float]:
    """Correlation with strength and with offset, as if each were set free."""
    shape, out = judged.shape, {}
    for name, index in (("strength", shape.strength), ("offset", shape.offset)):
        also = np.zeros(shape.size, bool)
        also[index] = True
        covariance = extended(judged.evidence, judged.fitted, also)
        if covariance[step, step] > 0.0 and covariance[index, index] > 0.0:
            out[name] = correlation(covariance, step, index)
    return out


def _enthalpy(judged: Judged, step: int) -> tuple[float | None, float | None, str]:
    """Enthalpy of ionization at the mean temperature [kJ/mol], its u, and where it is from."""
    index = judged.shape.steps + step
    value = float(judged.fitted.theta[0, index])
    if judged.fitted.seen[0, index]:
        return value, float(np.sqrt(judged.budget.whole[index, index])), "fitted"
    if judged.known:
        q = int(judged.acids.first[judged.evidence.medium.studied]) + step
        if np.isfinite(judged.acids.rows[q].dh_kj_mol):
            return value, U_KNOWN_DH, "library"
    return None, None, ""


def _at_25(
    judged: Judged, step: int, dh: float | None, u_dh: float | None, origin: str, u: float
) -> tuple[float | None, float | None]:
    shape = judged.shape
    value = float(judged.fitted.theta[0, step])
    if abs(shape.kelvin - T25) <= AT_25:
        return value, u
    if dh is None or u_dh is None:
        return None, None
    per_dh = PER_DH * (1.0 / T25 - 1.0 / shape.kelvin)
    ratio = T25 / shape.kelvin
    capacity = float(shape.dcp[step]) / (GAS_CONSTANT * LN10)
    moved = value + dh * per_dh - capacity * (np.log(ratio) + 1.0 / ratio - 1.0)
    along = np.zeros(shape.size)
    along[step] = 1.0
    if origin == "fitted":
        along[shape.steps + step] = per_dh
        return float(moved), float(np.sqrt(along @ judged.budget.whole @ along))
    return float(moved), float(np.hypot(u, per_dh * u_dh))


def _relation(judged: Judged, step: int, bounds: tuple[float | None, float | None], u: float) -> str:
    """What is known of a constant that is not identifiable."""
    shape, fitted = judged.shape, judged.fitted
    name, (low, high) = constant_name(step + 1, shape.steps), bounds
    covariance = fitted.covariance[0]
    if fitted.seen[0, step]:
        partners = [(shape.strength, "with-strength"), (shape.offset, "with-offset")]
        for index, key in partners:
            if abs(correlation(covariance, step, index)) >= LIMIT_CORRELATION:
                return _tied(judged, step, index, key, name)
        for other in range(shape.steps):
            if other != step and fitted.seen[0, other]:
                along = np.zeros(shape.size)
                along[[step, other]] = 0.5
                u_mean = float(np.sqrt(along @ judged.budget.whole @ along))
                if u_mean <= min(LIMIT_U, 0.5 * u):
                    mean = float(along @ fitted.theta[0])
                    first, second = (constant_name(j + 1, shape.steps) for j in sorted((step, other)))
                    apart = abs(float(fitted.theta[0, step] - fitted.theta[0, other]))
                    key = "with-step" if apart < CLOSE else "with-mean"
                    return say(key, name=first, other=second, value=figure(mean), u=uncertainty(u_mean))
    if low is not None and high is not None:
        return say(
            "wide", name=name, limit=f"{LIMIT_U:.2f}", low=figure(low, 2), high=figure(high, 2), u=uncertainty(u)
        )
    if high is not None:
        return say("bound-above", name=name, high=figure(high, 2))
    if low is not None:
        return say("bound-below", name=name, low=figure(low, 2))
    return say("bound-none", name=name)


def _tied(judged: Judged, step: int, index: int, key: str, name: str) -> str:
    """The combination of a constant and a strength or offset that is known, with its value and u."""
    covariance, theta = judged.fitted.covariance[0], judged.fitted.theta[0]
    slope = float(covariance[step, index] / covariance[index, index])
    along = np.zeros(judged.shape.size)
    along[step], along[index] = 1.0, -slope
    value, u = float(along @ theta), float(np.sqrt(along @ judged.budget.whole @ along))
    shown = slope * LN10 if key == "with-strength" else slope
    return say(
        key, name=name, sign="−" if shown > 0.0 else "+", slope=f"{abs(shown):.2f}", value=figure(value),
        u=uncertainty(u),
    )  # fmt: skip


def nuisance(judged: Judged, name: str) -> Nuisance:
    """The strength factor or the meter's offset: sought or not, and whether the readings would tell it."""
    shape, fitted = judged.shape, judged.fitted
    index = shape.strength if name == "strength" else shape.offset
    sought = bool(fitted.free[0, index])
    if not sought:
        also = np.zeros(shape.size, bool)
        also[index] = True
        covariance = extended(judged.evidence, fitted, also)
        pka = [j for j in range(shape.steps) if fitted.seen[0, j]]
        u = float(np.sqrt(covariance[index, index]))
        close = max((abs(correlation(covariance, index, j)) for j in pka), default=1.0)
        return Nuisance(name, False, bool(0.0 < u <= LIMIT_U and close < LIMIT_CORRELATION))
    if not identifiable(judged, index):
        return Nuisance(name, True, False)
    value, u = float(fitted.theta[0, index]), float(np.sqrt(judged.budget.whole[index, index]))
    if name == "strength":
        value = float(np.exp(value))
        u *= value
    return Nuisance(name, True, True, value, u)
