"""What the gist says of records that hold more, or less, than batches."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
from worked import at, audit_as

from reconcile.reporter.gist import gist

CHECKS = ("Read at", "Known solution", "Known solution lot", "Meter", "Temperature (°C)", "pH")
CERTIFICATES = [("Known solution", "Lot", "Temperature (°C)", "Certified pH", "u"),
                ("four", "K4", 25.0, 4.0, 0.01), ("seven", "K7", 25.0, 7.0, 0.01)]  # fmt: skip
ACETATE = [
    ("Batch", "Substance", "Amount", "Unit"),
    ("B", "acetic acid", 50.0, "mM"),
    ("B", "sodium acetate", 50.0, "mM"),
]


def said(folder: Path, sheets: dict[str, Any]) -> dict[str, str]:
    return {line.key: line.text for line in gist(audit_as("workbook", folder, sheets))}


def checks(seven: float) -> list[tuple[Any, ...]]:
    rng = np.random.default_rng(2)
    return [
        (at(day), name, lot, meter, 25.0, round(ph + rng.normal(0.0, 0.008), 2))
        for day in range(10)
        for meter in ("M-1", "M-2", "M-3")
        for name, lot, ph in (("four", "K4", 4.0), ("seven", "K7", seven))
    ]


def test_check_readings_alone_were_compared_with_their_certificates(tmp_path: Path) -> None:
    text = said(tmp_path, {"Checks": [CHECKS, *checks(7.0)], "Known": CERTIFICATES})["checked"]
    assert text.startswith("60 readings, on 3 meters")
    assert text.endswith("Each was compared with the certified pH of its known solution.")


def test_calibrations_alone_leave_nothing_compared(tmp_path: Path) -> None:
    rows = [
        ("Meter", "Calibrated at", "Slope (%)", "Offset (mV)"),
        ("M-1", at(0), 98.5, 2.0),
        ("M-1", at(7), 98.3, 2.5),
    ]
    text = said(tmp_path, {"Calibrations": rows})["checked"]
    assert text == (
        "No reading was compared with a prediction: the record holds 2 calibrations, which reconcile meters shows."
    )


def test_a_known_solution_that_reads_off_everywhere_is_pointed_out(tmp_path: Path) -> None:
    """A bottle 0.1 lower than certified, read on three meters that read everything else as it is."""
    readings = [(*CHECKS, "Batch"), *((*row, None) for row in checks(6.9))]
    rng = np.random.default_rng(4)
    readings += [
        (at(day, 14), None, None, meter, 25.0, round(4.671 + rng.normal(0.0, 0.008), 2), "B")
        for day in range(10)
        for meter in ("M-1", "M-2", "M-3")
    ]
    text = said(tmp_path, {"Readings": readings, "Known": CERTIFICATES, "Recipes": ACETATE})
    assert "30 of the 30 readings of the known solution seven, lot K7" in text["stands_out"]
    assert "four" not in text["stands_out"]
    assert "60 of known solutions with the certified pH" in text["checked"]


def test_an_odd_implied_amount_is_said(tmp_path: Path) -> None:
    recipes = [("Batch", "Substance", "Amount", "Unit"), ("B", "Tris base", 50.0, "mM"),
               ("B", "sodium hydroxide", "as needed", None)]  # fmt: skip
    readings = [("Read at", "Batch", "Meter", "Temperature (°C)", "pH"), (at(0), "B", "M-1", 25.0, 7.4)]
    text = said(tmp_path, {"Readings": readings, "Recipes": recipes})["stands_out"]
    assert text.endswith("1 implied amount of titrant is odd, which is a lead.")
