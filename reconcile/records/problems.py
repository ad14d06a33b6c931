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
