"""Rows of the readings sheets: every reading with its fields, or the reason why it is set aside."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from reconcile.importer.blocks import label_of
from reconcile.importer.cells import Fault, Parsed, as_text, blanks, parse_numbers
from reconcile.importer.limits import fill_limits
from reconcile.importer.lines import text_column
from reconcile.importer.tables import TableCells, covered
from reconcile.records.arrays import AnyArray, IntArray, TextArray
from reconcile.records.columns import BY_SHEET, STANDINGS, column, heading_key
from reconcile.records.problems import Problem
from reconcile.records.problems import shown as shown_text
from reconcile.records.settings import Settings

JUDGED = ("target", "low_limit", "high_limit", "ph_calculated")
"""Columns that no prediction rests on: a bad cell there is noted and left empty, and the reading is kept."""


@dataclass
class ReadingRows:
    """Readings of one sheet, one a row or one a repeat.

    columns : every readings field, with resolution and repeat; row : row numbers; ph_column : name of the pH column
    group : recipe group of the row's own amounts, -1 where it has none; problem : why it is set aside, or None
    """

    columns: dict[str, AnyArray]
    row: IntArray
    ph_column: TextArray
    group: IntArray
    problem: TextArray
    summary: AnyArray
    repeated: bool

    def __len__(self) -> int:
        return len(self.row)


def missing_column(sheet: str, name: str, n: int) -> AnyArray:
    """A column that the sheet does not have: NaN, "" or NaT."""
    kind = column(sheet, name).kind
    if kind == "text":
        return np.full(n, "", object)
    if kind == "time":
        return np.full(n, np.datetime64("NaT", "s"), "datetime64[s]")
    return np.full(n, np.nan)


def read_readings(table: TableCells, groups: IntArray, settings: Settings) -> tuple[ReadingRows, list[Problem]]:
    """The readings of one sheet, and the notices about its columns."""
    n = len(table)
    notes: list[Problem] = []
    columns: dict[str, AnyArray] = {}
    for c in BY_SHEET["readings"]:
        parsed = table.columns.get(c.name)
        columns[c.name] = parsed.values if parsed is not None else missing_column("readings", c.name, n)
    _stated_by_headings(table, columns, settings, notes)
    _limits_in_one_cell(table, columns, settings, notes)
    problem = np.full(n, None, object)
    for i, why in table.whole_row.items():
        problem[i] = why
    if "ph" in table.columns:
        _ph_faults(table, table.columns["ph"], table.block.columns["ph"], problem)
    _other_faults(table, problem, notes)
    _settle_standing(table, columns, problem)
    series = columns["series"] != ""
    nothing = (columns["batch"] == "") & (columns["known"] == "") & ~series
    for i in np.flatnonzero(nothing).tolist():
        where = "batch" if "batch" in table.columns else "known"
        problem[i] = problem[i] or table.problem(i, where, Fault("nothing-read", ""))
    columns["resolution"] = _resolution(table, table.block.columns.get("ph", -1), table.columns.get("ph"), n)
    columns["repeat"] = np.ones(n)
    row = table.sheet.row_numbers[table.rows]
    ph_column = np.full(n, table.sheet.names[table.block.columns["ph"]] if "ph" in table.columns else "", object)
    rows = ReadingRows(columns, row, ph_column, groups, problem, table.summary, False)
    if table.block.repeats:
        rows = _with_repeats(table, rows, settings)
    else:
        _say_missing_ph(table, rows)
    for i in np.flatnonzero(rows.summary).tolist():
        place = table.sheet.place(int(np.searchsorted(table.sheet.row_numbers, rows.row[i])))
        rows.problem[i] = Problem("summary-row", place, _label(table, int(rows.row[i])))
    return rows, notes


def _stated_by_headings(
    table: TableCells, columns: dict[str, AnyArray], settings: Settings, notes: list[Problem]
) -> None:
    """Temperatures that a heading states, and limits that a heading gives to one stage; cells go before headings."""
    for name, text in table.block.fixed.get("ph", ()):
        columns[name] = np.where(np.isnan(columns[name]), float(text), columns[name])
    said = columns["stage"].tolist() if table.block.staged else []
    keys = {stage: heading_key(stage) for stage in set(said)}
    stages = np.array([keys[stage] for stage in said], object)
    for index, name, stage in table.block.staged:
        parsed = parse_numbers(table.cells(index), settings["reading.decimal"], table.sheet.text_cells)
        table.note(parsed, index)
        if parsed.bad:
            first = min(parsed.bad)
            label = shown_text(label_of(table.sheet, table.block, index))
            words = (("count", str(len(parsed.bad))), ("name", label))
            place = table.sheet.place(int(table.rows[first]), index)
            notes.append(Problem("cell-not-used", place, parsed.bad[first].read, words))
        holds = (stages == heading_key(stage)) & ~np.isnan(parsed.values)
        columns[name] = np.where(holds, parsed.values, columns[name])


def _limits_in_one_cell(
    table: TableCells, columns: dict[str, AnyArray], settings: Settings, notes: list[Problem]
) -> None:
    """Both limits where one cell states them: "4.5 - 4.8"."""
    if "limits" not in table.columns:
        return
    low, high = columns["low_limit"].copy(), columns["high_limit"].copy()
    texts = columns["limits"].tolist()
    bad = fill_limits(texts, low, high, settings["reading.decimal"])
    columns["low_limit"], columns["high_limit"] = low, high
    if bad:
        words = (("count", str(len(bad))), ("name", column("readings", "limits").title))
        notes.append(Problem("cell-not-used", table.place(bad[0], "limits"), texts[bad[0]], words))


def _label(table: TableCells, row_number: int) -> str:
    index = int(np.searchsorted(table.sheet.row_numbers, row_number))
    return next((as_text(c) for c in table.sheet.row(index) if as_text(c).strip()), "")


def _say_missing_ph(table: TableCells, rows: ReadingRows) -> None:
    under = covered(table.cells(table.block.columns["ph"]))
    for i in np.flatnonzero(np.isnan(rows.columns["ph"])).tolist():
        if rows.problem[i] is None or rows.problem[i].code in ("nothing-read",):
            code = "ph-merged" if under[i] else "ph-missing"
            rows.problem[i] = table.problem(i, "ph", Fault(code, ""))


def _ph_faults(table: TableCells, parsed: Parsed, column_index: int, problem: TextArray) -> None:
    for i, fault in parsed.bad.items():
        code = "ph-not-a-number" if fault.code == "number-not-a-number" else fault.code
        problem[i] = problem[i] or table.problem(i, "ph", Fault(code, fault.read, fault.words), column_index)


def _other_faults(table: TableCells, problem: TextArray, notes: list[Problem]) -> None:
    """Bad cells of the other columns: the row is set aside, or only the cell where nothing rests on it."""
    for name, parsed in table.columns.items():
        if name == "ph" or not parsed.bad:
            continue
        if name in JUDGED:
            first = min(parsed.bad)
            fault = parsed.bad[first]
            words = (("count", str(len(parsed.bad))), ("name", column("readings", name).title))
            notes.append(Problem("cell-not-used", table.place(first, name), fault.read, words))
            continue
        for i, fault in parsed.bad.items():
            problem[i] = problem[i] or table.problem(i, name, fault)


def _settle_standing(table: TableCells, columns: dict[str, AnyArray], problem: TextArray) -> None:
    """Spellings of `standing`, each distinct one looked up once."""
    values = columns["standing"]
    if "standing" not in table.columns:
        columns["standing"] = np.full(len(values), STANDINGS[""], object)
        return
    known = {text: STANDINGS.get(heading_key(text)) for text in set(values.tolist())}
    for i in (i for i, v in enumerate(values.tolist()) if known[v] is None):
        problem[i] = problem[i] or table.problem(i, "standing", Fault("standing-unknown", values[i]))
    columns["standing"] = np.array([known[v] or "" for v in values.tolist()], object)


def _resolution(table: TableCells, column_index: int, parsed: Parsed | None, n: int) -> AnyArray:
    """Resolution of the display [pH] from the decimals of the number format or of the text; NaN where unknown.

    A value that is stored with more digits than its format shows did not come from a display of that resolution.
    """
    resolution = np.full(n, np.nan)
    formats = table.sheet.formats
    shown = formats.decimals(table.sheet, column_index) if formats is not None and column_index >= 0 else None
    if shown is not None and parsed is not None:
        decimals = shown[table.rows]
        step = 10.0 ** -np.maximum(decimals, 0).astype(np.float64)
        with np.errstate(invalid="ignore"):
            finer = (decimals >= 0) & (np.abs(parsed.values - np.round(parsed.values / step) * step) > 1e-6 * step)
        if finer.any():
            label = shown_text(label_of(table.sheet, table.block, column_index))
            words = (("count", str(int(finer.sum()))), ("name", label))
            place = table.sheet.place(int(table.rows[int(np.argmax(finer))]), column_index)
            table.notes.append(Problem("display-rounded", place, words=words))
        resolution = np.where((decimals >= 0) & ~finer, step, resolution)
    if parsed is not None and parsed.decimals is not None:
        decimals = parsed.decimals
        resolution = np.where(decimals >= 0, 10.0 ** -np.maximum(decimals, 0).astype(np.float64), resolution)
    return resolution


def _with_repeats(table: TableCells, rows: ReadingRows, settings: Settings) -> ReadingRows:
    """Each filled `pH k` cell becomes a reading of its own; a row with none stays as one row without a pH."""
    n = len(table)
    pieces: list[tuple[AnyArray, int, Parsed, int]] = []
    some = np.zeros(n, bool)
    if "ph" in table.columns:
        filled = ~blanks(table.cells(table.block.columns["ph"]))
        pieces.append((filled, table.block.columns["ph"], table.columns["ph"], 1))
        some |= filled
    for index, number in sorted(table.block.repeats, key=lambda repeat: (repeat[1], repeat[0])):
        cells = table.cells(index)
        parsed = parse_numbers(cells, settings["reading.decimal"], table.sheet.text_cells)
        table.note(parsed, index)
        with np.errstate(invalid="ignore"):
            outside = (parsed.values < -2) | (parsed.values > 16)
        for i in np.flatnonzero(outside).tolist():
            parsed.bad.setdefault(i, Fault("ph-not-physical", f"{parsed.values[i]:g}"))
        filled = ~blanks(cells) & (~np.isnan(parsed.values) | np.isin(np.arange(n), list(parsed.bad)))
        pieces.append((filled, index, parsed, number or 1))
        some |= filled
    if not some.all() and pieces:
        alone, index, parsed, number = pieces[0]
        pieces[0] = (alone | ~some, index, parsed, number)
    kept = [np.flatnonzero(filled) for filled, _, _, _ in pieces]
    origin = np.concatenate(kept)
    which = np.concatenate([np.full(len(k), j) for j, k in enumerate(kept)])
    order = np.lexsort((which, origin))
    origin, which = origin[order], which[order]
    columns = {name: values[origin] for name, values in rows.columns.items()}
    problem = rows.problem[origin]
    ph_column = np.full(len(origin), "", object)
    for j, (_, index, parsed, number) in enumerate(pieces):
        mine = which == j
        columns["ph"][mine] = parsed.values[origin[mine]]
        columns["repeat"][mine] = number
        columns["resolution"][mine] = _resolution(table, index, parsed, n)[origin[mine]]
        ph_column[mine] = table.sheet.names[index]
        for name, text in table.block.fixed.get(str(index), ()):
            columns[name][mine] = text
        for k in np.flatnonzero(mine).tolist():
            i = int(origin[k])
            if i in parsed.bad:
                fault = parsed.bad[i]
                code = "ph-not-a-number" if fault.code == "number-not-a-number" else fault.code
                problem[k] = problem[k] or table.problem(i, "ph", Fault(code, fault.read, fault.words), index)
            elif np.isnan(parsed.values[i]):
                problem[k] = problem[k] or table.problem(i, "ph", Fault("ph-missing", ""), index)
    return ReadingRows(columns, rows.row[origin], ph_column, rows.group[origin], problem, rows.summary[origin], True)


__all__ = ["ReadingRows", "missing_column", "read_readings", "text_column"]
