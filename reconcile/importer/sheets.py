"""From raw sheets to parsed tables: what was recognised, what was not, and what stops the import."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field

from reconcile.importer.blocks import find_blocks, label_of, nearest_headings
from reconcile.importer.cells import as_text
from reconcile.importer.headings import Block, ColumnMap
from reconcile.importer.raw import RawSheet
from reconcile.importer.tables import TableCells, read_cells
from reconcile.records.book import SheetSource
from reconcile.records.columns import BY_SHEET, NOT_READ, column
from reconcile.records.places import Place
from reconcile.records.problems import Problem, shown
from reconcile.records.settings import Settings
from reconcile.records.substances import Catalogue

_JUDGED_ELSEWHERE = ("readings", "recipes", "stocks")


@dataclass
class Book:
    """Everything read so far: parsed tables, their sheet sources, notices, and what stops the import.

    declared : sheets that say in their first cell that they are not read
    """

    tables: list[TableCells] = field(default_factory=list)
    sources: list[SheetSource] = field(default_factory=list)
    notes: list[Problem] = field(default_factory=list)
    stops: list[Problem] = field(default_factory=list)
    declared: list[Place] = field(default_factory=list)

    def of_kind(self, kind: str) -> Iterable[tuple[int, TableCells]]:
        """(index of its source, table) of every table of one kind."""
        return ((i, t) for i, t in enumerate(self.tables) if t.block.kind == kind)


def read_sheets(
    sheets: Sequence[RawSheet], settings: Settings, column_map: ColumnMap, names: Catalogue, book: Book
) -> None:
    """Add every table of every sheet; a problem that stops the import where none holds readings."""
    unread = []
    for sheet in sheets:
        if len(sheet) and sheet.columns and as_text(sheet.columns[0][0]).strip() == NOT_READ:
            book.declared.append(sheet.place())
            continue
        book.notes.extend(sheet.notes)
        blocks = find_blocks(sheet, column_map, names)
        if not blocks:
            unread.append(sheet)
        for block in blocks:
            _read_block(sheet, block, blocks, settings, book)
    kinds = {t.block.kind for t in book.tables}
    if book.stops or kinds & {"readings", "calibrations"}:
        book.notes.extend(Problem("sheet-ignored", s.place(), s.sheet or s.file) for s in unread)
        return
    for sheet in unread:
        read = ", ".join(shown(t, 30) for t in nearest_headings(sheet)[:12]) or "no text"
        book.stops.append(Problem("file-no-table", sheet.place(), read))
    if not book.stops:
        place = Place(sheets[0].file if sheets else "")
        book.stops.append(Problem("no-readings", place, ", ".join(sorted(kinds)) or "nothing"))


def _read_block(sheet: RawSheet, block: Block, blocks: Sequence[Block], settings: Settings, book: Book) -> None:
    for name, indices in block.twice:
        headed = " and ".join(f"{label_of(sheet, block, i)} in column {sheet.names[i]}" for i in indices)
        words = (("name", column(block.kind, name).title if name in _fields(block.kind) else name),)
        book.stops.append(Problem("column-twice", sheet.place(block.heading, indices[1]), headed, words))
    if block.twice:
        return
    table = read_cells(sheet, block, settings)
    book.tables.append(table)
    book.sources.append(_source(table))
    book.notes.extend(table.notes)
    table.notes = book.notes  # what is noticed later goes to the same list
    for index in block.ignored:
        label = label_of(sheet, block, index)
        book.notes.append(Problem("column-ignored", table.sheet.place(block.heading, index), label))
    for index in _unheaded(sheet, block, blocks):
        book.notes.append(Problem("heading-blank", sheet.place(block.heading, index), sheet.names[index]))
    if block.kind not in _JUDGED_ELSEWHERE:
        _note_bad_cells(table, book)


def _fields(kind: str) -> set[str]:
    return {c.name for c in BY_SHEET[kind]}


def _unheaded(sheet: RawSheet, block: Block, blocks: Sequence[Block]) -> list[int]:
    """Columns with cells in the rows of a table, but no heading, in no table at all."""
    elsewhere = {c for b in blocks for c in (*b.used(), *b.ignored)}
    if block is not blocks[0]:
        return []
    return [
        i
        for i, cells in enumerate(sheet.columns)
        if i not in elsewhere
        and not as_text(cells[block.heading]).strip()
        and not sheet.blanks(i, block.first, block.last).all()
    ]


def _note_bad_cells(table: TableCells, book: Book) -> None:
    """Cells that cannot be read in sheets on which no reading rests are left empty, and noted by column."""
    for name, parsed in table.columns.items():
        if parsed.bad:
            first = min(parsed.bad)
            words = (("count", str(len(parsed.bad))), ("name", column(table.block.kind, name).title))
            book.notes.append(Problem("cell-not-used", table.place(first, name), parsed.bad[first].read, words))


def _source(table: TableCells) -> SheetSource:
    sheet, block = table.sheet, table.block
    columns = {}

    def cell(index: int, unit: str) -> tuple[str, str, str]:
        return sheet.names[index], label_of(sheet, block, index), unit

    known = {c.name: c.unit for c in BY_SHEET[block.kind]}
    for name, index in block.columns.items():
        columns[name] = cell(index, block.units.get(name, "") or known.get(name, ""))
    if block.time_of_day >= 0:
        columns["read_at (time of day)"] = cell(block.time_of_day, "")
    for index, number in block.repeats:
        name = f"ph {number}" if number else f"ph {label_of(sheet, block, index)}"
        columns[name] = cell(index, "")
        columns.setdefault("ph", columns[name])
    for index, name, stage in block.staged:
        columns[f"{name} of stage {stage}"] = cell(index, "")
    for index, name, unit, lot in block.wide:
        columns[f"amount of {name}"] = cell(index, unit)
        if lot >= 0:
            columns[f"lot of {name}"] = cell(lot, "")
    return SheetSource(
        sheet.file,
        sheet.sheet,
        block.kind,
        int(sheet.row_numbers[block.heading]),
        columns,
        tuple(label_of(sheet, block, i) for i in block.ignored),
        sheet.sha256,
        {k: v for k, v in table.counts.items() if v},
    )
