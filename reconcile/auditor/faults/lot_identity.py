"""A stock lot that holds another substance than its label says: another acid, another salt form, another hydrate."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.alternatives import Alternative, alternatives
from reconcile.auditor.exact import points
from reconcile.auditor.proposals import Context, Proposal, Told
from reconcile.auditor.retrial import Supposed

ROOM = 2.5
"""Score of a lot's common shift from which other contents are computed."""

Meant = tuple[int, Alternative, float, float]
"""Lot, content, log prior odds, and the factor of a hydrate."""


def known_acids(context: Context) -> frozenset[str]:
    """Acids of the forms that the record names."""
    return frozenset(acid for form in context.layout.records.forms for acid in form.acids)


def lots_with_room(context: Context) -> list[int]:
    """Lots (positions in lots_used) whose readings share a shift of any common shape."""
    layout = context.layout
    x = sparse.csc_array(layout.lot_columns)
    touched = sparse.csc_array((np.ones(len(x.data)), x.indices, x.indptr), shape=x.shape)
    sign = sparse.csc_array((np.sign(x.data), x.indices, x.indptr), shape=x.shape)
    tilt = sparse.csc_array(sparse.diags_array(layout.ph - 7.0) @ touched)
    room = np.zeros(x.shape[1], bool)
    for shape in (x, touched, sign, tilt):
        room |= np.abs(context.screen(sparse.csc_array(shape))) > ROOM
    return [int(i) for i in np.flatnonzero(room)]


class LotIdentity:
    name, alarm_class = "lot_identity", "lot"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        odds = float(np.exp(context.settings["audit.known_acid_log_odds"]))
        acids = known_acids(context)
        blocks = [self.of_lot(context, position, acids, odds) for position in lots_with_room(context)]
        meant = [m for told, _ in blocks for m in told]
        if not meant:
            return None
        x = sparse.csc_array(sparse.hstack([columns for _, columns in blocks]))

        def tell(k: int, a: float) -> Told:
            _, choice, _, factor = meant[k]
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
            np.array([m[2] for m in meant]),
            np.ones(len(meant), bool),
            tell,
            same=[m[1].form.name for m in meant],
        )

    def of_lot(
        self, context: Context, position: int, acids: frozenset[str], odds: float
    ) -> tuple[list[Meant], sparse.csc_array]:
        """What one lot may hold, and the effect of each; worked out once a record."""
        key = (self.name, position)
        if key not in context.retrial.kept:
            records = context.layout.records
            lot = int(context.layout.lots_used[position])
            label = records.forms[int(records.lots.form[lot])]
            contributions = context.retrial.contributions_of_lot(lot)
            weighed = bool(np.all(records.solutions.by_mass[list(contributions)]))
            choices = alternatives(label, weighed, acids, odds)
            total = sum(c.weight for c in choices)
            kept, x = points(
                context, [Supposed(contributions, form=c.form.name, at_equal_mass=weighed) for c in choices]
            )
            meant = [
                (
                    lot,
                    choices[i],
                    float(np.log(choices[i].weight / total)),
                    label.molar_mass / choices[i].form.molar_mass if weighed else 1.0,
                )
                for i in kept
            ]
            context.retrial.kept[key] = (meant, x)
        found: tuple[list[Meant], sparse.csc_array] = context.retrial.kept[key]
        return found


KIND = LotIdentity()
