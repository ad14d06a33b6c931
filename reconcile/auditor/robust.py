"""Bounded scores of variance components (Huber), and where their estimates begin."""

from __future__ import annotations

import numpy as np

from reconcile.auditor import laws
from reconcile.auditor.components import Components
from reconcile.auditor.layout import ROOT3, Layout
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.settings import Settings

HUBER = 2.5
HUBER_MEAN = float(1.0 - laws.chi2_sf(HUBER**2, 3) + HUBER**2 * laws.chi2_sf(HUBER**2, 1))
"""Mean of min(z^2, HUBER^2) for standard normal z, so that the bounded squares stay consistent."""
OWN_NOISE_FROM = 20
"""Readings from which a meter has noise of its own."""


def stated(layout: Layout, settings: Settings) -> Components:
    """The components as stated, which are also the floors of the estimates."""
    return Components(
        noise=float(settings["uncertainty.noise_floor"]) ** 2,
        meter_ratio=np.ones(len(layout.meters)),
        session=float(settings["uncertainty.session"]) ** 2,
        preparation=(float(settings["uncertainty.preparation_percent"]) / 100 / ROOT3) ** 2,
    )


def bounded(score: FloatArray, information: FloatArray) -> tuple[float, float]:
    """Bounded sum of squared scores and its expectation: their ratio is one where a component fits."""
    good = information > 1e-12
    z2 = np.minimum(score[good] ** 2 / information[good], HUBER**2)
    return float((information[good] * z2).sum() / HUBER_MEAN), float(information[good].sum())


def meter_ratios(meter: IntArray, counts: IntArray, share: FloatArray, z2: FloatArray) -> FloatArray:
    """Noise variance of each meter over the present one, pulled towards one with the weight of 20 readings."""
    known = meter >= 0
    num = np.bincount(meter[known], (share * z2 / HUBER_MEAN)[known], minlength=len(counts))
    den = np.bincount(meter[known], share[known], minlength=len(counts))
    return np.asarray((num + OWN_NOISE_FROM) / (den + OWN_NOISE_FROM))
