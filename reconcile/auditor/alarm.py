"""How likely a score as large as the one seen is in a clean record, with everything that was tried."""

from __future__ import annotations

import zlib

import numpy as np
from scipy import linalg, optimize, sparse, special

from reconcile.auditor import laws
from reconcile.auditor.components import Model
from reconcile.auditor.scoring import Candidate, Pool
from reconcile.auditor.tails import TAILS
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

PRIOR_DF = 30.0
"""Degrees of freedom behind a stated accuracy or tolerance: reliable to about 13 % (JCGM 100:2008, G.4.2, eq. G.3)."""
OTHER_DF = {"meter": 60.0, "span": 8.0, "constant": 6.0}
"""The same by effect: an accuracy that the maker states for one instrument, reliable to 9 %; a span's, which few state,
to 25 %; a tabulated constant's uncertainty to 29 %, since tables differ by more than u."""
NOISE_DF_TIMES = 4.0
"""The noise is estimated from the readings it judges, which bounds their scores: the tails of a score are then lighter
than those of a t law with the plain degrees of freedom (internal studentization; Cook and Weisberg 1982, from memory).
The factor was chosen on clean simulated records, see tests/bench."""
DRAWS = 1000
CERTAIN = 1e-6
"""Family-wise probability under which the plain Bonferroni bound is given instead of a simulated one."""


def score_df(model: Model, x: sparse.csc_array, own: IntArray | None = None) -> FloatArray:
    """Degrees of freedom of the t law that each column's score follows in a clean record, FloatArray (laws, k).

    One row for each law of the noise in tails.TAILS. The score is normal only if the spreads are known and the noise is
    normal. Spreads known with limited degrees of freedom and heavy-tailed noise are met by a t law of the same
    kurtosis, their contributions weighted by their shares of the score's variance (Welch-Satterthwaite, JCGM 100:2008,
    G.4.1, for the first). own : column of layout.z that each column is, where they are such.
    """
    shares = model.shares(x, own)
    share = shares.noise
    df_known = np.full(len(model.g), PRIOR_DF)
    for sort, df in OTHER_DF.items():
        effects = model.layout.effects[sort]
        df_known[effects.first : effects.last] = df
    df_known = df_known[model.columns]
    kurtosis = 6.0 * share**2 / max(NOISE_DF_TIMES * model.components.noise_df - 4.0, 2.0)
    kurtosis += 6.0 * (shares.known**2 / (df_known - 4.0)[:, None]).sum(axis=0)
    laws = np.array(TAILS[: len(model.components.tails)])
    of_noise = 6.0 / (laws - 4.0)
    kurtosis = kurtosis + np.outer(of_noise, share**2 * shares.concentration)
    return np.asarray(4.0 + 6.0 / np.maximum(kurtosis, 1e-6), float)


def single_p(model: Model, x: sparse.csc_array, z: FloatArray) -> FloatArray:
    """Two-sided probability of a score as large as z, for each of k columns, in a clean record."""
    return mixed_p(model, score_df(model, x), z)


def mixed_p(model: Model, df: FloatArray, z: FloatArray) -> FloatArray:
    """The same from the degrees of freedom (laws, k), averaged over the laws of the noise with their weights."""
    return np.asarray(2.0 * np.array(model.components.tails) @ laws.t_sf(np.abs(z), df), float)


def score_needed(model: Model, df: FloatArray, p: float) -> float:
    """Score whose two-sided probability is p, for one column with degrees of freedom (laws,)."""

    def excess(z: float) -> float:
        return float(np.log(max(float(mixed_p(model, df[:, None], np.array([z]))[0]), 1e-300)) - np.log(p))

    return float(optimize.brentq(excess, 0.0, 1e4)) if p < 1.0 else 0.0


def equivalent_z(p: float) -> float:
    """Normal score with the same two-sided probability."""
    return float(laws.norm_isf(max(p, 1e-300) / 2.0))


