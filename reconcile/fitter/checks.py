"""Whether the fit leaves something unexplained: bent residuals, series that disagree; each series fitted alone."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from scipy import special

from reconcile.fitter.evidence import Evidence
from reconcile.fitter.fitting import Fitted, Task, fit
from reconcile.fitter.scatter import Scatter
from reconcile.records.arrays import BoolArray, FloatArray
from reconcile.records.pka_results import SeriesFit

LEVEL = 0.01
LEAST_FREEDOM = 3
MATTERS = 0.5
"""Misfit that matters, in units of the settings' noise floor."""
ALONE = "single solutions"
"""Name under which solutions made by themselves stand among the series."""


def chance_of(evidence: Evidence, fitted: Fitted, columns: FloatArray) -> float:
    """Chance that further columns (n, m) take so much of the residuals by luck; 1 where it cannot be told.

    Also 1 where what they take is too small to matter: in thousands of readings the slightest misfit is beyond chance.

    References
    ----------
    Seber and Lee 2003, Linear Regression Analysis, 2nd ed., theorem 4.1 (F test of further regressors).
    """
    kept = fitted.data.kept
    root = 1.0 / np.sqrt(fitted.data.variance[kept])
    base = fitted.jacobian[kept][:, fitted.seen[0]] * root[:, None]
    more = columns[kept] * root[:, None]
    residual = fitted.residual[kept] * root
    left = len(residual) - base.shape[1] - more.shape[1]
    if left < LEAST_FREEDOM or not more.shape[1]:
        return 1.0
    before, after = _rest(base, residual), _rest(np.hstack([base, more]), residual)
    gain = max(before - after, 0.0) / more.shape[1]
    taken = np.sqrt(max(before - after, 0.0) / np.sum(root**2))  # root mean square [pH]
    if taken < MATTERS * float(evidence.settings["uncertainty.noise_floor"]):
        return 1.0
    if not np.isfinite(fitted.freedom[0]):
        return float(special.chdtrc(more.shape[1], gain * more.shape[1]))
    scale = max(after / left, 1.0 if fitted.sigma[0] <= 0.0 else 0.0)  # never under the floor
    return float(special.fdtrc(more.shape[1], left, gain / scale))


def _rest(columns: FloatArray, residual: FloatArray) -> float:
    solved, *_ = np.linalg.lstsq(columns, residual, rcond=None)
    return float(np.sum((residual - columns @ solved) ** 2))


def bent(evidence: Evidence, fitted: Fitted) -> bool:
    """Whether the residuals bend with pH beyond chance at the 1 % level."""
    span = float(np.ptp(evidence.observed)) or 1.0
    x = (evidence.observed - evidence.observed.mean()) / span
    return chance_of(evidence, fitted, np.stack([x, x**2], axis=1)) < LEVEL


@dataclass(frozen=True)
class Disagreement:
    """Groups of readings that lie apart: the group furthest from the rest, and by how much [pH]."""

    group: str
    apart: float


def groups(evidence: Evidence) -> dict[str, BoolArray]:
    """Name of each titration series, or of the single solutions -> truth (n,)."""
    names = np.where(evidence.series == "", ALONE, evidence.series)
    return {name: names == name for name in dict.fromkeys(names.tolist())}


def disagreement(evidence: Evidence, fitted: Fitted) -> Disagreement | None:
    """The series furthest from the others, where they disagree beyond chance at the 1 % level; None otherwise."""
    kept = fitted.data.kept
    found = {name: mine & kept for name, mine in groups(evidence).items() if (mine & kept).sum() >= LEAST_FREEDOM}
    if len(found) < 2:
        return None
    columns = np.stack([mine.astype(float) for mine in found.values()], axis=1)[:, 1:]
    if chance_of(evidence, fitted, columns) >= LEVEL:
        return None
    means = {
        name: float(fitted.residual[mine].mean() - fitted.residual[kept & ~mine].mean()) for name, mine in found.items()
    }
    furthest = max(means, key=lambda name: abs(means[name]))
    return Disagreement(furthest, means[furthest])


def series_alone(evidence: Evidence, task: Task, fitted: Fitted) -> tuple[SeriesFit, ...]:
    """Every series fitted alone with the same parameters free, all in one call; empty where there is one series."""
    kept = fitted.data.kept
    rows = {name: np.flatnonzero(mine & kept) for name, mine in groups(evidence).items()}
    enough = {name: r for name, r in rows.items() if len(r) > int(task.free.sum())}
    if len(rows) < 2 or not enough:
        return ()
    order = np.concatenate(list(enough.values()))
    counts = np.array([len(r) for r in enough.values()], np.intp)
    part: Scatter = task.scatter.take(order)
    alone = replace(
        task,
        cases=task.cases.of_readings(order, counts),
        observed=task.observed[order],
        scatter=part,
    )
    found = fit(alone, np.repeat(fitted.theta, len(counts), axis=0))
    out = []
    pka = task.shape.pka
    for k, (name, count) in enumerate(zip(enough, counts.tolist(), strict=True)):
        values = found.theta[k, pka].tolist()
        u = np.sqrt(np.diag(found.covariance[k])[pka]).tolist()
        seen = found.seen[k, pka].tolist()
        out.append(
            SeriesFit(
                name,
                count,
                tuple(v if s else None for v, s in zip(values, seen, strict=True)),
                tuple(v if s else None for v, s in zip(u, seen, strict=True)),
            )
        )
    return tuple(out)
