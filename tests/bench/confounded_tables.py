"""What a record cannot tell apart: is the other explanation named with the one that is found, every time?

    python -m tests.bench.confounded_tables --seeds 60

A situation counts where a finding speaks of the subjects concerned; it is told where the planted truth and what it is
confounded with both stand among the finding and its rivals (for an acid, among the substances that go with it too).
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable, Mapping, Sequence
from multiprocessing import get_context

from reconcile.auditor.audit import audit
from reconcile.chemistry.predict import predict_records, repredictor
from reconcile.records.results import Finding
from tests.simulated.matching import says
from tests.simulated.planted import Planted
from tests.simulated.simulator import Simulated, simulate

Verdict = tuple[int, int]
"""Findings that speak of the subjects, and those of them that tell."""


def said(finding: Finding) -> list[Finding]:
    """The finding and its rivals."""
    return [finding, *finding.rivals]


def _truth_listed(planted: Planted, findings: Sequence[Finding]) -> Verdict:
    """Where the subject is found, what was planted is the finding or a rival of it."""
    mine = [f for f in findings if any(one.subject == planted.subject for one in said(f))]
    return len(mine), sum(any(says(one, planted) for one in said(f)) for f in mine)


def _one_bottle(planted: Planted, findings: Sequence[Finding]) -> Verdict:
    """A bottle used once: its strength and the preparation of that batch are both named."""
    batch = planted.detail["batch"]
    mine = [f for f in findings if any(one.subject in (planted.subject, batch) for one in said(f))]

    def both(finding: Finding) -> bool:
        kinds = {one.subject for one in said(finding)}
        return planted.subject in kinds and any(s == batch or (isinstance(s, tuple) and batch in s) for s in kinds)

    return len(mine), sum(both(f) for f in mine)


SITUATIONS: Mapping[str, tuple[str, dict[str, float], Callable[[Planted, Sequence[Finding]], Verdict]]] = {
    "small step, or drift": ("meter_step", {"meter_step": 0.045}, _truth_listed),
    "slow drift, or step": ("meter_drift", {"meter_drift": 0.08}, _truth_listed),
    "bottle used once, or preparation": ("lot_used_once", {}, _one_bottle),
    "another acid, or one of equal pKa": ("lot_identity", {}, _truth_listed),
}


def told(task: tuple[str, int]) -> Verdict:
    """One situation in one record."""
    name, seed = task
    kind, sizes, judge = SITUATIONS[name]
    simulated: Simulated = simulate(seed, [kind], sizes)
    records, settings = simulated.records, simulated.settings
    prediction = predict_records(records, settings)
    found = audit(records, prediction, repredictor(records, settings), settings).findings
    return judge(simulated.truth[0], found)


def main(arguments: Sequence[str]) -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--seeds", type=int, default=60)
    parser.add_argument("--processes", type=int, default=2)
    options = parser.parse_args(arguments)
    for name in SITUATIONS:
        with get_context("fork").Pool(options.processes) as pool:
            verdicts = pool.map(told, [(name, seed) for seed in range(options.seeds)], chunksize=4)
        spoke, tells = sum(v[0] for v in verdicts), sum(v[1] for v in verdicts)
        missing = [seed for seed, v in enumerate(verdicts) if v[1] < v[0]]
        print(f"{name:36} findings {spoke:4d}   told {tells:4d}   not in records {missing}", flush=True)


if __name__ == "__main__":
    main(sys.argv[1:])
