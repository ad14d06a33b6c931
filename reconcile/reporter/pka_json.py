"""pka.json, and the same with gist, hazards and cautions for --json."""

from __future__ import annotations

from typing import Any

from reconcile.records.pka_results import PkaFit, PkaStep
from reconcile.reporter.cautions import CAUTIONS
from reconcile.reporter.manifest import report_id
from reconcile.reporter.pka_gist import command, hazard_lines, pka_gist
from reconcile.reporter.to_json import to_text, value


def _step(step: PkaStep) -> dict[str, Any]:
    found: dict[str, Any] = {
        "pKa_thermodynamic": value(step.pka),
        "u": value(step.u),
        "interval95": value(step.interval95),
        "pKa_apparent": value(step.pka_apparent),
        "ionic_strength": value(step.ionic_strength),
        "temperature_C": value(step.temperature_c),
    }
    if step.pka_25c is not None:
        found["pKa_25C"] = value(step.pka_25c)
    if step.dh_kj_mol is not None:
        found["dH_kJ_mol"] = value(step.dh_kj_mol)
    return found


def pka_document(fit: PkaFit) -> dict[str, Any]:
    """Content of pka.json; a number that is not identifiable is null, what is known of it stands in the conclusion."""
    return {
        "acid": value(fit.acid),
        "steps": [_step(step) for step in fit.steps],
        "strength_factor": value(fit.strength.value),
        "meter_offset": value(fit.offset.value),
        "identifiable": fit.identifiable,
        "candidates": [
            {"acid": value(one.acid), "log_likelihood_ratio": value(one.log_likelihood_ratio)} for one in fit.candidates
        ],
        "readings_used": fit.readings_used,
        "conclusion": value(fit.conclusion),
    }


def pka_json(fit: PkaFit) -> bytes:
    """pka.json, as bytes."""
    return to_text(pka_document(fit)).encode("utf-8")


def printed_json(fit: PkaFit) -> str:
    """All that `--json` prints: pka.json, with report id, rows, flags, hazard words, gist and cautions."""
    document = pka_document(fit)
    document["report_id"] = report_id(fit, command(fit))
    document["rows"] = value(fit.rows)
    document["flags"] = value(fit.flags)
    document["hazards"] = [{"substance": name, "reason": words} for name, words in hazard_lines(fit)]
    document["gist"] = {line.key: line.text for line in pka_gist(fit)}
    document["cautions"] = list(CAUTIONS)
    return to_text(document)
