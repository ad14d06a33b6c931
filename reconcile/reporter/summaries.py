"""Tables about the whole record: findings, meters, stocks, settings, spreads, constants, what silence means."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from reconcile.records.arrays import FloatArray, IntArray
from reconcile.records.results import Audit, Silence
from reconcile.reporter.lookups import METER_TYPES, Lookups
from reconcile.reporter.manifest import Reported
from reconcile.reporter.plain import plain
from reconcile.reporter.stocks import Stock, stocks
from reconcile.reporter.tables import Column, Table, table_of
from reconcile.reporter.words import (
    explains_words,
    interval,
    kind_words,
    rival_words,
    silence_words,
    since_words,
    subject_words,
    title,
    unit_words,
)

FINDINGS: tuple[Column, ...] = (
    Column("id", "Finding", width=8),
    Column("what", "What", width=40),
    Column("estimate", "Estimate", "number"),
    Column("unit", "Unit", width=9),
    Column("interval95", "95 % interval", width=18),
    Column("since", "Since", width=26),
    Column("would_explain", "Would explain it", width=26),
    Column("readings", "Readings", "integer", 0),
    Column("impact", "Limits concerned (readings)", "integer", 0),
    Column("log_likelihood_gain", "Log-likelihood gain (–)", "number", 1),
    Column("family_wise_p", "Family-wise p (–)", "number"),
    Column("rivals", "Rivals", width=40),
    Column("next_check", "Next check", width=44),
    Column("text", "In words", width=56),
)
METERS: tuple[Column, ...] = (
    Column("meter", "Meter", width=14),
    Column("readings", "Readings", "integer", 0),
    Column("evidence", "Of these evidence", "integer", 0),
    Column("first", "First reading", "time", width=17),
    Column("last", "Last reading", "time", width=17),
    Column("mean_residual", "Mean residual (pH)", "number", 3, signed=True),
    Column("sd_residual", "SD of residuals (pH)", "number", 3),
    Column("stand_out", "Unexplained", "integer", 0),
    Column("smallest_offset", "Smallest detectable offset (pH)", "number", 3),
    Column("findings", "Findings", width=12),
)
STOCKS: tuple[Column, ...] = (
    Column("lot", "Lot", width=16),
    Column("substance", "Substance", width=26),
    Column("strength", "Strength as stated", width=16),
    Column("u_strength", "u of strength (%)", "number", 2),
    Column("readings", "Readings", "integer", 0),
    Column("mean_residual", "Mean residual (pH)", "number", 3, signed=True),
    Column("smallest_factor", "Smallest detectable factor (–)", "number", 3),
    Column("findings", "Findings", width=12),
    Column("hazard", "Hazard words", width=52),
)
SETTINGS: tuple[Column, ...] = (
    Column("name", "Setting", width=38, unbroken=True),
    Column("value", "Value", width=16),
    Column("unit", "Unit", width=24),
    Column("differs", "Differs from default", width=12),
    Column("reason", "Reason or source", width=60),
)
SPREADS: tuple[Column, ...] = (
    Column("name", "Spread of a clean record", width=32),
    Column("value", "Standard deviation", "number"),
    Column("unit", "Unit", width=12),
    Column("origin", "Origin", width=12),
    Column("reason", "Reason", width=60),
)
CONSTANTS: tuple[Column, ...] = (
    Column("acid", "Acid", width=28),
    Column("step", "Step", "integer", 0, width=7),
    Column("pKa", "pKa at 25 °C, I = 0", "number", 3),
    Column("u", "u (–)", "number", 3),
    Column("enthalpy", "Enthalpy (kJ/mol)", "number", 2),
    Column("heat_capacity", "Heat capacity (J/K/mol)", "number", 0),
    Column("source", "Source", width=70),
)
SILENT: tuple[Column, ...] = (
    Column("subject", "Subject", width=28),
    Column("kind", "Kind of fault", width=26),
    Column("reason", "Why it cannot be tested", width=70),
)
DETECTABLE: tuple[Column, ...] = (
    Column("subject", "Subject", width=28),
    Column("kind", "Kind of fault", width=26),
    Column("size", "Smallest detectable", width=24),
    Column("power", "Found in (%) of records", "number", 0),
    Column("reason", "Remark", width=50),
)


def findings(audit: Audit) -> Table:
    """One row a finding, most supported first."""
    return table_of(
        "findings",
        "Findings",
        FINDINGS,
        [
            (
                plain(f.id),
                title(f),
                math.nan if f.estimate is None else float(f.estimate),
                unit_words(f.unit),
                interval(f),
                since_words(f),
                explains_words(f),
                len(f.readings),
                len(f.impact),
                float(f.log_likelihood_gain),
                float(f.family_wise_p),
                "; ".join(rival_words(f, r) for r in f.rivals),
                plain(f.next_check),
                plain(f.text),
            )
            for f in audit.findings
        ],
    )


def _mean_sd(values: FloatArray) -> tuple[float, float]:
    return (
        float(values.mean()) if len(values) else math.nan,
        float(values.std(ddof=1)) if len(values) > 1 else math.nan,
    )


def _groups(keys: Any) -> dict[str, IntArray]:
    """Name -> indices, in order of name."""
    names, inverse = np.unique(np.asarray(keys, str), return_inverse=True)
    order = np.argsort(inverse, kind="stable")
    parts = np.split(order, np.cumsum(np.bincount(inverse, minlength=len(names)))[:-1]) if len(names) else []
    return {str(name): part.astype(np.intp) for name, part in zip(names, parts, strict=True)}


def meters(audit: Audit, lookups: Lookups) -> Table:
    """One row a meter that readings name."""
    smallest = lookups.smallest(METER_TYPES, ("meter_offset",))
    rows = []
    for name, own in _groups(lookups.meter).items():
        times = lookups.times[own]
        known = times[~np.isnat(times)]
        usable = own[lookups.usable[own]]
        rows.append(
            (
                name or "not named",
                len(own),
                len(usable),
                known.min() if len(known) else np.datetime64("NaT"),
                known.max() if len(known) else np.datetime64("NaT"),
                *_mean_sd(audit.residual[usable]),
                int((audit.status[own] == "stands_out").sum()),
                smallest.get(name, math.nan),
                " ".join(lookups.findings_of_meter.get(name, [])),
            )
        )
    return table_of("meters", "Meters", METERS, rows)


def stock_table(audit: Audit, lookups: Lookups) -> Table:
    """One row a stock lot, then one for each substance used without a lot; hazard words beside each."""
    smallest = lookups.smallest(("lot",), ("lot_strength",))
    lots = audit.records.lots
    reading, lot = lookups.reading_lots
    number = max(len(lots), 1)
    count = np.bincount(lot, minlength=number)
    usable = lookups.usable[reading]
    used = np.bincount(lot[usable], minlength=number)
    total = np.bincount(lot[usable], weights=audit.residual[reading[usable]], minlength=number)

    def row(stock: Stock) -> tuple[Any, ...]:
        i = stock.index
        known = i >= 0
        strength = float(lots.strength[i]) if known else math.nan
        return (
            stock.lot or "no lot named",
            stock.substance,
            f"{strength:.6g} {plain(str(lots.unit[i]))}" if math.isfinite(strength) else "",
            100.0 * float(lots.u_strength[i]) if known else math.nan,
            int(count[i]) if known else None,
            float(total[i] / used[i]) if known and used[i] else math.nan,
            smallest.get(stock.lot, math.nan) if known else math.nan,
            " ".join(lookups.findings_of_lot.get(stock.lot, [])) if known else "",
            stock.hazard,
        )

    return table_of("stocks", "Stocks", STOCKS, [row(s) for s in stocks(audit)])


def _setting(value: Any) -> str:
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, (tuple, list)):
        return ", ".join(plain(str(v)) for v in value) or "none"
    return f"{value:g}" if isinstance(value, float) else plain(str(value))


def settings(result: Reported) -> Table:
    """Every setting with its unit and reason; what differs from the defaults is marked by a word."""
    rows = result.settings.rows()
    table = table_of(
        "settings",
        "Settings",
        SETTINGS,
        [(n, _setting(v), plain(u), "differs" if changed else "", plain(r)) for n, v, u, r, changed in rows],
    )
    return Table(table.name, table.title, table.columns, table.data, flagged=np.array([r[4] for r in rows], bool))


def spreads(audit: Audit) -> Table:
    """The standard deviations that the auditor judged the record by."""
    return table_of(
        "spreads",
        "Spreads",
        SPREADS,
        [
            (plain(name), float(value), unit_words(unit), plain(origin), plain(reason))
            for name, (value, unit, origin, reason) in audit.spreads.by_name.items()
        ],
    )


def constants(audit: Audit) -> Table:
    """The ionization constants met in the record; without sources where the audit does not carry them."""
    met = audit.constants
    if met:
        rows: list[tuple[Any, ...]] = [
            (plain(c.acid), c.step, c.pka, c.u, c.enthalpy, c.heat_capacity, plain(c.source)) for c in met
        ]
    else:
        names, u = audit.prediction.constant_names, audit.prediction.constant_u.tolist()
        rows = [
            (plain(acid), int(step), math.nan, float(one), math.nan, math.nan, "see the library of substances")
            for (acid, step), one in zip(names, u, strict=True)
        ]
    return table_of("constants", "Constants", CONSTANTS, rows)


def not_testable(audit: Audit) -> Table:
    """What the record could not show, whatever its size."""
    return table_of(
        "not_testable",
        "Not testable",
        SILENT,
        [(subject_words(s), kind_words(s.kind), plain(s.reason)) for s in audit.not_testable],
    )


def detectable(audit: Audit, but: tuple[str, ...] = ()) -> Table:
    """The smallest fault of each kind that the record would have shown.

    but : kinds left out, because another table has them
    """

    def power(silence: Silence) -> float:
        return math.nan if silence.power is None else 100.0 * silence.power

    return table_of(
        "smallest_detectable",
        "Smallest detectable",
        DETECTABLE,
        [
            (subject_words(s), kind_words(s.kind), silence_words(s), power(s), plain(s.reason))
            for s in audit.smallest_detectable
            if s.kind not in but
        ],
    )
