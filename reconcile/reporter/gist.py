"""The gist: five lines that answer what a reviewer asks first."""

from __future__ import annotations

import math
from collections import Counter
from dataclasses import dataclass

import numpy as np

from reconcile.records.results import Audit, Finding
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.plain import plain
from reconcile.reporter.previous import sentence
from reconcile.reporter.words import (
    STATUSES,
    brief_since,
    counted,
    explains_words,
    half_up,
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
    lead: str = ""
    items: tuple[tuple[str, str], ...] = ()
    """Where there is room, lead and items (finding id, words) stand in place of the text."""


def gist(audit: Audit, lookups: Lookups | None = None) -> list[Line]:
    """What was checked, what stands out, what to read next, what could not be checked, how complete.

    A sixth line where the audit is compared with an earlier report: what is new, persists, is gone.
    """
    lookups = lookups or Lookups(audit)
    return [
        Line("checked", "What was checked", _checked(audit, lookups)),
        _stands_out(audit, lookups),
        Line("read_next", "What to read next", _read_next(audit)),
        Line("not_checked", "What could not be checked", _not_checked(audit)),
        Line("complete", "How complete", _complete(audit)),
        *([Line("previous", "Since the previous report", sentence(audit.before))] if audit.before is not None else []),
    ]


def _distinct(values: object) -> int:
    return len({v for v in values if v})  # type: ignore[attr-defined]


def _checked(audit: Audit, lookups: Lookups) -> str:
    readings = audit.records.readings
    if not len(readings):
        count = len(audit.records.calibrations)
        held = f": the record holds {counted(count, 'calibration')}, which reconcile meters shows" if count else ""
        return f"No reading was compared with a prediction{held}."
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
    known = int(np.isfinite(audit.records.solutions.known_ph[audit.records.readings_solution]).sum())
    if not known:
        return f"{text}. Each was compared with the pH that its recipe predicts."
    if known == len(readings):
        return f"{text}. Each was compared with the certified pH of its known solution."
    return (
        f"{text}. Each was compared with the pH that its recipe predicts, {known:,} of known solutions with the "
        "certified pH."
    )


def _stands_out(audit: Audit, lookups: Lookups) -> Line:
    outstanding = int((audit.status == "stands_out").sum())
    left = (
        f"{counted(outstanding, 'reading')} {'stands' if outstanding == 1 else 'stand'} out without a finding that "
        f"explains {'it' if outstanding == 1 else 'them'}.{_of_known_solutions(audit)}"
    )
    wrong = len(lookups.calculations)
    calculated = (
        f"{counted(wrong, 'calculated pH', 'calculated pHs')} in the record {'is' if wrong == 1 else 'are'} off."
    )
    odd = int(audit.records.solved.odd.sum())
    implied = f"{counted(odd, 'implied amount')} of titrant {'is' if odd == 1 else 'are'} odd, which is a lead."
    if not outstanding:
        left = "No other reading stands out." if lookups.faults else ""
    after = [left] * bool(left) + [calculated] * bool(wrong) + [implied] * bool(odd)
    none = "No fault is supported by the readings" + ("." if outstanding else ", and no reading stands out by itself.")
    faults = [finding for _, finding in lookups.faults]
    if not faults:
        return Line("stands_out", "What stands out", " ".join([none, *after]))
    shown = faults[:MOST_NAMED]
    items = tuple((plain(f.id), in_few_words(f)) for f in shown)
    number, more = counted(len(faults), "finding"), len(faults) - len(shown)
    rest = " ".join([f"{more} more stand in the table of findings."] * (more > 0) + after)
    named = "; ".join(" ".join(item) for item in items)
    lead = f"{number}, most supported first." if len(shown) > 1 else f"{number}."
    return Line("stands_out", "What stands out", f"{number}: {named}. {rest}".strip(), f"{lead} {rest}".strip(), items)


def _of_known_solutions(audit: Audit) -> str:
    """Known solutions of which half of the readings or more stand out, three at least: the certificate may be wrong."""
    readings = audit.records.readings
    named = zip(readings["known"].tolist(), readings["known_lot"].tolist(), readings["batch"].tolist(), strict=True)
    names = [f"{name}, lot {lot}" if lot else name for name, lot, batch in named if not batch]
    out = audit.status[[i for i, batch in enumerate(readings["batch"].tolist()) if not batch]] == "stands_out"
    of_all, of_out = Counter(names), Counter(name for name, is_out in zip(names, out.tolist(), strict=True) if is_out)
    words = [
        f"{n:,} of the {of_all[name]:,} readings of the known solution {plain(name)}"
        for name, n in sorted(of_out.items())
        if name and n >= 3 and 2 * n >= of_all[name]
    ]
    return f" Among them are {listed(words, 3)}: its certificate or its bottle may be at fault." if words else ""


def in_few_words(finding: Finding) -> str:
    """A finding as the gist names it: "meter M-3: step, +0.104 pH, since 2025-04-03"."""
    meant = explains_words(finding) if finding.kind == "reading_slip" and finding.estimate is not None else ""
    words = ", ".join(filter(None, (title(finding), quantity(finding), meant, brief_since(finding))))
    return words[:1].lower() + words[1:]


def _read_next(audit: Audit) -> str:
    checks = [(plain(f.id), plain(f.next_check)) for f in audit.findings if f.next_check.startswith("Read ")]
    if not checks:
        if audit.findings:
            return "No reading of what already stands would tell more about these findings."
        return "Nothing in particular."
    text = f"For {checks[0][0]}: {checks[0][1]}"
    others = [ident for ident, _ in checks[1:]]
    if not others:
        return text
    rest = (
        f"The checks for {listed(others, MOST_NAMED)} stand" if len(others) > 1 else f"The check for {others[0]} stands"
    )
    return f"{text} {rest} in {'their sections' if len(others) > 1 else 'its section'}."


def _not_checked(audit: Audit) -> str:
    parts = []
    if audit.not_testable:
        counts = Counter(f"{kind_words(s.kind)} of {s.subject_type}s" for s in audit.not_testable)
        words = [f"{what} ({number})" if number > 1 else _single(audit, what) for what, number in counts.most_common()]
        parts.append(f"Not testable: {listed(words, 4)}.")
    statuses = Counter(s for s in audit.status.tolist() if s in NO_EVIDENCE)
    if statuses:
        words = [f"{counted(n, 'reading')} {STATUSES[s]}" for s, n in statuses.most_common()]
        parts.append(f"Shown, but no evidence by themselves: {listed(words, 6)}.")
    parts.append("pH cannot see a fault that leaves pH unchanged, such as both halves of a buffer off together.")
    parts.append(silence_in_numbers(audit))
    return " ".join(filter(None, parts))


def silence_in_numbers(audit: Audit) -> str:
    """What silence means: the smallest offset of the meters and strength error of the lots that would have shown."""
    words = []
    offsets, strengths = (_sizes(audit, kind) for kind in ("meter_offset", "lot_strength"))
    if offsets:
        words.append(f"a meter offset of {_range(offsets, 3)} pH ({counted(len(offsets), 'meter')})")
    if strengths:
        percent = [100.0 * (max(size, 1.0 / size) - 1.0) for size in strengths]
        words.append(f"a strength {_range(percent, 1)} % off ({counted(len(strengths), 'lot')})")
    if not words:
        return ""
    powers = {s.power for s in audit.smallest_detectable if s.power is not None}
    how_often = f" in {half_up(100 * min(powers), 0)} of 100 such records" if powers else ""
    return f"Smallest faults that would have shown{how_often}: {' and '.join(words)}. Smaller ones may be there unseen."


def _sizes(audit: Audit, kind: str) -> list[float]:
    known = [float(s.size) for s in audit.smallest_detectable if s.kind == kind and s.size is not None]
    return [size for size in known if math.isfinite(size) and size > 0]


def _range(values: list[float], decimals: int) -> str:
    """Smallest to largest, one figure where both round to it."""
    return " to ".join(dict.fromkeys(half_up(value, decimals) for value in (min(values), max(values))))


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
