"""The library's constant of one acid does not hold for this record: wrong in every lot and on every meter."""

from __future__ import annotations

import numpy as np
from scipy import sparse

from reconcile.auditor.proposals import Context, Proposal, Told, linear


class AcidConstant:
    steady = True
    name, alarm_class = "acid_constant", "chemistry"

    def propose(self, context: Context) -> Proposal | None:
        layout = context.layout
        effects = layout.effects["constant"]
        x = sparse.csc_array(layout.z.tocsc()[:, effects.first : effects.last])
        batches = [len(set(layout.batch[x.indices[x.indptr[k] : x.indptr[k + 1]]].tolist())) for k in range(x.shape[1])]
        kept = [k for k, count in enumerate(batches) if count >= 2]
        names = [effects.subjects[k] for k in kept]

        def tell(k: int, a: float) -> Told:
            return Told(a, "pKa", {"pKa_shift": a})

        own = [layout.own("constant", k) for k in kept]
        return linear(
            self.name,
            self.alarm_class,
            "acid",
            sparse.csc_array(x[:, kept]),
            names,
            tell,
            prior_sd=0.15,
            own=own,
            log_prior=np.full(len(kept), -1.0),
        )


KIND = AcidConstant()
