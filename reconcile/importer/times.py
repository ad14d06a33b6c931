"""One column of dates and times: the order of day and month is settled by the whole column, never by a guess."""

from __future__ import annotations

import re
from collections.abc import Sequence
from datetime import date, datetime, time, timedelta
from typing import Any

import numpy as np

from reconcile.importer.cells import MARKER_CODES, MISSING, Fault, Parsed, as_text
from reconcile.importer.raw import Marker
from reconcile.records.arrays import AnyArray
from reconcile.records.settings import Settings

_CLOCK = r"(?:[T ,]+(\d{1,2}):(\d{2})(?::(\d{2})(?:[.,](\d{1,6}))?)?\s*([AaPp]\.?[Mm]\.?)?)?"
_ISO = re.compile(r"(\d{4})[-/.](\d{1,2})[-/.](\d{1,2})" + _CLOCK)
_NUMERIC = re.compile(r"(\d{1,2})([-/.])(\d{1,2})\2(\d{4})" + _CLOCK)
_NAMED = re.compile(r"(\d{1,2})[- .]*([A-Za-z]{3,9})\.?[-, ]*(\d{4})" + _CLOCK)
_NAMED_FIRST = re.compile(r"([A-Za-z]{3,9})\.? +(\d{1,2}),? +(\d{4})" + _CLOCK)
_ZONE = re.compile(r"(?:Z|[+-]\d{2}:?\d{2}|UTC|GMT)$")
_SHORT_YEAR = re.compile(r"\d{1,2}[-/.]\d{1,2}[-/.]\d{2}(?!\d)|\d{1,2}[- ][A-Za-z]{3,9}[- ]\d{2}(?!\d)")
_ONLY_CLOCK = re.compile(r"(\d{1,2}):(\d{2})(?::(\d{2}))?\s*([AaPp]\.?[Mm]\.?)?")
_MONTHS = {
    name[:length]: i + 1
    for i, name in enumerate(
        (
            "january", "february", "march", "april", "may", "june", "july", "august", "september", "october",
            "november", "december",
        )
    )
    for length in (3, 4, len(name))
}  # fmt: skip
_DAY_ZERO = datetime(1899, 12, 30)
_DAY_ZERO_1904 = datetime(1904, 1, 1)
_SECOND = np.timedelta64(1, "s")


def parse_times(cells: Sequence[Any], settings: Settings, epoch_1904: bool = False) -> Parsed:
    """A column of local wall times as datetime64[s], NaT where missing.

    Text dates among real ones are a question too: the spreadsheet has then turned some of a column into dates, and may
    have taken the day for the month in them.
    """
    n = len(cells)
    kinds = set(map(type, cells))
    if kinds == {datetime}:
        seconds = np.array([(v - _DAY_ZERO).total_seconds() for v in cells])
        return Parsed(np.datetime64(_DAY_ZERO, "s") + np.floor(seconds + 0.5).astype("timedelta64[s]"))
    if kinds <= {datetime, date}:
        return Parsed(_rounded(np.array(cells, "datetime64[us]")))
    moments = np.full(n, np.datetime64("NaT", "us"), "datetime64[us]")
    parsed = Parsed(moments)
    real = np.fromiter((type(v) in (datetime, date) for v in cells), bool, n)
    if real.any():
        moments[real] = np.array([v for v in cells if type(v) in (datetime, date)], "datetime64[us]")
    ways = (settings["reading.two_digit_years"], settings["reading.time_zone"])
    texts = {v: _as_agreed(v, *ways) for v in cells if type(v) is str}
    wanted = settings["reading.date_order"]
    order = _order(set(texts.values()), wanted)
    if wanted == "auto" and real.any():
        order = "mixed"
    meaning = {t: _from_text(t, bare, order) for t, bare in texts.items()}
    serials: list[int] = []
    marks: list[int] = []
    for i in np.flatnonzero(~real).tolist():
        v = cells[i]
        if type(v) is str:
            found = meaning[v]
            if isinstance(found, Fault):
                parsed.bad[i] = found
                if found.code == "date-order-unclear":
                    parsed.open_choice.setdefault("date_order", []).append(i)
                elif found.code in ("year-short", "time-zone"):
                    parsed.open_choice.setdefault(found.code, []).append(i)
            elif found is not None:
                moments[i] = np.datetime64(found, "us")
            elif v.strip():
                marks.append(i)
        elif type(v) in (float, int):
            if 61 <= v < 2958466:
                moments[i] = np.datetime64((_DAY_ZERO_1904 if epoch_1904 else _DAY_ZERO) + timedelta(days=v), "us")
                serials.append(i)
            else:
                parsed.bad[i] = Fault("time-not-a-time", as_text(v))
        elif isinstance(v, Marker):
            if v.kind != "covered":
                parsed.bad[i] = Fault(MARKER_CODES.get(v.kind, "time-not-a-time"), v.text)
        elif isinstance(v, (time, timedelta)):
            parsed.bad[i] = Fault("time-without-date", as_text(v))
        else:
            parsed.bad[i] = Fault("time-not-a-time", as_text(v))
    for code, rows in (("serial-date", serials), ("missing-mark", marks)):
        if rows:
            parsed.notes.append((code, rows[0], as_text(cells[rows[0]]), (("count", str(len(rows))),)))
    parsed.values = _rounded(moments)
    return parsed


