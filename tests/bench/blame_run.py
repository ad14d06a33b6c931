"""One simulated record through prediction and audit, timed; many of them over two processes."""

from __future__ import annotations

import multiprocessing
import os
import time
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

os.environ.setdefault("OMP_NUM_THREADS", "1")  # two processes on two cores: one thread each
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

from reconcile.auditor.audit import audit
from reconcile.auditor.faults import KINDS
from reconcile.auditor.layout import build_layout, evidence
from reconcile.auditor.retrial import Retrial
from reconcile.auditor.search import Search
from reconcile.chemistry.predict import predict_records, repredictor
from reconcile.chemistry.shortcuts import shortcut_values
from tests.simulated.matching import match, says
from tests.simulated.planted import Planted
from tests.simulated.simulator import Simulated, simulate


@dataclass(frozen=True)
class Case:
    """What to simulate: a seed, the faults and their sizes, and the room's settings."""

    seed: int
    faults: tuple[str, ...] = ()
    sizes: dict[str, float] = field(default_factory=dict)
    room: dict[str, Any] = field(default_factory=dict)


@dataclass(frozen=True)
class Told:
    """One finding in brief; rivals as (kind, subject), component as far as it names one."""

    kind: str
    subject: str
    estimate: float | None
    interval: tuple[float, float] | None
    gain: float
    p: float
    rivals: tuple[tuple[str, str], ...]
    component: str


@dataclass(frozen=True)
class Result:
    """What came of one case; seconds of simulating, predicting and auditing."""

    case: Case
    truth: tuple[Planted, ...]
    outcomes: tuple[str, ...]
    told: tuple[Told | None, ...]
    """The finding that stands for each planted fault (the rival itself, where a rival names it)."""
    stray: tuple[Told, ...]
    seconds: tuple[float, float, float]


def _told(finding: Any) -> Told:
    rivals = tuple((r.kind, str(r.subject)) for r in finding.rivals)
    component = str((finding.would_explain or {}).get("component", ""))
    return Told(
        finding.kind,
        str(finding.subject),
        finding.estimate,
        finding.interval95,
        finding.log_likelihood_gain,
        finding.family_wise_p,
        rivals,
        component,
    )


def search_of(simulated: Simulated) -> Search:
    """The auditor's search over a simulated record, not yet run."""
    records, settings = simulated.records, simulated.settings
    prediction = predict_records(records, settings)
    layout = build_layout(records, prediction, settings, evidence(records, prediction))
    return Search(layout, settings, Retrial(layout, repredictor(records, settings)), KINDS)


def run(case: Case) -> Result:
    """Simulate, predict, audit and match one case."""
    start = time.perf_counter()
    simulated = simulate(case.seed, case.faults, case.sizes, **case.room)
    made = time.perf_counter()
    records, settings = simulated.records, simulated.settings
    prediction = predict_records(records, settings)
    predicted = time.perf_counter()
    found = audit(
        records,
        prediction,
        repredictor(records, settings),
        settings,
        shortcuts=lambda rows: shortcut_values(records, settings, rows),
    ).findings
    done = time.perf_counter()
    matched = match(found, simulated.truth)
    told = []
    for outcome in matched.outcomes:
        if outcome.finding is None:
            told.append(None)
            continue
        said = [outcome.finding, *outcome.finding.rivals]
        told.append(_told(next(one for one in said if says(one, outcome.planted))))
    return Result(
        case,
        simulated.truth,
        tuple(o.outcome for o in matched.outcomes),
        tuple(told),
        tuple(_told(f) for f in matched.stray),
        (made - start, predicted - made, done - predicted),
    )


def run_all(cases: Iterable[Case], processes: int = 2) -> list[Result]:
    """Every case, in order, over some processes (0: in this one)."""
    cases = list(cases)
    if not processes:
        return [run(case) for case in cases]
    with multiprocessing.get_context("fork").Pool(processes) as pool:
        return pool.map(run, cases, chunksize=max(1, min(16, len(cases) // (4 * processes))))
