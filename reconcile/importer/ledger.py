"""The ledger of rows set aside, and the questions asked where one choice would settle many of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from reconcile.importer.compose import Composer
from reconcile.importer.lines import Recipes
from reconcile.importer.raw import Marker
from reconcile.importer.tables import TableCells
from reconcile.records.arrays import AnyArray
from reconcile.records.book import SetAside
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.settings import Settings

CHOICES: Mapping[str, str] = {
    "decimal": 'Say it in the settings: [reading] decimal = "," or decimal = ".".',
    "date_order": 'Say it in the settings: [reading] date_order = "day-month" or "month-day".',
    "year-short": 'Write years with four digits, or say in the settings: [reading] two_digit_years = "2000".',
    "time-zone": 'Write local wall times, or say in the settings: [reading] time_zone = "ignore".',
    "blank_batch": 'Say it in the settings: [reading] blank_batch = "above" or "missing".',
    "delimiter": 'Name the delimiter in the settings: [reading] delimiter = ";" (or ",", "tab" or "|").',
}
MANY_SHARE, MANY_LEAST = 0.05, 3


def questions(tables: Sequence[TableCells], settings: Settings) -> list[Problem]:
    """A problem wherever 5 % of a table's rows, and at least 3, have one fault that a choice settles."""
    found = []
    for table in tables:
        for name, parsed in table.columns.items():
            for choice, rows in parsed.open_choice.items():
                if _many(len(rows), len(table)):
                    read = parsed.bad[rows[0]].read if rows[0] in parsed.bad else "nothing"
                    found.append(_question(table, choice, rows, table.place(rows[0], name), read))
        ragged = sorted(i for i, p in table.whole_row.items() if p.code == "row-width")
        if _many(len(ragged), len(table)):
            read = f"{table.whole_row[ragged[0]].read} fields in the line"
            found.append(_question(table, "delimiter", ragged, table.place(ragged[0]), read))
        found.extend(_never_calculated(table))
        if settings["reading.leading_zeros"] == "ask":
            found.extend(_lost_zeros(table))
    return found


def _many(count: int, rows: int) -> bool:
    return count >= MANY_LEAST and count >= MANY_SHARE * rows


def _question(table: TableCells, choice: str, rows: Sequence[int], place: Place, read: str) -> Problem:
    words = (("count", str(len(rows))), ("rows", str(len(table))), ("choice", CHOICES[choice]))
    return Problem("too-many-alike", place, read, words)


def _never_calculated(table: TableCells) -> list[Problem]:
    """A column of formulas none of which was ever calculated."""
    found = []
    for name in ("ph", "amount"):
        parsed = table.columns.get(name)
        if parsed is None or len(table) == 0:
            continue
        rows = [i for i, fault in parsed.bad.items() if fault.code == "formula-uncalculated"]
        if rows and not np.isfinite(parsed.values).any():
            found.append(table.problem(rows[0], name, replace(parsed.bad[rows[0]], code="formulas-uncalculated")))
    return found


def _lost_zeros(table: TableCells) -> list[Problem]:
    """A name stored as a number, such as 12, beside a text that differs by leading zeros alone, such as 0012."""
    found = []
    for name in ("batch", "lot", "meter", "probe"):
        if name not in table.columns:
            continue
        cells = table.cells(table.block.columns[name])
        if set(map(type, cells)) <= {str}:
            continue
        texts = {v.strip().lstrip("0"): v.strip() for v in cells if isinstance(v, str) and v.strip().startswith("0")}
        texts |= {v.text.lstrip("0"): v.text for v in cells if isinstance(v, Marker) and v.kind == "padded"}
        for i, v in enumerate(cells):
            if type(v) in (float, int) and float(v).is_integer() and str(int(v)) in texts:
                words = (("name", name), ("other", f'"{texts[str(int(v))]}"'))
                found.append(Problem("names-zeros", table.place(i, name), str(int(v)), words))
                break
    return found


def rows_without_name(tables: Sequence[TableCells]) -> list[Problem]:
    """Notices about rows of recipes and stocks that no reading can rest on, because they name no batch or no lot."""
    found = []
    for table in tables:
        name = {"recipes": "batch", "stocks": "lot"}.get(table.block.kind, "")
        if not name:
            continue
        nameless = np.flatnonzero((table.columns[name].values == "") & ~table.summary)
        if len(nameless):
            words = (("count", str(len(nameless))), ("name", name))
            found.append(Problem("row-nameless", table.place(int(nameless[0]), name), words=words))
    return found


def set_aside(
    problem: Problem,
    place: Place,
    columns: Mapping[str, AnyArray],
    i: int,
    summary: bool,
    composer: Composer,
    recipes: Recipes,
    group: int,
) -> SetAside:
    """One row of the ledger; the cause's own cell is kept where it lies in a recipe or a stock."""
    batch = columns["batch"][i]
    if group < 0 and batch:
        group = next(iter(recipes.by_batch.get(batch, [])), -1)
    return SetAside(
        place=place,
        cause=problem.place,
        code=problem.code,
        read=problem.read,
        reason=problem.reason,
        advice=problem.advice,
        batch=batch,
        meter=columns["meter"][i],
        lot=_lots_of(problem, composer, group) or columns["known_lot"][i],
        summary=summary,
    )


def _lots_of(problem: Problem, composer: Composer, group: int) -> str:
    """Lots that the row is lost to, parted by "; ": that of the recipe line at fault, or all of the row's recipe."""
    lines, L = composer.by_group.get(group, []), composer.lines
    at_fault = [i for i in lines if composer.reader.place(i, "") == replace(problem.place, column="")]
    return "; ".join(dict.fromkeys(L.lot[i] for i in (at_fault or lines) if L.lot[i]))