def _rounded(moments: AnyArray) -> AnyArray:
    """To the nearest second: a spreadsheet keeps fractions of a day, so 11:30 may be stored as 11:29:59.9995."""
    return (moments + np.timedelta64(500_000, "us")).astype("datetime64[s]")


def parse_clocks(cells: Sequence[Any]) -> Parsed:
    """A column of times of day as timedelta64[s], NaT where missing; its date stands in another column."""
    n = len(cells)
    values = np.full(n, np.timedelta64("NaT", "s"), "timedelta64[s]")
    parsed = Parsed(values)
    for i, v in enumerate(cells):
        if isinstance(v, Marker) and v.kind == "duration":
            v = v.value
        if isinstance(v, time):
            values[i] = v.hour * 3600 + v.minute * 60 + v.second + (v.microsecond >= 500_000)
        elif isinstance(v, datetime):
            values[i] = v.hour * 3600 + v.minute * 60 + v.second
        elif isinstance(v, timedelta):
            values[i] = round(v.total_seconds())
        elif type(v) in (float, int) and 0 <= v < 1:
            values[i] = round(v * 86400)
        elif type(v) is str:
            if v.strip().casefold() in MISSING:
                continue
            clock = _ONLY_CLOCK.fullmatch(v.strip())
            seconds = _seconds(clock.group(1), clock.group(2), clock.group(3), clock.group(4)) if clock else None
            if seconds is None:
                parsed.bad[i] = Fault("time-not-a-time", v)
            else:
                values[i] = seconds
        elif not (isinstance(v, Marker) and v.kind == "covered"):
            parsed.bad[i] = Fault("time-not-a-time", as_text(v))
    return parsed


def _order(texts: set[str], wanted: str) -> str:
    """ "day-month", "month-day", "both" where cells contradict each other, "" where none tells."""
    if wanted != "auto":
        return wanted
    sure = set()
    for text in texts:
        match = _NUMERIC.fullmatch(text.strip())
        if match:
            first, second = int(match.group(1)), int(match.group(3))
            if first > 12 >= second:
                sure.add("day-month")
            elif second > 12 >= first:
                sure.add("month-day")
    return "both" if len(sure) == 2 else next(iter(sure), "")


def _seconds(hour: str | None, minute: str | None, second: str | None, half: str | None) -> int | None:
    h, m, s = int(hour or 0), int(minute or 0), int(second or 0)
    if half:
        if not 1 <= h <= 12:
            return None
        h = h % 12 + (12 if half[0] in "pP" else 0)
    return h * 3600 + m * 60 + s if h < 24 and m < 60 and s < 60 else None


def _moment(year: int, month: int, day: int, clock: tuple[Any, ...]) -> datetime | None:
    hour, minute, second, fraction, half = clock
    seconds = _seconds(hour, minute, second, half)
    if seconds is None:
        return None
    try:
        moment = datetime(year, month, day) + timedelta(seconds=seconds)
    except ValueError:
        return None
    return moment + timedelta(microseconds=int((fraction or "0").ljust(6, "0")))


def _as_agreed(text: str, short_years: str, zones: str) -> str:
    """A text with its spaces tidied, its zone dropped and its century filled in where the settings say so."""
    bare = " ".join(text.replace("\u00a0", " ").split())
    if zones == "ignore" and re.match(r"\d{4}-", bare):
        bare = _ZONE.sub("", bare).strip()
    if short_years == "2000" and (short := _SHORT_YEAR.match(bare)):
        bare = f"{bare[: short.end() - 2]}20{bare[short.end() - 2 :]}"
    return bare


def _from_text(text: str, bare: str, order: str) -> datetime | Fault | None:
    if bare.casefold() in MISSING:
        return None
    bad = Fault("time-not-a-time", text)
    if match := _ISO.fullmatch(bare):
        return _moment(int(match[1]), int(match[2]), int(match[3]), match.groups()[3:]) or bad
    if match := _NUMERIC.fullmatch(bare):
        first, second, year = int(match[1]), int(match[3]), int(match[4])
        if (first != second and order in ("", "both") and max(first, second) <= 12) or order == "mixed":
            return Fault("date-order-unclear", text)
        day_first = order == "day-month" or (order != "month-day" and first > 12) or first == second
        if order == "both" and first > 12:
            day_first = True
        day, month = (first, second) if day_first else (second, first)
        return _moment(year, month, day, match.groups()[4:]) or bad
    if match := _NAMED.fullmatch(bare):
        month = _MONTHS.get(match[2].casefold(), 0)
        return (_moment(int(match[3]), month, int(match[1]), match.groups()[3:]) if month else None) or bad
    if match := _NAMED_FIRST.fullmatch(bare):
        month = _MONTHS.get(match[1].casefold(), 0)
        return (_moment(int(match[3]), month, int(match[2]), match.groups()[3:]) if month else None) or bad
    if _ONLY_CLOCK.fullmatch(bare):
        return Fault("time-without-date", text)
    if _ZONE.search(bare) and re.match(r"\d{4}-", bare):
        return Fault("time-zone", text)
    if _SHORT_YEAR.match(bare):
        return Fault("year-short", text)
    return bad
