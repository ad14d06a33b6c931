"""Problems with the input as values: one table of codes holds the wording, the effect and the advice."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from enum import Enum

from reconcile.records.places import Place


class Effect(Enum):
    """What a problem does to the import."""

    STOPS = "stops the import"
    LEAVES_OUT = "leaves the row out"
    NOTED = "noted"


@dataclass(frozen=True)
class Kind:
    """One code: its effect, what is said (with {read} and any words of the problem), what was expected, what to do."""

    effect: Effect
    says: str
    expected: str
    advice: str


S, L, N = Effect.STOPS, Effect.LEAVES_OUT, Effect.NOTED
_ORIGINAL = "Compare with the original entry and correct it under site procedure; until then this reading is set aside."
PROBLEMS: Mapping[str, Kind] = {
    # files
    "file-missing": Kind(S, "there is no such file", "the name of an existing file", "Check the name and the folder."),
    "file-unreadable": Kind(
        S, "the file cannot be opened: {read}", "a file that may be read", "Check the permissions."
    ),
    "file-empty": Kind(
        S, "the file is empty", "a workbook or a CSV file with a heading row", "Export the record again."
    ),
    "file-type": Kind(
        S,
        "the content is {read}",
        "an .xlsx or .xlsm workbook, or a CSV file",
        "Save it as .xlsx or CSV and try again.",
    ),
    "file-damaged": Kind(
        S, "the workbook is damaged or incomplete: {read}", "a complete .xlsx file", "Save or copy it again."
    ),
    "file-encoding": Kind(
        S,
        "the text is not UTF-8; line reads {read}",
        "UTF-8, or a named encoding",
        'Name it in the settings: [reading] encoding = "cp1252".',
    ),
    "file-no-table": Kind(
        S,
        "no heading row was recognised; the nearest had {read}",
        "a sheet with a column pH and a column Batch or Known solution",
        "Map the headings with --columns FILE.toml (reconcile read FILE --write-columns FILE.toml).",
    ),
    "file-too-large": Kind(
        S,
        "the file inflates to {read}",
        "no more than the limit in the settings",
        "Raise [limits] inflated_mib, or split the file.",
    ),
    "file-lock": Kind(
        S,
        "this is the lock file of a workbook that is open elsewhere",
        "the workbook itself",
        "Close the workbook, or name the file without ~$.",
    ),
    "file-encrypted": Kind(
        S, "the workbook is protected by a password", "an unprotected workbook", "Save an unprotected copy."
    ),
    "file-entities": Kind(
        S,
        "part {read} declares entities",
        "a workbook as spreadsheet programs write it",
        "Save it again from a spreadsheet program.",
    ),
    "file-nul": Kind(
        S,
        "the text holds NUL bytes; it may be UTF-16",
        "UTF-8, or a named encoding",
        'Name it in the settings: [reading] encoding = "utf-16".',
    ),
    "sheet-too-wide": Kind(
        S,
        "the cells span {read} rows and columns",
        "a sheet without stray cells far outside its table",
        "Delete the empty rows and columns beyond the table and save it again.",
    ),
    "delimiter-unclear": Kind(
        S,
        "the lines can be split by {read}",
        "one delimiter",
        'Name it in the settings: [reading] delimiter = ";" (or "," or "tab").',
    ),
    "csv-quote": Kind(
        S,
        "a quotation mark is not closed, or stands inside a field: {read}",
        "quoted fields that end with a quotation mark",
        "Correct the quotation marks, or export the record again.",
    ),
    "no-readings": Kind(
        S,
        "there is no sheet of readings or calibrations; recognised: {read}",
        "a sheet with a column pH and a column Batch or Known solution",
        "Name the file with the readings too, or map its headings with --columns FILE.toml.",
    ),
    "toml-bad": Kind(S, "the file is not valid TOML: {read}", 'lines such as key = "value"', "Correct the line."),
    "map-section": Kind(S, "{read} is no kind of sheet", "a section named {known}", "Correct the map of columns."),
    "map-field": Kind(
        S, "{heading} is mapped to {read}", "one of {known}, or a table with substance", "Correct the map of columns."
    ),
    "column-twice": Kind(
        S,
        "two columns are headed as {name}: {read}",
        "one column for {name}",
        "Rename one of them, or map them with --columns.",
    ),
    "too-many-alike": Kind(
        S, "{count} of {rows} rows have the same fault: {read}", "a choice that settles it", "{choice}"
    ),
    # rows of readings
    "ph-missing": Kind(L, "there is no pH", "a number such as 7.41", _ORIGINAL),
    "ph-not-a-number": Kind(L, "pH reads {read}", "a number such as 7.41", _ORIGINAL),
    "ph-not-physical": Kind(L, "pH reads {read}", "a value between -2 and 16", _ORIGINAL),
    "number-not-a-number": Kind(L, "{name} reads {read}", "a number such as 25.0", _ORIGINAL),
    "number-out-of-range": Kind(L, "{name} reads {read}", "a value between {low} and {high}", _ORIGINAL),
    "time-not-a-time": Kind(L, "{name} reads {read}", "a date such as 2026-03-05 14:20", _ORIGINAL),
    "nothing-read": Kind(L, "neither a batch nor a known solution is named", "the batch that was read", _ORIGINAL),
    "batch-without-recipe": Kind(
        L,
        "batch {read} has no recipe",
        "a row of the recipes for this batch",
        "Add the recipe, or name the known solution that was read.",
    ),
    "known-not-known": Kind(
        L,
        "known solution {read} is neither in the record nor built in",
        "a name of the Known solutions sheet or a published standard buffer",
        "Add it to a Known solutions sheet with its certified pH.",
    ),
    "cell-error": Kind(L, "{name} holds the error {read}", "a value", _ORIGINAL),
    "formula-uncalculated": Kind(
        L,
        "{name} holds a formula without a saved value: {read}",
        "a calculated value",
        "Open the workbook in a spreadsheet program, save it, and try again.",
    ),
    "superscript-digits": Kind(L, "{name} reads {read} with raised digits", "a plain number", _ORIGINAL),
    "cell-too-long": Kind(L, "{name} holds more text than a cell can: {read}", "a short text", _ORIGINAL),
    "number-censored": Kind(
        L,
        "{name} reads {read}, a limit or a range",
        "a single number such as 7.41",
        "A limit or a range is not a reading; enter the reading itself if the original entry has it.",
    ),
    "number-turned-date": Kind(
        L,
        "{name} reads {read}, a date",
        "a number such as 7.41",
        "The spreadsheet may have turned a number into a date. " + _ORIGINAL,
    ),
    "decimal-unclear": Kind(
        L,
        "{name} reads {read}: decimal mark or thousands separator",
        "a number such as 7.41",
        'Say it in the settings: [reading] decimal = "," or decimal = ".".',
    ),
    "id-destroyed": Kind(
        L,
        "{name} reads {read}; the spreadsheet has changed the name into a date or a number",
        "a name, stored as text",
        "The original spelling cannot be recovered from the file. " + _ORIGINAL,
    ),
    "time-without-date": Kind(L, "{name} reads {read}, a time without a date", "a date and a time", _ORIGINAL),
    "time-zone": Kind(
        L,
        "{name} reads {read}, with a time zone",
        "local wall time without a zone",
        "Write all times as local wall time.",
    ),
    "date-order-unclear": Kind(
        L,
        "{name} reads {read}: day or month first",
        "a date such as 2026-03-05",
        'Say it in the settings: [reading] date_order = "day-month" or "month-day".',
    ),
    "year-short": Kind(
        L, "{name} reads {read}, a year of two digits", "a date such as 2026-03-05", "Write the year in full."
    ),
    "known-temperature": Kind(
        L,
        "known solution {read} has no certified pH at {temperature} °C",
        "a temperature within the certified ones",
        "Add the value at this temperature to the Known solutions sheet.",
    ),
    "summary-row": Kind(L, "this is a summary row: {read}", "a reading", "None needed; it is no reading."),
    "row-width": Kind(
        L,
        "the line has {read} fields",
        "{count} fields as in the heading row",
        "Is a decimal comma unquoted? Export the record again.",
    ),
    "ph-merged": Kind(
        L, "the reading is merged over several rows", "one reading a row", "It counts once, for the top row."
    ),
    "standing-unknown": Kind(L, "standing reads {read}", "original, retest or void", _ORIGINAL),
    # recipes and stocks: the readings that rest on them are set aside
    "substance-unknown": Kind(
        L,
        "substance {read} is not in the library{near}",
        "a name, synonym or formula",
        "See reconcile substances; a substance without effect on pH is declared in the settings: "
        '[substances] without_effect = ["{bare}"].',
    ),
    "substance-ambiguous": Kind(L, "substance {read} may mean {several}", "one substance", "Write the full name."),
    "substance-missing": Kind(L, "no substance is named", "a substance such as acetic acid", _ORIGINAL),
    "amount-missing": Kind(L, "there is no amount", "a number such as 25.0", _ORIGINAL),
    "amount-not-a-number": Kind(L, "the amount reads {read}", "a number such as 25.0", _ORIGINAL),
    "unit-missing": Kind(
        L,
        "the amount {read} has no unit",
        "a unit such as mM, g or mL",
        "Units are never guessed: name it in the sheet or in the heading.",
    ),
    "unit-unknown": Kind(L, "the unit reads {read}", "a unit such as mM, M, g/L, g, mL or mol/kg", _ORIGINAL),
    "unit-conflict": Kind(L, "the cell reads {read} under a heading in {name}", "one unit", _ORIGINAL),
    "unit-needs": Kind(L, "the unit {read} needs {name}", "{name}", "Add it to the Stocks sheet."),
    "made-up-to-missing": Kind(
        L,
        "{read} was taken, but not what it was made up to",
        "a volume or mass made up to",
        "Add the final volume under site procedure.",
    ),
    "made-up-to-differs": Kind(
        L, "this batch is made up to {read} and to {name}", "one final volume a batch", _ORIGINAL
    ),
    "lot-unknown": Kind(
        L, "lot {read} is not in the Stocks sheet", "a lot with its strength", "Add the lot to the Stocks sheet."
    ),
    "lot-strength-missing": Kind(
        L, "lot {read} has no strength", "a strength with its unit", "Add it to the Stocks sheet."
    ),
    "lot-other-substance": Kind(L, "lot {read} is {name} in the Stocks sheet", "the substance of the lot", _ORIGINAL),
    "lot-twice": Kind(
        L, "lot {read} stands twice in the Stocks sheet, with different content", "one row a lot", _ORIGINAL
    ),
    "adjustment-unwritten": Kind(
        L,
        "the amount reads {read}",
        "the amount of titrant added",
        "Write the amount that was added, if the original entry gives it.",
    ),
    "percent-unclear": Kind(
        L, "the amount {read} does not say % of what", "% w/v or % w/w", "Write % w/v or % w/w in the sheet."
    ),
    "strength-unit": Kind(
        L, "the strength reads {read}", "a concentration such as 0.1 mol/L", "Write a unit of concentration."
    ),
    "volume-of-what": Kind(
        L,
        "a volume of {name} is taken, but of no lot and no strength",
        "the lot, or the strength in the name (0.1 M)",
        "Name the lot, with its strength in the Stocks sheet.",
    ),
    "times-unclear": Kind(
        L, "{read} cannot be a dilution of this stock", "1x of a stock of 10x, or 10x of a stock", _ORIGINAL
    ),
    "batch-stock-amount": Kind(
        L,
        "the amount {read} of a stock that is itself a batch",
        "a volume, a mass (with the density of the lot), a multiple such as 10x, or mol/L of a substance in it",
        _ORIGINAL,
    ),
    "stock-cycle": Kind(
        L, "this stock is made from itself: {read}", "stocks made from other stocks", "Correct the Stocks sheet."
    ),
    "stock-without-recipe": Kind(
        L, "the stock is made as batch {read}, which has no recipe", "a recipe for that batch", "Add the recipe."
    ),
    "fill-not-water": Kind(
        L,
        "the solution is filled up with {read}",
        "water as what is filled up with",
        "Write the amount of it that was added, if the original entry gives it.",
    ),
    "litre-and-kilogram": Kind(
        L,
        "amounts per litre and per kilogram meet in one recipe: {read}",
        "amounts by one measure, or the density of the lots",
        _ORIGINAL,
    ),
    "no-water-left": Kind(L, "the solutes weigh more than the solution: {read}", "a smaller amount", _ORIGINAL),
    "recipe-bad": Kind(
        L, "the recipe of batch {name} cannot be used: {read}", "a complete recipe", "See the recipe's cell."
    ),
    # parts of a solution in words
    "part-unreadable": Kind(
        S,
        "the part {read} cannot be read",
        'an amount, a unit and a substance, such as "0.1 M acetic acid" or "25 mL of 0.1 M sodium hydroxide"',
        "Write numbers with a decimal point.",
    ),
    "part-unit": Kind(
        S,
        "no known unit follows the number in {read}",
        "a unit such as M, mM, mol/kg, g/L, g or mL",
        "Units are never guessed, and capitals count.",
    ),
    "part-without-total": Kind(
        S,
        "{read} is a quantity taken, and what it was made up to is not said",
        "a total volume or mass",
        'Add it: --to "100 mL".',
    ),
    "part-strength-missing": Kind(
        S,
        "{read} is a volume of {name} of unsaid strength",
        'a strength, as in "25 mL of 0.1 M sodium hydroxide"',
        "{usual}",
    ),
    "part-density-missing": Kind(
        S,
        "a strength in {read} and this quantity are joined only by a density",
        'a density at the end, as in "5 mL of 37 % w/w hydrochloric acid, 1.18 g/mL"',
        "Add the density of the stock solution.",
    ),
    "parts-mixed-bases": Kind(
        S,
        "amounts per litre and per kilogram stand side by side: {read}",
        "all amounts on one basis",
        "State all of them per litre, or all of them per kilogram.",
    ),
    "parts-over-total": Kind(
        S, "more was taken than the total of {read}", "a total not below what was taken", "Check the amounts."
    ),
    "total-unreadable": Kind(
        S, "the total reads {read}", "a volume or a mass with its unit, such as 100 mL or 1 kg", "Check --to."
    ),
    "at-out-of-range": Kind(S, "{name} is {read}", "a temperature from {low} to {high}", "Check --at."),
    "at-unreadable": Kind(S, "the temperature reads {read}", "degrees Celsius, such as 20", "Check --at."),
    "unit-percent": Kind(
        S,
        "{read} has % without w/v or w/w",
        "% w/v (g in 100 mL of solution) or % w/w (g in 100 g of solution)",
        "Say which it is; units are never guessed.",
    ),
    # notices
    "number-as-text": Kind(
        N, "{count} numbers in column {name} are stored as text", "numbers", "They were read as numbers."
    ),
    "decimal-comma": Kind(
        N, "{count} cells of column {name} use a decimal comma", "a decimal point", "They were read as decimals."
    ),
    "missing-mark": Kind(
        N, "{count} cells of column {name} hold {read} or the like", "a value", "They count as missing."
    ),
    "look-alike-characters": Kind(
        N,
        "{count} cells of column {name} hold look-alike characters: {read}",
        "plain digits and signs",
        "They were read as numbers.",
    ),
    "number-with-unit": Kind(
        N, "{count} cells of column {name} carry a unit: {read}", "numbers alone", "They were read in that unit."
    ),
    "id-number": Kind(
        N, "{count} names in column {name} are stored as numbers", "text", "They were read as written out: {read}."
    ),
    "id-padded": Kind(
        N,
        "{count} names in column {name} are numbers shown with leading zeros: {read}",
        "text",
        "They were read as shown.",
    ),
    "serial-date": Kind(
        N, "{count} cells of column {name} hold a date as a plain number: {read}", "dates", "They were read as dates."
    ),
    "cell-not-used": Kind(
        N,
        "{count} cells of column {name} cannot be read, the first is {read}",
        "values as in the rest of the column",
        "These cells are left empty; nothing else in the row changes.",
    ),
    "file-name-differs": Kind(
        N, "the name ends in {read}, but the content is a {kind}", "a name that fits", "It was read by its content."
    ),
    "file-macros": Kind(N, "the workbook may hold macros", "a workbook", "They were not run; saved values were read."),
    "file-maybe-cut": Kind(
        N,
        "the sheet has exactly {read} rows",
        "fewer",
        "Another program may have cut it off there; compare with the original record.",
    ),
    "beside-the-cells": Kind(N, "the sheet also carries {read}", "values in cells", "These were not read."),
    "epoch-1904": Kind(N, "dates count from 1904 in this workbook", "1900 or 1904", "They were read so."),
    "rows-hidden": Kind(N, "{count} rows are hidden", "visible rows", "They were read like any other."),
    "sheet-hidden": Kind(N, "sheet {read} is hidden", "a visible sheet", "It was read like any other."),
    "cells-computed": Kind(N, "{count} cells are computed by formulas", "entries", "Their saved values were read."),
    "delimiter-declared": Kind(N, "the first line says {read}", "a heading row", "The file was split as it says."),
    "column-ignored": Kind(
        N,
        "column {read} matches no column of the table and is not read",
        "a known heading",
        "Map it with --columns FILE.toml if it matters.",
    ),
    "sheet-ignored": Kind(N, "sheet {read} has no recognised headings and is not read", "a recognised sheet", ""),
    "duplicate-row": Kind(
        N, "{count} rows repeat another reading in every column", "each reading once", "Both are kept."
    ),
    "names-alike": Kind(N, "{name} {read} and {other} may be the same", "one spelling", "They are kept apart."),
}


@dataclass(frozen=True)
class Problem:
    """One problem: its code, the place, what was read there, and the words its template needs."""

    code: str
    place: Place
    read: str = ""
    words: tuple[tuple[str, str], ...] = ()

    @property
    def kind(self) -> Kind:
        return PROBLEMS[self.code]

    def _fill(self, template: str) -> str:
        values = dict(self.words)
        values.setdefault("read", shown(self.read) if self.read else "nothing")
        values.setdefault("bare", self.read)
        for _ in range(2):
            for key, value in values.items():
                template = template.replace("{" + key + "}", value)
        return template

    @property
    def reason(self) -> str:
        """What is wrong, and what was expected."""
        says = self._fill(self.kind.says)
        return f"{says}. Expected {self._fill(self.kind.expected)}." if self.kind.expected else f"{says}."

    @property
    def advice(self) -> str:
        return self._fill(self.kind.advice)

    def message(self) -> str:
        """Where, what was read, what was expected, what to do."""
        where = self.place.words()
        return " ".join(part for part in (f"{where}: {self.reason}" if where else self.reason, self.advice) if part)


def shown(text: str, most: int = 60) -> str:
    """A cell's text for a message: quoted, hidden characters made visible, cut when long."""
    visible = "".join(c if c.isprintable() else f"\\u{ord(c):04x}" for c in text)
    return f'"{visible}"' if len(visible) <= most else f'"{visible[:most]}…"'


class InputProblems(Exception):
    """The input is refused: every problem found that stops the import, in sheet order."""

    def __init__(self, problems: Sequence[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__("; ".join(p.message() for p in self.problems))
