"""Words and figures for what the auditor returns as codes and numbers: one place for page, workbook and terminal."""

from __future__ import annotations

import math
from collections.abc import Mapping
from datetime import datetime
from typing import Any

import numpy as np

from reconcile.records.results import COULD_ALSO_BE, Finding, Silence
from reconcile.records.rounding import chance_words, decimals_of
from reconcile.records.rounding import half_up as half_up  # the reporter takes its words from here
from reconcile.records.rounding import minus as minus
from reconcile.records.rounding import signed as signed
from reconcile.records.rounding import significant as significant
from reconcile.reporter.plain import plain

KINDS: Mapping[str, str] = {
    "meter_offset": "offset",
    "meter_span": "span error",
    "meter_drift": "drift",
    "meter_step": "step",
    "meter_temperature": "temperature fault",
    "meter_stuck": "stuck display",
    "probe_matrix": "error in one kind of solution",
    "calibration_buffer": "wrong calibration buffer",
    "lot_strength": "strength",
    "lot_identity": "another substance",
    "batch_preparation": "preparation",
    "recipe_slip": "recipe slip",
    "reading_slip": "reading slip",
    "acid_constant": "ionization constant",
    "carbon_dioxide": "carbon dioxide",
    "record_value": "calculated pH in the record",
}
STATUSES: Mapping[str, str] = {
    "as_predicted": "as predicted",
    "stands_out": "stands out",
    "explained": "explained",
    "adjusted": "adjusted",
    "outside_model": "outside model",
    "outside_electrode_range": "outside electrode range",
    "unbuffered": "unbuffered",
    "void": "void",
    "not_solved": "not solved",
}
STATUS_MEANINGS: Mapping[str, str] = {
    "as_predicted": "within the spread of a clean record",
    "stands_out": "further from the prediction than the settings' multiple of the full spread of a clean record",
    "explained": "would stand out, but a finding accounts for it",
    "adjusted": "brought to target on this meter with an unwritten amount; no evidence by itself",
    "outside_model": "ionic strength beyond the range of the activity model",
    "outside_electrode_range": "outside the range in which the glass electrode is reliable",
    "unbuffered": "too little buffer capacity for the reading to say anything about a meter or a lot",
    "void": "marked void in the record; kept and shown, no evidence",
    "not_solved": "no prediction was reached",
}
EVERY = "all"
"""Subject of a silence that is about every meter, named or not."""
TIMELESS = ("reading", "batch", "acid", "lot", "buffer")
"""Subjects of which "throughout the record" would say nothing."""


def moment(when: datetime | np.datetime64 | None, seconds: bool = False) -> str:
    """A time as ISO date, with the time of day where there is one; "" for none."""
    if when is None or (isinstance(when, np.datetime64) and np.isnat(when)):
        return ""
    text = str(when.astype("datetime64[s]")) if isinstance(when, np.datetime64) else when.isoformat(timespec="seconds")
    if seconds:
        return text
    date, _, time = text.partition("T")
    return date if time == "00:00:00" else f"{date} {time[:5]}"


def kind_words(kind: str) -> str:
    """A fault kind in words."""
    return KINDS.get(kind, plain(kind).replace("_", " "))


def subject_words(finding: Finding | Silence) -> str:
    """What is concerned: "meter M-3", "lot A-17", "reading of batch B-9 on meter M-3, row 12"."""
    subject, what = finding.subject, finding.subject_type
    if isinstance(finding, Silence) and subject == EVERY:
        return f"every {what}"
    if isinstance(subject, str):
        return f"{what} {plain(subject)}".strip()
    parts = [plain(str(part)) for part in subject]
    if what == "reading" and len(parts) == 3:
        batch, meter, row = parts
        return f"reading of batch {batch}" + (f" on meter {meter}" if meter else "") + f", row {row}"
    return f"{what} {', '.join(parts)}".strip()


def title(finding: Finding) -> str:
    """Heading of a finding, without its id."""
    words = f"{subject_words(finding)}: {kind_words(finding.kind)}"
    return words[:1].upper() + words[1:]


def unit_words(unit: str) -> str:
    """A unit as it follows a number."""
    return "" if unit in ("", "-", "1") else plain(unit)


def _decimals(finding: Finding) -> int:
    """Digits after the point that the interval deserves: two of its width, and three at least for a pH or a factor."""
    return decimals_of(finding.interval95, 3 if finding.unit == "factor" or _is_difference(finding.unit) else 0)


def _is_difference(unit: str) -> bool:
    return unit.startswith("p")  # pH, pH/day, pH per pH, pKa


def _number(value: float, finding: Finding) -> str:
    text = half_up(value, _decimals(finding)) if finding.interval95 else f"{value:.3g}"
    return signed(text) if _is_difference(finding.unit) else minus(text)


def quantity(finding: Finding) -> str:
    """An estimate with its unit: differences with their sign, as many decimals as the interval deserves."""
    if finding.estimate is None or not math.isfinite(finding.estimate):
        return explains_words(finding)
    name = unit_words(finding.unit)
    if name in ("", "factor"):
        return f"{_number(finding.estimate, finding)} times as stated"
    return f"{_number(finding.estimate, finding)} {name}"


def brief_since(finding: Finding) -> str:
    """The day it began, without interval; "" for the whole record."""
    return f"since {moment(finding.since)[:10]}" if finding.since is not None else ""


