"""How far an audit can be trusted on records in which half of the batches were adjusted, and on shared buffer lots.

    python -m tests.bench.adjusted_tables --seeds 200

Printed: findings in clean records; an offset of 0.06 named, or a rival, with half of the batches adjusted; a wrong lot
of calibration buffer shared by three meters: named as the lot, as a rival, or as meters.
"""

from __future__ import annotations

import argparse
import multiprocessing
import os
from collections import Counter
from typing import Any

os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from reconcile.auditor.audit import audit
from reconcile.chemistry.adjusted import with_adjustments
from reconcile.chemistry.predict import predict_records, repredictor
from tests.bench.blame_tables import share
from tests.simulated.half_adjusted import half_adjusted
from tests.simulated.matching import match
from tests.simulated.simulator import simulate

CASES: dict[str, tuple[tuple[str, ...], dict[str, float], dict[str, Any], bool]] = {
    "clean, half adjusted": ((), {}, {}, True),
    "offset 0.06, half adjusted": (("meter_offset",), {"meter_offset": 0.06}, {}, True),
    "offset 0.06, half adjusted, 3 readings a batch": (
        ("meter_offset",), {"meter_offset": 0.06}, {"readings_per_batch": 3}, True,
    ),
    "offset 0.06, half adjusted, meters of accuracy 0.01": (
        ("meter_offset",), {"meter_offset": 0.06}, {"accuracy": 0.01}, True,
    ),
    "offset 0.06, none adjusted": (("meter_offset",), {"meter_offset": 0.06}, {}, False),
    "offset 0.07, half adjusted": (("meter_offset",), {"meter_offset": 0.07}, {}, True),
    "buffer lot, three meters": (("calibration_buffer",), {}, {"n_meters": 3}, False),
    "buffer lot, three meters with check readings": (
        ("calibration_buffer",), {}, {"n_meters": 3, "checks_per_meter": 4}, False,
    ),
}  # fmt: skip


def one(case: tuple[str, int]) -> tuple[str, tuple[str, ...], tuple[str, ...]]:
    """(case, outcomes of what was planted, kinds of the findings) of one seed."""
    name, seed = case
    faults, sizes, room, adjusted = CASES[name]
    simulated = simulate(seed, faults, sizes, **room)
    records, settings = simulated.records, simulated.settings
    if adjusted:
        records = with_adjustments(half_adjusted(records, seed), settings)
    found = audit(records, predict_records(records, settings), repredictor(records, settings), settings).findings
    matched = match(found, simulated.truth)
    return name, tuple(o.outcome for o in matched.outcomes), tuple(f"{f.kind} {f.subject_type}" for f in found)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--seeds", type=int, default=200)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--processes", type=int, default=2)
    parser.add_argument("--only", nargs="*", default=[])
    options = parser.parse_args()
    names = [n for n in CASES if not options.only or any(word in n for word in options.only)]
    cases = [(n, s) for n in names for s in range(options.first, options.first + options.seeds)]
    with multiprocessing.get_context("fork").Pool(options.processes) as pool:
        results = pool.map(one, cases, chunksize=4)
    for name in names:
        mine = [r for r in results if r[0] == name]
        outcomes = Counter(o for _, outcome, _ in mine for o in outcome)
        any_found = sum(1 for *_, kinds in mine if kinds)
        meters = sum(1 for *_, kinds in mine if sum(k.endswith(" meter") for k in kinds) >= 3)
        print(name)
        print(f"  any finding {share(any_found, len(mine))} %, three meters or more {share(meters, len(mine))} %")
        for outcome in ("named", "rival", "missed"):
            if outcomes:
                print(f"  {outcome:7s} {share(outcomes[outcome], len(mine))} %")
        print("  findings:", ", ".join(f"{k} {n}" for k, n in Counter(k for *_, ks in mine for k in ks).most_common(6)))


if __name__ == "__main__":
    main()
