"""Tables of a fit of ionization constants, described once for the CSV files, the workbook and the page."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

import numpy as np

from reconcile.records.pka_results import PkaFit, PkaStep
from reconcile.reporter.plain import plain
from reconcile.reporter.tables import SET_ASIDE, Column, Table, plain_column, set_aside_rows, table_of
from reconcile.reporter.words import half_up, minus

STANDINGS = {
    "found": "found",
    "not_identifiable": "not identifiable",
    "held": "held at the library's value",
}
STATUSES = {
    "used": "used",
    "rejected": "rejected",
    "void": "void",
    "adjusted": "adjusted",
    "outside_electrode_range": "outside electrode range",
    "outside_model": "outside model",
    "not_solved": "not solved",
}
READINGS: tuple[Column, ...] = (
    Column("source", "Source", width=18),
    Column("sheet", "Sheet", width=12),
    Column("row", "Row", "integer", 0, width=7),
    Column("batch", "Batch", width=14),
    Column("series", "Series", width=10),
    Column("titrant_added", "Titrant added (mL)", "number", 2),
    Column("meter", "Meter", width=10),
    Column("temperature_C", "Temperature (°C)", "number", 1, brief="t (°C)"),
    Column("concentration", "Acid (mol/kg)", "number"),
    Column("base_per_acid", "Strong base per acid (mol/mol)", "number", 3),
    Column("neutralised", "Neutralised (of all protons that can be lost)", "number", 3),
    Column("ionic_strength", "Ionic strength (mol/kg)", "number", 4),
    Column("pH_observed", "pH observed", "number", 2),
    Column("pH_fitted", "pH fitted", "number", 3),
    Column("residual", "Residual (pH)", "number", 3, signed=True),
    Column("u_reading", "u of reading (pH)", "number", 3),
    Column("studentised", "Studentised residual (–)", "number", 1, signed=True),
    Column("leverage", "Leverage (–)", "number", 3),
    Column("status", "Status", width=16),
)
STEPS: tuple[Column, ...] = (
    Column("step", "Step", "integer", 0, width=7),
    Column("standing", "Standing", width=20),
    Column("pKa_thermodynamic", "pKa (I = 0)", "number", 3),
    Column("u", "u (–)", "number", 3),
    Column("low", "95 % interval from", "number", 3),
    Column("high", "95 % interval to", "number", 3),
    Column("pKa_apparent", "Apparent pKa (mixed)", "number", 3),
    Column("ionic_strength", "at ionic strength (mol/kg)", "number", 4),
    Column("temperature_C", "Temperature (°C)", "number", 1),
    Column("pKa_25C", "pKa at 25 °C", "number", 3),
    Column("u_25C", "u at 25 °C (–)", "number", 3),
    Column("dH_kJ_mol", "Enthalpy (kJ/mol)", "number", 1),
    Column("u_dH", "u of enthalpy (kJ/mol)", "number", 2),
    Column("dH_origin", "Enthalpy from", width=10),
    Column("with_strength", "Correlation with strength (–)", "number", 3),
    Column("with_offset", "Correlation with offset (–)", "number", 3),
    Column("library", "Library pKa at temperature", "number", 3),
    Column("u_library", "u of library (–)", "number", 3),
    Column("with_all", "pKa with every reading", "number", 3),
    Column("relation", "What is known", width=60),
)
BUDGET: tuple[Column, ...] = (
    Column("step", "Step", "integer", 0, width=7),
    Column("source", "Source of uncertainty", width=26),
    Column("u", "Share as u (–)", "number", 4),
    Column("percent", "Share of the variance (%)", "number", 1),
)
CANDIDATES: tuple[Column, ...] = (
    Column("acid", "Acid", width=28),
    Column("log_likelihood_ratio", "Log likelihood ratio (–)", "number", 1),
    Column("explains", "With the readings", width=14),
    Column("rms", "RMS residual (pH)", "number", 3),
    Column("pKa", "Its pKa at temperature", width=24),
)
SERIES: tuple[Column, ...] = (
    Column("series", "Series", width=16),
    Column("readings", "Readings", "integer", 0),
    Column("step", "Step", "integer", 0, width=7),
    Column("pKa", "pKa, fitted alone", "number", 3),
    Column("u", "u of the readings (–)", "number", 3),
)
NUMBERS: tuple[Column, ...] = (
    Column("steps", "Steps", "integer", 0, width=7),
    Column("aicc", "AICc (–)", "number", 1),
    Column("chosen", "Chosen", width=10),
)
HAZARDS: tuple[Column, ...] = (
    Column("substance", "Substance", width=28),
    Column("hazard", "Hazard words", width=52),
)
METHOD: tuple[Column, ...] = (Column("what", "What", width=34), Column("text", "In words", width=100))


def _none(value: float | None) -> float:
    return math.nan if value is None else float(value)


def readings(fit: PkaFit) -> Table:
    """One row a reading of a solution that holds the acid, in file order."""
    kinds = {c.key: c.kind for c in READINGS}
    data: dict[str, Any] = {
        key: plain_column(values.tolist()) if kinds[key] == "text" else values
        for key, values in fit.reading_columns().items()
    }
    resolution = fit.records.readings["resolution"][fit.index]
    known = np.isfinite(resolution) & (resolution > 0)
    places = np.ceil(-np.log10(np.where(known, resolution, 0.001)) - 1e-9)
    decimals = np.clip(places, 0, 4).astype(np.intp)
    return Table("readings", "Readings", READINGS, data, {"pH_observed": decimals}, flagged=fit.status == "rejected")


def steps(fit: PkaFit) -> Table:
    """One row an ionization step."""

    def row(one: PkaStep) -> Sequence[Any]:
        low, high = one.interval95 or (math.nan, math.nan)
        library, u_library = one.library or (math.nan, math.nan)
        return (
            one.step,
            STANDINGS[one.standing],
            _none(one.pka),
            _none(one.u),
            low,
            high,
            _none(one.pka_apparent),
            _none(one.ionic_strength),
            one.temperature_c,
            _none(one.pka_25c),
            _none(one.u_25c),
            _none(one.dh_kj_mol),
            _none(one.u_dh),
            one.dh_origin,
            one.correlation.get("strength", math.nan),
            one.correlation.get("offset", math.nan),
            library,
            u_library,
            one.with_all[0] if one.with_all else math.nan,
            plain(one.relation),
        )

    return table_of("steps", "Ionization steps", STEPS, [row(one) for one in fit.steps])


def budget(fit: PkaFit) -> Table:
    """Shares of the uncertainty of every constant found, the largest first."""
    rows = []
    for one in fit.steps:
        whole = sum(share.u**2 for share in one.budget)
        rows += [(one.step, share.source, share.u, 100.0 * share.u**2 / whole) for share in one.budget if whole > 0.0]
    return table_of("budget", "Uncertainty budget", BUDGET, rows)


def candidates(fit: PkaFit) -> Table:
    """Acids of the library, those that explain the readings best first."""
    rows = [
        (
            plain(one.acid),
            one.log_likelihood_ratio,
            "consistent" if one.explains else "not consistent",
            one.rms,
            ", ".join(minus(half_up(p, 2)) for p in one.pka),
        )
        for one in fit.candidates
    ]
    return table_of("candidates", "Acids of the library", CANDIDATES, rows)


def series(fit: PkaFit) -> Table:
    """Every series fitted alone."""
    rows = [
        (plain(one.series), one.readings, step + 1, value, math.nan if u is None else u)
        for one in fit.series
        for step, (value, u) in enumerate(zip(one.pka, one.u, strict=True))
        if value is not None
    ]
    return table_of("series", "Series fitted alone", SERIES, rows)


def numbers(fit: PkaFit) -> Table:
    """AICc of every number of steps that was tried."""
    rows = [(number, value, "chosen" if number == len(fit.steps) else "") for number, value in fit.steps_chosen.items()]
    return table_of("numbers", "Number of steps", NUMBERS, rows)


def set_aside(fit: PkaFit) -> Table:
    """Rows of the whole record that were set aside."""
    return table_of("set_aside", "Set aside", SET_ASIDE, set_aside_rows(fit.records))


CSV_TABLES = (readings, steps, budget, candidates, series, numbers, set_aside)
"""Builders of the CSV files; each file bears the name of its table."""
