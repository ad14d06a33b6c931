"""findings.json, and the same with gist and cautions for --json."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from datetime import datetime
from typing import Any

import numpy as np

from reconcile import __version__
from reconcile.records.arrays import IntArray
from reconcile.records.results import Audit, Finding, Silence
from reconcile.reporter import previous
from reconcile.reporter.adjusted import rows_of
from reconcile.reporter.cautions import CAUTIONS
from reconcile.reporter.gist import gist
from reconcile.reporter.manifest import report_id
from reconcile.reporter.plain import plain
from reconcile.reporter.stocks import Stock, stocks
from reconcile.reporter.words import moment

SCHEMA = 1
MOST_RIVALS = 8


def value(thing: Any) -> Any:
    """Anything as JSON holds it: texts plain, numbers that are none null, times ISO, keys sorted."""
    if thing is None or isinstance(thing, bool):
        return thing
    if isinstance(thing, str):
        return plain(thing)
    if isinstance(thing, (datetime, np.datetime64)):
        return moment(thing, seconds=True) or None
    if isinstance(thing, (np.bool_,)):
        return bool(thing)
    if isinstance(thing, (int, np.integer)):
        return int(thing)
    if isinstance(thing, (float, np.floating)):
        return float(thing) if math.isfinite(thing) else None
    if isinstance(thing, Mapping):
        return {plain(str(k)): value(v) for k, v in sorted(thing.items(), key=lambda item: str(item[0]))}
    if isinstance(thing, (list, tuple, np.ndarray)):
        return [value(v) for v in thing]
    return plain(str(thing))


def _places(audit: Audit, indices: IntArray) -> list[dict[str, Any]]:
    readings, sheets = audit.records.readings, audit.records.sheets
    found = []
    for i in sorted({int(i) for i in indices}):
        sheet = sheets[int(readings.source[i])]
        found.append({"source": plain(sheet.file), "sheet": plain(sheet.sheet), "row": int(readings.row[i])})
    return found


def _finding(audit: Audit, finding: Finding, with_rivals: bool = True) -> dict[str, Any]:
    rivals = finding.rivals[:MOST_RIVALS] if with_rivals else ()
    return {
        "id": plain(finding.id),
        "kind": plain(finding.kind),
        "subject": value(finding.subject),
        "subject_type": plain(finding.subject_type),
        "estimate": value(finding.estimate),
        "unit": plain(finding.unit),
        "interval95": value(finding.interval95),
        "since": value(finding.since),
        "until": value(finding.until),
        "since_interval95": value(finding.since_interval95),
        "would_explain": value(finding.would_explain),
        "also": value(finding.also),
        "readings": _places(audit, finding.readings),
        "evidence": {
            "log_likelihood_gain": value(finding.log_likelihood_gain),
            "family_wise_p": value(finding.family_wise_p),
        },
        "rivals": [_finding(audit, rival, with_rivals=False) for rival in rivals],
        "next_check": plain(finding.next_check),
        "impact": _places(audit, finding.impact),
        "text": plain(finding.text),
    }


def _silence(silence: Silence) -> dict[str, Any]:
    found: dict[str, Any] = {
        "kind": plain(silence.kind),
        "subject": plain(silence.subject),
        "subject_type": plain(silence.subject_type),
    }
    if silence.reason:
        found["reason"] = plain(silence.reason)
    if silence.size is not None:
        found |= {"size": value(silence.size), "unit": plain(silence.unit), "power": value(silence.power)}
    return found


def _hazard(stock: Stock) -> dict[str, Any]:
    return {
        "kind": "hazard",
        "subject": stock.lot or stock.substance,
        "subject_type": "lot" if stock.lot else "substance",
        "substance": stock.substance,
        "reason": stock.hazard,
    }


def findings_document(audit: Audit) -> dict[str, Any]:
    """Content of findings.json."""
    return {
        "schema": SCHEMA,
        "version": __version__,
        "rows": value(audit.rows),
        "findings": [_finding(audit, f) for f in audit.findings],
        "not_testable": [_silence(s) for s in audit.not_testable],
        "smallest_detectable": [_silence(s) for s in audit.smallest_detectable],
        "hazards": [_hazard(s) for s in stocks(audit)],
        **({"previous": previous.document(audit.before)} if audit.before is not None else {}),
        **({"adjusted": [value(row) for row in rows_of(audit)]} if len(audit.records.solved) else {}),
    }


def to_text(document: Mapping[str, Any]) -> str:
    """A document as text: two spaces, no escapes but those JSON needs, a line end at the end."""
    return json.dumps(document, ensure_ascii=False, indent=2, allow_nan=False) + "\n"


def findings_json(audit: Audit) -> bytes:
    """findings.json, as bytes."""
    return to_text(findings_document(audit)).encode("utf-8")


def gist_json(audit: Audit) -> str:
    """findings.json with report id, gist and cautions: all that `--json` prints."""
    document = findings_document(audit)
    document["report_id"] = report_id(audit)
    document["gist"] = {line.key: line.text for line in gist(audit)}
    document["cautions"] = list(CAUTIONS)
    return to_text(document)
