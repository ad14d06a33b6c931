"""State fractions of every acid, the charge balance and the ionic strength, with their slopes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from reconcile.chemistry.activity import SIZE_HYDROGEN, SIZE_HYDROXIDE, ActivityModel
from reconcile.chemistry.temperature import LN10
from reconcile.records.arrays import FloatArray

if TYPE_CHECKING:
    from reconcile.chemistry.composition import Chunk, Slot


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


@dataclass(frozen=True)
class Activity:
    """What the activity model gives at an ionic strength.

    d, d_i : D and dD/dI of ions with no size of their own; hydrogen, hydroxide : D of these; states : D of the states
    of each slot, None where the model knows no sizes; g2 : 10^(2 D).
    """

    d: FloatArray
    d_i: FloatArray
    hydrogen: FloatArray
    hydroxide: FloatArray
    states: list[FloatArray] | None
    g2: FloatArray


def activity(chunk: Chunk, model: ActivityModel, strength: FloatArray) -> Activity:
    """D of every ion of a chunk at its ionic strength [mol/kg]."""
    d, d_i, *_ = model.exponent(chunk.a, chunk.b, strength, np.array(4.5))
    g2 = np.exp((2.0 * LN10) * d)
    if not model.sized:
        return Activity(d, d_i, d, d, None, g2)
    h = model.exponent(chunk.a, chunk.b, strength, np.array(SIZE_HYDROGEN))[0]
    oh = model.exponent(chunk.a, chunk.b, strength, np.array(SIZE_HYDROXIDE))[0]
    states = [
        model.exponent(chunk.a, chunk.b, strength, s.size, s.linear if model.linear else 0.0)[0] for s in chunk.slots
    ]
    return Activity(d, d_i, h, oh, states, g2)


def free_ions(chunk: Chunk, act: Activity, ph: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Molality of H+ and of OH-, and 10^(pH + D), from which the weights of the states are made."""
    raised = np.exp(LN10 * (ph + act.d))
    if act.states is None:
        h = act.g2 / raised
        return h if chunk.hydrogen is None else h * chunk.hydrogen, chunk.kw * raised, raised
    return np.exp(LN10 * (act.hydrogen - ph)), chunk.kw * np.exp(LN10 * (act.hydroxide + ph)), raised


def weights(slot: Slot, ph: FloatArray, act: Activity, raised: FloatArray, number: int) -> list[FloatArray]:
    """Molality of every later state of an acid over that of its fully protonated state; slot `number` of its chunk.

    m_j / m_0 = prod K_i / a_H^j * 10^(z_j^2 D_j - z_0^2 D_0), as activities are molalities times 10^(-z^2 D).
    """
    out: list[FloatArray] = []
    if act.states is None:
        ratio = raised if slot.neutral else raised * np.exp(act.d * ((-2.0 * LN10) * slot.charge))
        for j, k in enumerate(slot.k):
            if j:
                ratio = ratio * act.g2
                step = k * ratio
                step *= out[-1]
            else:
                step = k * ratio
            out.append(step)
        return out
    state_d = act.states[number]
    for j, k in enumerate(slot.k):
        before, after = (slot.charge - j) ** 2 * state_d[j], (slot.charge - j - 1) ** 2 * state_d[j + 1]
        step = k * np.exp(LN10 * (ph + after - before))
        out.append(step if j == 0 else out[-1] * step)
    return out


