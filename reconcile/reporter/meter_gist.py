"""The gist of meters through time: what a reviewer asks first, for page, terminal and JSON."""

from __future__ import annotations

from collections import Counter

import numpy as np

from reconcile.records.meter_results import QUANTITIES, WHOLE_RECORD, Crossing, MeterHistory
from reconcile.reporter.gist import Line
from reconcile.reporter.meter_tables import beyond, outside_words
from reconcile.reporter.plain import plain
from reconcile.reporter.words import brief_since, counted, half_up, listed, minus, moment, quantity, signed, title

MOST = 6
NO_LEAVE = "A date of crossing does not extend a calibration interval; site procedure says when a meter is calibrated."
BY_CHANCE = "By chance one interval in twenty leaves zero out."


def meter_gist(history: MeterHistory) -> list[Line]:
    """What was looked at, what lies outside, what is coming, what changed, how the meters agree, what is not shown."""
    return [
        Line("looked_at", "What was looked at", _looked_at(history)),
        Line("outside", "Outside the limits", _outside(history)),
        Line("crossings", "Lines and limits", _crossings(history)),
        Line("steps", "Steps and findings", _steps(history)),
        Line("between", "Between calibrations", _between(history)),
        Line("agreement", "Agreement", _agreement(history)),
        Line("not_shown", "What could not be shown", _not_shown(history)),
        Line("complete", "How complete", _complete(history)),
    ]


def _looked_at(history: MeterHistory) -> str:
    table = history.records.calibrations
    parts = [counted(len(table), "calibration")]
    if len(history.records.readings):
        parts.append(counted(len(history.records.readings), "reading"))
    names = counted(len(history.meters), "meter")
    if history.probes:
        names += f" and {counted(len(history.probes), 'probe')}"
    text = f"{' and '.join(parts)} of {names}"
    times = np.concatenate([table["calibrated_at"], history.records.readings["read_at"]])
    known = times[~np.isnat(times)]
    return f"{text}; {moment(known.min())[:10]} to {moment(known.max())[:10]}." if len(known) else f"{text}."


def _outside(history: MeterHistory) -> str:
    table = history.records.calibrations
    if not len(table):
        return "The record holds no calibrations."
    counts: Counter[tuple[str, str]] = Counter()
    for i in range(len(table)):
        for what in filter(None, outside_words(history, i).split("; ")):
            counts[(plain(str(table["meter"][i])), what)] += 1
    if not counts:
        return "No calibration lies outside the limits of the settings."
    words = [f"meter {meter or 'not named'}, {what} in {n:,}" for (meter, what), n in sorted(counts.items())]
    return _capital(f"{listed(words, MOST)}.")


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]


def _crossings(history: MeterHistory) -> str:
    lines = [x for x in history.lines if not x.reason]
    if not lines:
        return "No line could be drawn." if history.lines else "There are no calibrations to draw a line through."
    judged = [x for x in history.crossings if x.limit.judged]
    crossed = [x for x in judged if not x.ahead]
    ahead = sorted((x for x in judged if x.ahead and not np.isnat(x.at)), key=lambda x: x.at)
    parts = []
    if crossed:
        parts.append(f"Beyond by the line: {listed([_crossing(x) for x in crossed], MOST)}.")
    if ahead:
        more = f", and {len(ahead) - 3} more." if ahead[3:] else "."
        parts.append(f"Ahead, soonest first: {listed([_crossing(x) for x in ahead[:3]])}{more}")
    if not parts:
        parts.append("No line is known to reach a limit within twice the length of its calibrations.")
    return " ".join([*parts, NO_LEAVE])


def _crossing(crossing: Crossing) -> str:
    """One crossing in few words."""
    bound = f"{minus(f'{crossing.limit.value:g}')} {QUANTITIES[crossing.quantity]}"
    when = "" if np.isnat(crossing.at) else f" about {moment(crossing.at)[:10]}"
    return f"{crossing.subject_type} {plain(crossing.subject)}, {crossing.quantity} {bound}{when}"


def _steps(history: MeterHistory) -> str:
    words = [
        f"{x.subject_type} {plain(x.subject)}, {x.quantity} {signed(half_up(x.size, 1))} {QUANTITIES[x.quantity]} "
        f"between {moment(x.earliest)[:10]} and {moment(x.latest)[:10]}"
        for x in history.calibration_steps
    ]
    parts = [f"Unlogged steps: {listed(words, MOST)}."] if words else []
    found = [", ".join(filter(None, (title(f), quantity(f), brief_since(f)))) for f in history.findings]
    if found:
        parts.append(f"From the readings: {listed(found, MOST)}.")
    if not parts:
        return "No unlogged step between calibrations, and no finding about a meter, probe or calibration buffer."
    return " ".join(parts)


def _between(history: MeterHistory) -> str:
    known = [b for b in history.between if not b.reason]
    if not known:
        return "No meter has enough dated readings after a recorded calibration."
    moved = [b for b in known if b.interval95[0] > 0 or b.interval95[1] < 0]
    if not moved:
        return (
            f"None of {counted(len(known), 'meter')} moves with the days since its calibration as far as can be told."
        )
    words = [
        f"meter {plain(b.meter)}, {signed(half_up(b.rate, 4))} pH/day "
        f"({' to '.join(signed(half_up(v, 4)) for v in b.interval95)})"
        for b in sorted(moved, key=lambda b: -abs(b.rate))
    ]
    of = counted(len(known), "meter")
    return f"The 95 % interval leaves zero out for {listed(words, MOST)}, of {of}. {BY_CHANCE}"


def _agreement(history: MeterHistory) -> str:
    if not history.agreement:
        return "Not computed; see below."
    whole = [c for c in history.agreement if c.solution == WHOLE_RECORD]
    words = []
    for c in whole:
        if abs(c.h) > c.h_1:
            words.append(f"h of meter {plain(c.meter)} {signed(half_up(c.h, 2))} (1 % value {half_up(c.h_1, 2)})")
        if c.k > c.k_1:
            words.append(f"k of meter {plain(c.meter)} {half_up(c.k, 2)} (1 % value {half_up(c.k_1, 2)})")
    text = (
        f"On the whole record, beyond the 1 % value: {listed(words, MOST)}."
        if words
        else "On the whole record no h or k lies beyond its 1 % value."
    )
    single = [c for c in history.agreement if c.solution != WHOLE_RECORD]
    if single:
        out = sum(beyond(c) for c in single)
        tested = sum(np.isfinite(c.h) for c in single) + sum(np.isfinite(c.k) for c in single)
        text += (
            f" On single solutions {out} of {len(single)} meters are beyond in h or k, where chance alone gives about "
            f"{half_up(0.01 * tested, 1)}."
        )
    return text


def _not_shown(history: MeterHistory) -> str:
    if not history.not_shown:
        return "Nothing was left out for want of data."
    return " ".join(f"{_capital(what)}: {why}." for what, why in history.not_shown)


def _complete(history: MeterHistory) -> str:
    rows = history.rows
    if not rows["read"]:
        return "The files hold no rows of readings."
    return "{read:,} rows of readings read = {used:,} used + {set_aside:,} set aside.".format(**rows)
