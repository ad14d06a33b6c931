"""Meters and probes through time as one JSON document, for --json."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import fields
from typing import Any

from reconcile import __version__
from reconcile.records.meter_results import MeterHistory
from reconcile.reporter.cautions import CAUTIONS
from reconcile.reporter.manifest import report_id
from reconcile.reporter.meter_gist import NO_LEAVE, meter_gist
from reconcile.reporter.meter_page import METERS
from reconcile.reporter.to_json import findings_document, to_text, value

SCHEMA = 1


def meter_document(history: MeterHistory) -> dict[str, Any]:
    """Everything the report's tables hold but the single readings and calibrations."""
    findings = findings_document(history.audit)["findings"] if history.audit is not None else []
    about = {f.id for f in history.findings}
    return {
        "schema": SCHEMA,
        "version": __version__,
        "report_id": report_id(history, METERS),
        "rows": value(history.rows),
        "meters": value(history.meters),
        "probes": value(history.probes),
        "limits": _rows(history.limits),
        "lines": [
            {**row, "calibrations": len(x.calibration)}
            for x, row in zip(history.lines, _rows(history.lines), strict=True)
        ],
        "crossings": _rows(history.crossings),
        "notice": NO_LEAVE,
        "steps": _rows(history.calibration_steps),
        "between_calibrations": _rows(history.between),
        "noise": _rows(history.noise),
        "agreement": _rows(history.agreement),
        "findings": [f for f in findings if f["id"] in about],
        "not_shown": [{"what": value(what), "reason": value(why)} for what, why in history.not_shown],
        "gist": {line.key: value(line.text) for line in meter_gist(history)},
        "cautions": list(CAUTIONS),
    }


def _rows(things: Sequence[Any]) -> list[dict[str, Any]]:
    """Dataclasses as JSON objects; a limit inside one by its value and side, indices left out."""
    found = []
    for thing in things:
        row: dict[str, Any] = {}
        for one in fields(thing):
            held = getattr(thing, one.name)
            if one.name == "limit":
                row |= {"limit": value(held.value), "side": held.side, "judged": held.judged}
            elif one.name != "calibration":
                row[one.name] = value(held)
        found.append(row)
    return found


def meter_json(history: MeterHistory) -> str:
    """All that `--json` prints."""
    return to_text(meter_document(history))
