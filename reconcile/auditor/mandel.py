"""Mandel's h and k, and the values that they pass by chance, from their exact laws."""

from __future__ import annotations

import numpy as np

from reconcile.auditor import laws
from reconcile.records.arrays import FloatArray

LEAST_METERS = 4
"""Of three means one is always within 1.155 standard deviations of the others: h says nothing there."""


def h_statistics(mean: FloatArray) -> FloatArray:
    """h of the means of p meters on one solution: deviation from their mean over their standard deviation.

    mean : FloatArray (p,)    means of one solution, one a meter, any unit
    Returns FloatArray (p,)   NaN where all means are equal
    References                ISO 5725-2:1994, equation 6 (between-laboratory consistency statistic)
    """
    spread = float(mean.std(ddof=1)) if len(mean) > 1 else 0.0
    if spread <= 0:
        return np.full(len(mean), np.nan)
    return np.asarray((mean - mean.mean()) / spread, float)


def h_critical(meters: int, alpha: float) -> float:
    """|h| that one of p meters exceeds with probability alpha when all agree.

    Parameters
    ----------
    meters : int       number of meters p, at least 3
    alpha : float      two-sided probability

    Raises
    ------
    ValueError
        Fewer than three meters.

    Notes
    -----
    h = (p - 1) t / sqrt(p (t^2 + p - 2)), with t the two-sided quantile of Student's law with p - 2 degrees of freedom.

    References
    ----------
    Wilrich 2013, AStA Adv. Stat. Anal. 97:1, doi:10.1007/s10182-011-0185-y; tabulated in ISO 5725-2:1994, 8.3.
    """
    if meters < 3:
        raise ValueError(f"h needs three meters, not {meters}")
    t = float(laws.t_isf(alpha / 2.0, meters - 2))
    return (meters - 1) * t / float(np.sqrt(meters * (t * t + meters - 2)))


def k_statistics(sd: FloatArray, df: FloatArray) -> FloatArray:
    """k of the standard deviations of p meters on one solution: each over the pooled one.

    sd : FloatArray (p,)     standard deviation of each meter, any unit; NaN where it has one reading only
    df : FloatArray (p,)     degrees of freedom of each, readings - 1
    Returns FloatArray (p,)  NaN where a meter has no standard deviation, or all are zero
    References               ISO 5725-2:1994, equation 7 (within-laboratory consistency statistic)
    """
    known = np.isfinite(sd) & (df > 0)
    pooled = float((df[known] * sd[known] ** 2).sum() / df[known].sum()) if known.any() else 0.0
    k = np.full(len(sd), np.nan)
    if pooled > 0:
        k[known] = sd[known] / np.sqrt(pooled)
    return k


def k_critical(df: FloatArray, alpha: float) -> FloatArray:
    """k that each of p meters exceeds with probability alpha when all have one standard deviation.

    Parameters
    ----------
    df : FloatArray (p,)     degrees of freedom of each meter's standard deviation (readings - 1 on a solution); 0 for
                             none
    alpha : float            one-sided probability

    Returns
    -------
    FloatArray (p,)
        NaN where the meter has no standard deviation, or no other meter has one.

    Notes
    -----
    A meter's share of the pooled sum of squares follows the beta law with parameters df/2 and (sum of the others'
    df)/2; k^2 is that share times (sum of df)/df. With n readings on every meter it is the law behind the tables of
    ISO 5725-2; written so, it holds for unequal numbers too.

    References
    ----------
    Wilrich 2013, AStA Adv. Stat. Anal. 97:1, doi:10.1007/s10182-011-0185-y; tabulated in ISO 5725-2:1994, 8.3.
    """
    own = np.asarray(df, float)
    total = float(own.sum())
    value = np.full(len(own), np.nan)
    good = (own > 0) & (total - own > 0)
    share = laws.beta_isf(alpha, own[good] / 2.0, (total - own[good]) / 2.0)
    value[good] = np.sqrt(np.asarray(share, float) * total / own[good])
    return value
