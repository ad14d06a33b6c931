"""Who and what each residual rests on: the columns of the mixed model, and the index tables the fault kinds use."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse

from reconcile.auditor.adjusted import UNKNOWN_SD, anchor_of, speaking, stock_columns, with_anchors
from reconcile.auditor.certificates import certificate_columns
from reconcile.auditor.probes import probe_index
from reconcile.auditor.subjects import codes, family_names, sessions_of, solution_names
from reconcile.records.arrays import BoolArray, FloatArray, IntArray, TextArray, Triplets
from reconcile.records.book import BatchRecords
from reconcile.records.results import Prediction
from reconcile.records.settings import Settings

DAY = 86400.0
ROOT3 = 3.0**0.5
EVIDENCE = ("ok",)


@dataclass(frozen=True)
class Effects:
    """Random effects of one sort: columns `first` to `last` of the design matrix, one for each subject."""

    sort: str
    subjects: tuple[str, ...]
    first: int

    @property
    def last(self) -> int:
        return self.first + len(self.subjects)

    def column(self, index: int) -> int:
        return self.first + index


@dataclass(frozen=True)
class Layout:
    """The evidence rows (n of them, batches kept together) and all that the model needs to know of each.

    reading : IntArray (n,)     index into records.readings
    r : FloatArray (n,)         residual, observed - predicted [pH]
    ph : FloatArray (n,)        predicted pH
    day : FloatArray (n,)       time of reading [d] from the first one; NaN where unknown
    meter, batch, family, session, solution : IntArray (n,)   index; -1 where there is none
    meters, families, batches : names; one of a batch may occur twice
    z : FloatArray (n, q)       columns of the random effects with a prior
    prior : FloatArray (q,)     prior variances; NaN for those estimated from the record (sessions)
    other : FloatArray (n,)     variance of temperature and allowance of each reading [pH^2]
    shared : FloatArray (n,)    variance shared by the readings of a batch whatever the preparation [pH^2]
    preparation : FloatArray (n,)  d(pH) for a unit relative error in every component, root-sum-square
    first_of_batch : IntArray   where each batch begins
    lots_used : IntArray (k,), lots met; lot_columns : sparse (n, k), dpH/d ln strength of each
    start : time of the first reading
    averaged : FloatArray (n,)  how many readings each is the mean of
    anchor : IntArray (n,)      row of the reading that the solution was adjusted by, its own for that reading; -1
    """

    records: BatchRecords
    prediction: Prediction
    reading: IntArray
    r: FloatArray
    ph: FloatArray
    observed: FloatArray
    temperature: FloatArray
    day: FloatArray
    resolution: FloatArray
    meter: IntArray
    batch: IntArray
    family: IntArray
    session: IntArray
    solution: IntArray
    meters: tuple[str, ...]
    families: tuple[str, ...]
    batches: tuple[str, ...]
    z: sparse.csr_array
    prior: FloatArray
    effects: dict[str, Effects]
    other: FloatArray
    shared: FloatArray
    preparation: FloatArray
    first_of_batch: IntArray
    lots_used: IntArray
    lot_columns: sparse.csc_array
    start: np.datetime64
    anchor: IntArray
    averaged: FloatArray

    kept: dict[str, Any] = field(default_factory=dict, repr=False, compare=False)
    """What models of a long record worked out once, under names of their own; layouts made from this one share it."""

    def __len__(self) -> int:
        return len(self.r)

    @cached_property
    def dense(self) -> FloatArray:
        """z written out, (n, q); only for a short record."""
        return np.asarray(self.z.toarray(), float)

    @cached_property
    def same_batch(self) -> BoolArray:
        """True where two readings are of one batch, (n, n); only for a short record."""
        return np.asarray(self.batch[:, None] == self.batch, bool)

    def own(self, sort: str, index: int) -> tuple[int, ...]:
        """Columns of the design that hold one subject's own prior; () when it has none."""
        effects = self.effects.get(sort)
        return () if effects is None else (effects.column(index),)


def evidence(records: BatchRecords, prediction: Prediction) -> BoolArray:
    """Readings that may speak: solved, inside model and electrode, buffered, not void nor adjusted, with a residual."""
    usable: BoolArray = (
        np.isin(prediction.status, EVIDENCE) & np.isfinite(prediction.ph) & np.isfinite(records.readings["ph"])
    )
    standing: TextArray = records.readings["standing"]
    return speaking(records, np.asarray(usable & (standing != "void") & (prediction.u > 0), bool))


