"""The gist: five lines that answer what a reviewer asks first."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass

from reconcile.records.results import Audit
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.plain import plain
from reconcile.reporter.words import (
    STATUSES,
    brief_since,
    counted,
    kind_words,
    listed,
    moment,
    quantity,
    subject_words,
    title,
)

NO_EVIDENCE = ("adjusted", "outside_model", "outside_electrode_range", "unbuffered", "void", "not_solved")
MOST_NAMED = 8


@dataclass(frozen=True)
class Line:
    """One line of the gist: key (JSON), label (as shown), text."""

    key: str
    label: str
    text: str


def gist(audit: Audit, lookups: Lookups | None = None) -> list[Line]:
    """What was checked, what stands out, what to read next, what could not be checked, how complete."""
    lookups = lookups or Lookups(audit)
    return [
        Line("checked", "What was checked", _checked(audit, lookups)),
        Line("stands_out", "What stands out", _stands_out(audit)),
        Line("read_next", "What to read next", _read_next(audit)),
        Line("not_checked", "What could not be checked", _not_checked(audit)),
        Line("complete", "How complete", _complete(audit)),
    ]


def _distinct(values: object) -> int:
    return len({v for v in values if v})  # type: ignore[attr-defined]


def _checked(audit: Audit, lookups: Lookups) -> str:
    readings = audit.records.readings
    batches = _distinct(readings["batch"].tolist())
    parts = [counted(len(readings), "reading")]
    if batches:
        parts[0] += f" of {counted(batches, 'batch', 'batches')}"
    meters, lots = _distinct(readings["meter"].tolist()), len(audit.records.lots)
    parts.append(f"on {counted(meters, 'meter')}" if meters else "on meters that the record does not name")
    if lots:
        parts.append(f"made with {counted(lots, 'stock lot')}")
    text = ", ".join(parts)
    if lookups.period:
        first, last = (moment(t)[:10] for t in lookups.period)
        text += f"; {first} to {last}" if first != last else f"; {first}"
    return f"{text}. Each was compared with the pH that its recipe predicts."


def _stands_out(audit: Audit) -> str:
    outstanding = int((audit.status == "stands_out").sum())
    left = (
        f"{counted(outstanding, 'reading')} {'stands' if outstanding == 1 else 'stand'} out without a finding that "
        "explains it."
        if outstanding == 1
        else f"{counted(outstanding, 'reading')} stand out without a finding that explains them."
    )
    if not audit.findings:
        silence = "No fault is supported by the readings; smaller ones than the smallest detectable would not be seen."
        return f"{silence} {left}" if outstanding else silence
    named = [
        ", ".join(filter(None, (f"{plain(f.id)} {_lower(title(f))}", quantity(f), brief_since(f))))
        for f in audit.findings[:MOST_NAMED]
    ]
    more = len(audit.findings) - MOST_NAMED
    text = f"{counted(len(audit.findings), 'finding')}. {'; '.join(named)}"
    text += f"; and {more} more." if more > 0 else "."
    return f"{text} {left}" if outstanding else text


def _lower(text: str) -> str:
    return text[:1].lower() + text[1:]


def _read_next(audit: Audit) -> str:
    checks = [(f.id, f.next_check) for f in audit.findings if f.next_check]
    if not checks:
        return (
            "No reading is named for these findings."
            if audit.findings
            else "Nothing in particular; see the smallest detectable faults for what more readings would show."
        )
    first_id, first = checks[0]
    text = f"For {plain(first_id)}: {plain(first)}"
    if len(checks) > 1:
        text += f" {counted(len(checks) - 1, 'further check')} with the other findings."
    return text


def _not_checked(audit: Audit) -> str:
    parts = []
    if audit.not_testable:
        counts = Counter(f"{kind_words(s.kind)} of {s.subject_type}s" for s in audit.not_testable)
        words = [f"{what} ({number})" if number > 1 else _single(audit, what) for what, number in counts.most_common()]
        parts.append(f"Not testable: {listed(words, 4)}.")
    statuses = Counter(s for s in audit.status.tolist() if s in NO_EVIDENCE)
    if statuses:
        words = [f"{counted(n, 'reading')} {STATUSES[s]}" for s, n in statuses.most_common()]
        parts.append(f"Shown but no evidence: {listed(words, 6)}.")
    parts.append("pH cannot see a fault that leaves pH unchanged, such as both halves of a buffer off together.")
    return " ".join(parts)


def _single(audit: Audit, what: str) -> str:
    for silence in audit.not_testable:
        if f"{kind_words(silence.kind)} of {silence.subject_type}s" == what:
            return f"{kind_words(silence.kind)} of {subject_words(silence)}"
    return what


def _complete(audit: Audit) -> str:
    rows = audit.rows
    text = f"{rows['read']:,} rows read = {rows['used']:,} used + {rows['set_aside']:,} set aside"
    if not rows["set_aside"]:
        return f"{text}. Nothing was left out."
    share = 100 * rows["set_aside"] / max(rows["read"], 1)
    causes = Counter(s.code for s in audit.records.set_aside)
    words = [f"{_cause(code)} ({n:,})" for code, n in causes.most_common()]
    return f"{text} ({share:.1f} %): {listed(words, 5)}. Each is listed with its reason."


def _cause(code: str) -> str:
    return " ".join("pH" if word == "ph" else word for word in code.split("-"))
