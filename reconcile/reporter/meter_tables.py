"""Tables of meters and probes through time, described once for the CSV files and the page."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from reconcile.records.meter_results import QUANTITIES, WHOLE_RECORD, Agreement, Crossing, MeterHistory
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import SET_ASIDE, Column, Table, set_aside_rows, table_of

CALIBRATIONS: tuple[Column, ...] = (
    Column("source", "Source", width=18),
    Column("sheet", "Sheet", width=12),
    Column("row", "Row", "integer", 0, width=7),
    Column("meter", "Meter", width=10),
    Column("probe", "Probe", width=10),
    Column("calibrated_at", "Calibrated at", "time", width=17),
    Column("slope_percent", "Slope (%)", "number", 1),
    Column("offset_mV", "Offset (mV)", "number", 1, signed=True),
    Column("temperature_C", "Temperature (°C)", "number", 1, brief="t (°C)"),
    Column("buffer_lots", "Buffer lots", width=18),
    Column("as_found_pH", "As-found check (pH)", "number", 2),
    Column("outside", "Outside the limits", width=24),
)
LINES: tuple[Column, ...] = (
    Column("subject", "Subject", width=12),
    Column("subject_type", "Kind", width=8),
    Column("probe", "Probe", width=10),
    Column("quantity", "Quantity", width=10),
    Column("unit", "Unit", width=6),
    Column("begun_by", "Begun by", width=26),
    Column("first", "First calibration", "time", width=17),
    Column("last", "Last calibration", "time", width=17),
    Column("calibrations", "Calibrations", "integer", 0),
    Column("outside", "Outside the limits", "integer", 0),
    Column("at_last", "Line at the last calibration", "number", 1, brief="Line at last"),
    Column("rate_30d", "Rate in 30 days", "number", 2, signed=True),
    Column("rate_low", "95 % interval from", "number", 2, signed=True),
    Column("rate_high", "to", "number", 2, signed=True),
    Column("robust_30d", "Theil–Sen rate in 30 days", "number", 2, signed=True),
    Column("robust_low", "Theil–Sen 95 % from", "number", 2, signed=True, brief="from"),
    Column("robust_high", "Theil–Sen to", "number", 2, signed=True, brief="to"),
    Column("sd", "SD about the line", "number", 2),
    Column("reason", "Why there is no line", width=40),
)
CROSSINGS: tuple[Column, ...] = (
    Column("subject", "Subject", width=12),
    Column("subject_type", "Kind", width=8),
    Column("probe", "Probe", width=10),
    Column("quantity", "Quantity", width=10),
    Column("limit", "Limit", "number", 1, signed=False),
    Column("unit", "Unit", width=6),
    Column("counted", "Counted by", width=12),
    Column("at", "Line crosses", "time", width=17),
    Column("earliest", "95 % interval from", "time", width=17),
    Column("latest", "95 % interval to", "time", width=17),
    Column("ahead", "Seen from the last calibration", width=12),
    Column("text", "In words", width=60),
)
STEPS: tuple[Column, ...] = (
    Column("subject", "Subject", width=12),
    Column("subject_type", "Kind", width=8),
    Column("probe", "Probe", width=10),
    Column("quantity", "Quantity", width=10),
    Column("unit", "Unit", width=6),
    Column("size", "Step", "number", 2, signed=True),
    Column("size_low", "95 % interval from", "number", 2, signed=True),
    Column("size_high", "to", "number", 2, signed=True),
    Column("earliest", "Between", "time", width=17),
    Column("latest", "and", "time", width=17),
    Column("family_wise_p", "Family-wise p (–)", "number"),
)
METERS: tuple[Column, ...] = (
    Column("meter", "Meter", width=12),
    Column("calibrations", "Calibrations", "integer", 0),
    Column("outside", "Outside the limits", "integer", 0),
    Column("readings", "Readings, evidence", "integer", 0),
    Column("noise", "Noise, SD (pH)", "number", 4),
    Column("noise_low", "Noise, 95 % from", "number", 4, brief="95 % from"),
    Column("noise_high", "Noise, to", "number", 4, brief="to"),
    Column("between_rate", "Between calibrations (pH/day)", "number", 4, signed=True),
    Column("between_low", "Between calibrations, 95 % from", "number", 4, signed=True, brief="95 % from"),
    Column("between_high", "Between calibrations, to", "number", 4, signed=True, brief="to"),
    Column("mean", "Mean deviation (pH)", "number", 3, signed=True),
    Column("from_centre", "From the meters’ robust centre (pH)", "number", 3, signed=True),
    Column("remark", "Remark", width=44),
)
AGREEMENT: tuple[Column, ...] = (
    Column("solution", "Solution", width=18),
    Column("meter", "Meter", width=12),
    Column("meters", "Meters", "integer", 0),
    Column("readings", "Readings", "integer", 0),
    Column("mean", "Mean residual (pH)", "number", 3, signed=True),
    Column("sd", "SD (pH)", "number", 4),
    Column("centre", "Robust centre (pH)", "number", 3, signed=True),
    Column("spread", "Robust SD of means (pH)", "number", 4),
    Column("from_centre", "From the centre (pH)", "number", 3, signed=True),
    Column("h", "h (–)", "number", 2, signed=True),
    Column("h_5", "h, 5 % (–)", "number", 2),
    Column("h_1", "h, 1 % (–)", "number", 2),
    Column("k", "k (–)", "number", 2),
    Column("k_5", "k, 5 % (–)", "number", 2),
    Column("k_1", "k, 1 % (–)", "number", 2),
)
SINCE: tuple[Column, ...] = (
    Column("source", "Source", width=18),
    Column("sheet", "Sheet", width=12),
    Column("row", "Row", "integer", 0, width=7),
    Column("batch", "Batch or known solution", width=16),
    Column("meter", "Meter", width=10),
    Column("read_at", "Read at", "time", width=17),
    Column("days_since", "Days since calibration", "number", 2),
    Column("residual", "Residual (pH)", "number", 3, signed=True),
    Column("status", "Status", width=16),
)
LIMITS: tuple[Column, ...] = (
    Column("quantity", "Quantity", width=10),
    Column("side", "Side", width=8),
    Column("value", "Limit", "number", 1),
    Column("unit", "Unit", width=6),
    Column("counted", "Counted by", width=12),
    Column("source", "Source", width=60),
)


NO_LEAVE = "A date of crossing does not extend a calibration interval."


def calibrations(history: MeterHistory) -> Table:
    """One row a calibration, in file order; values outside the limits of the settings are named."""
    table, sheets = history.records.calibrations, history.records.sheets
    data: dict[str, Any] = {
        "source": [plain(sheets[i].file) for i in table.source.tolist()],
        "sheet": [plain(sheets[i].sheet) for i in table.source.tolist()],
        "row": table.row,
        "meter": [plain(str(v)) for v in table["meter"]],
        "probe": [plain(str(v)) for v in table["probe"]],
        "calibrated_at": table["calibrated_at"],
        "slope_percent": table["slope"],
        "offset_mV": table["offset"],
        "temperature_C": table["temperature"],
        "buffer_lots": [plain(str(v)) for v in table["buffer_lots"]],
        "as_found_pH": table["as_found"],
        "outside": [outside_words(history, i) for i in range(len(table))],
    }
    flagged = np.array([w != "" for w in data["outside"]], np.bool_)
    return Table("calibrations", "Calibrations", CALIBRATIONS, data, flagged=flagged)


def outside_words(history: MeterHistory, row: int) -> str:
    """Which limits of the settings a calibration lies outside; "" for none."""
    found = []
    for limit in history.limits:
        value = float(history.records.calibrations[limit.quantity][row])
        if limit.judged and (value < limit.value if limit.side == "low" else value > limit.value):
            word = "below" if limit.side == "low" else "above"
            found.append(f"{limit.quantity} {word} {limit.value:g} {QUANTITIES[limit.quantity]}".replace("-", "−"))
    return "; ".join(found)


def lines(history: MeterHistory) -> Table:
    """One row a run of calibrations and quantity."""
    rows = [
        (
            plain(x.subject), x.subject_type, plain(x.probe), x.quantity, QUANTITIES[x.quantity], plain(x.begun_by),
            x.first, x.last, len(x.calibration), x.outside, x.at_last, x.rate, *x.rate_interval95, x.robust_rate,
            *x.robust_interval95, x.sd, x.reason,
        )
        for x in history.lines
    ]  # fmt: skip
    return table_of("lines", "Lines through calibrations", LINES, rows)


def crossings(history: MeterHistory) -> Table:
    """One row a line and limit that it moves towards."""
    rows = [
        (
            plain(x.subject), x.subject_type, plain(x.probe), x.quantity, x.limit.value, QUANTITIES[x.quantity],
            "settings" if x.limit.judged else "shown beside", x.at, x.earliest, x.latest, _when(x),
            f"{plain(x.text)} {NO_LEAVE}",
        )
        for x in history.crossings
    ]  # fmt: skip
    return table_of("crossings", "When lines cross limits", CROSSINGS, rows)


def _when(crossing: Crossing) -> str:
    if not crossing.ahead:
        return "before it"
    if not np.isnat(crossing.at):
        return "after it"
    return "" if np.isnat(crossing.earliest) else "later than was looked at"


def steps(history: MeterHistory) -> Table:
    """One row an unlogged step between calibrations."""
    rows = [
        (
            plain(x.subject), x.subject_type, plain(x.probe), x.quantity, QUANTITIES[x.quantity], x.size,
            *x.interval95, x.earliest, x.latest, x.family_wise_p,
        )
        for x in history.calibration_steps
    ]  # fmt: skip
    return table_of("steps", "Steps between calibrations", STEPS, rows)


def meters(history: MeterHistory) -> Table:
    """One row a meter: how many calibrations and readings, noise, rate between calibrations, agreement."""
    noise = {x.meter: x for x in history.noise}
    between = {x.meter: x for x in history.between}
    whole = {x.meter: x for x in history.agreement if x.solution == WHOLE_RECORD}
    table = history.records.calibrations
    named = np.array([str(m) for m in table["meter"]], object)
    nothing = (math.nan, math.nan)
    rows: list[tuple[Any, ...]] = []
    for name in history.meters:
        own, n, b, w = np.flatnonzero(named == name), noise.get(name), between.get(name), whole.get(name)
        remarks = [x.reason for x in (n, b) if x is not None and x.reason]
        rows.append(
            (
                plain(name), len(own), sum(bool(outside_words(history, i)) for i in own.tolist()),
                n.readings if n else 0, n.sd if n else math.nan, *(n.interval95 if n else nothing),
                b.rate if b else math.nan, *(b.interval95 if b else nothing),
                w.mean if w else math.nan, w.from_centre if w else math.nan, "; ".join(remarks),
            )
        )  # fmt: skip
    return table_of("meters", "Meters", METERS, rows)


def agreement(history: MeterHistory) -> Table:
    """One row a meter and solution; marked where h or k lies beyond its 1 % value."""
    rows = [
        (
            plain(x.solution), plain(x.meter), x.meters, x.readings, x.mean, x.sd, x.centre, x.spread, x.from_centre,
            x.h, x.h_5, x.h_1, x.k, x.k_5, x.k_1,
        )
        for x in history.agreement
    ]  # fmt: skip
    table = table_of("agreement", "Agreement of the meters", AGREEMENT, rows)
    flagged = np.array([beyond(x) for x in history.agreement], np.bool_)
    return Table(table.name, table.title, table.columns, table.data, flagged=flagged)


def beyond(cell: Agreement) -> bool:
    """Whether h or k of a meter on a solution lies beyond its 1 % value."""
    return abs(cell.h) > cell.h_1 or cell.k > cell.k_1


def since_calibration(history: MeterHistory) -> Table:
    """One row a used reading: residual and days since its meter's calibration."""
    audit, readings, sheets = history.audit, history.records.readings, history.records.sheets
    n = len(readings)
    data: dict[str, Any] = {
        "source": [plain(sheets[i].file) for i in readings.source.tolist()],
        "sheet": [plain(sheets[i].sheet) for i in readings.source.tolist()],
        "row": readings.row,
        "batch": [
            plain(str(b) or str(k)) for b, k in zip(readings["batch"], readings["known"], strict=True)
        ],
        "meter": [plain(str(v)) for v in readings["meter"]],
        "read_at": readings["read_at"],
        "days_since": history.days_since,
        "residual": audit.residual if audit is not None else np.full(n, np.nan),
        "status": [str(s) for s in audit.status] if audit is not None else [""] * n,
    }  # fmt: skip
    return Table("since_calibration", "Residual and days since calibration", SINCE, data)


def limits(history: MeterHistory) -> Table:
    """One row a limit, with its source, and what another text says."""
    rows = [
        (
            x.quantity,
            x.side,
            x.value,
            QUANTITIES[x.quantity],
            "settings" if x.judged else "shown beside",
            plain(x.source),
        )
        for x in history.limits
    ]
    return table_of("limits", "Limits of slope and offset", LIMITS, rows)


def set_aside(history: MeterHistory) -> Table:
    """One row a reading that was set aside, with its reason, in file order."""
    return table_of("set_aside", "Set aside", SET_ASIDE, set_aside_rows(history.records))
