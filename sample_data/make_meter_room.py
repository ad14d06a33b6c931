"""Makes meter_room.xlsx: half a year of calibrations and buffer checks of six meters in an invented solution room.

Run from anywhere: python sample_data/make_meter_room.py. Planted: the slope of Bench 1 falls by 0.03 % a day; the
offset of Bench 3 jumps by 12 mV in the sixteenth week, and nobody logged why; Bench 4 drifts by 0.006 pH a day between
calibrations; Bench 5 gets a new probe, which is logged; Bench 6 is 2.5 times as noisy. The same bytes each time.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import xlsxwriter

HERE = Path(__file__).resolve().parent
START = datetime(2025, 1, 6, 8)
WEEKS = 26
METERS = ("Bench 1", "Bench 2", "Bench 3", "Bench 4", "Bench 5", "Bench 6")
BUFFERS = {"phthalate": 4.001, "phosphate": 6.881, "borax": 9.225}
"""Known solutions and their pH at 20 °C, by the table of published standard buffers that comes with the program."""
NEW_PROBE, JUMP = 13, 15
HEADINGS = {
    "Calibrations": ("Meter", "Probe", "Calibrated at", "Slope (%)", "Offset (mV)", "Temperature (°C)", "Buffer lots"),
    "Events": ("Meter", "Date", "What was done"),
    "Readings": ("Read at", "Known solution", "Meter", "Probe", "Temperature (°C)", "pH"),
}


def probe_of(meter: int, week: int) -> str:
    """The probe on a meter in a week."""
    return f"P-{meter + 1:02d}" if not (meter == 4 and week >= NEW_PROBE) else "P-11"


def calibrations(rng: np.random.Generator) -> Iterator[Sequence[Any]]:
    """One calibration of each meter, every Monday."""
    for week in range(WEEKS):
        for meter in range(len(METERS)):
            age = 7 * (week - (NEW_PROBE if meter == 4 and week >= NEW_PROBE else 0))
            slope = 98.8 - (0.03 if meter == 0 else 0.004) * age + rng.normal(0, 0.3)
            offset = 3.0 - meter + 0.01 * age + (12.0 if meter == 2 and week >= JUMP else 0.0) + rng.normal(0, 1.0)
            at = START + timedelta(days=7 * week, minutes=12 * meter)
            lots = f"CB-{4 + week // 9}, CB-{14 + week // 9}"
            yield METERS[meter], probe_of(meter, week), at, round(slope, 1), round(offset, 1), 20.0, lots


def checks(rng: np.random.Generator) -> Iterator[Sequence[Any]]:
    """One known solution on each meter on most working days, each buffer in turn."""
    names = list(BUFFERS)
    for day in range(7 * WEEKS):
        if day % 7 in (5, 6):
            continue
        for meter in range(len(METERS)):
            if rng.random() < 0.25:
                continue
            name = names[(day + meter) % 3]
            drift = 0.006 * (day % 7) if meter == 3 else 0.0
            ph = BUFFERS[name] + drift + rng.normal(0, 0.012 * (2.5 if meter == 5 else 1.0))
            at = START + timedelta(days=day, hours=3, minutes=7 * meter)
            yield at, name, METERS[meter], probe_of(meter, day // 7), 20.0, round(float(ph), 2)


def main(folder: Path = HERE) -> None:
    """Write the workbook."""
    rng = np.random.default_rng(20250106)
    rows = {
        "Calibrations": list(calibrations(rng)),
        "Events": [("Bench 5", START + timedelta(days=7 * NEW_PROBE, hours=-1), "new probe")],
        "Readings": list(checks(rng)),
    }
    book = xlsxwriter.Workbook(str(folder / "meter_room.xlsx"))
    book.set_properties({"created": START, "title": "Meters of an invented solution room"})
    bold = book.add_format({"bold": True, "bottom": 1})
    time, hundredth, tenth = (book.add_format({"num_format": f}) for f in ("yyyy-mm-dd hh:mm", "0.00", "0.0"))
    for name, headings in HEADINGS.items():
        sheet = book.add_worksheet(name)
        sheet.freeze_panes(1, 0)
        sheet.set_column(0, len(headings) - 1, 17)
        sheet.write_row(0, 0, headings, bold)
        for i, row in enumerate(rows[name], start=1):
            for j, value in enumerate(row):
                if isinstance(value, datetime):
                    sheet.write_datetime(i, j, value, time)
                elif isinstance(value, float):
                    sheet.write_number(i, j, value, hundredth if headings[j] == "pH" else tenth)
                else:
                    sheet.write_string(i, j, value)
    about = book.add_worksheet("About")
    about.set_column(0, 0, 110)
    about.write_string(0, 0, "Half a year of six meters in an invented solution room. Nobody and nothing in it exists.")
    book.close()


if __name__ == "__main__":
    main()
