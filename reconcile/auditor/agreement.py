"""Agreement of meters on the solutions that several of them read: Mandel's h and k, and a robust centre."""

from __future__ import annotations

import numpy as np

from reconcile.auditor.algorithm_a import algorithm_a
from reconcile.auditor.mandel import LEAST_METERS, h_critical, h_statistics, k_critical, k_statistics
from reconcile.auditor.meter_readings import MeterReadings, meter_means
from reconcile.records.arrays import FloatArray, IntArray, TextArray
from reconcile.records.meter_results import WHOLE_RECORD, Agreement, MeterNoise

STRAGGLER, OUTLIER = 0.05, 0.01
"""Chances at which the standard calls a value a straggler and an outlier."""


def compare(
    solution: str, meters: list[str], mean: FloatArray, sd: FloatArray, count: IntArray, df: FloatArray, step: float
) -> list[Agreement]:
    """The meters that read one solution, each against the others.

    mean, sd : FloatArray (p,) of the residuals of each meter [pH], sd NaN where there is none
    count : IntArray (p,) readings; df : FloatArray (p,) degrees of freedom of sd, 0 where there is none
    step : resolution of the display [pH], 0 where unknown; means that lie within it (over the square root of the number
        of readings) show no disagreement, and have no h
    """
    p = len(meters)
    centre = algorithm_a(mean, step / float(np.sqrt(12.0 * count.min())))
    h, k = h_statistics(mean), k_statistics(sd, df)
    if np.ptp(mean) <= step / float(np.sqrt(count.min())) * (1.0 + 1e-9):
        h = np.full(p, np.nan)
    h_5, h_1 = h_critical(p, STRAGGLER), h_critical(p, OUTLIER)
    k_5, k_1 = k_critical(df, STRAGGLER), k_critical(df, OUTLIER)
    return [
        Agreement(
            solution,
            meters[i],
            p,
            int(count[i]),
            float(mean[i]),
            float(sd[i]),
            float(mean[i]) - centre.centre,
            centre.centre,
            centre.spread,
            float(h[i]),
            h_5,
            h_1,
            float(k[i]),
            float(k_5[i]),
            float(k_1[i]),
        )
        for i in range(p)
    ]


def agreement(seen: MeterReadings, noise: tuple[MeterNoise, ...]) -> tuple[Agreement, ...]:
    """The whole record first, then every solution that at least four meters read, in order of name.

    Notes
    -----
    Residuals stand for readings, so that a difference of temperature between two meters is no disagreement. On the
    whole record the mean of a meter is that of the joint model, and its standard deviation its reading noise.
    """
    layout = seen.layout
    found: list[Agreement] = []
    display = layout.resolution[np.isfinite(layout.resolution)]
    step = float(np.median(display)) if len(display) else 0.0
    if len(layout.meters) >= LEAST_METERS:
        sd = np.array([n.sd for n in noise])
        df = np.array([n.df if np.isfinite(n.sd) else 0.0 for n in noise])
        count = np.array([n.readings for n in noise], np.intp)
        found += compare(WHOLE_RECORD, list(layout.meters), meter_means(seen), sd, count, df, step)
    return (*found, *_by_solution(seen, step))


def solution_labels(seen: MeterReadings) -> TextArray:
    """What each evidence row was taken on: batch or known solution, its lot, and the stage, (n,)."""
    layout = seen.layout
    readings = layout.records.readings
    rows = layout.reading
    labels = []
    for batch, known, lot, stage in zip(
        *(readings[name][rows].tolist() for name in ("batch", "known", "known_lot", "stage")), strict=True
    ):
        name = str(batch) or " lot ".join(filter(None, (str(known), str(lot))))
        labels.append(f"{name}, {stage}" if stage else name)
    return np.array(labels, object)


def _by_solution(seen: MeterReadings, step: float) -> list[Agreement]:
    layout, r = seen.layout, seen.of_meters
    width = len(layout.meters)
    names, code = np.unique(solution_labels(seen).astype(str), return_inverse=True)
    named = layout.meter >= 0
    cell = code[named] * width + layout.meter[named]
    size = len(names) * width
    count = np.bincount(cell, minlength=size).reshape(-1, width)
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = np.bincount(cell, r[named], minlength=size).reshape(-1, width) / count
        away = r[named] - mean.ravel()[cell]
        sd = np.sqrt(np.bincount(cell, away**2, minlength=size).reshape(-1, width) / (count - 1))
    sd[count < 2] = np.nan
    found = []
    for level in np.flatnonzero((count > 0).sum(axis=1) >= LEAST_METERS).tolist():
        own = np.flatnonzero(count[level])
        found += compare(
            str(names[level]),
            [layout.meters[m] for m in own],
            mean[level, own],
            sd[level, own],
            count[level, own].astype(np.intp),
            np.maximum(count[level, own] - 1, 0).astype(float),
            step,
        )
    return found
