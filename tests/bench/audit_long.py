"""What the auditor costs on long records, room by room of it: python tests/bench/audit_long.py [readings ...]

Nothing here asserts; it prints. Only audit() is measured, given the record and its predictions; simulating, predicting
and writing are left out. Times are those of the processor, so that other work on the machine does not count; each part
is counted without the parts inside it. The cost per reading is printed as a ratio to the smallest record's.
"""

from __future__ import annotations

import os
import resource
import sys
import time
from collections.abc import Callable
from typing import Any

os.environ.setdefault("OMP_NUM_THREADS", "1")  # as the command line has it
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from reconcile.auditor import audit as whole
from reconcile.auditor import base_model, judging, long_model, scoring, search
from reconcile.auditor.retrial import Retrial
from reconcile.chemistry.predict import predict_records, repredictor
from tests.simulated.simulator import simulate

SIZES = (10_000, 30_000, 100_000)
PLANTED = ("meter_offset", "lot_strength", "reading_slip")
METERS = {10_000: 20, 30_000: 30, 100_000: 50}
PARTS: tuple[tuple[str, Any, str], ...] = (
    ("laying the evidence out", whole, "build_layout"),
    ("laying the evidence out", Retrial, "__init__"),
    ("estimating spreads", search.Search, "components"),
    ("factoring the covariance", base_model.BaseModel, "__init__"),
    ("models beside findings", long_model.LongModel, "__init__"),
    ("predicting again", Retrial, "shifts"),
    ("predicting again", Retrial, "shifts_at"),
    ("proposing candidates", judging, "pool_of"),
    ("scoring candidates", scoring.Pool, "scores"),
    ("alarm rate", search.Search, "supported"),
    ("alarm rate", search.Search, "support"),
    ("findings and rivals", whole, "build"),
    ("next checks", whole, "next_check"),
    ("not testable", whole, "not_testable"),
    ("smallest detectable", whole, "smallest_detectable"),
    ("statuses", whole, "statuses"),
)


class Clock:
    """Processor time by part; a part inside another counts for itself alone."""

    def __init__(self) -> None:
        self.spent: dict[str, float] = {}
        self.stack: list[str] = ["the rest"]
        self.last = time.process_time()

    def mark(self) -> None:
        now = time.process_time()
        self.spent[self.stack[-1]] = self.spent.get(self.stack[-1], 0.0) + now - self.last
        self.last = now

    def timed(self, part: str, function: Callable[..., Any]) -> Callable[..., Any]:
        def inside(*args: Any, **kwargs: Any) -> Any:
            self.mark()
            self.stack.append(part)
            try:
                return function(*args, **kwargs)
            finally:
                self.mark()
                self.stack.pop()

        return inside


def measured(readings: int, faults: tuple[str, ...]) -> tuple[dict[str, float], float, list[str], int]:
    """Seconds by part, seconds in all, what was found, and readings, for one simulated record."""
    batches = readings // 3
    meters = METERS.get(readings, max(5, round(readings**0.34)))
    simulated = simulate(
        5, faults, n_batches=batches, n_meters=meters, readings_per_batch=3, batches_per_lot_set=250, weeks=26
    )
    records, settings = simulated.records, simulated.settings
    prediction = predict_records(records, settings)
    again = repredictor(records, settings)
    clock = Clock()
    originals = [(owner, name, getattr(owner, name)) for _, owner, name in PARTS]
    for (part, owner, name), (_, _, function) in zip(PARTS, originals, strict=True):
        setattr(owner, name, clock.timed(part, function))
    begun = time.process_time()
    clock.last = begun
    try:
        found = whole.audit(records, prediction, again, settings)
    finally:
        clock.mark()
        for owner, name, function in originals:
            setattr(owner, name, function)
    names = [f"{f.kind} {f.subject if isinstance(f.subject, str) else ' '.join(f.subject)}" for f in found.findings]
    return clock.spent, time.process_time() - begun, names, len(records.lots)


def report(sizes: tuple[int, ...]) -> None:
    for faults in ((), PLANTED):
        print(f"\n{'clean record' if not faults else ' + '.join(faults)}")
        columns = {size: measured(size, faults) for size in sizes}
        print(f"{'readings':28}" + "".join(f"{size:>12,}" for size in sizes))
        print(f"{'lots':28}" + "".join(f"{columns[size][3]:>12,}" for size in sizes))
        parts = list(dict.fromkeys([*(part for part, _, _ in PARTS), "the rest"]))
        for part in parts:
            print(f"{part:28}" + "".join(f"{columns[s][0].get(part, 0.0):>10.2f} s" for s in sizes))
        print(f"{'all':28}" + "".join(f"{columns[s][1]:>10.2f} s" for s in sizes))
        first = columns[sizes[0]][1] / sizes[0]
        print(f"{'cost of a reading, ratio':28}" + "".join(f"{columns[s][1] / s / first:>12.2f}" for s in sizes))
        for size in sizes:
            print(f"  found in {size:,}: {'; '.join(columns[size][2]) or 'nothing'}")
    print(f"\npeak memory of the whole run {resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024:,.0f} MiB")


if __name__ == "__main__":
    report(tuple(int(a.replace("_", "")) for a in sys.argv[1:]) or SIZES)
