"""One table of sentences: how each kind of finding is told. Consistent with, never proves."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime

from reconcile.auditor.proposals import Told
from reconcile.auditor.scoring import Candidate
from reconcile.records.rounding import chance_words, decimals_of, half_up, minus, signed

# {subject}, {size}, {interval}, {since}, {detail}, {direction} are filled; each sentence says what and how large
SENTENCES: Mapping[str, str] = {
    "meter_offset": "Meter {subject} reads {size} pH {direction}{interval}.",
    "meter_span": "Meter {subject} has an error of {size} pH per pH about a {detail}{interval}: it {direction} "
    "differences in pH.",
    "meter_drift": "Meter {subject} drifts {direction} by {size} pH a day{interval}{since}, {total} pH in all.",
    "meter_step": "Meter {subject} reads {size} pH {direction} than before{interval}{since}.",
    "meter_temperature": "Meter {subject} behaves as if its temperature compensation were {detail}.",
    "meter_stuck": "The display of meter {subject} stood at {size}{since} while the solutions changed.",
    "probe_matrix": "Meter {subject} reads {size} pH {direction}{interval} in one kind of solution only: {detail}.",
    "calibration_buffer": "Calibration buffer {subject} differs from its certified pH by {size}{interval}; every "
    "calibration made with it carries that error.",
    "lot_strength": "Lot {subject} has {size} times its stated strength{interval}.",
    "lot_identity": "Lot {subject} acts as {detail} would, not as its label says.",
    "batch_preparation": "Batch {subject} holds {size} times the stated amount of {detail}{interval}.",
    "recipe_slip": "The recipe of batch {subject} was probably misread: {detail}.",
    "reading_slip": "One reading of batch {batch} on meter {meter} (row {row}) is {size} pH {direction}{interval}"
    "{detail}.",
    "acid_constant": "The library's pKa of {subject} is off by {size}{interval} for every lot and meter here.",
    "carbon_dioxide": "{subject} holds carbon dioxide that its recipe does not: {detail}.",
    "record_value": "The record's own calculated pH of batch {subject} is off by {size}: {detail}.",
}
NAMES: Mapping[str, str] = {
    "meter_offset": "offset of meter {subject}",
    "meter_span": "span error of meter {subject}",
    "meter_drift": "drift of meter {subject}",
    "meter_step": "step of meter {subject}",
    "meter_temperature": "temperature compensation of meter {subject}",
    "meter_stuck": "stuck display of meter {subject}",
    "probe_matrix": "meter {subject} off in {detail} only",
    "calibration_buffer": "calibration buffer {subject} off its certified value",
    "lot_strength": "wrong strength of lot {subject}",
    "lot_identity": "{detail} in lot {subject}",
    "batch_preparation": "batch {subject} prepared with too much or too little {detail}",
    "recipe_slip": "misread recipe of batch {subject} ({detail})",
    "reading_slip": "one mistyped reading of batch {batch} on meter {meter} (row {row})",
    "acid_constant": "library constant of {subject} off",
    "carbon_dioxide": "carbon dioxide in {subject}",
    "record_value": "calculated pH of batch {subject} wrong",
}
SIGNED = ("calibration_buffer", "acid_constant", "meter_span", "record_value")
"""Kinds told with the sign of their size; the others say its direction in a word."""
DIRECTIONS: Mapping[str, tuple[str, str]] = {
    "meter_drift": ("up", "down"),
    "meter_step": ("higher", "lower"),
    "meter_span": ("exaggerates", "flattens"),
}


def number(value: float, digits: int = 3) -> str:
    """A size with three significant digits and no superfluous zeros; never a sign for zero."""
    if value == 0:
        return "0"
    return f"{value:.{digits}g}"


def date_words(moment: datetime) -> str:
    return moment.strftime("%Y-%m-%d")


def since_words(since: datetime | None, until: datetime | None, between: tuple[datetime, datetime] | None) -> str:
    """From when to when, with the interval of the onset."""
    if since is None:
        return " over the whole record"
    words = f" from {date_words(since)}"
    if until is not None:
        words += f" to {date_words(until)}"
    if between is not None and date_words(between[0]) != date_words(between[1]):
        words += f" (onset between {date_words(between[0])} and {date_words(between[1])})"
    return words


def fields_of(subject: str | tuple[str, ...]) -> dict[str, str]:
    """The subject as the templates name it."""
    if isinstance(subject, tuple):
        batch, meter, row = (*subject, "", "", "")[:3]
        return {
            "subject": f"batch {batch}, meter {meter or 'not named'}, row {row}",
            "batch": batch,
            "meter": meter or "not named",
            "row": row,
        }
    return {"subject": subject, "batch": subject, "meter": subject, "row": ""}


def short_name(kind: str, subject: str | tuple[str, ...], detail: str) -> str:
    """An explanation in a few words, for lists of rivals."""
    return _fill(NAMES[kind], {**fields_of(subject), "detail": detail})


def detail_of(told: Told) -> str:
    """What a told candidate is about beside its subject: a substance, a component, a kind of solution."""
    explains = told.would_explain or {}
    for name in ("substance", "component", "solutions", "slip"):
        if explains.get(name):
            return str(explains[name])
    return told.detail


def name_of(candidate: Candidate, amplitude: float) -> str:
    """A candidate in a few words."""
    name = short_name(candidate.kind, candidate.subject, detail_of(candidate.tell(amplitude)))
    return as_probe(name, candidate.subject) if candidate.subject_type == "probe" else name


def as_probe(words: str, subject: str | tuple[str, ...]) -> str:
    """Words about a meter, said of a probe."""
    return words.replace(f"Meter {subject}", f"Probe {subject}").replace(f"meter {subject}", f"probe {subject}")


def sentence(
    kind: str,
    subject: str | tuple[str, ...],
    estimate: float | None,
    interval: tuple[float, float] | None,
    since: str,
    detail: str,
    total: float | None,
) -> str:
    """What a finding says, and how large with its interval."""
    size, between = size_words(estimate, interval, kind in SIGNED)
    up, down = DIRECTIONS.get(kind, ("high", "low"))
    direction = "" if estimate is None else (up if estimate > 0 else down)
    if kind == "reading_slip":
        detail = f", consistent with {detail}" if detail else ", unexplained"
    return _fill(
        SENTENCES[kind],
        {
            **fields_of(subject),
            "size": size,
            "direction": direction,
            "interval": between,
            "since": since,
            "detail": detail,
            "total": "" if total is None else half_up(abs(total), 3),
        },
    )


def size_words(estimate: float | None, interval: tuple[float, float] | None, with_sign: bool) -> tuple[str, str]:
    """A size, and its interval in brackets, with the digits that the interval deserves.

    Without a sign a direction stands beside it; the interval is turned round with it, and shows the sign of an end that
    lies on the other side of zero.
    """
    if estimate is None:
        return "", ""
    turned = not with_sign and estimate < 0
    ends = None if interval is None else (-interval[1], -interval[0]) if turned else interval
    digits = decimals_of(ends)
    write = signed if with_sign else minus
    if ends is None:
        return write(number(estimate if with_sign else abs(estimate))), ""
    size = write(half_up(estimate if with_sign else abs(estimate), digits))
    return size, " (95 % interval {} to {})".format(*(write(half_up(end, digits)) for end in ends))


def _fill(template: str, values: Mapping[str, str]) -> str:
    for key, value in values.items():
        template = template.replace("{" + key + "}", value)
    return template


def support_words(p: float, readings: int, solutions: int, rivals: int) -> str:
    """How sure, on what, and whether the data can decide."""
    words = (
        f"It rests on {readings} reading{'s' * (readings != 1)} of {solutions} solution{'s' * (solutions != 1)}. "
        f"The chance that a clean record of this size shows anything as striking is {chance_words(p)}."
    )
    if rivals:
        words += (
            f" The readings are consistent with {rivals} other explanation{'s' * (rivals != 1)} too, "
            "which this record cannot tell from it."
        )
    return words
