"""The audit as a whole: residuals, the joint search, findings, statuses, and what silence means."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np

from reconcile.auditor.adjusted import only_adjusted
from reconcile.auditor.components import Components, Model, noise_of
from reconcile.auditor.faults import KINDS
from reconcile.auditor.findings import build, error_of
from reconcile.auditor.impact import with_impact
from reconcile.auditor.layout import Layout, build_layout, evidence
from reconcile.auditor.next_check import next_check
from reconcile.auditor.proposals import FaultKind
from reconcile.auditor.record_values import Shortcuts, record_values
from reconcile.auditor.retrial import Retrial
from reconcile.auditor.search import Search
from reconcile.auditor.silence import not_testable, smallest_detectable
from reconcile.records.arrays import BoolArray, FloatArray, TextArray
from reconcile.records.book import BatchRecords
from reconcile.records.results import Audit, Finding, Hazard, Prediction, Repredict, Spreads
from reconcile.records.settings import Settings

EXPLAINED_SHARE = 0.5
"""A finding explains a reading when it moves it by this many spreads or more."""


def audit(
    records: BatchRecords,
    prediction: Prediction,
    repredict: Repredict,
    settings: Settings,
    progress: Callable[[str], None] | None = None,
    kinds: Sequence[FaultKind] = KINDS,
    shortcuts: Shortcuts | None = None,
) -> Audit:
    """Explains the residuals of a record together.

    Parameters
    ----------
    records, prediction : the record and its predicted pH, n readings each
    repredict : predicts readings again under a supposed other recipe
    progress : told in words what is being done
    shortcuts : hand methods' values for some readings, to name the one that the record used
    """
    say = progress or (lambda _: None)
    say("comparing readings with predictions")
    usable = evidence(records, prediction)
    layout = build_layout(records, prediction, settings, usable)
    retrial = Retrial(layout, repredict)
    search = Search(layout, settings, retrial, kinds, progress)
    state = search.run()
    say("describing findings and their rivals")
    pairs = build(search, state, layout, float(settings["audit.reach"]))
    say("choosing next checks")
    checked = [
        replace(finding, next_check=next_check(search, state, j, candidates))
        for j, (finding, candidates) in enumerate(pairs)
    ]
    said = record_values(records, prediction, shortcuts)
    found_spreads = spreads(layout, state.components, len(records.readings))
    errors = [error_of(layout, *candidates[0]) for _, candidates in pairs]
    concerned = with_impact(records, checked, found_spreads.noise, errors)
    together = sorted([*concerned, *said], key=lambda f: -f.log_likelihood_gain)
    findings = [replace(finding, id=f"F{i + 1}") for i, finding in enumerate(together)]
    say("working out what could not be seen")
    pool, bare, _ = search.scored(state.components, [])
    power = float(settings["audit.detectable_power"])
    residual = records.readings["ph"] - prediction.ph
    model = search.model(state.components, [])
    spread = full_spread(layout, model, prediction, usable)
    z = residual / spread
    status, explained_by = statuses(records, prediction, settings, usable, z, spread, findings)
    return Audit(
        records=records,
        prediction=prediction,
        settings=settings,
        residual=residual,
        u_residual=spread,
        z=z,
        status=status,
        explained_by=explained_by,
        evidence=usable,
        findings=tuple(findings),
        not_testable=not_testable(layout),
        smallest_detectable=smallest_detectable(layout, bare, pool, power, search.rate),
        hazards=hazards(records),
        spreads=found_spreads,
    )


def full_spread(layout: Layout, model: Model, prediction: Prediction, usable: BoolArray) -> FloatArray:
    """Standard deviation of every residual in a clean record, (n,) [pH]."""
    spread = np.sqrt(prediction.u**2 + model.components.noise)
    spread[layout.reading] = np.sqrt(model.variance())
    return spread


def statuses(
    records: BatchRecords,
    prediction: Prediction,
    settings: Settings,
    usable: BoolArray,
    z: FloatArray,
    spread: FloatArray,
    findings: Sequence[Finding],
) -> tuple[TextArray, TextArray]:
    """Status of every reading and the findings that explain it, TextArray (n,) each."""
    n = len(z)
    status = np.full(n, "as_predicted", object)
    by = [[] for _ in range(n)]  # type: list[list[str]]
    left = z.copy()
    for finding in findings:
        part = finding.shift / spread[finding.readings]
        left[finding.readings] -= part
        for reading, size in zip(finding.readings.tolist(), part.tolist(), strict=True):
            if abs(size) >= EXPLAINED_SHARE:
                by[reading].append(finding.id)
    limit = float(settings["status.stands_out_z"])
    out = np.abs(z) > limit
    status[out] = "stands_out"
    told = np.array([bool(b) for b in by], np.bool_)
    status[told & out & (np.abs(left) <= limit)] = "explained"
    for name in ("outside_model", "outside_electrode_range", "unbuffered"):
        status[prediction.status == name] = name
    status[only_adjusted(records)] = "adjusted"
    status[prediction.status == "not_solved"] = "not_solved"
    status[~np.isfinite(prediction.ph)] = "not_solved"
    status[records.readings["standing"] == "void"] = "void"
    return status, np.array([" ".join(b) for b in by], object)


def hazards(records: BatchRecords) -> tuple[Hazard, ...]:
    """Hazard words of every lot in the record, in order of lot names."""
    found = []
    for name, form in zip(records.lots.name.tolist(), records.lots.form.tolist(), strict=True):
        substance = records.forms[form]
        words = substance.hazard or "no hazard word recorded here; see the safety data sheet"
        found.append(Hazard("hazard", str(name), "lot", substance.name, words, substance.gas_with_acid))
    return tuple(sorted(found, key=lambda h: h.subject))


def spreads(layout: Layout, components: Components, n: int) -> Spreads:
    """The spreads as judged, with their origin."""
    noise = np.full(n, components.noise**0.5)
    noise[layout.reading] = np.sqrt(noise_of(layout, components))
    named = {
        "reading noise": (components.noise**0.5, "pH", "estimated", "restricted maximum likelihood, bounded scores"),
        "calibration session": (
            components.session**0.5,
            "pH",
            "estimated",
            "readings of one meter on one day share it",
        ),
        "preparation": (components.preparation**0.5 * 100, "%", "estimated", "floor from the settings"),
    }
    for index, meter in enumerate(layout.meters):
        ratio = float(components.meter_ratio[index])
        if ratio != 1.0:
            named[f"reading noise of meter {meter}"] = (
                (components.noise * ratio) ** 0.5,
                "pH",
                "estimated",
                "the meter's own, from 20 readings on",
            )
    return Spreads(noise, named)
