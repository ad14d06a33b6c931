"""Every species of one solved solution, with its molality and activity coefficient."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import SIZE_HYDROGEN, SIZE_HYDROXIDE, ActivityModel
from reconcile.chemistry.balance import activity, free_ions
from reconcile.chemistry.composition import Chunk, Contents, FormTable, Padding
from reconcile.chemistry.fractions import fractions
from reconcile.chemistry.ion_data import chloride_interactions, interaction, strong_ions, truesdell_jones_ions
from reconcile.chemistry.pair_solve import trial
from reconcile.chemistry.pair_table import Pair
from reconcile.chemistry.pairs import Layout
from reconcile.chemistry.temperature import Solvent
from reconcile.records.arrays import FloatArray
from reconcile.records.substances import ions


@dataclass(frozen=True)
class Species:
    """One species at the answer: charge, molality [mol/kg], lg of its activity coefficient."""

    name: str
    charge: int
    molality: float
    lg_gamma: float


@dataclass(frozen=True)
class Solved:
    """One solution with its answer: pH and ionic strength (1,), and where pairs take part their layout and y."""

    chunk: Chunk
    padding: Padding
    contents: Contents
    forms: FormTable
    water: Solvent
    ph: FloatArray
    strength: FloatArray
    layout: Layout | None
    pairs: tuple[Pair, ...]
    y: FloatArray


def state_name(acid: str, lost: int, charge: int) -> str:
    """A protonation state in words."""
    name = f"{acid} less {lost} H" if lost else acid
    return f"{name} ({charge:+d})".replace("-", "−") if charge else name


class Coefficients:
    """lg of activity coefficients in one solution."""

    def __init__(self, solved: Solved, acids: AcidTable, model: ActivityModel) -> None:
        self._model, self._acids = model, acids
        self._a, self._b, self._strength = solved.chunk.a, solved.chunk.b, solved.strength
        brings = solved.forms.brings[solved.contents.form]
        self._molality = solved.contents.amount @ brings if model.pairwise else np.zeros(len(strong_ions()))
        self.scale = float(self._molality @ chloride_interactions())

    def _d(self, size: float, linear: float = 0.0) -> float:
        return float(self._model.exponent(self._a, self._b, self._strength, np.array(size), linear)[0][0])

    def hydrogen(self) -> float:
        """Of H+, on the scale on which chloride has the coefficient of the convention."""
        return -self._d(SIZE_HYDROGEN) + float(self._molality @ self._acids.interactions[-2]) + self.scale

    def hydroxide(self) -> float:
        return -self._d(SIZE_HYDROXIDE) + float(self._molality @ self._acids.interactions[-1]) - self.scale

    def state(self, acid: int, lost: int) -> float:
        """Of a protonation state; a charge of z moves it by z times the scale."""
        index = int(self._acids.first[acid]) + acid + lost
        charge = int(self._acids.charge[acid]) - lost
        size, linear = float(self._acids.size[index]), 0.0
        if self._model.linear:
            sizes, over_square = self._acids.sizes_and_linear
            size, linear = float(sizes[index]), float(over_square[index])
        own = float(self._molality @ self._acids.interactions[index]) + charge * self.scale
        return -(charge**2) * self._d(size, linear) + own

    def strong(self, ion: str) -> float:
        charge = ions()[ion].charge
        size, linear = {1: 3.5, 2: 6.0}.get(abs(charge), 6.0), 0.0
        if self._model.linear and ion in truesdell_jones_ions():
            size, linear = truesdell_jones_ions()[ion][0], truesdell_jones_ions()[ion][1] / charge**2
        own = sum(m * interaction(ion, charge, other) for m, other in zip(self._molality, strong_ions(), strict=True))
        return -(charge**2) * self._d(size, linear) + float(own) + charge * self.scale

    def other(self, charge: int, size: float) -> float:
        """Of an ion pair, to which no coefficient of its own is known."""
        return -(charge**2) * self._d(size) + charge * self.scale


def all_species(solved: Solved, acids: AcidTable, model: ActivityModel) -> list[Species]:
    """Hydrogen and hydroxide ions, every state of every acid, strong ions, pairs; the most abundant first."""
    lg = Coefficients(solved, acids, model)
    rest = solved.chunk if solved.layout is None else solved.layout.rest
    act = activity(rest, model, solved.strength)
    h, oh, raised = free_ions(rest, act, solved.ph)
    out = [
        Species("H+", 1, float(h[0]), lg.hydrogen()),
        Species("OH-", -1, float(oh[0]), lg.hydroxide()),
    ]
    for slot, x in zip(rest.slots, fractions(rest, act, solved.ph, raised), strict=True):
        acid = int(slot.acid[0])
        if acid >= len(acids.names) or not slot.total[0] > 0.0:
            continue
        for lost, share in enumerate(x.f[: int(acids.steps[acid]) + 1]):
            charge = int(acids.charge[acid]) - lost
            name = state_name(acids.names[acid], lost, charge)
            out.append(Species(name, charge, float(slot.total[0] * share[0]), lg.state(acid, lost)))
    free: dict[str, float] = {}
    if solved.layout is not None:
        lay = solved.layout
        molality = trial(lay, model, solved.ph, solved.strength, solved.y).molality[:, 0]
        index = 0
        for acid in lay.acids:
            for lost in range(int(acids.steps[acid]) + 1):
                charge = int(acids.charge[acid]) - lost
                name = state_name(acids.names[acid], lost, charge)
                out.append(Species(name, charge, float(molality[index]), lg.state(acid, lost)))
                index += 1
        for metal in lay.metals:
            free[metal] = float(molality[index])
            index += 1
        for pair in solved.pairs:
            charge = int(lay.z[index])
            out.append(Species(pair.name, charge, float(molality[index]), lg.other(charge, float(lay.size[index, 0]))))
            index += 1
    amounts = solved.contents.amount @ solved.forms.brings[solved.contents.form]
    for ion, amount in zip(strong_ions(), amounts, strict=True):
        if amount > 0.0:
            out.append(Species(ion, ions()[ion].charge, free.get(ion, float(amount)), lg.strong(ion)))
    return sorted(out, key=lambda s: (-s.molality, s.name))


def acting(species: Sequence[Species], acid: str, step: int, pka: float, charge: int) -> float:
    """A constant as it acts: activity of the hydrogen ion, molalities of the acid's states (the mixed constant)."""
    lg = {s.name: s.lg_gamma for s in species}
    before, after = state_name(acid, step - 1, charge - step + 1), state_name(acid, step, charge - step)
    return pka + lg[after] - lg[before] if before in lg and after in lg else float("nan")
