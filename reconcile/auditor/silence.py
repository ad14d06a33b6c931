"""What silence means: which faults could not be seen, and how large the others would have had to be."""

from __future__ import annotations

import zlib
from collections.abc import Iterator

import numpy as np
from scipy import sparse

from reconcile.auditor import laws
from reconcile.auditor.alarm import Alarm, score_df, score_needed
from reconcile.auditor.components import Model
from reconcile.auditor.estimates import critical_score
from reconcile.auditor.faults.meter_offset import LEAST, told_of
from reconcile.auditor.faults.meter_span import LEAST_SPREAD
from reconcile.auditor.faults.meter_temperature import LEAST_SPREAD_K
from reconcile.auditor.layout import Layout, matrix, one_hot
from reconcile.auditor.long_critical import critical_scores
from reconcile.auditor.scoring import Pool
from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.results import Silence

BLIND = 0.01
"""dpH/d ln amount below which a common error of all amounts is not seen: 10 % then moves pH by 0.001."""


def not_testable(layout: Layout) -> tuple[Silence, ...]:
    """Kinds that the design of the record cannot show, by subject, with the reason."""
    return (*_of_record(layout), *_of_meters(layout), *_of_lots(layout), *_of_buffers(layout))


def _of_record(layout: Layout) -> Iterator[Silence]:
    if not layout.meters:
        yield Silence("meter_offset", "all", "meter", "no meter is named in the readings")
    if not np.isfinite(layout.day).any():
        for kind in ("meter_drift", "meter_step"):
            yield Silence(kind, "all", "meter", "the readings have no date or time")


def _of_meters(layout: Layout) -> Iterator[Silence]:
    for index, meter in enumerate(layout.meters):
        rows = np.flatnonzero(layout.meter == index)
        if len(rows) < LEAST:
            yield Silence("meter_offset", meter, "meter", f"only {len(rows)} usable reading{'s' * (len(rows) != 1)}")
            continue
        spread = float(np.ptp(layout.ph[rows]))
        if spread < LEAST_SPREAD:
            reason = f"its readings span {spread:.2f} pH: a span error looks like an offset"
            yield Silence("meter_span", meter, "meter", reason)
        if np.ptp(layout.temperature[rows]) < LEAST_SPREAD_K:
            reason = f"its samples span less than {LEAST_SPREAD_K:g} K: a constant temperature error looks like a span"
            yield Silence("meter_temperature", meter, "meter", reason)


def _of_lots(layout: Layout) -> Iterator[Silence]:
    names = layout.records.lots.name
    met = set(layout.lots_used.tolist())
    for lot in range(len(names)):
        if lot not in met:
            yield Silence("lot_strength", str(names[lot]), "lot", "no usable reading depends on it")
    columns = layout.lot_columns
    for position, lot in enumerate(layout.lots_used.tolist()):
        rows = columns.indices[columns.indptr[position] : columns.indptr[position + 1]]
        batches = set(layout.batch[rows].tolist())
        if len(batches) == 1:
            reason = "used in one batch only: its fault and a fault of that preparation look alike"
            yield Silence("lot_strength", str(names[lot]), "lot", reason)
        elif layout.meters and len(set(layout.meter[rows].tolist())) == 1:
            reason = "read on one meter only: its fault and a fault of that meter look alike in these readings"
            yield Silence("lot_strength", str(names[lot]), "lot", reason)


def _of_buffers(layout: Layout) -> Iterator[Silence]:
    """Kinds of solution in which an error common to all amounts leaves pH where it is."""
    total = np.asarray(matrix(layout.prediction.contributions).sum(axis=1)).ravel()[layout.reading]
    for index, family in enumerate(layout.families):
        rows = layout.family == index
        if rows.any() and family not in ("known solution", "no weak acid") and np.abs(total[rows]).max() < BLIND:
            reason = "all amounts of such a solution too high or too low together (both halves of a buffer) leave pH"
            yield Silence("batch_preparation", family, "batch", reason)


def smallest_detectable(layout: Layout, model: Model, pool: Pool, power: float, rate: float) -> tuple[Silence, ...]:
    """Smallest offset of each meter and smallest strength error of each lot that is found with the given power."""
    found = []
    meters = told_of(layout)
    for kind, subject_type, unit, names, x in (
        (
            "meter_offset",
            "meter",
            "pH",
            tuple(layout.meters[i] for i in meters),
            one_hot(layout.meter, len(layout.meters))[:, meters],
        ),
        (
            "lot_strength",
            "lot",
            "factor",
            tuple(str(layout.records.lots.name[i]) for i in layout.lots_used),
            sparse.csc_array(layout.lot_columns),
        ),
    ):
        if not names:
            continue
        own = (meters if unit == "pH" else np.arange(len(names))) + layout.effects[subject_type].first
        needed = _critical(model, pool, kind, names, x, own, rate)
        information = model.information(x, np.full(len(names), np.inf), own)
        with np.errstate(divide="ignore"):
            size = (needed + laws.norm_ppf(power)) / np.sqrt(np.maximum(information, 1e-12))
        for name, value in zip(names, size.tolist(), strict=True):
            shown = value if unit == "pH" else float(np.exp(min(value, 50.0)))
            if shown < (2.0 if unit == "pH" else 10.0):
                found.append(Silence(kind, name, subject_type, size=shown, unit=unit, power=power))
            else:
                found.append(
                    Silence(kind, name, subject_type, "nothing of a realistic size would be found", power=power)
                )
    return tuple(found)


def _critical(
    model: Model, pool: Pool, kind: str, names: tuple[str, ...], x: sparse.csc_array, own: IntArray, rate: float
) -> FloatArray:
    """Score that a fault of each subject must pass, with the tails of its own law."""
    alarm = Alarm(pool, model)
    members: dict[str, int] = {}
    offset = 0
    for proposal in pool.proposals:
        if proposal.kind == kind:
            members.update({str(s): offset + i for i, s in enumerate(proposal.subject)})
        offset += len(proposal)
    df = score_df(model, x, own)
    if model.long:
        at = np.array([members.get(name, -1) for name in names], np.intp)
        return critical_scores(alarm, at, df, rate, zlib.crc32(b"meter" if kind.startswith("meter") else b"lot"))
    needed = np.empty(len(names))
    for i, name in enumerate(names):
        k = members.get(name)
        seed = zlib.crc32(b"meter" if kind.startswith("meter") else b"lot")
        needed[i] = (
            critical_score(alarm, k, df[:, i], rate, seed)
            if k is not None
            else score_needed(model, df[:, i], rate / max(pool.classes * len(names), 1))
        )
    return needed
