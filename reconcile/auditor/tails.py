"""How heavy the tails of the reading noise are: odds between normal noise and t laws, from the record itself."""

from __future__ import annotations

import numpy as np

from reconcile.auditor import laws
from reconcile.auditor.components import Model
from reconcile.records.arrays import FloatArray

TAILS = (np.inf, 10.0, 6.0, 4.5)
"""Degrees of freedom of the noise laws considered; inf is normal."""
PRIOR = (0.93, 0.02, 0.02, 0.03)
"""Prior odds: readings are normal unless the record says otherwise (chosen on simulated records, see tests/bench)."""
SCALES = (0.8, 0.9, 1.0, 1.1, 1.25)
FEW = 20
ENOUGH = 4000
"""Residuals that tell one law from another; of more, as many evenly spaced by size are taken."""


def tail_weights(model: Model) -> tuple[float, ...]:
    """Posterior weights of TAILS, given the standardized residuals without the largest.

    The largest is left out because it is what a reading's own test asks about; every law is cut where it was and takes
    the scale that serves it best.
    """
    n = len(model.layout)
    if n < FEW:
        return (0.5, 0.2, 0.2, 0.1)
    z = model.pr / np.sqrt(np.maximum(model.diagonal(), 1e-12))
    z = z[np.argsort(np.abs(z), kind="stable")][: n - max(1, n // 200)]
    if len(z) > ENOUGH:
        z = z[np.linspace(0, len(z) - 1, ENOUGH).round().astype(np.intp)]
    bound, middle = float(np.abs(z).max()), float(np.median(np.abs(z)))
    fits = np.array([_best_fit(z, nu, middle, bound) for nu in TAILS])
    weights = np.array(PRIOR) * np.exp(fits - fits.max())
    return tuple((weights / weights.sum()).tolist())


def _best_fit(z: FloatArray, nu: float, middle: float, bound: float) -> float:
    law = laws.Law(nu)
    best = -np.inf
    for share in SCALES:
        scale = max(middle / float(law.ppf(0.75)) * share, 1e-6)
        inside = float(law.cdf(bound / scale) - law.cdf(-bound / scale))
        best = max(best, float((law.logpdf(z / scale) - np.log(scale) - np.log(inside)).sum()))
    return best
