"""A stock lot that holds another substance than its label says: another acid, another salt form, another hydrate."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.alternatives import Alternative, alternatives
from reconcile.auditor.exact import points
from reconcile.auditor.plausible import plausible
from reconcile.auditor.proposals import Context, Proposal, Told
from reconcile.auditor.retrial import Supposed
from reconcile.records.arrays import FloatArray
from reconcile.records.substances import Form

ROOM = 2.5
"""Score of a lot's common shift from which other contents are computed."""

Meant = tuple[int, Alternative, float, float, Supposed]
"""Lot, content, mol of it for a mol of the label, log prior odds, and what is supposed for it."""


def known_acids(context: Context) -> frozenset[str]:
    """Acids of the forms that the record names."""
    return frozenset(acid for form in context.layout.records.forms for acid in form.acids)


def lots_with_room(context: Context) -> list[int]:
    """Lots (positions in lots_used) whose readings share a shift of any common shape."""
    layout = context.layout
    x = layout.lot_columns
    room: set[int] = set()
    for shape in context.kept("lot shapes", lambda: _shapes(x, layout.ph)):
        room.update(context.promising(shape, ROOM, steady=True).tolist())
    return sorted(room)


SHAPES = ("strength", "everywhere", "sign", "distance from pH 7")


def _shapes(x: sparse.csc_array, ph: FloatArray) -> list[sparse.csc_array]:
    """Common shapes of an error of each lot: as of its strength, equal everywhere, by sign, by distance from pH 7."""
    touched = sparse.csc_array((np.ones(len(x.data)), x.indices, x.indptr), shape=x.shape)
    sign = sparse.csc_array((np.sign(x.data), x.indices, x.indptr), shape=x.shape)
    return [x, touched, sign, sparse.csc_array(sparse.diags_array(ph - 7.0) @ touched)]


def contents(
    context: Context, lot: int, label: Form, acids: frozenset[str], odds: float
) -> list[tuple[Alternative, float]]:
    """What a lot may hold instead of its label, each with the mol of it for a mol of the label.

    A solid is weighed, so another content comes at equal mass. A stock solution of stated strength may be the wrong
    bottle, at equal mol, or was made by weighing another hydrate or salt form.
    """
    records = context.layout.records
    mine = list(context.retrial.contributions_of_lot(lot))
    direct = records.solutions.lot[mine] == lot
    solid = not np.isfinite(records.lots.strength[lot]) and bool(np.all(records.solutions.by_mass[mine] | ~direct))
    at_mass = [(a, label.molar_mass / a.form.molar_mass) for a in alternatives(label, True, acids, odds, records.own)]
    if solid:
        return at_mass
    at_mol = [(a, 1.0) for a in alternatives(label, False, acids, odds, records.own)]
    return at_mol + [(a, factor) for a, factor in at_mass if a.relation in ("hydrate", "form")]


class LotIdentity:
    name, alarm_class = "lot_identity", "lot"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        odds = float(np.exp(context.settings["audit.known_acid_log_odds"]))
        acids = known_acids(context)
        blocks = [self.of_lot(context, position, acids, odds) for position in lots_with_room(context)]
        meant = [m for told, _ in blocks for m in told]
        looked_at = len(SHAPES) * layout.lot_columns.shape[1] if context.model.long else 0
        if not meant and not looked_at:
            return None
        none = sparse.csc_array((len(layout), 0))
        x = sparse.csc_array(sparse.hstack([none, *(columns for _, columns in blocks)]))

        def tell(k: int, a: float) -> Told:
            _, choice, factor, *_ = meant[k]
            explains: dict[str, object] = {"substance": choice.form.name}
            if choice.relation == "hydrate":
                explains["factor"] = factor
            return Told(None, "", explains, also=choice.also, detail=choice.relation)

        subject = [str(layout.records.lots.name[lot]) for lot, *_ in meant]
        return Proposal(
            self.name,
            self.alarm_class,
            "lot",
            x,
            subject,
            subject,
            np.ones(len(meant)),
            np.array([m[3] for m in meant]),
            np.ones(len(meant), bool),
            tell,
            supposed=lambda k: meant[k][-1],
            same=[f"{m[1].form.name} {m[2]:.3g}" for m in meant],
            blocks=looked_at,
        )

    def of_lot(
        self, context: Context, position: int, acids: frozenset[str], odds: float
    ) -> tuple[list[Meant], sparse.csc_array]:
        """What one lot may hold, and the effect of each; worked out once a record (a long one: what is plausible)."""
        key = (self.name, position)
        if key not in context.retrial.kept or context.model.long:
            records = context.layout.records
            lot = int(context.layout.lots_used[position])
            label = records.forms[int(records.lots.form[lot])]
            contributions = context.retrial.contributions_of_lot(lot)
            choices = contents(context, lot, label, acids, odds)
            total = sum(choice.weight for choice, _ in choices)
            supposed = [Supposed(contributions, c.form.name, factor) for c, factor in choices]
            tried = plausible(context, supposed)
            kept, x = points(context, [supposed[i] for i in tried])
            kept = [tried[i] for i in kept]
            meant = [(lot, *choices[i], float(np.log(choices[i][0].weight / total)), supposed[i]) for i in kept]
            context.retrial.kept[key] = (meant, x)
        found: tuple[list[Meant], sparse.csc_array] = context.retrial.kept[key]
        return found


KIND = LotIdentity()
