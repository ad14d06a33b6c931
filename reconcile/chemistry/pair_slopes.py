"""Slopes of pH where pairs take part: one adjoint solution of the equations gives every one of them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from reconcile.chemistry.acids import AcidTable
from reconcile.chemistry.activity import ActivityModel
from reconcile.chemistry.balance import Balance
from reconcile.chemistry.ion_data import chloride_interactions, strong_ions
from reconcile.chemistry.pair_solve import eliminate, trial
from reconcile.chemistry.pair_table import Pair
from reconcile.chemistry.pairs import Layout
from reconcile.chemistry.temperature import LN10, Solvent
from reconcile.chemistry.water import ZERO_CELSIUS, co2_solubility
from reconcile.records.arrays import FloatArray
from reconcile.records.substances import ions


@dataclass(frozen=True)
class Paired:
    """Slopes of the pH of n solutions with pairs.

    on_charge, on_squares : FloatArray (n,)   per mol/kg of charge, and of molality times charge squared, of ions that
                                              are no components
    on_total : FloatArray (c, n)              per mol/kg of a component; 0 where its molality is held or 0
    on_held : FloatArray (c, n)               per unit of lg molality of a component that the air holds
    species : FloatArray (s, n)               per unit of c, the constant of a species
    molality : FloatArray (s, n)
    """

    layout: Layout
    pairs: tuple[Pair, ...]
    acids: AcidTable
    on_charge: FloatArray
    on_squares: FloatArray
    on_total: FloatArray
    on_held: FloatArray
    species: FloatArray
    molality: FloatArray

    def by_d(self, d: FloatArray) -> FloatArray:
        """dpH where D of every species changes by d, (s, n) or (1, n)."""
        return np.asarray((self.species * self.layout.shifts(d)).sum(axis=0))

    def activity_slopes(
        self, model: ActivityModel, water: Solvent, strength: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Part of dpH/dT through A and B, and of dpH/dc, that the species of components have (n,)."""
        rest = self.layout.rest
        size = self.layout.size if model.sized else np.full((1, len(strength)), 4.5)
        _, _, d_a, d_b, d_c = model.exponent(rest.a, rest.b, strength, size)
        return self.by_d(d_a * water.d_a + d_b * water.d_b), self.by_d(d_c)

    def on_pkw(self) -> FloatArray:
        """Part of dpH/dpKw through pairs with hydroxide (n,)."""
        out = np.zeros(self.species.shape[1])
        for index, pair in self._own():
            out -= pair.hydroxide * self.species[index]
        return out

    def _own(self) -> list[tuple[int, Pair]]:
        first = int(np.count_nonzero(self.layout.pair < 0))
        return list(enumerate(self.pairs, start=first))

    def _losing(self, acid: int, step: int) -> FloatArray:
        """How often each species has lost the proton of one step of one acid (s,)."""
        name, out, index = self.acids.names[acid], np.zeros(len(self.layout.q)), 0
        for one in self.layout.acids:
            for lost in range(int(self.acids.steps[one]) + 1):
                out[index] = one == acid and lost >= step
                index += 1
        for place, pair in self._own():
            out[place] = sum(n for (who, lost), n in pair.states.items() if who == name and lost >= step)
        return out

    def fill_constants(self, value: FloatArray, warming: FloatArray, first_cell: Sequence[int]) -> FloatArray:
        """Put dpH/dpKa of the acids that are components into their cells; their part of dpH/dT (n,).

        value, warming : (n, cells) dpH/dpKa and dpKa/dT; first_cell : first cell of every slot of the chunk
        """
        d_temperature = np.zeros(len(value))
        for a, acid in enumerate(self.layout.acids):
            for step in range(1, int(self.acids.steps[acid]) + 1):
                slope = -(self._losing(acid, step) @ self.species)
                for number, cell in enumerate(first_cell):
                    here = np.flatnonzero(self.layout.slot[a] == number)
                    if len(here):
                        value[here, cell + step - 1] = slope[here]
                        d_temperature[here] += slope[here] * warming[here, cell + step - 1]
        return d_temperature

    def temperature(self, water: Solvent) -> FloatArray:
        """Part of dpH/dT through the pairs' own constants, and through the air's hold on a component (n,)."""
        out = np.zeros(self.species.shape[1])
        for index, pair in self._own():
            out += self.species[index] * pair.value(water.temperature_c + ZERO_CELSIUS)[1]
        if self.layout.held.any():
            solubility, slope = co2_solubility(water.temperature_c)
            out += self.on_held.sum(axis=0) * slope / solubility / LN10
        return out

    def u_squared(self, kelvin: FloatArray) -> FloatArray:
        """Square of the share of the pairs' constants, independent of one another [pH^2] (n,)."""
        out = np.zeros(self.species.shape[1])
        for index, pair in self._own():
            out += (self.species[index] * pair.u_at(kelvin)) ** 2
        return out

    def on_metals(self) -> FloatArray:
        """What one mol/kg of each strong ion does beyond its charge, where it is a component (n, i)."""
        out = np.zeros((self.species.shape[1], len(strong_ions())))
        for place, metal in enumerate(self.layout.metals, start=len(self.layout.acids)):
            charge = ions()[metal].charge
            inert = self.on_charge * charge + self.on_squares * charge**2
            here = self.layout.total[place] > 0.0
            out[:, strong_ions().index(metal)] = np.where(here, self.on_total[place] - inert, 0.0)
        return out

    def on_interactions(self) -> FloatArray:
        """dpH per mol/kg of every strong ion through its interactions with the species of components (n, i)."""
        scale, coefficient = chloride_interactions(), self.acids.interactions
        changes = np.zeros((len(self.layout.q), len(scale)))
        where: dict[tuple[str, int], int] = {}
        index = 0
        for acid in self.layout.acids:
            state = int(self.acids.first[acid]) + acid
            for lost in range(int(self.acids.steps[acid]) + 1):
                changes[index] = lost * scale - (coefficient[state + lost] - coefficient[state])
                where[self.acids.names[acid], lost] = index
                index += 1
        for place, pair in self._own():
            changes[place] = pair.hydroxide * (scale - coefficient[-1])
            for part, number in pair.states.items():
                changes[place] += number * changes[where[part]]
        return np.asarray(self.species.T @ changes)

    def fill_degree(self, degree: FloatArray) -> None:
        """Put the protons lost, free and bound, by the acids that are components into their slots (n, slots)."""
        for a, acid in enumerate(self.layout.acids):
            steps = int(self.acids.steps[acid])
            lost = sum(self._losing(acid, step) for step in range(1, steps + 1)) @ self.molality
            whole = self.layout.nu[:, a] @ self.molality
            for number in range(degree.shape[1]):
                here = self.layout.slot[a] == number
                degree[here, number] = lost[here] / whole[here] / steps


