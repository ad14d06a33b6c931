"""One batch whose recipe was misread: unit, normality, hydrate, form, % w/w for % w/v, or a decimal point."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.alternatives import alternatives
from reconcile.auditor.exact import points
from reconcile.auditor.faults.batch_preparation import batches_with_room, component_name, components
from reconcile.auditor.faults.lot_identity import known_acids
from reconcile.auditor.proposals import Context, Proposal, Told
from reconcile.auditor.retrial import Supposed

FACTORS = ((10.0, "decimal point"), (0.1, "decimal point"), (1000.0, "unit"), (0.001, "unit"))

OTHER_FORM = -1.5
"""Log prior odds of another salt or acid form to a slip in the amount: it takes another bottle, not another number."""


def misreadings(context: Context, contribution: int) -> list[tuple[Supposed, str]]:
    """Every slip of one component with an exact effect: factors, normality, density, hydrates and other forms."""
    records = context.layout.records
    solutions = records.solutions
    label = records.forms[int(solutions.form[contribution])]
    only = (contribution,)
    slips = [(Supposed(only, factor=f), how) for f, how in FACTORS]
    if label.equivalents > 1:
        slips += [(Supposed(only, factor=f), "normality") for f in (label.equivalents, 1.0 / label.equivalents)]
    lot = int(solutions.lot[contribution])
    density = np.nan
    if lot >= 0 and records.lots.row[lot] >= 0:
        stock = np.flatnonzero(records.stocks.row == records.lots.row[lot])
        density = float(records.stocks["density"][stock[0]]) if len(stock) else np.nan
    if np.isfinite(density) and abs(density - 1.0) > 0.02:
        slips += [(Supposed(only, factor=f), "% w/w for % w/v") for f in (density, 1.0 / density)]
    for choice in alternatives(label, True, known_acids(context), 1.0, records.own):
        if choice.relation in ("hydrate", "form"):
            factor = label.molar_mass / choice.form.molar_mass
            slips.append((Supposed(only, form=choice.form.name, factor=factor), choice.relation))
    return slips


class RecipeSlip:
    name, alarm_class = "recipe_slip", "batch"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        room = batches_with_room(context)
        blocks = [
            (batch, contribution, *self.of_component(context, contribution))
            for batch, contribution, _, _ in components(context, room)
        ]
        meant = [(batch, contribution, *slip) for batch, contribution, slips, _ in blocks for slip in slips]
        if not meant:
            return None
        x = sparse.csc_array(sparse.hstack([columns for *_, columns in blocks]))
        count = np.bincount([m[0] for m in meant], minlength=len(layout.batches))

        def tell(k: int, a: float) -> Told:
            _, contribution, supposed, how = meant[k]
            name = component_name(context, contribution)
            explains: dict[str, object] = {"component": name, "slip": how}
            if supposed.form:
                explains["substance"] = supposed.form
            else:
                explains["factor"] = supposed.factor
            return Told(supposed.factor if not supposed.form else None, "factor", explains, detail=f"{name}: {how}")

        batch = np.array([m[0] for m in meant])
        subject = [layout.batches[b] for b in batch]
        return Proposal(
            self.name,
            self.alarm_class,
            "batch",
            x,
            subject,
            subject,
            np.ones(len(meant)),
            -np.log(count[batch]) - np.log(2.0) + np.where([m[3] == "form" for m in meant], OTHER_FORM, 0.0),
            np.ones(len(meant), bool),
            tell,
            supposed=lambda k: meant[k][2],
            same=[f"{component_name(context, m[1])} {m[3]} {m[2].form}" for m in meant],
        )

    def of_component(self, context: Context, contribution: int) -> tuple[list[tuple[Supposed, str]], sparse.csc_array]:
        """Slips of one component that can be solved, and their effects; worked out once a record."""
        key = (self.name, contribution)
        if key not in context.retrial.kept:
            slips = misreadings(context, contribution)
            kept, x = points(context, [supposed for supposed, _ in slips])
            context.retrial.kept[key] = ([slips[i] for i in kept], x)
        found: tuple[list[tuple[Supposed, str]], sparse.csc_array] = context.retrial.kept[key]
        return found


KIND = RecipeSlip()
