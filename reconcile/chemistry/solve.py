"""pH and ionic strength of many solutions together: safeguarded Newton, finished rows dropped."""

from __future__ import annotations

import numpy as np

from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.balance import AtStrength, balance
from reconcile.chemistry.composition import Chunk
from reconcile.records.arrays import BoolArray, FloatArray, IntArray

PH_LOW, PH_HIGH = -1.0, 15.0  # first bracket; the last resort searches further
WIDE_LOW, WIDE_HIGH = -4.0, 19.0
HALVINGS = 5
FIXED_STEPS = 1
STEPS = 30
TOLERANCE = 3e-6  # of the last step: Newton doubles the digits, so that what is left is about 1e-11
TOLERANCE_SIZED = 1e-10  # where the slopes are only nearly exact, each step gains two digits or so
LEAST_STRENGTH = 1e-9  # mol/kg; pure water at 0 °C has 3e-8


def solve(chunk: Chunk, model: ActivityModel) -> tuple[FloatArray, FloatArray, BoolArray]:
    """pH and ionic strength at which charge balance and ionic strength both close.

    Parameters
    ----------
    chunk : Chunk
        m solutions in the padded layout; a row with NaN is left unsolved and harms no other.
    model : ActivityModel
        Activity model.

    Returns
    -------
    ph, strength : ndarray (m,)
        pH [-] and ionic strength [mol/kg]; NaN where not solved.
    solved : ndarray of bool (m,)

    Notes
    -----
    Four halvings of the bracket at a guessed ionic strength, then Newton in both unknowns with the pH step held to 1
    and the ionic strength to a factor of 5. Rows that have not closed after 30 steps are solved by nested halving,
    which cannot fail: at a fixed ionic strength the charge balance falls steadily with pH, and the ionic strength of
    the species found stays within bounds.
    """
    m = len(chunk)
    ph, strength = np.full(m, np.nan), np.full(m, np.nan)
    usable = np.isfinite(chunk.charge) & np.isfinite(chunk.kw) & np.isfinite(chunk.square)
    for slot in chunk.slots:
        usable &= np.isfinite(slot.total)
    row = np.flatnonzero(usable)
    if not len(row):
        return ph, strength, usable
    part = chunk if len(row) == m else chunk.take(row)
    x, i = _start(part, model)
    tolerance = TOLERANCE_SIZED if model.sized else TOLERANCE
    for _ in range(STEPS):
        b = balance(part, model, x, i)
        det = b.excess_ph * b.strength_i - b.excess_i * b.strength_ph
        with np.errstate(divide="ignore", invalid="ignore"):
            step = (b.excess_i * b.strength - b.excess * b.strength_i) / det
            rise = (b.strength_ph * b.excess - b.excess_ph * b.strength) / det
        done = (np.abs(step) < tolerance) & (np.abs(rise) < tolerance * i)
        x = x + np.clip(step, -1.0, 1.0)
        i = np.clip(i + rise, 0.2 * i, 5.0 * i + 1e-3)
        np.maximum(i, LEAST_STRENGTH, out=i)
        finished = int(np.count_nonzero(done))
        if finished == len(row) or finished > 0.3 * len(row):
            ph[row[done]], strength[row[done]] = x[done], i[done]
            keep = np.flatnonzero(~done)
            row, x, i, part = row[keep], x[keep], i[keep], part.take(keep)
        if not len(row):
            break
    if len(row):
        ph[row], strength[row] = _nested(part, model)
    return ph, strength, usable & np.isfinite(ph)


def _start(chunk: Chunk, model: ActivityModel) -> tuple[FloatArray, FloatArray]:
    """A pH near the answer, at the ionic strength that the strong ions and their counter-ions alone would give."""
    strength = 0.5 * (chunk.square + np.abs(chunk.strong)) + 1e-7
    fixed = AtStrength(chunk, model, strength)
    width = 0.5 * (PH_HIGH - PH_LOW)
    middle = np.full(len(chunk), PH_LOW + width)
    for _ in range(HALVINGS):
        width *= 0.5
        middle += np.copysign(width, fixed.excess(middle))
    for _ in range(FIXED_STEPS):
        step, strength = fixed.newton(middle)
        middle += np.clip(step, -width, width)
    return middle, np.maximum(strength, LEAST_STRENGTH)


def _ph_at(chunk: Chunk, model: ActivityModel, strength: FloatArray) -> FloatArray:
    """pH that closes the charge balance at a given ionic strength, by halving."""
    fixed = AtStrength(chunk, model, strength)
    low, high = np.full(len(chunk), WIDE_LOW), np.full(len(chunk), WIDE_HIGH)
    for _ in range(56):
        middle = 0.5 * (low + high)
        above = fixed.excess(middle) > 0.0
        low, high = np.where(above, middle, low), np.where(above, high, middle)
    return np.asarray(0.5 * (low + high))


def _nested(chunk: Chunk, model: ActivityModel) -> tuple[FloatArray, FloatArray]:
    """The last resort: halving in ionic strength around halving in pH."""
    most = 0.5 * chunk.square + np.abs(chunk.strong) + 1.0
    for slot in chunk.slots:
        charges = np.abs(slot.charge - np.arange(len(slot.k) + 1)[:, None]).max(axis=0)
        most += slot.total * charges**2
    low, high = np.full(len(chunk), LEAST_STRENGTH), most
    for _ in range(56):
        middle = np.sqrt(low * high)
        ph = _ph_at(chunk, model, middle)
        over = balance(chunk, model, ph, middle).strength < 0.0  # the species found make more than was assumed
        low, high = np.where(over, middle, low), np.where(over, high, middle)
    middle = np.sqrt(low * high)
    return _ph_at(chunk, model, middle), middle


_HASH_SEED = 20240229
_BLOCK = 1 << 20  # cells looked at together, so that a wide table needs no second copy


def rows_alike(keys: FloatArray) -> tuple[IntArray, IntArray]:
    """First row of each set of identical rows, and for every row the index of its set.

    keys : ndarray (n, k), compared bit for bit. Rows are grouped by a 64-bit hash and checked against their group's
    first row; a row that merely shares the hash is kept as a set of its own.
    """
    n, k = keys.shape
    if n < 2:
        return np.arange(n), np.arange(n)
    bits = np.ascontiguousarray(keys, float).view(np.uint64).reshape(n, k)
    odd = np.random.default_rng(_HASH_SEED).integers(0, 2**63, k, np.uint64) * np.uint64(2) + np.uint64(1)
    mixed = np.empty(n, np.uint64)
    rows = max(1, _BLOCK // max(k, 1))
    with np.errstate(over="ignore"):
        for begin in range(0, n, rows):
            part = bits[begin : begin + rows]
            mixed[begin : begin + rows] = ((part ^ (part >> np.uint64(31))) * odd).sum(axis=1, dtype=np.uint64)
    _, first, inverse = np.unique(mixed, return_index=True, return_inverse=True)
    if len(first) == n:
        return np.arange(n), np.arange(n)
    order = np.argsort(first)  # sets in the order in which they first appear, so that neighbours stay neighbours
    first, renamed = first[order], np.empty(len(first), np.intp)
    renamed[order] = np.arange(len(first))
    inverse = renamed[inverse]
    apart = [
        begin + np.flatnonzero(np.any(bits[begin : begin + rows] != bits[first[inverse[begin : begin + rows]]], axis=1))
        for begin in range(0, n, rows)
    ]
    others = np.concatenate(apart)
    if len(others):
        inverse[others] = len(first) + np.arange(len(others))
        first = np.concatenate([first, others])
    return first, inverse