class AtStrength:
    """The charge balance of a chunk at a fixed ionic strength: apparent constants are formed once for many trial pH."""

    def __init__(self, chunk: Chunk, model: ActivityModel, strength: FloatArray) -> None:
        act = activity(chunk, model, strength)
        self._charge, self._square = chunk.charge, chunk.square
        zero = np.zeros(len(chunk))  # at pH 0 the weights are the products of apparent constants
        self._hydrogen, self._hydroxide, raised = free_ions(chunk, act, zero)
        self._slots = [(slot, weights(slot, zero, act, raised, i)) for i, slot in enumerate(chunk.slots)]

    def excess(self, ph: FloatArray) -> FloatArray:
        """Positive minus negative charge [mol/kg] at a trial pH; falls steadily as pH rises."""
        ratio = np.exp(LN10 * ph)
        excess = self._charge + (self._hydrogen / ratio - self._hydroxide * ratio)
        for slot, products in self._slots:
            power = ratio
            s1 = products[0] * power
            s0 = 1.0 + s1
            for j, product in enumerate(products[1:], start=2):
                power = power * ratio
                w = product * power
                s0 += w
                w *= j
                s1 += w
            s1 *= slot.total
            s1 /= _whole(slot, s0)
            excess -= s1
        return excess

    def newton(self, ph: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Newton's step in pH at this ionic strength, and the ionic strength that the species at the trial pH make."""
        ratio = np.exp(LN10 * ph)
        h, oh = self._hydrogen / ratio, self._hydroxide * ratio
        excess, falling = self._charge + (h - oh), h + oh
        squares = self._square + falling
        for slot, products in self._slots:
            power = ratio
            w = products[0] * power
            s0, s1, s2 = 1.0 + w, w.copy(), w.copy()
            for j, product in enumerate(products[1:], start=2):
                power = power * ratio
                w = product * power
                s0 += w
                w *= j
                s1 += w
                w *= j
                s2 += w
            share = 1.0 / _whole(slot, s0)
            s1 *= share
            s2 *= share
            second = s2 if slot.neutral else s2 + slot.charge * (slot.charge - 2.0 * s1)
            squares += slot.total * second
            excess -= slot.total * s1
            s1 *= s1
            falling += slot.total * (s2 - (s1 if slot.closed is None else slot.closed * s1))
        return excess / (LN10 * falling), 0.5 * squares


def _whole(slot: Slot, s0: FloatArray) -> FloatArray:
    """What molality is divided by: the sum over states, or 1 where the air holds the first state."""
    return s0 if slot.closed is None else np.where(slot.closed > 0.0, s0, 1.0)


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
    h, oh, raised = free_ions(chunk, act, ph)
    both, difference = h + oh, h - oh
    excess = chunk.charge + difference
    squares = chunk.square + both
    excess_ph = -both
    excess_d = difference.copy()
    squares_ph = -difference
    squares_d = both
    for i, slot in enumerate(chunk.slots):
        n1, n2, var, mixed, wide = _moments(slot, weights(slot, ph, act, raised, i))
        total = slot.total
        if slot.neutral:
            cov, spread, second = mixed, wide, n2
        else:
            z = slot.charge
            at = z * var
            spread = wide - 4.0 * z * (mixed - at)
            cov = mixed - 2.0 * at
            second = n2 + z * (z - 2.0 * n1)
        excess -= total * n1
        squares += total * second
        excess_ph -= total * var
        cov = total * cov
        excess_d -= cov
        squares_ph += cov
        squares_d += total * spread
    d_i = LN10 * act.d_i
    excess_d *= d_i
    squares_d *= d_i
    return Balance(
        excess, strength - 0.5 * squares, LN10 * excess_ph, excess_d, (-0.5 * LN10) * squares_ph, 1.0 - 0.5 * squares_d
    )


Five = tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]


def _moments(slot: Slot, some: list[FloatArray]) -> Five:
    """Of the number j of protons lost: mean, mean square, variance, covariance with j^2, variance of j^2."""
    s0 = 1.0 + some[0]
    for w in some[1:]:
        s0 += w
    share = 1.0 / _whole(slot, s0)
    n1 = some[0] * share
    if len(some) == 1:
        var = n1 * (1.0 - n1) if slot.closed is None else n1 - slot.closed * n1 * n1
        return n1, n1, var, var, var
    n2, n3, n4 = n1.copy(), n1.copy(), n1.copy()
    for j, w in enumerate(some[1:], start=2):
        part = w * share
        part *= j
        n1 += part
        part *= j
        n2 += part
        part *= j
        n3 += part
        part *= j
        n4 += part
    away = n1 if slot.closed is None else slot.closed * n1
    square = n2 if slot.closed is None else slot.closed * n2
    return n1, n2, n2 - away * n1, n3 - away * n2, n4 - square * n2