def matrix(t: Triplets) -> sparse.csc_array:
    """Triplets as a sparse matrix; repeated cells add up."""
    return sparse.csc_array((t.value, (t.row, t.column)), shape=t.shape)


def lot_sensitivities(records: BatchRecords, prediction: Prediction) -> sparse.csc_array:
    """dpH/d ln strength (readings, lots): every contribution that rests on the lot counts, through stocks of stocks."""
    solutions = records.solutions
    ones = np.ones(len(solutions.chain_lot))
    chain = sparse.csc_array(
        (ones, (solutions.chain_contribution, solutions.chain_lot)), shape=(len(solutions.solution), len(records.lots))
    )
    return sparse.csc_array(matrix(prediction.contributions) @ chain)


def one_hot(index: IntArray, width: int, value: FloatArray | None = None) -> sparse.csc_array:
    """Sparse matrix with `value` (or 1) in column index[i] of row i; rows of index -1 stay empty."""
    row = np.flatnonzero(index >= 0)
    values = np.ones(len(row)) if value is None else value[row]
    return sparse.csc_array((values, (row, index[row])), shape=(len(index), width))


def felt(block: sparse.csc_array, weight: FloatArray | float = 1.0, least: float = 1e-5) -> IntArray:
    """Columns with an entry that matters."""
    if 0 in block.shape:
        return np.zeros(0, np.intp)
    largest = np.asarray(abs(block).max(axis=0).todense()).ravel()
    return np.flatnonzero(largest * weight > least).astype(np.intp)


