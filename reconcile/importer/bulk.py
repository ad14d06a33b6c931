"""Ordinary recipes composed all together in arrays; the result is that of Composer.mixture, solution by solution."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.importer.compose import Composer
from reconcile.importer.line_parts import HOWS, Basis
from reconcile.records.arrays import AnyArray, BoolArray, FloatArray, IntArray

_TAKEN, _MOLAR, _MOLAL, _W = range(len(HOWS))


@dataclass(frozen=True)
class Plain:
    """What the array reckoning settles.

    Groups (g,): plain, True where every line is ordinary; per_kg_water; without_effect, holds a declared substance.
    Lines (n,): kept, brings something; basis, index into `bases`; amount, u : final, as in Solutions. Only lines of
    plain groups have a meaning.
    """

    plain: BoolArray
    per_kg_water: BoolArray
    without_effect: BoolArray
    bases: list[Basis]
    basis: IntArray
    kept: BoolArray
    amount: FloatArray
    u: FloatArray
    first: IntArray
    count: IntArray
    order: IntArray

    def lines_of(self, group: int) -> IntArray:
        """Lines of one group that bring something, in file order."""
        lines = self.order[self.first[group] : self.first[group] + self.count[group]]
        return lines[self.kept[lines]]


def compose_plain(composer: Composer, groups: int) -> Plain:
    """Compose every group whose lines each have one form, a number and a unit, and one final volume or mass at most."""
    L, reader = composer.lines, composer.reader
    index: dict[tuple[str, str, str], int] = {}
    keys = zip(L.substance.tolist(), L.lot.tolist(), L.unit.tolist(), strict=True)
    basis = np.array([index.setdefault(k, len(index)) for k in keys], np.intp)
    bases = [reader.basis(*k) for k in index]
    plain_basis = np.array([b.plain for b in bases], bool)
    nothing = np.array([b.nothing for b in bases], bool)
    how = np.array([HOWS.index(b.how) if b.plain else -1 for b in bases], np.intp)

    def spread(values: list[float]) -> FloatArray:
        return np.array(values, np.float64)[basis] if len(basis) else np.zeros(0)

    k, solute, u = (spread([getattr(b, name) for b in bases]) for name in ("k", "solute", "u"))
    molar_mass = spread([b.form.molar_mass if b.form is not None else np.nan for b in bases])
    how = how[basis] if len(basis) else how
    usual = np.equal(L.special, "") & np.fromiter((p is None for p in L.problem), bool, len(L))
    brings = plain_basis[basis] & usual & ~np.isnan(L.value) if len(basis) else np.zeros(0, bool)
    empty = nothing[basis] & usual if len(basis) else np.zeros(0, bool)
    declared = np.array([b.taken.without_effect for b in bases], bool)[basis] if len(basis) else np.zeros(0, bool)
    kept = brings & (L.value != 0.0)
    group = L.group
    added = np.fromiter((m.startswith("added") for m in L.total_measure), bool, len(L))
    odd = _any_in(group, ~(brings | empty) | added, groups)
    total, measure, unclear = _totals(L.total, L.total_measure, group, groups)
    taken, litre, water = (kept & (how == h) for h in (_TAKEN, _MOLAR, _MOLAL))
    has_taken, has_molar = _any_in(group, taken, groups), _any_in(group, litre, groups)
    has_mass_based = _any_in(group, water | (kept & (how == _W)), groups)
    per_litre = has_molar | (has_taken & (measure == 1))
    per_kg = has_mass_based | (has_taken & (measure == 2))
    plain = ~odd & ~unclear & ~(has_taken & (measure == 0)) & ~(per_litre & per_kg)
    amount = np.where(kept, L.value * k, 0.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        whole = np.append(total, np.nan)[group]  # lines without a group, -1, take the last entry
        share = np.where(taken, amount / whole * 1000.0, amount)
        by_water = np.append(per_kg, False)[group]
        s = _sum_in(group, np.where(kept & ~water, share * solute, 0.0), groups) / 1000.0
        m = _sum_in(group, np.where(water, share * solute, 0.0), groups) / 1000.0
        left = (1.0 - s) / (1.0 + m)
        moles = np.where(how == _W, share / molar_mass, share)
        final = np.where(by_water & ~water, moles / np.append(left, np.nan)[group], moles)
    plain &= ~(per_kg & ~(left > 0.0))
    u_total = np.where(by_water, reader.u_weighing, reader.u_volume)
    order = np.argsort(group, kind="stable")
    count = np.bincount(group[group >= 0], minlength=groups)
    first = np.concatenate([[0], np.cumsum(count)[:-1]]) + int((group < 0).sum()) if groups else np.zeros(0)
    return Plain(
        plain=plain,
        per_kg_water=per_kg,
        without_effect=_any_in(group, declared, groups),
        bases=bases,
        basis=basis,
        kept=kept,
        amount=final,
        u=np.where(taken, np.hypot(u, u_total), u),
        first=first.astype(np.intp),
        count=count.astype(np.intp),
        order=order.astype(np.intp),
    )


def _any_in(group: IntArray, mask: AnyArray, groups: int) -> BoolArray:
    """BoolArray (groups,): whether any line of a group is marked; lines without a group count for none."""
    inside = mask & (group >= 0)
    return np.bincount(group[inside], minlength=groups) > 0


def _sum_in(group: IntArray, values: FloatArray, groups: int) -> FloatArray:
    inside = group >= 0
    return np.bincount(group[inside], values[inside], minlength=groups).astype(np.float64)


def _totals(
    total: FloatArray, measure: AnyArray, group: IntArray, groups: int
) -> tuple[FloatArray, IntArray, BoolArray]:
    """What each group is made up to, in mL (measure 1) or g (2), 0 where unstated; unclear where its lines differ."""
    kind = np.where(np.equal(measure, "volume"), 1, np.where(np.equal(measure, "mass"), 2, 0))
    said = (kind > 0) & (group >= 0)
    low, high = np.full(groups, np.inf), np.full(groups, -np.inf)
    np.minimum.at(low, group[said], total[said])
    np.maximum.at(high, group[said], total[said])
    kinds = np.zeros(groups, np.intp)
    np.bitwise_or.at(kinds, group[said], kind[said])
    with np.errstate(invalid="ignore"):
        unclear = (kinds == 3) | ((kinds > 0) & ((high - low > 1e-9 * high) | ~(low > 0.0)))
    return np.where(kinds > 0, high, np.nan), kinds, unclear
