"""Findings of an earlier report beside those of this one: new, persisting, gone. They match by kind and subject."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from reconcile.records.book import BatchRecords
    from reconcile.records.results import Finding

NEW, PERSISTS, GONE = "new", "persists", "gone"


@dataclass(frozen=True)
class Standing:
    """What became of one finding between two reports.

    what : "new", "persists" or "gone"
    now, then : the finding in this report and in the earlier one; None where it stands in one of them alone
    other : what stands in its place in the report that lacks it, "" for nothing known: "lot_identity of the same
        subject", "rival" (it is a rival of `beside` there), "absent" (its subject is not in this record)
    beside : id of the finding that `other` speaks of, in the report that lacks this one; "" where it speaks of none
    """

    what: str
    now: Finding | None
    then: Finding | None
    other: str = ""
    beside: str = ""


@dataclass(frozen=True)
class Before:
    """An earlier report: its id, the SHA-256 and the content of its findings.json, and what became of each finding."""

    report_id: str
    sha256: str
    content: bytes
    standings: tuple[Standing, ...]

    def of(self, what: str) -> list[Standing]:
        """Those that are new, persist, or are gone."""
        return [standing for standing in self.standings if standing.what == what]


Key = tuple[str, tuple[str, ...]]


def key(finding: Finding) -> Key:
    """What two findings have in common that are one over time."""
    return finding.kind, subject_key(finding)


def subject_key(finding: Finding) -> tuple[str, ...]:
    """The subject as a tuple, whatever its form."""
    return (finding.subject,) if isinstance(finding.subject, str) else tuple(str(part) for part in finding.subject)


def standings(now: Sequence[Finding], then: Sequence[Finding], records: BatchRecords) -> tuple[Standing, ...]:
    """What became of every finding of two reports: those of this one in their order, then those that are gone.

    now, then : of this report, and of the earlier one
    records : the record of this report; it tells whether a subject that is gone is still in it
    """
    left = list(then)
    pairs: list[tuple[Finding, Finding | None]] = []
    for finding in now:
        match = _match(finding, left, now)
        if match is not None:
            left.remove(match)
        pairs.append((finding, match))
    fresh = [finding for finding, match in pairs if match is None]
    found = []
    for finding, match in pairs:
        if match is not None:
            found.append(Standing(PERSISTS, finding, match))
        else:
            found.append(Standing(NEW, finding, None, *_instead(finding, left, then)))
    subjects = _subjects(records)
    for past in left:
        other, beside = _instead(past, fresh, now)
        if not other and not _is_in(past, subjects):
            other = "absent"
        found.append(Standing(GONE, None, past, other, beside))
    return tuple(found)


def _match(finding: Finding, then: Sequence[Finding], now: Sequence[Finding]) -> Finding | None:
    """The earlier finding of the same kind and subject; of a reading's, whose row may have moved, the only one left."""
    for past in then:
        if key(past) == key(finding):
            return past
    place = subject_key(finding)[:2]
    if len(subject_key(finding)) < 3:
        return None
    alike = [past for past in then if (past.kind, subject_key(past)[:2]) == (finding.kind, place)]
    rivals = [other for other in now if (other.kind, subject_key(other)[:2]) == (finding.kind, place)]
    return alike[0] if len(alike) == len(rivals) == 1 else None


def _instead(finding: Finding, unmatched: Sequence[Finding], every: Sequence[Finding]) -> tuple[str, str]:
    """What stands in a finding's place in the other report: another kind of the same subject, or it is a rival."""
    for other in unmatched:
        if subject_key(other) == subject_key(finding) and other.subject_type == finding.subject_type:
            return other.kind, other.id
    for other in every:
        if any(key(rival) == key(finding) for rival in other.rivals):
            return "rival", other.id
    return "", ""


def _subjects(records: BatchRecords) -> Mapping[str, set[str]]:
    readings = records.readings
    return {
        "meter": set(readings["meter"].tolist()),
        "probe": set(readings["probe"].tolist()),
        "batch": set(readings["batch"].tolist()),
        "reading": set(readings["batch"].tolist()) | set(readings["known"].tolist()),
        "lot": set(records.lots.name.tolist()),
    }


def _is_in(finding: Finding, subjects: Mapping[str, set[str]]) -> bool:
    """Whether a finding's subject is in the record; True where that cannot be told."""
    known = subjects.get(finding.subject_type)
    return known is None or subject_key(finding)[0] in known