def build_layout(records: BatchRecords, prediction: Prediction, settings: Settings, usable: BoolArray) -> Layout:
    """The evidence of a record as the model sees it, with the readings that its solutions were adjusted by.

    Raises nothing for a record without evidence: the layout is then empty.
    """
    names = solution_names(records)
    chosen, anchors = np.flatnonzero(with_anchors(records, usable)), anchor_of(records)
    order = np.lexsort((anchors[chosen], names[chosen].astype(str))) if len(chosen) else chosen
    rows = chosen[order].astype(np.intp)
    n = len(rows)
    readings = records.readings
    at = readings["read_at"][rows]
    start = np.min(at[~np.isnat(at)]) if n and (~np.isnat(at)).any() else np.datetime64("1970-01-01", "s")
    day = np.where(np.isnat(at), np.nan, (at - start) / np.timedelta64(1, "s") / DAY)
    meter, meters = codes(readings["meter"][rows])
    new = np.r_[True, (names[rows][1:] != names[rows][:-1]) | (np.diff(anchors[rows]) != 0)] if n else np.zeros(0, bool)
    batch = (np.cumsum(new) - 1).astype(np.intp)  # a batch before and after it was adjusted counts as two
    row_of = np.full(len(readings) + 1, -1, np.intp)
    row_of[rows] = np.arange(n)
    anchor = row_of[anchors[rows]]
    solution = records.readings_solution[rows]
    family_of_solution, families = codes(family_names(records))
    family = family_of_solution[solution] if n else np.zeros(0, np.intp)
    session, sessions = sessions_of(records, meters, meter, rows)
    ph = prediction.ph[rows]

    accuracy = _accuracies(records, meters, float(settings["uncertainty.meter_accuracy"]))
    span = float(settings["uncertainty.meter_span_percent"]) / 100 / ROOT3
    columns: list[sparse.csc_array] = []
    prior: list[float] = []
    effects: dict[str, Effects] = {}

    def add(sort: str, subjects: Sequence[str], block: sparse.csc_array, variances: Sequence[float]) -> None:
        effects[sort] = Effects(sort, tuple(subjects), len(prior))
        columns.append(block)
        prior.extend(variances)

    probe, probes = probe_index(records, rows)
    carry = np.array([bool(np.any(probe[meter == i] >= 0)) for i in range(len(meters))], bool)
    half = np.where(carry, 0.5, 1.0)  # what a meter may be off is half its own, half that of a probe that moves
    add("meter", meters, one_hot(meter, len(meters)), (half * np.square(accuracy)).tolist())
    if probes:
        usual = [0.5 * np.square([accuracy[m] for m in meter[probe == i]]).mean() for i in range(len(probes))]
        add("probe", probes, one_hot(probe, len(probes)), usual)
    add("span", meters, one_hot(meter, len(meters), ph - 7.0), [span**2] * len(meters))
    every_lot = lot_sensitivities(records, prediction).tocsr()[rows].tocsc()
    lots_used = felt(every_lot)
    lot_columns = every_lot[:, lots_used]
    u_lot = records.lots.u_strength[lots_used]
    add("lot", [str(records.lots.name[i]) for i in lots_used], lot_columns, [float(u) ** 2 for u in u_lot])
    constants = matrix(prediction.constants).tocsr()[rows].tocsc()
    met = felt(constants, prediction.constant_u)
    constant_names = [f"{prediction.constant_names[i][0]}, step {prediction.constant_names[i][1]}" for i in met]
    add("constant", constant_names, constants[:, met], [float(u) ** 2 for u in prediction.constant_u[met]])
    model_column = one_hot(family, len(families), prediction.d_model[rows])
    add("model", families, model_column, [prediction.u_model**2] * len(families))
    adjusted_stocks, stock_block, stock_variance = stock_columns(records, prediction)
    if adjusted_stocks:
        add("adjusted stock", adjusted_stocks, stock_block.tocsr()[rows].tocsc(), stock_variance.tolist())
    certificates, certificate_block = certificate_columns(records, prediction, rows)
    if certificates:
        add("certificate", certificates, certificate_block, [1.0] * len(certificates))
    counts = np.bincount(session[session >= 0], minlength=len(sessions)) if n else np.zeros(0, np.intp)
    repeated = np.flatnonzero(counts > 1)  # a session with one reading cannot be told from its noise
    session_block = one_hot(session, len(sessions))[:, repeated]
    add("session", [sessions[i] for i in repeated], session_block, [np.nan] * len(repeated))

    square, taken = _preparation(records, prediction)
    resolution = readings["resolution"][rows]
    display = np.where(np.isfinite(resolution), resolution, 0.0) ** 2 / 12.0
    u_temperature = _budget(prediction, "temperature")[rows]
    declared = _budget(prediction, "declared without effect")[rows]
    return Layout(
        records=records,
        prediction=prediction,
        reading=rows,
        r=readings["ph"][rows] - ph,
        ph=ph,
        observed=readings["ph"][rows],
        temperature=prediction.temperature_c[rows],
        day=day,
        resolution=resolution,
        meter=meter,
        batch=batch,
        family=family,
        session=session,
        solution=solution,
        meters=meters,
        families=families,
        batches=tuple(str(name) for name in names[rows][new]),
        z=sparse.csr_array(sparse.hstack(columns)),
        prior=np.array(prior, float),
        effects=effects,
        other=u_temperature**2 + _allowance(records)[rows],
        shared=taken[rows] + display + declared**2 + np.where(anchor >= 0, UNKNOWN_SD**2, 0.0),
        preparation=np.sqrt(square[rows]),
        first_of_batch=np.flatnonzero(new),
        anchor=anchor,
        averaged=np.maximum(np.nan_to_num(readings["averaged"][rows], nan=1.0), 1.0),
        lots_used=lots_used,
        lot_columns=lot_columns,
        start=start,
    )


def _accuracies(records: BatchRecords, meters: Sequence[str], default: float) -> list[float]:
    """Standard uncertainty of each meter from its stated accuracy, a half-width (JCGM 100, 4.3.7)."""
    stated = {str(m): float(a) for m, a in zip(records.meters["meter"], records.meters["accuracy"], strict=True)}
    values = [stated.get(m, default) for m in meters]
    return [(a if np.isfinite(a) and a > 0 else default) / ROOT3 for a in values]


def _preparation(records: BatchRecords, prediction: Prediction) -> tuple[FloatArray, FloatArray]:
    """Sum of squared sensitivities, and variance of taking the amounts, for each reading."""
    t = prediction.contributions
    square = np.bincount(t.row, t.value**2, minlength=len(prediction))
    taking = np.bincount(t.row, (t.value * records.solutions.u_amount[t.column]) ** 2, minlength=len(prediction))
    return np.asarray(square, float), np.asarray(taking, float)


def _budget(prediction: Prediction, name: str) -> FloatArray:
    return np.nan_to_num(prediction.budget.get(name, np.zeros(len(prediction))))


def _allowance(records: BatchRecords) -> FloatArray:
    """Variance of a reading's own stated half-width, where the record has one."""
    stated = records.readings.columns.get("u_reading")
    if stated is None:
        return np.zeros(len(records.readings))
    return np.nan_to_num(stated) ** 2 / 3.0
