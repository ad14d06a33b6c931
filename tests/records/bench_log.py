"""A bench log of 400 rows that mixes everything that laboratories write down, and where a person would put each row."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from datetime import timedelta
from typing import Any

import numpy as np
from worked import at

HEAD = (
    "Read at",
    "Batch",
    "Known solution",
    "Meter",
    "Probe",
    "Stage",
    "Temperature (°C)",
    "Reference temperature (°C)",
    "pH",
    "Readings averaged",
    "Standing",
    "Target pH",
    "Low limit (final)",
    "High limit (final)",
    "Remark",
)
RECIPE = ("Batch", "Substance", "Lot", "Amount", "Planned amount", "Unit", "Made up to", "Made up to unit", "Step")
STOCK = ("Lot", "Substance", "Made as batch", "Strength", "Unit", "Density (g/mL)", "Assay (%)", "Factor",
         "Adjusted to pH", "Adjusted at (°C)")  # fmt: skip
ROWS = 400
AS_PREDICTED, ADJUSTED = "as_predicted", "adjusted"


@dataclass
class Log:
    """Rows of the sheets, and for each row of the Readings sheet where it belongs: a status, or a reason's code."""

    readings: list[list[Any]] = field(default_factory=list)
    recipes: list[tuple[Any, ...]] = field(default_factory=list)
    belongs: list[str] = field(default_factory=list)

    def read(self, moment: int, belongs: str, ph: Any = None, **more: Any) -> None:
        """One row; a pH of None is filled in later, from its prediction and some noise."""
        meter = more.get("meter", f"M-{len(self.readings) % 3 + 1}")
        when = at(moment // 8, 8) + timedelta(minutes=45 * (moment % 8))
        celsius = more.get("celsius", 20.0 + len(self.readings) % 6)
        self.readings.append(
            [when, more.get("batch"), more.get("known"), meter, f"P-{meter[-1]}", more.get("stage"), celsius,
             more.get("reference"), ph, more.get("averaged"), more.get("standing"), more.get("target"), more.get("low"),
             more.get("high"), more.get("remark")]
        )  # fmt: skip
        self.belongs.append(belongs)

    def line(
        self, batch: str, substance: str | None, lot: str | None, amount: Any, unit: str | None, **more: Any
    ) -> None:
        self.recipes.append(
            (
                batch,
                substance,
                lot,
                amount,
                more.get("planned"),
                unit,
                more.get("to"),
                more.get("to_unit"),
                more.get("step"),
            )
        )


STOCKS: Sequence[tuple[Any, ...]] = [
    STOCK,
    ("AC", "acetic acid", None, None, None, 1.049, 99.7, None, None, None),
    ("NA", "sodium hydroxide", None, 1.0, "N", None, None, 1.002, None, None),
    ("HC", "hydrochloric acid", None, 37.0, "% w/w", 1.18, None, None, None, None),
    ("H1", None, "HCL-1M", None, None, None, None, None, None, None),
    ("X10", None, "ACE-10X", None, None, None, None, None, None, None),
    ("TS", "Tris hydrochloride", None, 1.0, "M", None, None, None, 8.0, 25.0),
]
RECIPE_KINDS: Sequence[Callable[[Log, str], None]] = (
    lambda log, b: _lines(log, b, ("acetic acid", "AC", 2.87, "mL", 1.0, "L"), ("sodium acetate", "SA", 4.10, "g")),
    lambda log, b: _lines(
        log, b, ("sodium dihydrogen phosphate", "PM", 50.0, "mM"), ("disodium hydrogen phosphate", "PD", 50.0, "mM")
    ),
    lambda log, b: _lines(
        log, b, ("Tris base", "TB", 6.057, "g", 1000.0, "mL"), ("hydrochloric acid", "H1", 25.0, "mL")
    ),
    lambda log, b: _lines(log, b, (None, "X10", "10x", None)),
    lambda log, b: _lines(log, b, ("Tris hydrochloride", "TS", 50.0, "mL", 1.0, "L")),
    lambda log, b: _lines(
        log, b, ("citric acid monohydrate", "CI", 0.42, "% w/v"), ("sodium hydroxide", "NA", 0.02, "N")
    ),
    lambda log, b: _lines(
        log,
        b,
        ("acetic acid", "AC", 3.003, "g"),
        ("sodium acetate trihydrate", "S3", 6.804, "g"),
        ("purified water", None, "q.s. to 1 kg", None),
    ),
)


def _lines(log: Log, batch: str, *parts: tuple[Any, ...]) -> None:
    for substance, lot, amount, unit, *rest in parts:
        to, to_unit = (*rest, None, None)[:2]
        log.line(batch, substance, lot, amount, unit, to=to, to_unit=to_unit)


def bench_log() -> Log:
    """The log, pH of ordinary rows still open."""
    log = Log()
    log.line("HCL-1M", "hydrochloric acid", "HC", 83.5, "mL", to=1.0, to_unit="L")
    log.line("ACE-10X", "acetic acid", "AC", 28.7, "mL", to=1.0, to_unit="L")
    log.line("ACE-10X", "sodium hydroxide", "NA", 249.5, "mL", planned=250.0)
    for k in range(60):  # check readings
        log.read(4 * k, AS_PREDICTED, known=("phthalate", "phosphate", "borax", "House 5")[k % 4], celsius=20.0 + k % 6)
    for k in range(70):  # ordinary batches, each on two meters
        batch = f"B-{k:03d}"
        RECIPE_KINDS[k % len(RECIPE_KINDS)](log, batch)
        more: dict[str, Any] = {"batch": batch, "stage": "final", "target": 5.0, "low": 1.0, "high": 12.0}
        if k % 9 == 4:
            more["celsius"] = None
        if k % 9 == 5:
            more["reference"] = 25.0
        log.read(3 * k, AS_PREDICTED, **more)
        log.read(3 * k + 2, AS_PREDICTED, averaged=3 if k % 5 == 0 else None, **more)
    for k in range(24):  # adjusted to a pH, and read again on another meter the day after
        batch = f"T-{k:03d}"
        log.line(batch, "Tris base", "TB", 6.057 if k % 2 else 12.114, "g", to=1.0, to_unit="L")
        log.line(batch, "hydrochloric acid", "H1", ("as needed", "to pH 8.0", "q.s.")[k % 3], None)
        log.read(8 * k, ADJUSTED, round(8.0 + 0.01 * (k % 3), 2), batch=batch, meter=f"M-{k % 3 + 1}", target=8.0)
        log.read(8 * k + 9, AS_PREDICTED, batch=batch, meter=f"M-{(k + 1) % 3 + 1}", target=8.0)
        if k < 8:
            log.read(8 * k + 10, AS_PREDICTED, batch=batch, meter=f"M-{(k + 2) % 3 + 1}", stage="after sterilising")
    for k in range(12):  # stages, the later one with more in it
        batch = f"S-{k:03d}"
        log.line(batch, "acetic acid", "AC", 100.0, "mM", step="acid")
        log.line(batch, "sodium acetate", "SA", 80.0, "mM", step="final")
        for stage in ("acid", "final", "after filtration"):
            log.read(9 * k + 1, AS_PREDICTED, batch=batch, stage=stage)
    for k in range(8):  # retests and voids
        log.read(9 * k + 2, "void", 9.99, batch=f"S-{k:03d}", stage="final", standing="VOID", remark="probe not rinsed")
        log.read(9 * k + 3, AS_PREDICTED, batch=f"S-{k:03d}", stage="final", standing="retest")
    log.line("NEUTRAL", "sodium chloride", None, 9.0, "g/L")
    log.line("STRONG", "sodium hydroxide", "NA", 100.0, "mL", to=1.0, to_unit="L")
    for k in range(6):
        log.read(7 * k, "unbuffered", 6.1, batch="purified water")
        log.read(7 * k + 1, "unbuffered", 6.4, batch="NEUTRAL")
        log.read(7 * k + 2, "outside_electrode_range", 12.8, batch="STRONG")
    log.line("ODD-1", "acetic acid", "AC", 50.0, "mM")
    log.line("ODD-1", "house blend 7", None, 1.0, "g/L")
    log.line("ODD-2", "acetic acid", "AC", 50.0, "mM")
    log.line("ODD-2", "ethanol", None, 300.0, "g/L")
    log.line("ODD-3", "acetic acid", "AC", 50.0, None)
    for k in range(5):
        log.read(5 * k, "substance-unknown", 4.0, batch="ODD-1")
        log.read(5 * k, "solvent-mixed", 4.0, batch="ODD-2")
        log.read(5 * k, "unit-missing", 4.0, batch="ODD-3")
        log.read(5 * k, "batch-without-recipe", 4.0, batch=f"LOST-{k}")
        log.read(5 * k, "known-not-known", 4.0, known="someone's buffer")
        log.read(5 * k, "ph-missing", "", batch="B-000", remark="not entered")
        log.read(5 * k, "ph-not-a-number", "see print", batch="B-001")
        log.read(5 * k, "number-censored", "<2", batch="B-002")
    k = 0
    while len(log.readings) < ROWS:
        log.read(200 + k, AS_PREDICTED, batch=f"B-{k % 70:03d}", stage="final")
        k += 1
    order = np.random.default_rng(400).permutation(len(log.readings))
    log.readings, log.belongs = [log.readings[i] for i in order], [log.belongs[i] for i in order]
    return log


def sheets_of(log: Log) -> dict[str, list[Any]]:
    return {
        "Readings": [HEAD, *log.readings],
        "Recipes": [RECIPE, *log.recipes],
        "Stocks": list(STOCKS),
        "Known": [
            ("Known solution", "Temperature (°C)", "Certified pH", "u"),
            ("House 5", 20.0, 5.02, 0.005),
            ("House 5", 25.0, 5.00, 0.005),
        ],
        "Meters": [("Meter", "Accuracy (pH)"), *((f"M-{i}", 0.02) for i in (1, 2, 3))],
        "Calibrations": [
            ("Meter", "Probe", "Calibrated at", "Slope (%)", "Offset (mV)", "Buffer lots"),
            *((f"M-{i}", f"P-{i}", at(day, 7), 98.0, 3.0, "K4, K7, K10") for day in range(0, 60, 4) for i in (1, 2, 3)),
        ],
        "Events": [("Meter", "Probe", "Date", "What was done"), ("M-2", None, at(9, 7), "cable replaced")],
    }
