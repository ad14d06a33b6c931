"""Tails and quantiles of the laws that the auditor judges by, from scipy.special: scipy.stats takes long to load.

Named as there: sf is the upper tail, isf its inverse, ppf the quantile.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from scipy import special

from reconcile.records.arrays import FloatArray


def norm_sf(z: Any) -> Any:
    """Chance that a standard normal value exceeds z."""
    return special.ndtr(-np.asarray(z, float))


def norm_ppf(p: Any) -> Any:
    """Standard normal quantile."""
    return special.ndtri(p)


def norm_isf(p: Any) -> Any:
    """The value that a standard normal one exceeds with chance p; from the logarithm, for chances that are tiny."""
    return -special.ndtri_exp(np.log(np.asarray(p, float)))


def t_sf(t: Any, df: Any) -> Any:
    """Chance that a value of Student's t exceeds t."""
    return special.stdtr(df, -np.asarray(t, float))


def t_isf(p: Any, df: Any) -> Any:
    """The value that Student's t exceeds with chance p."""
    return -special.stdtrit(df, p)


def chi2_sf(x: Any, df: Any) -> Any:
    """Chance that a chi-square value exceeds x."""
    return special.chdtrc(df, x)


def chi2_isf(p: Any, df: Any) -> Any:
    """The value that a chi-square one exceeds with chance p."""
    return special.chdtri(df, p)


def f_isf(p: Any, df: Any, df_below: Any) -> Any:
    """The value that an F ratio exceeds with chance p."""
    return special.fdtri(df, df_below, 1.0 - np.asarray(p, float))


def beta_isf(p: Any, a: Any, b: Any) -> Any:
    """The value that a beta one exceeds with chance p."""
    return special.betainccinv(a, b, p)


class Law:
    """A symmetric law about zero: Student's t, or the normal law for infinite degrees of freedom."""

    def __init__(self, df: float) -> None:
        self.df = df

    def ppf(self, p: float) -> float:
        return float(special.ndtri(p) if np.isinf(self.df) else special.stdtrit(self.df, p))

    def cdf(self, x: float) -> float:
        return float(special.ndtr(x) if np.isinf(self.df) else special.stdtr(self.df, x))

    def logpdf(self, x: FloatArray) -> FloatArray:
        """Logarithm of the density, (n,)."""
        if np.isinf(self.df):
            return np.asarray(-0.5 * x**2 - 0.5 * np.log(2.0 * np.pi), float)
        df = self.df
        scale = special.gammaln((df + 1.0) / 2.0) - special.gammaln(df / 2.0) - 0.5 * np.log(df * np.pi)
        return np.asarray(scale - (df + 1.0) / 2.0 * np.log1p(x**2 / df), float)
