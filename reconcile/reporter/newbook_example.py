"""The filled example of a new workbook: two days of an invented room, with nothing to be noticed."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import datetime
from typing import Any

Row = Mapping[str, Any]


def _day(day: int, hour: int = 0, minute: int = 0) -> datetime:
    return datetime(2026, 3, day, hour, minute)


def _reading(day: int, hour: int, minute: int, meter: str, celsius: float, ph: float, **more: Any) -> Row:
    probe = {"M-A": "P-1", "M-B": "P-2"}[meter]
    moment = _day(day, hour, minute)
    return {
        "read_at": moment,
        "meter": meter,
        "probe": probe,
        "temperature": celsius,
        "ph": ph,
        "analyst": "AB",
        **more,
    }


_ACETATE = {"batch": "EX-1", "target": 4.6, "low_limit": 4.5, "high_limit": 4.8}
_PHOSPHATE = {"batch": "EX-2", "target": 6.8, "low_limit": 6.7, "high_limit": 7.0}
_LITRE = {"made_up_to": 1000.0, "made_up_to_unit": "mL"}
_VESSEL = {"series": "T-1", "start_volume": 50.0, "titrant": "sodium hydroxide", "titrant_lot": "EX-N1"}

EXAMPLE: Mapping[str, Sequence[Row]] = {
    "readings": (
        _reading(2, 8, 30, "M-A", 22.0, 7.01, known="Check buffer 7", known_lot="CB-31", remark="before use"),
        _reading(2, 8, 35, "M-B", 22.0, 6.87, known="phosphate 1:1"),
        _reading(2, 10, 5, "M-A", 22.4, 4.67, **_ACETATE, stage="final", averaged=3, ph_calculated=4.67),
        _reading(2, 10, 20, "M-B", 22.5, 4.68, **_ACETATE, stage="final", standing="retest", u_reading=0.01),
        _reading(2, 14, 0, "M-A", 21.8, 6.87, **_PHOSPHATE, stage="final"),
        _reading(2, 14, 10, "M-B", 21.9, 6.87, **_PHOSPHATE, stage="final"),
        _reading(3, 9, 40, "M-A", 22.1, 7.05, batch="EX-3", stage="final", remark="diluted from EX-2"),
        _reading(3, 11, 0, "M-B", 23.0, 3.04, series="T-1", titrant_added=0.0),
        _reading(3, 11, 10, "M-B", 23.0, 4.05, series="T-1", titrant_added=5.0),
        _reading(3, 11, 20, "M-B", 23.1, 4.65, series="T-1", titrant_added=12.5),
    ),
    "recipes": (
        {"batch": "EX-1", "substance": "acetic acid", "lot": "EX-A1", "planned": 50.0, "amount": 50.0, "unit": "mL"}
        | _LITRE,
        {"batch": "EX-1", "substance": "sodium acetate trihydrate", "lot": "EX-S1", "planned": 6.8, "amount": 6.81}
        | {"unit": "g"}
        | _LITRE,
        {"batch": "EX-2", "substance": "potassium dihydrogen phosphate", "lot": "EX-P1", "amount": 25.0, "unit": "mM"},
        {"batch": "EX-2", "substance": "disodium hydrogen phosphate", "lot": "EX-P2", "amount": 25.0, "unit": "mM"},
        {"batch": "EX-3", "substance": "phosphate buffer EX-2", "lot": "EX-C1", "amount": 100.0, "unit": "mL"} | _LITRE,
    ),
    "stocks": (
        {"lot": "EX-A1", "substance": "acetic acid", "strength": 1.0, "unit": "mol/L", "factor": 1.002}
        | {"tolerance": 0.5, "opened": _day(1), "expiry": datetime(2026, 9, 1)},
        {"lot": "EX-S1", "substance": "sodium acetate trihydrate", "assay": 99.5, "opened": _day(1)},
        {"lot": "EX-P1", "substance": "potassium dihydrogen phosphate", "assay": 99.8},
        {"lot": "EX-P2", "substance": "disodium hydrogen phosphate", "assay": 99.6},
        {"lot": "EX-C1", "batch": "EX-2", "opened": _day(3)},
        {"lot": "EX-N1", "substance": "sodium hydroxide", "strength": 0.1, "unit": "mol/L", "factor": 0.998},
    ),
    "known": (
        {"name": "Check buffer 7", "lot": "CB-31", "temperature": 20.0, "ph": 7.02, "u": 0.005}
        | {"expiry": datetime(2027, 1, 31)},
        {"name": "Check buffer 7", "lot": "CB-31", "temperature": 25.0, "ph": 7.00, "u": 0.005}
        | {"expiry": datetime(2027, 1, 31)},
    ),
    "meters": (
        {"meter": "M-A", "accuracy": 0.02, "resolution": 0.01},
        {"meter": "M-B", "accuracy": 0.02, "resolution": 0.01},
    ),
    "calibrations": (
        {"meter": "M-A", "probe": "P-1", "calibrated_at": _day(2, 8, 0), "slope": 98.9, "offset": -4.0}
        | {"temperature": 22.0, "buffer_lots": "CB-24; CB-29", "as_found": 7.02},
        {"meter": "M-B", "probe": "P-2", "calibrated_at": _day(2, 8, 10), "slope": 99.4, "offset": 2.5}
        | {"temperature": 22.0, "buffer_lots": "CB-24; CB-29", "as_found": 7.0},
    ),
    "events": ({"meter": "M-B", "probe": "P-2", "at": _day(1, 16, 0), "what": "probe replaced"},),
    "series": (
        {**_VESSEL, "substance": "acetic acid", "lot": "EX-A1", "amount": 50.0, "unit": "mM"},
        {**_VESSEL, "substance": "potassium chloride", "amount": 0.1, "unit": "mol/L"},
    ),
}
"""Kind of sheet -> rows, each field -> value."""
