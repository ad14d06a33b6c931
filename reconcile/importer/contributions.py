"""Solutions and lots as the arrays of BatchRecords."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from reconcile.importer.line_parts import stated_words
from reconcile.importer.open_amounts import open_amounts
from reconcile.importer.resolve import LotList
from reconcile.importer.solutions import Assigner
from reconcile.records.adjusting import OpenAmounts
from reconcile.records.arrays import AnyArray, FloatArray, IntArray, TextArray
from reconcile.records.book import Lots, Solutions
from reconcile.records.places import Place
from reconcile.records.settings import Settings
from reconcile.records.substances import Form


def solutions_of(assigner: Assigner) -> tuple[Solutions, tuple[Form, ...], IntArray, OpenAmounts]:
    """The arrays of every solution, sorted by solution; the forms; the lots that are used; the amounts left open."""
    made, plain, composer = assigner.made, assigner.plain, assigner.composer
    group = np.array(made.plain_group, np.intp)
    bulk = np.flatnonzero(group >= 0)
    lines, owner = _lines_of(plain.order, plain.first[group[bulk]], plain.count[group[bulk]], bulk)
    kept = plain.kept[lines]
    lines, owner = lines[kept], owner[kept]
    forms: dict[Form, int] = {}
    used_bases = np.unique(plain.basis[lines])
    form_of = np.full(len(plain.bases) + 1, -1, np.intp)
    lot_of, mass_of = np.full(len(plain.bases) + 1, -1, np.intp), np.zeros(len(plain.bases) + 1, bool)
    for b in used_bases.tolist():
        basis = plain.bases[b]
        if basis.form is not None:
            form_of[b] = forms.setdefault(basis.form, len(forms))
        lot_of[b], mass_of[b] = basis.taken.lot, basis.by_mass
    odd = [(s, p, a, u) for s, mixture in made.mixtures.items() for p, a, u in mixture.parts]
    basis_index = plain.basis[lines]
    solution = np.concatenate([owner, np.array([s for s, *_ in odd], np.intp)])
    line = np.concatenate([lines, np.array([p.line for _, p, *_ in odd], np.intp)])
    odd_forms = np.array([forms.setdefault(p.form, len(forms)) for _, p, *_ in odd], np.intp)
    form = np.concatenate([form_of[basis_index], odd_forms])
    lot = np.concatenate([lot_of[basis_index], np.array([p.lot for _, p, *_ in odd], np.intp)])
    by_mass = np.concatenate([mass_of[basis_index], np.array([p.by_mass for _, p, *_ in odd], bool)])
    amount = np.concatenate([plain.amount[lines], np.array([a for _, _, a, _ in odd], np.float64)])
    u = np.concatenate([plain.u[lines], np.array([x for *_, x in odd], np.float64)])
    owner_of = np.concatenate([np.full(len(lines), -1, np.intp), np.array([p.open for _, p, *_ in odd], np.intp)])
    own = np.flatnonzero(lot[: len(lines)] >= 0)
    deep = [(len(lines) + k, chained) for k, (_, p, *_) in enumerate(odd) for chained in p.chain]
    pairs = np.concatenate([np.column_stack([own, lot[own]]), np.array(deep, np.intp).reshape(-1, 2)])
    order = np.argsort(solution, kind="stable")
    rank = np.empty_like(order)
    rank[order] = np.arange(len(order))
    pairs = np.column_stack([rank[pairs[:, 0]], pairs[:, 1]])
    pairs = pairs[np.argsort(pairs[:, 0], kind="stable")]
    used = np.unique(pairs[:, 1])
    new = np.full(len(composer.resolver.lots.forms) + 1, -1, np.intp)  # the last entry keeps -1 at -1
    new[used] = np.arange(len(used))
    line, owner_of, amount = line[order], owner_of[order], amount[order]
    scaled = np.flatnonzero(owner_of >= 0)
    left_open = open_amounts(composer, scaled, owner_of[scaled], amount[scaled], forms)
    amount[scaled] = np.nan
    known = np.full((len(made.batch), 3), np.nan)
    for s, value in made.known.items():
        known[s] = value
    per_kg = plain.per_kg_water[group] & (group >= 0) if len(plain.per_kg_water) else np.zeros(len(group), bool)
    declared = np.append(plain.without_effect, False)[group]
    for s, mixture in made.mixtures.items():
        per_kg[s], declared[s] = mixture.per_kg_water, mixture.without_effect
    L = composer.lines
    result = Solutions(
        batch=texts(made.batch),
        stage=texts(made.stage),
        per_kg_water=per_kg,
        known_ph=known[:, 0],
        known_u=known[:, 1],
        solution=solution[order],
        form=form[order],
        lot=new[lot[order]],
        amount=amount,
        u_amount=u[order],
        by_mass=by_mass[order],
        recipe_row=L.table_row[line],
        place=_places(assigner, line),
        stated=_stated(np.where(L.special[line] == "", L.value[line], np.nan), L.unit[line], L.lot[line]),
        chain_contribution=pairs[:, 0],
        chain_lot=new[pairs[:, 1]],
        without_effect=declared,
        known_u_temperature=np.nan_to_num(known[:, 2]),
    )
    return result, tuple(forms), used, left_open


def _lines_of(order: IntArray, first: IntArray, count: IntArray, owners: IntArray) -> tuple[IntArray, IntArray]:
    """Lines of several groups one after another, and the owner of each."""
    n = int(count.sum())
    start = np.repeat(first - np.concatenate([[0], np.cumsum(count)[:-1]]).astype(np.intp), count) if n else first[:0]
    return order[start + np.arange(n)], np.repeat(owners, count)


def _places(assigner: Assigner, line: IntArray) -> tuple[Place, ...]:
    L, files = assigner.composer.lines, assigner.composer.reader.files
    rows = zip(L.source[line].tolist(), L.row[line].tolist(), L.column[line].tolist(), strict=True)
    return tuple(Place(files[source][0], files[source][1], row, column) for source, row, column in rows)


def _stated(values: FloatArray, units: TextArray, lots: TextArray) -> TextArray:
    words: dict[tuple[float, str, str], str] = {}
    out = []
    for key in zip(values.tolist(), units.tolist(), lots.tolist(), strict=True):
        if key not in words:
            words[key] = stated_words(*key)
        out.append(words[key])
    return texts(out)


def texts(values: Sequence[str]) -> TextArray:
    """A TextArray of strings."""
    out: AnyArray = np.empty(len(values), object)
    out[:] = values
    return out


def lots_of(
    lots: LotList, used: IntArray, forms: tuple[Form, ...], settings: Settings
) -> tuple[Lots, tuple[Form, ...]]:
    """The used lots as arrays; forms that only a lot's label names are added to the forms."""
    names = lots.names()
    kept = used.tolist()
    index = {f: i for i, f in enumerate(forms)}
    for k in kept:
        index.setdefault(lots.forms[k], len(index))
    default = float(settings["uncertainty.lot_strength_percent"])
    u: FloatArray = np.full(len(kept), default / np.sqrt(3.0) / 100.0)
    strength = np.full(len(kept), np.nan)
    unit = np.full(len(kept), "", object)
    row = np.full(len(kept), -1, np.intp)
    for i, k in enumerate(kept):
        stock = lots.stocks[k]
        if stock is None:
            continue
        row[i] = stock.row
        if not np.isnan(stock.tolerance):
            u[i] = stock.tolerance / np.sqrt(3.0) / 100.0
        if stock.is_solution and stock.unit is not None:
            strength[i], unit[i] = stock.strength, stock.unit.name
    form = np.array([index[lots.forms[k]] for k in kept], np.intp)
    return Lots(texts([names[k] for k in kept]), form, u, strength, unit, row), tuple(index)