def root_of(correlation: FloatArray) -> FloatArray:
    """The symmetric square root of a correlation matrix, for draws with that correlation.

    It is unique, so that the order of rows and rounding do not turn the draws.
    """
    values, vectors = linalg.eigh(correlation)
    return np.asarray((vectors * np.sqrt(np.maximum(values, 0.0))) @ vectors.T)


def block_p(correlation: FloatArray, root: FloatArray, one_sided: BoolArray, threshold: float, seed: int) -> float:
    """Probability that any of j correlated normal scores passes a threshold, by importance sampling.

    One score is drawn beyond the threshold, the others given it; the mean of 1/(number beyond) times the sum of the
    single probabilities is unbiased for the probability of the union (Naiman and Priebe 2001, J. Comput. Graph. Stat.
    10:296; Adler, Blanchet and Liu 2012, Ann. Appl. Probab. 22:1167; from memory).

    Parameters
    ----------
    correlation, root : ndarray (j, j)    and its square root
    one_sided : ndarray (j,)      True where only positive scores count
    """
    weight = np.where(one_sided, 0.5, 1.0)
    single = 2.0 * float(special.ndtr(-threshold))
    j = len(correlation)
    if j == 1 or single < 1e-290:
        return min(1.0, single * float(weight.sum()))
    rng = np.random.default_rng(seed)
    pick = rng.choice(j, size=DRAWS, p=weight / weight.sum())
    size = -special.ndtri(special.ndtr(-threshold) * rng.uniform(size=DRAWS))
    sign = np.where(one_sided[pick] | (rng.uniform(size=DRAWS) < 0.5), 1.0, -1.0)
    free = root @ rng.standard_normal((j, DRAWS))
    at = np.arange(DRAWS)
    z = free + correlation[:, pick] * (sign * size - free[pick, at])
    beyond = np.where(one_sided[:, None], z, np.abs(z)) >= threshold - 1e-9
    return float(min(1.0, single * weight.sum() * np.mean(1.0 / np.maximum(beyond.sum(axis=0), 1))))


class Alarm:
    """Family-wise probabilities of one pool's candidates under one model; what was worked out is kept."""

    def __init__(self, pool: Pool, model: Model) -> None:
        self.pool, self.model = pool, model
        self._correlation: dict[int, tuple[FloatArray, FloatArray, BoolArray]] = pool.kept.setdefault(model, {})

    def block(self, block: int) -> tuple[FloatArray, FloatArray, BoolArray]:
        """Correlation of the scores of one block, its root, and which of them count on one side only."""
        if block not in self._correlation:
            members = np.flatnonzero((self.pool.block == block) & (self.pool.df == 1))
            x = self.pool.columns(members)
            covariance = self.model.covariance(x)
            sd = np.sqrt(np.maximum(np.diag(covariance), 1e-12))
            good = np.diag(covariance) > 1e-9
            correlation = (covariance / np.outer(sd, sd))[np.ix_(good, good)]
            self._correlation[block] = (correlation, root_of(correlation), self.pool.point[members][good])
        return self._correlation[block]

    def family_wise(self, candidate: Candidate, k: int, gain: float, p_single: float, limit: float = 1.0) -> float:
        """Probability that a clean record shows anything as striking anywhere; above `limit` a bound is enough.

        The maximum within the candidate's block is simulated, blocks and classes are charged by Bonferroni.
        """
        trials = self.pool.trials(k)
        if candidate.df > 1:
            return min(1.0, trials * float(laws.chi2_sf(2.0 * gain, candidate.df)))
        size = int(np.count_nonzero(self.pool.block == self.pool.block[k]))
        if p_single * trials > limit or size == 1:
            return min(1.0, p_single * trials)
        if p_single * trials * size < CERTAIN:
            return p_single * trials * size
        correlation, root, one_sided = self.block(int(self.pool.block[k]))
        if not len(correlation):
            return min(1.0, p_single * trials)
        seed = zlib.crc32(candidate.alarm_class.encode())
        return min(1.0, trials * block_p(correlation, root, one_sided, equivalent_z(p_single), seed))