@dataclass(frozen=True)
class Solution:
    """n solved solutions with pairs: their layout, the pairs that may take part, and y of every component (c, n)."""

    layout: Layout
    pairs: tuple[Pair, ...]
    acids: AcidTable
    y: FloatArray


def adjoint(solution: Solution, model: ActivityModel, ph: FloatArray, strength: FloatArray, rest: Balance) -> Paired:
    """Slopes by implicit differentiation: with F = 0 and J = dF/du, dpH/dp = -(J^-T e_pH) . F_p.

    rest : slopes of the part that takes no part in pairs

    References
    ----------
    JCGM 100:2008, section 5.1; implicit function theorem.
    """
    lay = solution.layout
    now = trial(lay, model, ph, strength, solution.y, rest=rest)
    unit = np.zeros_like(now.residual)
    unit[0] = 1.0
    weight = eliminate(np.swapaxes(now.jacobian, 0, 1), unit)
    free = ~(lay.held | (lay.total <= 0.0))
    on_total = np.where(free, weight[2:], 0.0)
    of_species = lay.z[:, None] * weight[0] - 0.5 * lay.z[:, None] ** 2 * weight[1] + lay.nu @ on_total
    return Paired(
        lay,
        solution.pairs,
        solution.acids,
        -weight[0],
        0.5 * weight[1],
        on_total,
        np.where(lay.held, weight[2:], 0.0),
        -LN10 * now.molality * of_species,
        now.molality,
    )
