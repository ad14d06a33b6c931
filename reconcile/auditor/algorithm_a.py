"""A robust centre and spread: Algorithm A of ISO 13528."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.records.arrays import FloatArray

CLIP = 1.5
"""Robust standard deviations from the centre at which a value is clipped."""
MAD_TO_SD = 1.483
CLIPPED_TO_SD = 1.134
STILL = 1e-7
"""Relative change of the spread at which the iteration ends; the standard asks for the third significant figure."""
MOST_STEPS = 200


@dataclass(frozen=True)
class Centre:
    """Robust centre x* and robust standard deviation s* of some values, and how many values were clipped."""

    centre: float
    spread: float
    clipped: int


def algorithm_a(values: FloatArray, least: float = 0.0) -> Centre:
    """Robust centre and standard deviation of values by Algorithm A.

    Parameters
    ----------
    values : FloatArray (p,)    any unit; NaN is left out
    least : float               spread below which none is believed, in the same unit (a display's resolution over
                                sqrt 12): with a coarse display more than half of the values may be equal

    Returns
    -------
    Centre
        NaN centre and spread where there is no value; NaN spread for a single one.

    Notes
    -----
    x* = median, s* = 1.483 median |x - x*|; then, until neither moves, values are clipped at x* ± 1.5 s*,
    x* = mean of the clipped values, s* = 1.134 times their standard deviation (p - 1). Tolerates about a fifth of bad
    values.

    References
    ----------
    ISO 13528:2005, Annex C, equations C.1 to C.6 (ISO 5725-5:1998, Algorithm A).
    """
    known = values[np.isfinite(values)]
    if len(known) < 2:
        return Centre(float(known[0]) if len(known) else float("nan"), float("nan"), 0)
    centre = float(np.median(known))
    spread = max(MAD_TO_SD * float(np.median(np.abs(known - centre))), least)
    for _ in range(MOST_STEPS):
        clipped = np.clip(known, centre - CLIP * spread, centre + CLIP * spread)
        before, centre = spread, float(clipped.mean())
        spread = max(CLIPPED_TO_SD * float(clipped.std(ddof=1)), least)
        if abs(spread - before) <= STILL * max(spread, before):
            break
    outside = int(np.count_nonzero(np.abs(known - centre) > CLIP * spread))
    return Centre(centre, spread, outside)
