"""Carbon dioxide that the recipe does not hold: taken up or lost by one batch, or brought by a base that took it up."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.exact import Column
from reconcile.auditor.faults.batch_preparation import batches_with_room
from reconcile.auditor.faults.lot_identity import lots_with_room
from reconcile.auditor.proposals import Context, Proposal, Told, stack
from reconcile.auditor.retrial import Supposed

TAKEN_UP = (1e-5, 3e-5, 1e-4, 3e-4, 1e-3, 3e-3)
"""Carbon dioxide taken up by a batch [mol/kg], each a shape of effect; the amount itself is free around it."""
LOST = (0.1, 0.3)
"""Shares of a batch's carbonate lost to the air."""
CARBONATED = (0.01, 0.03, 0.1)
"""Carbon dioxide taken up by a base, mol per mol of base."""
LIKELY = 2.0
"""Log prior odds: dilute alkali reads low for this reason before any other (common practice, no source)."""
ALKALINE = 6.5
"""pH under which a solution takes up too little carbon dioxide to show (first pKa of carbonic acid 6.35)."""


class CarbonDioxide:
    name, alarm_class = "carbon_dioxide", "batch"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns: list[Column] = []
        subject: list[str] = []
        amount: list[float] = []
        for batch in sorted(batches_with_room(context)):
            rows = np.flatnonzero(layout.batch == batch)
            for solution in sorted(set(layout.solution[rows].tolist())):
                for change, column in self.of_solution(context, solution):
                    columns.append(column)
                    subject.append(layout.batches[batch])
                    amount.append(change)
        if not subject:
            return None

        def tell(k: int, a: float) -> Told:
            change = a * amount[k]
            how = "carbon dioxide taken up" if change > 0 else "carbon dioxide lost"
            return Told(
                change,
                "mol/kg",
                {"carbon_dioxide": change},
                detail=f"{how}, {abs(change):.2g} mol/kg",
                scale=lambda v: v * amount[k],
            )

        k = len(subject)
        return Proposal(
            self.name,
            self.alarm_class,
            "batch",
            stack(columns, len(layout)),
            subject,
            subject,
            np.full(k, 0.5),
            np.full(k, LIKELY - np.log(len(TAKEN_UP))),
            np.zeros(k, bool),
            tell,
        )

    def of_solution(self, context: Context, solution: int) -> list[tuple[float, Column]]:
        """Changes of dissolved carbon dioxide [mol/kg] that move one solution, with their effects; kept."""
        key = (self.name, solution)
        if key not in context.retrial.kept:
            layout = context.layout
            inside = tuple(context.retrial.contributions_of_solution(solution))
            alkaline = bool((layout.ph[layout.solution == solution] > ALKALINE).any())
            changes = list(TAKEN_UP) if alkaline and inside else []
            carbonate = self.carbonate(context, inside)
            changes += [-share * carbonate for share in LOST if carbonate > 0]
            shifts = context.retrial.shifts([Supposed(inside, co2=c) for c in changes])
            context.retrial.kept[key] = [
                (change, (rows, shift))
                for change, (rows, shift) in zip(changes, shifts, strict=True)
                if len(rows) and np.isfinite(shift).all() and np.abs(shift).max() > 1e-3
            ]
        found: list[tuple[float, Column]] = context.retrial.kept[key]
        return found

    @staticmethod
    def carbonate(context: Context, contributions: tuple[int, ...]) -> float:
        """Carbonate that the recipe itself brings [mol/L or mol/kg as the solution is stated]."""
        records = context.layout.records
        forms = records.solutions.form[list(contributions)]
        amounts = records.solutions.amount[list(contributions)]
        units = [records.forms[int(form)].acids.get("carbonic acid", 0.0) for form in forms]
        return float(np.dot(units, amounts))


class CarbonatedBase:
    """The same acid brought in by a lot of strong base, in proportion to the base taken."""

    name, alarm_class = "carbon_dioxide", "lot"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        columns: list[Column] = []
        subject: list[str] = []
        share: list[float] = []
        for position in lots_with_room(context):
            lot = int(layout.lots_used[position])
            form = layout.records.forms[int(layout.records.lots.form[lot])]
            if "OH-" not in form.ions:
                continue
            for part in CARBONATED:
                column = self.of_lot(context, lot, part)
                if column is not None:
                    columns.append(column)
                    subject.append(str(layout.records.lots.name[lot]))
                    share.append(part)
        if not subject:
            return None

        def tell(k: int, a: float) -> Told:
            part = a * share[k]
            return Told(
                part,
                "mol/mol",
                {"carbon_dioxide_per_base": part},
                detail=f"a carbonated base, {part:.2g} mol of carbon dioxide for each mol of base",
                scale=lambda v: v * share[k],
            )

        k = len(subject)
        return Proposal(
            self.name,
            self.alarm_class,
            "lot",
            stack(columns, len(layout)),
            subject,
            subject,
            np.full(k, 0.5),
            np.full(k, -1.0 - np.log(len(CARBONATED))),
            np.zeros(k, bool),
            tell,
        )

    def of_lot(self, context: Context, lot: int, part: float) -> Column | None:
        """Effect of a base of which `part` was taken up as carbon dioxide, over all its solutions; kept."""
        key = ("carbonated base", lot, part)
        if key not in context.retrial.kept:
            solutions = context.layout.records.solutions
            mine = context.retrial.contributions_of_lot(lot)
            supposed = [Supposed((c,), co2=part * float(solutions.amount[c])) for c in mine]
            found = [(rows, shift) for rows, shift in context.retrial.shifts(supposed) if len(rows)]
            whole: Column | None = None
            if found:
                rows = np.concatenate([rows for rows, _ in found])
                shift = np.concatenate([shift for _, shift in found])
                total = sparse.coo_array((shift, (rows, np.zeros_like(rows))), shape=(len(context.layout), 1)).tocsc()
                if np.isfinite(total.data).all() and np.abs(total.data).max() > 1e-3:
                    whole = (total.indices.astype(np.intp), total.data)
            context.retrial.kept[key] = whole
        result: Column | None = context.retrial.kept[key]
        return result


KIND = CarbonDioxide()
KIND_OF_LOTS = CarbonatedBase()
