"""Specific ion interaction: what the strong ions of a solution do to every other ion.

lg gamma = -z^2 D + sum of epsilon m, the sum over ions of the other sign.

Partners that are strong ions have known molalities, so that their part of lg gamma is a number for each solution and
goes into its constants. Between weak ions of opposite charge no coefficient is published; none is used.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from reconcile.chemistry.fractions import Found, spread
from reconcile.chemistry.ion_data import TITRANT, chloride_interactions, strong_ions
from reconcile.chemistry.temperature import LN10
from reconcile.records.arrays import FloatArray

if TYPE_CHECKING:
    from reconcile.chemistry.acids import AcidTable
    from reconcile.chemistry.composition import Chunk, FormTable


def interact(chunk: Chunk, molality: FloatArray, acids: AcidTable) -> None:
    """Turn constants into those at the strong ions' molality (m, i): lg gamma = -z^2 D + sum of epsilon m.

    pH is shifted to the scale on which chloride has the coefficient of the convention, -D alone.
    """
    coefficient = acids.interactions
    shift = molality @ chloride_interactions()
    hydrogen, hydroxide = molality @ coefficient[-2], molality @ coefficient[-1]
    chunk.hydrogen = np.exp(-LN10 * (hydrogen + shift))
    chunk.kw *= np.exp(LN10 * (shift - hydroxide))
    for slot in chunk.slots:
        before = np.einsum("mi,mi->m", molality, coefficient[acids.state_of(slot.acid, 0)])
        for j in range(len(slot.k)):
            after = np.einsum("mi,mi->m", molality, coefficient[acids.state_of(slot.acid, j + 1)])
            slot.k[j] *= np.exp(LN10 * (shift + before - after))
            before = after


def interaction_slopes(
    chunk: Chunk,
    forms: FormTable,
    acids: AcidTable,
    h: FloatArray,
    oh: FloatArray,
    found: list[Found],
    on_charge: FloatArray,
    on_squares: FloatArray,
) -> FloatArray:
    """dpH per mol/kg of every strong ion through its interactions alone (m, i); 0 for ions that no form brings."""
    coefficient, scale = acids.interactions, chloride_interactions()
    out = np.zeros((len(chunk), len(scale)))
    titrant = strong_ions().index(TITRANT)
    for ion in np.flatnonzero(forms.brings.any(axis=0) | (np.arange(len(scale)) == titrant)):
        shift, own = scale[ion], coefficient[:, ion]
        up, down = h * (-own[-2] - shift), oh * (shift - own[-1])  # change of lg molality times molality
        charge, squares = up - down, up + down
        for slot, x in zip(chunk.slots, found, strict=True):
            z = [slot.charge - j for j in range(len(x.f))]
            moved = [j * shift - own[acids.state_of(slot.acid, j)] for j in range(len(x.f))]
            moved = [one - moved[0] for one in moved]
            charge = charge + slot.total * spread(x, z, moved)
            squares = squares + slot.total * spread(x, [c * c for c in z], moved)
        out[:, ion] = LN10 * (on_charge * charge + on_squares * squares)
    return out
