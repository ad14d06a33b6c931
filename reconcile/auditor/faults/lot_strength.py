"""A stock lot that is stronger or weaker than stated, in every batch made from it."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.exact import secants
from reconcile.auditor.proposals import Context, Proposal, Told, linear
from reconcile.auditor.retrial import Supposed

ROOM = 2.0
"""Score from which a lot's exact profile is computed; below it the tangent says enough."""


class LotStrength:
    name, alarm_class = "lot_strength", "lot"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        names = [str(layout.records.lots.name[i]) for i in layout.lots_used]
        x = layout.lot_columns
        own = [layout.own("lot", i) for i in range(len(names))]
        promising = context.promising(x, ROOM, steady=True, own=np.array(own, np.intp).ravel())
        likely: dict[int, Supposed | None] = {}
        if len(promising):
            groups = [context.retrial.contributions_of_lot(int(layout.lots_used[i])) for i in promising]
            exact, at = secants(context, groups, x[:, promising])
            likely = dict(zip(promising.tolist(), at, strict=True))
            rest = np.setdiff1d(np.arange(x.shape[1]), promising)
            order = np.argsort(np.r_[promising, rest])
            x = sparse.csc_array(sparse.csc_array(sparse.hstack([exact, x[:, rest]]))[:, order])

        def tell(k: int, a: float) -> Told:
            factor = float(np.exp(np.clip(a, -7, 7)))
            return Told(factor, "factor", {"factor": factor}, scale=lambda v: float(np.exp(np.clip(v, -7, 7))))

        return linear(
            self.name,
            self.alarm_class,
            "lot",
            x,
            names,
            tell,
            prior_sd=0.3,
            own=own,
            supposed=likely.get,
        )


KIND = LotStrength()
