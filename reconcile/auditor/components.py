"""Variance components, and what every model of the residuals offers."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import sparse

from reconcile.auditor.adjusted import contrast_variance
from reconcile.auditor.layout import Layout
from reconcile.records.arrays import FloatArray, IntArray

SHORT = 1200
"""Readings up to which the whole covariance is written out, which is then the faster way."""


@dataclass(frozen=True)
class Components:
    """Variance components [pH^2; preparation relative^2].

    noise : common reading variance; meter_ratio : FloatArray (meters,) a meter's own noise variance over it
    session, preparation : variances; tails : weights of the noise laws that tails.py considers, normal first
    noise_df : effective degrees of freedom behind `noise`
    """

    noise: float
    meter_ratio: FloatArray
    session: float
    preparation: float
    tails: tuple[float, ...] = (1.0,)
    noise_df: float = np.inf


def noise_of(layout: Layout, components: Components) -> FloatArray:
    """Reading variance of each row [pH^2]; a mean of n readings has an nth of it, and nothing else less."""
    ratio = np.ones(len(layout))
    known = layout.meter >= 0
    ratio[known] = components.meter_ratio[layout.meter[known]]
    return np.asarray(components.noise * ratio / layout.averaged, float)


@dataclass(frozen=True)
class Shares:
    """What the variance of k scores in a clean record is made of; each score's variance is 1.

    noise : FloatArray (k,)          the readings' noise
    concentration : FloatArray (k,)  sum of the squared shares of single readings in it: 1 where one reading is all
    known : FloatArray (q, k)        each effect with a prior, in the order of the model's columns
    """

    noise: FloatArray
    concentration: FloatArray
    known: FloatArray


class Model:
    """One covariance V of the residuals, with fixed effects projected out: P = V^-1 less what they take up.

    layout, components : what it was made of; r : residuals; g : prior variances of the columns of layout.z
    noise, d : FloatArray (n,) reading variance, and all variance that a reading shares with no other [pH^2]
    pr : FloatArray (n,) P r
    log_det : log determinant of V, and of X'V^-1 X where there are fixed effects
    long : True where columns are kept sparse and fault kinds hand in only what comes near significance
    columns : IntArray, columns of layout.z that `shares` tells apart
    """

    pr: FloatArray
    log_det = 0.0
    long = False
    columns: IntArray

    def __init__(
        self, layout: Layout, components: Components, own_dropped: tuple[int, ...], r: FloatArray | None
    ) -> None:
        self.layout, self.components = layout, components
        self.r = layout.r if r is None else r
        self.noise = noise_of(layout, components)
        self.d = self.noise + layout.other
        self.g = np.where(np.isnan(layout.prior), components.session, layout.prior)
        self.g[list(own_dropped)] = 0.0
        self.columns = np.arange(len(self.g))

    def project(self, y: FloatArray) -> FloatArray:
        """P y; y (n,) or (n, k)."""
        raise NotImplementedError

    def quadratic(self, x: sparse.csc_array) -> FloatArray:
        """x' P x of each sparse column, FloatArray (k,)."""
        raise NotImplementedError

    def information(
        self, x: sparse.csc_array, slope: FloatArray, own: IntArray | None = None, steady: bool = False
    ) -> FloatArray:
        """x' P x of each sparse column as far as a score test needs it, FloatArray (k,).

        slope : x' P r; own : column of layout.z that a column may be, or -1; steady : x is the same object every time
        """
        return self.quadratic(x)

    def covariance(self, x: sparse.csc_array) -> FloatArray:
        """X' P X, FloatArray (k, k)."""
        return np.asarray(x.T @ self.project(x.toarray()))

    def shares(self, x: sparse.csc_array, own: IntArray | None = None) -> Shares:
        """What each column's score is made of in a clean record; own : column of layout.z that each one is."""
        column = x.toarray()
        px = self.project(column)
        size = np.einsum("ij,ij->j", px, column)
        a = px / np.sqrt(np.maximum(size, 1e-12))
        noise = a**2 * self.noise[:, None]
        share = noise.sum(axis=0)
        concentration = (noise**2).sum(axis=0) / np.maximum(share, 1e-12) ** 2
        return Shares(share, concentration, np.asarray(self.layout.z.T @ a) ** 2 * self.g[:, None])

    def diagonal(self) -> FloatArray:
        """Diagonal of P, FloatArray (n,)."""
        return self.quadratic(sparse.csc_array(sparse.eye_array(len(self.layout))))

    def batch_sd(self) -> FloatArray:
        """Standard deviation that a reading shares with its batch [pH], FloatArray (n,)."""
        return np.asarray(np.sqrt(self.components.preparation * self.layout.preparation**2 + self.layout.shared), float)

    def variance(self) -> FloatArray:
        """Diagonal of V [pH^2]: the full spread of each residual in a clean record."""
        z2 = self.layout.z.multiply(self.layout.z)
        whole = np.asarray(self.d + self.batch_sd() ** 2 + z2 @ self.g, float)
        return contrast_variance(self.layout, whole, self.d, self.g)
