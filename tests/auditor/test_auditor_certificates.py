"""The error of a known solution's certificate: one for all readings of a lot, another for another lot."""

from __future__ import annotations

from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from openpyxl import Workbook

import reconcile
from reconcile.records.results import Finding

U = 0.01


def check_record(
    path: Path,
    lots: list[tuple[str, str, float]],
    shift: dict[str, float],
    meters: tuple[str, ...] = ("M1", "M2", "M3"),
) -> Path:
    """Check readings of twelve days, each lot once a day; `shift` moves what stands under a meter or a lot."""
    book = Workbook()
    readings, known = book.active, book.create_sheet("Certificates")
    assert readings is not None
    readings.append(["Check buffer", "Buffer lot", "Read at", "Meter", "Temperature (°C)", "pH"])
    known.append(["Known solution", "Lot", "Temperature (°C)", "Certified pH", "u (pH)"])
    rng = np.random.default_rng(5)
    for day in range(12):
        for meter in meters:
            for name, lot, ph in lots:
                shown = ph + shift.get(meter, 0.0) + shift.get(lot, 0.0) + rng.normal(0.0, 0.008)
                at = datetime(2031, 3, 3, 9) + timedelta(days=day)
                readings.append([name, lot, at, meter, 25.0, round(shown, 2)])
    for name, lot, ph in lots:
        known.append([name, lot, 25.0, ph, U])
    book.save(path)
    return path


def findings(path: Path) -> tuple[Finding, ...]:
    return reconcile.audit(path).findings


@pytest.mark.parametrize("count", [1, 2, 4])
def test_an_offset_is_known_no_better_than_the_lots_it_rests_on(tmp_path: Path, count: int) -> None:
    lots = [("buffer seven", f"S{k}", 7.0) for k in range(count)]
    path = check_record(tmp_path / "checks.xlsx", lots, {"M1": 0.12}, ("M1",))
    (found,) = findings(path)
    assert (found.kind, found.subject) == ("meter_offset", "M1")
    assert found.interval95 is not None
    half = (found.interval95[1] - found.interval95[0]) / 2.0
    # the mean of k independent certificates has u / sqrt(k), however often each is read: JCGM 100:2008, F.1.2.3;
    # noise and spreads that are themselves only estimated widen it by a fifth
    assert 1.0 < half / (1.96 * U / np.sqrt(count)) < 1.3


def test_certificates_wrong_within_their_uncertainty_accuse_no_meter(tmp_path: Path) -> None:
    lots = [("four", "F1", 4.0), ("seven", "S1", 7.0), ("ten", "T1", 10.0)]
    assert findings(check_record(tmp_path / "checks.xlsx", lots, {"F1": 0.02, "S1": -0.02, "T1": 0.015})) == ()
