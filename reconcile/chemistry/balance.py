"""State fractions of every acid, the charge balance and the ionic strength, with their slopes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.activity import SIZE_HYDROGEN, SIZE_HYDROXIDE, ActivityModel
from reconcile.chemistry.composition import Chunk, Slot
from reconcile.chemistry.temperature import LN10
from reconcile.records.arrays import FloatArray


@dataclass(frozen=True)
class Balance:
    """The two equations at a trial pH and ionic strength, and their slopes; all (m,), [mol/kg].

    excess : positive minus negative charge (0 at the answer)
    strength : ionic strength that the species found would have, minus the one assumed, negated (0 at the answer)
    excess_ph, excess_i, strength_ph, strength_i : partial derivatives
    """

    excess: FloatArray
    strength: FloatArray
    excess_ph: FloatArray
    excess_i: FloatArray
    strength_ph: FloatArray
    strength_i: FloatArray


def weights(slot: Slot, ph: FloatArray, d: FloatArray, g2: FloatArray, state_d: FloatArray | None) -> list[FloatArray]:
    """Molality of every later state of an acid over that of its fully protonated state.

    m_j / m_0 = prod K_i / a_H^j * 10^(z_j^2 D_j - z_0^2 D_0), as activities are molalities times 10^(-z^2 D).
    """
    out: list[FloatArray] = []
    if state_d is None:
        ratio = np.exp(LN10 * (ph + d * (1.0 - 2.0 * slot.charge)))
        for j, k in enumerate(slot.k):
            step = k * ratio
            out.append(step if j == 0 else out[-1] * step)
            ratio = ratio * g2
        return out
    for j, k in enumerate(slot.k):
        before, after = (slot.charge - j) ** 2 * state_d[j], (slot.charge - j - 1) ** 2 * state_d[j + 1]
        step = k * np.exp(LN10 * (ph + after - before))
        out.append(step if j == 0 else out[-1] * step)
    return out


@dataclass(frozen=True)
class Activity:
    """What the activity model gives at an ionic strength.

    d, d_i : D and dD/dI of ions with no size of their own; hydrogen, hydroxide : D of these; states : D of the states
    of each slot, None where the model knows no sizes.
    """

    d: FloatArray
    d_i: FloatArray
    hydrogen: FloatArray
    hydroxide: FloatArray
    states: list[FloatArray] | None


def activity(chunk: Chunk, model: ActivityModel, strength: FloatArray) -> Activity:
    """D of every ion of a chunk at its ionic strength [mol/kg]."""
    usual = np.array(4.5)
    d, d_i, *_ = model.exponent(chunk.a, chunk.b, strength, usual)
    if not model.sized:
        return Activity(d, d_i, d, d, None)
    h = model.exponent(chunk.a, chunk.b, strength, np.array(SIZE_HYDROGEN))[0]
    oh = model.exponent(chunk.a, chunk.b, strength, np.array(SIZE_HYDROXIDE))[0]
    return Activity(d, d_i, h, oh, [model.exponent(chunk.a, chunk.b, strength, s.size)[0] for s in chunk.slots])


def charge_only(chunk: Chunk, act: Activity, ph: FloatArray) -> FloatArray:
    """Positive minus negative charge [mol/kg] at a trial pH; falls steadily as pH rises."""
    excess = chunk.charge + np.exp(LN10 * (act.hydrogen - ph)) - chunk.kw * np.exp(LN10 * (act.hydroxide + ph))
    g2 = np.exp(LN10 * 2.0 * act.d)
    for i, slot in enumerate(chunk.slots):
        some = weights(slot, ph, act.d, g2, None if act.states is None else act.states[i])
        s0 = np.ones_like(ph)
        s1 = np.zeros_like(ph)
        for j, w in enumerate(some, start=1):
            s0 += w
            s1 += w if j == 1 else j * w
        if slot.closed.all():
            excess += slot.total * (slot.charge - s1 / s0)
        else:
            excess += slot.total * (slot.charge - s1 / np.where(slot.closed > 0.0, s0, 1.0))
    return excess


def balance(chunk: Chunk, model: ActivityModel, ph: FloatArray, strength: FloatArray) -> Balance:
    """Charge balance and ionic strength at a trial pH and ionic strength, with their slopes.

    Parameters
    ----------
    chunk : Chunk
        m solutions.
    model : ActivityModel
        Activity model.
    ph, strength : ndarray (m,)
        Trial pH [-] and ionic strength [mol/kg].

    Returns
    -------
    Balance
        Both equations and their four slopes, (m,).

    Notes
    -----
    With f_j the fraction of state j and z_j its charge, dn/dpH = ln 10 var(j) and dn/dD = ln 10 cov(j, z_j^2), so that
    four moments of j give every slope. A model with ion sizes uses the same slopes with the D of a usual ion: its
    residuals are exact, its slopes nearly so.

    References
    ----------
    Stumm and Morgan, Aquatic Chemistry, 3rd ed. 1996, section 3.4 (charge balance); Butler 1998, Ionic Equilibrium,
    chapter 4 (buffer capacity as the slope of the charge balance).
    """
    act = activity(chunk, model, strength)
    h = np.exp(LN10 * (act.hydrogen - ph))
    oh = chunk.kw * np.exp(LN10 * (act.hydroxide + ph))
    g2 = np.exp((2.0 * LN10) * act.d)
    excess = chunk.charge + (h - oh)
    squares = chunk.square + (h + oh)
    excess_ph = -(h + oh)
    excess_d = h - oh
    squares_ph = oh - h
    squares_d = h + oh
    for i, slot in enumerate(chunk.slots):
        some = weights(slot, ph, act.d, g2, None if act.states is None else act.states[i])
        s0 = np.ones_like(h)
        s1, s2, s3, s4 = (np.zeros_like(h) for _ in range(4))
        for j, w in enumerate(some, start=1):
            s0 += w
            if j > 1:
                w = w * j
            s1 += w
            if j > 1:
                w = w * j
            s2 += w
            if j > 1:
                w = w * j
            s3 += w
            if j > 1:
                w = w * j
            s4 += w
        closed = slot.closed
        if not closed.all():
            s0 = np.where(closed > 0.0, s0, 1.0)
        s0 = 1.0 / s0
        s1 *= s0
        s2 *= s0
        s3 *= s0
        s4 *= s0
        z, total = slot.charge, slot.total
        away = closed * s1
        var = s2 - away * s1
        mixed = s3 - away * s2
        cov = mixed - 2.0 * z * var  # of j with z_j^2
        excess += total * (z - s1)
        squares += total * (z * (z - 2.0 * s1) + s2)
        excess_ph -= total * var
        excess_d -= total * cov
        squares_ph += total * cov
        squares_d += total * (s4 - closed * s2 * s2 - 4.0 * z * (mixed - z * var))
    d_i = LN10 * act.d_i
    return Balance(
        excess,
        strength - 0.5 * squares,
        LN10 * excess_ph,
        excess_d * d_i,
        (-0.5 * LN10) * squares_ph,
        1.0 - 0.5 * squares_d * d_i,
    )
