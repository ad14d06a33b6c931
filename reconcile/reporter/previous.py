"""An earlier report taken up into this one: read from its findings.json, and told in tables, lines and JSON."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np

from reconcile.records.over_time import GONE, NEW, PERSISTS, Before, Standing, standings
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.results import Audit, Finding
from reconcile.reporter.manifest import MANIFEST, sha256
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import Column, Table, table_of
from reconcile.reporter.words import brief_since, counted, kind_words, listed, size_words, title
from reconcile.reporter.working_place import settle

FINDINGS, COPY = "findings.json", "previous.json"
"""Where findings stand in a report, and the earlier ones in the report that is compared with them."""
MOST_NAMED = 6
COLUMNS: tuple[Column, ...] = (
    Column("standing", "Since then", width=10),
    Column("id", "Finding", width=8),
    Column("what", "What", width=40),
    Column("now", "Size now", width=26),
    Column("then", "Size then", width=26),
    Column("note", "Remark", width=40),
)


@dataclass(frozen=True)
class Previous:
    """An earlier report: its id, the bytes of its findings.json, and the findings in them."""

    report_id: str
    content: bytes
    findings: tuple[Finding, ...]


def read_previous(folder: Path | str) -> Previous:
    """The findings of an earlier report; raises InputProblems where the folder holds none that can be read."""
    place = Path(folder)
    settle(place.resolve().parent)
    try:
        content = (place / FINDINGS).read_bytes()
        identity = json.loads((place / MANIFEST).read_bytes())["report_id"]
    except FileNotFoundError:
        raise InputProblems([Problem("previous-missing", Place(str(folder)))]) from None
    except OSError as error:
        raise InputProblems([Problem("file-unreadable", Place(str(folder)), error.strerror or "unreadable")]) from None
    except (ValueError, KeyError, TypeError) as error:
        raise InputProblems([Problem("report-manifest", Place(str(folder)), str(error))]) from None
    return previous_of(content, plain(str(identity)), str(folder))


def previous_of(content: bytes, identity: str, named: str) -> Previous:
    """An earlier report from the bytes of its findings.json; raises InputProblems where they are not such findings."""
    try:
        document = json.loads(content)
        if document["schema"] != 1:
            raise ValueError(f"schema {document['schema']}")
        findings = tuple(_finding(one) for one in document["findings"])
    except (ValueError, KeyError, TypeError, AttributeError, RecursionError) as error:
        raise InputProblems([Problem("previous-unreadable", Place(named), str(error))]) from None
    return Previous(identity, content, findings)


def _finding(one: Mapping[str, Any], with_rivals: bool = True) -> Finding:
    """A finding from its JSON, as far as a comparison needs it; raises ValueError, KeyError or TypeError."""
    subject, estimate, between = one["subject"], one["estimate"], one["interval95"]
    if not isinstance(subject, str):
        subject = tuple(_text(part) for part in subject)
    if not (estimate is None or _number(estimate)):
        raise ValueError(f"estimate {estimate!r}")
    if between is not None and not (len(between) == 2 and all(_number(v) for v in between)):
        raise ValueError(f"interval95 {between!r}")
    explains = one.get("would_explain")
    if explains is not None and not isinstance(explains, Mapping):
        raise ValueError(f"would_explain {explains!r}")
    return Finding(
        kind=_text(one["kind"]),
        subject=subject,
        subject_type=_text(one["subject_type"]),
        estimate=None if estimate is None else float(estimate),
        unit=_text(one["unit"]),
        interval95=None if between is None else (float(between[0]), float(between[1])),
        log_likelihood_gain=0.0,
        family_wise_p=1.0,
        readings=np.zeros(0, np.intp),
        text="",
        id=_text(one["id"]),
        since=None if one.get("since") is None else datetime.fromisoformat(_text(one["since"])),
        would_explain=explains,
        rivals=tuple(_finding(rival, False) for rival in one.get("rivals", ())) if with_rivals else (),
    )


def _number(thing: Any) -> bool:
    return type(thing) in (int, float) and math.isfinite(thing)


def _text(thing: Any) -> str:
    if not isinstance(thing, (str, int)) or isinstance(thing, bool):
        raise ValueError(f"{thing!r} for a text")
    return plain(str(thing))


def since_previous(audit: Audit, previous: Previous | Path | str) -> Audit:
    """The same audit, with what is new, persists or is gone since an earlier report.

    Parameters
    ----------
    audit : what `reconcile.audit` gave
    previous : folder of the earlier report

    Raises
    ------
    InputProblems : the folder holds no findings that can be read
    """
    then = previous if isinstance(previous, Previous) else read_previous(previous)
    found = standings(_plain(audit), then.findings, audit.records)
    return replace(audit, before=Before(then.report_id, sha256(then.content), then.content, found))


def _plain(audit: Audit) -> list[Finding]:
    """The findings with their subjects as a report writes them, so that they match those that were read from one."""
    return [_as_written(f) for f in audit.findings]


def _as_written(finding: Finding) -> Finding:
    subject = finding.subject
    written = plain(subject) if isinstance(subject, str) else tuple(plain(str(part)) for part in subject)
    return replace(finding, subject=written, rivals=tuple(_as_written(rival) for rival in finding.rivals))


def table(before: Before) -> Table:
    """One row a finding of either report."""
    return table_of("previous", "Since the previous report", COLUMNS, [_row(one) for one in before.standings])


def _row(one: Standing) -> list[str]:
    finding = one.now or one.then
    assert finding is not None
    sizes = [size_words(f) if f is not None else "" for f in (one.now, one.then)]
    return [one.what, one.now.id if one.now else "", title(finding), *sizes, remark(one)]


def remark(one: Standing) -> str:
    """What is known of a finding in the report that lacks it; of one in both, when it began then and now."""
    if one.what == PERSISTS:
        begun = [brief_since(f) for f in (one.now, one.then) if f is not None]
        return f"begun {begun[0] or 'at no date'}; then {begun[1] or 'at no date'}" if begun[0] != begun[1] else ""
    when = "then" if one.what == NEW else "now"
    if one.other == "absent":
        return "not in this record"
    if one.other == "rival":
        return f"among the rivals of {one.beside} {when}"
    if one.other:
        return f"{one.beside} {when}, as {kind_words(one.other)}"
    return ""


def sentence(before: Before) -> str:
    """All of it in a sentence or two: "2 new: ...; 1 persists: ...; 1 gone: ..."."""
    parts = []
    for what, words in ((NEW, "new"), (PERSISTS, "persisting"), (GONE, "gone")):
        of_kind = before.of(what)
        named = [_named(one) for one in of_kind]
        parts.append(f"{len(of_kind)} {words}" + (f": {listed(named, MOST_NAMED)}" if named else ""))
    return f"Against report {plain(before.report_id)}: {'; '.join(parts)}."


def _named(one: Standing) -> str:
    finding = one.now or one.then
    assert finding is not None
    words = title(finding)
    words = words[:1].lower() + words[1:]
    words = f"{finding.id} {words}" if one.now is not None else words
    beside = remark(one) if one.what != PERSISTS else ""
    return f"{words} ({beside})" if beside else words


def lines(before: Before) -> list[tuple[str, str]]:
    """Rows for a terminal: new, persists or gone, and the finding with its sizes."""
    found = []
    for one in before.standings:
        _, ident, what, now, then, note = _row(one)
        sizes = f"{now}, then {then}" if now and then else now or f"then {then}"
        found.append((one.what, ", ".join(filter(None, [f"{ident}  {what}".strip(), sizes, note]))))
    return found or [("", f"{counted(0, 'finding')} in either report")]


def document(before: Before) -> dict[str, Any]:
    """What findings.json holds of it."""
    return {
        "report_id": plain(before.report_id),
        "new": [{"id": one.now.id, "remark": remark(one)} for one in before.of(NEW) if one.now],
        "persisting": [
            {"id": one.now.id, "then": _brief(one.then)} for one in before.of(PERSISTS) if one.now and one.then
        ],
        "gone": [{**_brief(one.then), "remark": remark(one)} for one in before.of(GONE) if one.then],
    }


def _brief(finding: Finding) -> dict[str, Any]:
    return {
        "id": finding.id,
        "kind": finding.kind,
        "subject": finding.subject if isinstance(finding.subject, str) else list(finding.subject),
        "subject_type": finding.subject_type,
        "estimate": finding.estimate,
        "unit": finding.unit,
        "interval95": None if finding.interval95 is None else list(finding.interval95),
        "since": None if finding.since is None else finding.since.isoformat(timespec="seconds"),
    }