def interval(finding: Finding) -> str:
    """The 95 % interval of an estimate; "" when there is none."""
    if finding.interval95 is None or not all(math.isfinite(v) for v in finding.interval95):
        return ""
    return " to ".join(_number(v, finding) for v in finding.interval95)


def size_words(finding: Finding) -> str:
    """How large, with the interval; what would explain it where no size is estimated."""
    between = interval(finding)
    return (quantity(finding) or "no size is estimated") + (f" (95 % interval {between})" if between else "")


def since_words(finding: Finding) -> str:
    """Since when, until when; "" where time does not come into it."""
    words = []
    if finding.since is not None:
        words.append(f"since {moment(finding.since)}")
        if finding.since_interval95 is not None:
            low, high = (moment(t) for t in finding.since_interval95)
            if low != high:
                words.append(f"(95 % interval {low} to {high})")
    if finding.until is not None:
        words.append(f"until {moment(finding.until)}")
    if words or finding.subject_type in TIMELESS:
        return " ".join(words)
    return "throughout the record"


def lead(finding: Finding) -> str:
    """A finding's own words, without the sentence that names its rivals: they are listed beside it."""
    return plain(finding.text.partition(COULD_ALSO_BE)[0] if finding.rivals else finding.text).strip()


def unsaid(finding: Finding) -> list[tuple[str, str]]:
    """Name and text of each fact about a finding that its own words leave out."""
    text = finding.text
    facts = []
    if finding.estimate is not None and _number(abs(finding.estimate), finding).lstrip("+") not in text:
        facts.append(("How large", size_words(finding)))
    explains = [words for value, words in explains_parts(finding) if value not in text]
    if explains:
        facts.append(("Would explain it", "; ".join(explains)))
    when = since_words(finding)
    dates = [moment(t)[:10] for t in (finding.since, finding.until) if t is not None]
    if when and dates and not all(date in text for date in dates):
        facts.append(("When", when))
    if finding.also:
        facts.append(("Acts the same in pH", listed([plain(a) for a in finding.also], 8)))
    chance = chance_words(finding.family_wise_p)
    if chance not in text:
        facts.append(("Family-wise p", chance))
    facts.append(("Log-likelihood gain", half_up(finding.log_likelihood_gain, 1)))
    return facts


def rival_words(finding: Finding, rival: Finding) -> str:
    """A rival in few words: its kind, and its subject where that is another one."""
    what = title(rival) if rival.subject != finding.subject else kind_words(rival.kind)
    explains = explains_words(rival)
    return f"{what} ({explains})" if explains else what


EXPLAINS: Mapping[str, str] = {
    "substance": "acts as {}",
    "factor": "{} times the amount",
    "component": "in the amount of {}",
    "total": "{} pH in all",
    "offset": "an offset of {} pH",
    "step": "a step of {} pH",
    "span": "{} pH per pH",
    "pivot": "about pH {}",
    "pH": "pH {}",
    "pKa_shift": "pKa shifted by {}",
    "temperature": "compensation at {} °C",
    "solutions": "in {}",
    "slip": "{}",
}
"""What would explain a finding, by the key of findings.json; other keys are written as they are."""
DIFFERENCES = ("total", "offset", "step", "span", "pKa_shift")
SAME_AS_ESTIMATE = ("offset", "step", "factor", "pKa_shift", "pH", "temperature")


def explains_parts(finding: Finding) -> list[tuple[str, str]]:
    """What would explain it, where that says more than the estimate: value, and value in words."""
    explains = finding.would_explain or {}
    if set(explains) <= set(SAME_AS_ESTIMATE) and len(explains) == 1 and finding.estimate is not None:
        return []
    parts = []
    for key, value in explains.items():
        if value is None:
            continue
        text = _value(value, key in DIFFERENCES)
        if key == "pH" and finding.kind == "reading_slip":
            words = f"pH {text} meant"
        else:
            words = EXPLAINS[key].format(text) if key in EXPLAINS else f"{plain(str(key)).replace('_', ' ')} {text}"
        parts.append((text.lstrip("+−"), words))
    return parts


def explains_words(finding: Finding) -> str:
    """What would explain it, where that says more than the estimate: "acts as formic acid"."""
    return "; ".join(words for _, words in explains_parts(finding))


def _value(value: Any, difference: bool) -> str:
    if isinstance(value, (list, tuple)):
        return listed([_value(v, difference) for v in value])
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return plain(str(value))
    number = float(value)
    text = f"{number:.3g}" if abs(number) < 1000 else half_up(number, 0)
    return signed(text) if difference else minus(text)


def silence_words(silence: Silence) -> str:
    """The smallest fault that would have been seen, as a size."""
    if silence.size is None or not math.isfinite(silence.size):
        return "none of any size"
    name = unit_words(silence.unit)
    if name in ("", "factor"):
        return f"a factor of {half_up(silence.size, 3)}"
    return f"{significant(silence.size, 2)} {name}"


def counted(number: int, one: str, many: str = "") -> str:
    """A count with its noun: "1 reading", "1,204 readings"."""
    return f"{number:,} {one if number == 1 else many or one + 's'}"


def listed(words: list[str], most: int = 6) -> str:
    """A list in a sentence, cut when long: "a, b and c", "a, b, c and 4 more"."""
    if len(words) > most:
        return f"{', '.join(words[:most])} and {len(words) - most:,} more"
    return " and ".join(filter(None, [", ".join(words[:-1]), words[-1]])) if words else ""
