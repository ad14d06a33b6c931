"""Solutions that hold ion pairs or condensed species, laid out by species and solved from the answer without them.

Every species follows from components: pH, the first state of each acid that takes part, each free metal ion.

    lg m = c + q pH + sum nu y + z^2 D - sum nu z_c^2 D_c

with y the lg of a component's molality and D, D_c those of the species and of the component. Acids that take no part
stay in the balance of balance.py, which counts them by their fractions.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from reconcile.chemistry.acids import AcidTable, usual_size
from reconcile.chemistry.composition import Chunk
from reconcile.chemistry.ion_data import strong_ions
from reconcile.chemistry.pair_table import Pair
from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.substances import ions

NOTHING = -400.0  # lg of a molality that counts as none


@dataclass
class Layout:
    """n solutions by species: s species of c components.

    rest : Chunk                    the same solutions without the acids and metals that are components
    acids, metals : components, acids first
    slot : IntArray (a, n)          slot of each acid in the chunk, -1 where a row does not hold it
    lgc : FloatArray (s, n); q, z : FloatArray (s,); nu : FloatArray (s, c)
    pair : FloatArray (s,)          index of the pair that a species is, -1 for states and free metals
    total : FloatArray (c, n)       molality of each component, free and bound [mol/kg]
    held : BoolArray (c, n)         True where the air holds the first state's molality, which is then `total`
    size : FloatArray (s, n)        ion sizes [angstrom]
    reference : IntArray (c,)       species whose molality a component's y is the lg of
    """

    rest: Chunk
    acids: tuple[int, ...]
    metals: tuple[str, ...]
    slot: IntArray
    lgc: FloatArray
    q: FloatArray
    z: FloatArray
    nu: FloatArray
    pair: IntArray
    total: FloatArray
    held: BoolArray
    size: FloatArray
    reference: IntArray

    def take(self, keep: IntArray) -> Layout:
        return replace(
            self,
            rest=self.rest.take(keep),
            slot=self.slot[:, keep],
            lgc=self.lgc[:, keep],
            total=self.total[:, keep],
            held=self.held[:, keep],
            size=self.size[:, keep],
        )

    def shifts(self, d: FloatArray) -> FloatArray:
        """z^2 D - sum nu z_c^2 D_c of every species (s, n), from D of every species (or of all alike, (1, n))."""
        squares = self.z**2
        own = np.broadcast_to(d, self.lgc.shape)
        return squares[:, None] * own - self.nu @ (squares[self.reference][:, None] * own[self.reference])


def layout(
    chunk: Chunk, metal_totals: dict[str, FloatArray], some: Sequence[Pair], acids: AcidTable, kelvin: FloatArray
) -> Layout:
    """The layout of a chunk of n rows with the pairs given; a row that lacks a part has that pair at molality 0."""
    n = len(chunk)
    used = tuple(sorted({acids.index[acid] for pair in some for acid, _ in pair.states}))
    metals = tuple(sorted({metal for pair in some for metal in pair.metals}))
    slot = np.full((len(used), n), -1, np.intp)
    for number, one in enumerate(chunk.slots):
        for a, acid in enumerate(used):
            slot[a, (one.acid == acid) & (one.total > 0.0)] = number
    everyone = np.arange(n)
    lgc: list[FloatArray] = []
    q: list[int] = []
    z: list[int] = []
    component: list[int] = []
    size: list[FloatArray] = []
    total, held = np.zeros((len(used) + len(metals), n)), np.zeros((len(used) + len(metals), n), bool)
    reference = []
    first: dict[tuple[str, int], int] = {}
    for a, acid in enumerate(used):
        steps, charge = int(acids.steps[acid]), int(acids.charge[acid])
        running = np.zeros(n)
        reference.append(len(lgc))
        for lost in range(steps + 1):
            if lost:
                running = running + _lg_k(chunk, slot[a], lost - 1, everyone)
            first[acids.names[acid], lost] = len(lgc)
            lgc.append(running)
            q.append(lost)
            z.append(charge - lost)
            component.append(a)
            size.append(np.full(n, acids.size[acids.first[acid] + acid + lost]))
        for number, one in enumerate(chunk.slots):
            here = slot[a] == number
            total[a, here] = one.total[here]
            if one.closed is not None:
                held[a, here] = one.closed[here] == 0.0
    for i, metal in enumerate(metals, start=len(used)):
        reference.append(len(lgc))
        first[metal, -1] = len(lgc)
        lgc.append(np.zeros(n))
        q.append(0)
        z.append(ions()[metal].charge)
        component.append(i)
        size.append(np.full(n, usual_size(ions()[metal].charge)))
        total[i] = metal_totals[metal]
    states = len(lgc)
    nu = np.zeros((states + len(some), len(used) + len(metals)))
    nu[np.arange(states), component] = 1.0
    lg_kw = np.log10(chunk.kw)
    for p, pair in enumerate(some, start=states):
        parts = [(first[state], number) for state, number in pair.states.items()]
        parts += [(first[metal, -1], number) for metal, number in pair.metals.items()]
        whole = pair.value(kelvin)[0] + pair.hydroxide * lg_kw
        for index, number in parts:
            whole = whole + number * lgc[index]
            nu[p] += number * nu[index]
        present = np.all(total[nu[p] > 0.0] > 0.0, axis=0)
        lgc.append(np.where(present, whole, NOTHING))
        q.append(sum(number * q[index] for index, number in parts) + pair.hydroxide)
        z.append(sum(number * z[index] for index, number in parts) - pair.hydroxide)
        size.append(np.full(n, usual_size(int(z[-1]))))
    pair_of = np.concatenate([np.full(states, -1), np.arange(len(some))]).astype(np.intp)
    return Layout(
        _rest(chunk, used, metals, metal_totals),
        used,
        metals,
        slot,
        np.array(lgc),
        np.array(q, float),
        np.array(z, float),
        nu,
        pair_of,
        total,
        held,
        np.array(size),
        np.array(reference, np.intp),
    )


def _lg_k(chunk: Chunk, slot: IntArray, step: int, everyone: IntArray) -> FloatArray:
    """lg of one step's constant for the slot named in each row; NOTHING where there is none."""
    out = np.full(len(chunk), NOTHING)
    for number, one in enumerate(chunk.slots):
        here = everyone[slot == number]
        if len(here) and step < len(one.k):
            out[here] = np.log10(np.maximum(one.k[step, here], 10.0**-300))
    return out


def _rest(chunk: Chunk, used: tuple[int, ...], metals: tuple[str, ...], totals: dict[str, FloatArray]) -> Chunk:
    slots = [
        replace(one, total=np.where(np.isin(one.acid, used), 0.0, one.total), k=one.k, size=one.size)
        for one in chunk.slots
    ]
    strong, square = chunk.strong.copy(), chunk.square.copy()
    for metal in metals:
        of_one = ions()[metal].charge
        strong -= of_one * totals[metal]
        square -= of_one**2 * totals[metal]
    charge = strong.copy()
    for one in slots:
        charge += one.total * one.charge
    return replace(chunk, charge=charge, strong=strong, square=square, slots=slots)


def metal_molalities(
    some: Sequence[Pair], amount: FloatArray, form: IntArray, row: IntArray, brings: FloatArray, n: int
) -> dict[str, FloatArray]:
    """Molality of every metal that the pairs name, in each of n rows [mol/kg]."""
    place = {name: i for i, name in enumerate(strong_ions())}
    metals = sorted({metal for pair in some for metal in pair.metals})
    return {metal: np.bincount(row, amount * brings[form, place[metal]], n).astype(float) for metal in metals}
