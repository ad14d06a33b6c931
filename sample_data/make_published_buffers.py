"""Makes published_buffers.xlsx: published buffer tables laid out as a record of readings, meters and lots unnamed.

Run from anywhere: python sample_data/make_published_buffers.py. Values and sources: published_buffers_source.csv. The
uncertainty of each row is the tolerance that its table deserves, or the allowance of its series in
published_allowances.csv, whichever is larger. Primary standards stand wide (a column a substance, mol/kg); the round
values and the older tables stand long, with a recipe sheet. The same bytes each time.
"""

from __future__ import annotations

import csv
from collections.abc import Iterator
from datetime import datetime
from pathlib import Path

import xlsxwriter

HERE = Path(__file__).resolve().parent
PRIMARY_TOLERANCE = 0.03
"""Half-width of a primary standard [pH]: what a pKa-and-Davies model is worth at their ionic strength."""
TITLES = {"round": "Round values", "other": "Older tables"}
READING = ("Batch", "pH", "Temperature (°C)", "Reading uncertainty (pH)", "Remark")


def rows() -> list[dict[str, str]]:
    """Every published value."""
    with (HERE / "published_buffers_source.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def allowances() -> list[dict[str, str]]:
    """Every allowance: series, one row number where it is not for them all, above which temperature, reason."""
    with (HERE / "published_allowances.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def half_width(row: dict[str, str], allowed: list[dict[str, str]]) -> float:
    """Uncertainty of one row as a half-width [pH]: the larger of its table's tolerance and its allowance."""
    wide = [
        float(a["half_width"])
        for a in allowed
        if a["series"] == row["series"]
        and a["number"] in ("", row["number"])
        and float(row["temperature_C"]) > float(a["above_C"] or "-inf")
    ]
    return max([float(row["tolerance"] or PRIMARY_TOLERANCE), *wide])


def components(row: dict[str, str]) -> Iterator[tuple[str, float]]:
    """Substances of one solution, with the amount in the row's unit."""
    for part in row["components"].split(";"):
        substance, _, amount = part.rpartition("=")
        yield substance.strip(), float(amount)


def decimals(text: str) -> str:
    """Number format that shows a value with the decimals its table gave."""
    return "0." + "0" * max(1, len(text.partition(".")[2]))


def main(folder: Path = HERE) -> None:
    """Write the workbook into a folder."""
    everything, allowed = rows(), allowances()
    book = xlsxwriter.Workbook(str(folder / "published_buffers.xlsx"))
    book.set_properties({"created": datetime(2025, 1, 6), "title": "Published buffer tables as a record"})
    bold = book.add_format({"bold": True, "text_wrap": True, "valign": "top", "bottom": 1})
    shown = {f"0.{'0' * n}": book.add_format({"num_format": f"0.{'0' * n}"}) for n in range(1, 5)}

    def sheet_of(title: str, headings: list[str]) -> xlsxwriter.worksheet.Worksheet:
        sheet = book.add_worksheet(title)
        sheet.freeze_panes(1, 1)
        for column, heading in enumerate(headings):
            sheet.set_column(column, column, 60 if heading == "Remark" else 14)
            sheet.write_string(0, column, heading, bold)
        return sheet

    def reading(sheet: xlsxwriter.worksheet.Worksheet, at: int, row: dict[str, str]) -> None:
        sheet.write_string(at, 0, row["number"])
        sheet.write_number(at, 1, float(row["pH"]), shown[decimals(row["pH"])])
        sheet.write_number(at, 2, float(row["temperature_C"]))
        sheet.write_number(at, 3, half_width(row, allowed))
        sheet.write_string(at, 4, f"{row['series']}: {row['source']}"[:200])

    primary = [row for row in everything if row["table"] == "primary"]
    substances = list(dict.fromkeys(name for row in primary for name, _ in components(row)))
    wide = sheet_of("Primary standards", [*READING, *(f"{name} (mol/kg)" for name in substances)])
    for at, row in enumerate(primary, start=1):
        reading(wide, at, row)
        for name, amount in components(row):
            wide.write_number(at, len(READING) + substances.index(name), amount)
    for table, title in TITLES.items():
        sheet = sheet_of(title, list(READING))
        for at, row in enumerate((r for r in everything if r["table"] == table), start=1):
            reading(sheet, at, row)
    recipes, at = sheet_of("Recipes", ["Batch", "Substance", "Amount", "Unit"]), 0
    for row in everything:
        if row["table"] in TITLES:
            for name, amount in components(row):
                at += 1
                recipes.write_row(at, 0, [row["number"], name, amount, row["unit"]])
    book.close()
    print(f"published_buffers.xlsx: {len(everything)} published values")


if __name__ == "__main__":
    main()
