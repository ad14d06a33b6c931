"""Who and what each residual rests on: the columns of the mixed model, and the index tables the fault kinds use."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from scipy import sparse

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
    meters, families : names; z : FloatArray (n, q) columns of the random effects with a prior
    prior : FloatArray (q,)     prior variances; NaN for those estimated from the record (sessions)
    other : FloatArray (n,)     variance of temperature, certificate and allowance of each reading [pH^2]
    shared : FloatArray (n,)    variance shared by the readings of a batch whatever the preparation [pH^2]
    preparation : FloatArray (n,)  d(pH) for a unit relative error in every component, root-sum-square
    first_of_batch : IntArray   where each batch begins
    lots_used : IntArray (k,), lots met; lot_columns : sparse (n, k), dpH/d ln strength of each
    start : time of the first reading
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

    @cached_property
    def kept(self) -> dict[str, Any]:
        """What models of a long record worked out once, under names of their own."""
        return {}

    def own(self, sort: str, index: int) -> tuple[int, ...]:
        """Columns of the design that hold one subject's own prior; () when it has none."""
        effects = self.effects.get(sort)
        return () if effects is None else (effects.column(index),)


def evidence(records: BatchRecords, prediction: Prediction) -> BoolArray:
    """Readings that may speak: solved, inside model and electrode, buffered, not void, with a finite residual."""
    usable: BoolArray = (
        np.isin(prediction.status, EVIDENCE) & np.isfinite(prediction.ph) & np.isfinite(records.readings["ph"])
    )
    standing: TextArray = records.readings["standing"]
    return np.asarray(usable & (standing != "void") & (prediction.u > 0), bool)


def _codes(values: Iterable[object]) -> tuple[IntArray, tuple[str, ...]]:
    """Index of each value among the sorted distinct ones; -1 for an empty text."""
    texts = [str(v) for v in values]
    names = sorted({v for v in texts if v})
    index = {name: i for i, name in enumerate(names)}
    return np.array([index.get(v, -1) for v in texts], np.intp), tuple(names)


def solution_names(records: BatchRecords) -> TextArray:
    """Batch or known solution that each reading was taken on."""
    readings = records.readings
    return np.where(readings["batch"] == "", readings["known"], readings["batch"])


def family_names(records: BatchRecords) -> list[str]:
    """Kind of each solution: the acids in it, in alphabetical order; "no weak acid" where there is none."""
    acids: list[set[str]] = [set() for _ in range(len(records.solutions))]
    forms = records.forms
    for solution, form in zip(records.solutions.solution.tolist(), records.solutions.form.tolist(), strict=True):
        acids[solution].update(forms[form].acids)
    return [
        "known solution" if np.isfinite(known) else (" + ".join(sorted(found)) or "no weak acid")
        for found, known in zip(acids, records.solutions.known_ph, strict=True)
    ]


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


def sessions_of(
    records: BatchRecords, meters: Sequence[str], meter: IntArray, rows: IntArray
) -> tuple[IntArray, tuple[str, ...]]:
    """Calibration session of each reading; the meter's day where no calibration of the meter is recorded before it."""
    at = records.readings["read_at"][rows]
    days = at.astype("datetime64[D]").astype(str)
    labels = [f"{meters[m]} {t}" if m >= 0 and t != "NaT" else "" for m, t in zip(meter, days, strict=True)]
    table = records.calibrations
    named = np.array([str(m) for m in table["meter"]], object) if len(table) else np.zeros(0, object)
    for index, name in enumerate(meters):
        calibrated = np.sort(table["calibrated_at"][named == name]) if len(named) else np.zeros(0, "datetime64[s]")
        calibrated = calibrated[~np.isnat(calibrated)]
        mine = np.flatnonzero((meter == index) & ~np.isnat(at)) if len(calibrated) else np.zeros(0, np.intp)
        for row, session in zip(mine, np.searchsorted(calibrated, at[mine], side="right"), strict=True):
            if session:
                labels[row] = f"{name} calibrated {calibrated[session - 1]}"
    return _codes(labels)


def build_layout(records: BatchRecords, prediction: Prediction, settings: Settings, usable: BoolArray) -> Layout:
    """The evidence of a record as the model sees it.

    Raises nothing for a record without evidence: the layout is then empty.
    """
    names = solution_names(records)
    chosen = np.flatnonzero(usable)
    order = np.argsort(np.array([str(n) for n in names[chosen]], dtype=str), kind="stable") if len(chosen) else chosen
    rows = chosen[order].astype(np.intp)
    n = len(rows)
    readings = records.readings
    at = readings["read_at"][rows]
    start = np.min(at[~np.isnat(at)]) if n and (~np.isnat(at)).any() else np.datetime64("1970-01-01", "s")
    day = np.where(np.isnat(at), np.nan, (at - start) / np.timedelta64(1, "s") / DAY)
    meter, meters = _codes(readings["meter"][rows])
    batch, batches = _codes(names[rows])
    solution = records.readings_solution[rows]
    family_of_solution, families = _codes(family_names(records))
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

    add("meter", meters, one_hot(meter, len(meters)), [a**2 for a in accuracy])
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
    counts = np.bincount(session[session >= 0], minlength=len(sessions)) if n else np.zeros(0, np.intp)
    repeated = np.flatnonzero(counts > 1)  # a session with one reading cannot be told from its noise
    session_block = one_hot(session, len(sessions))[:, repeated]
    add("session", [sessions[i] for i in repeated], session_block, [np.nan] * len(repeated))

    square, taken = _preparation(records, prediction)
    resolution = readings["resolution"][rows]
    display = np.where(np.isfinite(resolution), resolution, 0.0) ** 2 / 12.0
    u_temperature = _budget(prediction, "temperature")[rows]
    known = _budget(prediction, "certificate")[rows]
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
        batches=batches,
        z=sparse.csr_array(sparse.hstack(columns)),
        prior=np.array(prior, float),
        effects=effects,
        other=u_temperature**2 + known**2 + _allowance(records)[rows],
        shared=taken[rows] + display,
        preparation=np.sqrt(square[rows]),
        first_of_batch=np.flatnonzero(np.r_[True, batch[1:] != batch[:-1]]) if n else np.zeros(0, np.intp),
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
