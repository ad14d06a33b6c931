"""Files to BatchRecords: the importer's one door."""

from __future__ import annotations

import gc
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import numpy as np

from reconcile.importer.compose import Composer
from reconcile.importer.contributions import lots_of, solutions_of
from reconcile.importer.files import read_file
from reconcile.importer.headings import ColumnMap
from reconcile.importer.known import KnownSolutions
from reconcile.importer.ledger import questions, rows_without_name, set_aside
from reconcile.importer.line_parts import LineReader
from reconcile.importer.lines import Recipes, long_lines, wide_lines
from reconcile.importer.notices import notices, of_temperatures, with_grid
from reconcile.importer.raw import RawSheet
from reconcile.importer.readings import ReadingRows, missing_column, read_readings
from reconcile.importer.resolve import Resolver
from reconcile.importer.series import SeriesList, read_series
from reconcile.importer.sheets import Book, read_sheets
from reconcile.importer.solutions import Assigner
from reconcile.importer.stocks import StockRoom, read_stocks
from reconcile.records.adjusting import Solved
from reconcile.records.arrays import AnyArray
from reconcile.records.book import BatchRecords, FileSource, Table
from reconcile.records.columns import BY_SHEET, READING_EXTRA
from reconcile.records.own_substances import OwnSubstances, own_of_record
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems
from reconcile.records.settings import Settings
from reconcile.records.substances import Catalogue, catalogue

_NO_SETTINGS = Settings()


def read_books(
    paths: Sequence[Path | str],
    settings: Settings = _NO_SETTINGS,
    column_map: ColumnMap | None = None,
    catalogue: Catalogue | None = None,
) -> BatchRecords:
    """Read workbooks and CSV files into one record.

    paths : files, read together: recipes may stand in one and readings in another
    column_map : what `read_column_map` gives
    catalogue : the substances known, by default the library with the site's own
    Raises InputProblems, with every problem found, where the input is refused.
    """
    with _without_collection():
        own = own_of_record(paths)
        names = catalogue if catalogue is not None else _library(own)
        return _read(paths, settings, column_map or {}, names, own)


@contextmanager
def _without_collection() -> Iterator[None]:
    """Leave the cycle collector off: millions of cells make it run often, and none of them is in a cycle."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _read(
    paths: Sequence[Path | str], settings: Settings, column_map: ColumnMap, names: Catalogue, own: OwnSubstances
) -> BatchRecords:
    book = Book()
    sheets: list[RawSheet] = []
    files: list[FileSource] = []
    for path in map(Path, paths):
        try:
            found = read_file(path, settings)
            sheets.extend(found)
            files += [FileSource(path.as_posix(), sheet.file, sheet.sha256) for sheet in found[:1]]
        except InputProblems as refused:
            book.stops.extend(refused.problems)
    read_sheets(sheets, settings, column_map, names, book)
    if book.stops:
        raise InputProblems(book.stops)
    return replace(_understood(book, settings, names, own), files=tuple(files), column_map=column_map)


def _library(own: OwnSubstances) -> Catalogue:
    return catalogue(own)


def _understood(book: Book, settings: Settings, names: Catalogue, own: OwnSubstances) -> BatchRecords:
    recipes, room, known, series = Recipes(), StockRoom(), KnownSolutions(), SeriesList()
    long_groups: dict[str, int] = {}
    counts = {"recipes": 0, "stocks": 0}
    own_groups = {}
    for i, table in book.of_kind("recipes"):
        if "substance" in table.block.columns:
            recipes.parts.append(long_lines(table, i, counts["recipes"], recipes, long_groups))
        counts["recipes"] += len(table)
        if table.block.wide:
            recipes.parts.append(wide_lines(table, i, recipes, settings)[0])
    for _, table in book.of_kind("stocks"):
        read_stocks(table, counts["stocks"], names, room)
        counts["stocks"] += len(table)
    for i, table in book.of_kind("readings"):
        if table.block.wide:
            lines, own_groups[i] = wide_lines(table, i, recipes, settings)
            recipes.parts.append(lines)
    for _, table in book.of_kind("known"):
        known.add(table)
    for i, table in book.of_kind("series"):
        read_series(table, i, recipes, series)
    rows: list[tuple[int, ReadingRows]] = []
    for i, table in book.of_kind("readings"):
        groups = own_groups.get(i, np.full(len(table), -1, np.intp))
        found, notes = read_readings(table, groups, settings)
        rows.append((i, found))
        book.notes.extend(notes)
    book.notes.extend(rows_without_name(book.tables))
    stops = questions(book.tables, settings)
    if stops:
        raise InputProblems(stops)
    resolver = Resolver(names, room, tuple(settings["substances.without_effect"]))
    files = [(s.file, s.sheet) for s in book.sources]
    composer = Composer(LineReader(recipes.lines(), resolver, settings, files))
    composer.group_of_batch = {b: groups[0] for b, groups in recipes.by_batch.items()}
    composer.batch_names = recipes.batch
    return _records(book, rows, recipes, composer, known, series, settings, own)


def _records(
    book: Book,
    rows: list[tuple[int, ReadingRows]],
    recipes: Recipes,
    composer: Composer,
    known: KnownSolutions,
    series: SeriesList,
    settings: Settings,
    own: OwnSubstances,
) -> BatchRecords:
    fields = [c.name for c in BY_SHEET["readings"]] + list(READING_EXTRA)
    columns = {
        f: _joined(
            [r.columns[f] for _, r in rows], missing_column("readings", f, 0) if f not in READING_EXTRA else np.zeros(0)
        )
        for f in fields
    }
    number = _joined([r.row for _, r in rows], np.zeros(0, np.intp))
    source = _joined([np.full(len(r), i, np.intp) for i, r in rows], np.zeros(0, np.intp))
    ph_column = _joined([r.ph_column for _, r in rows], np.zeros(0, object))
    group = _joined([r.group for _, r in rows], np.zeros(0, np.intp))
    problem = _joined([r.problem for _, r in rows], np.zeros(0, object))
    summary = _joined([r.summary for _, r in rows], np.zeros(0, bool))
    repeated = _joined([np.full(len(r), r.repeated) for _, r in rows], np.zeros(0, bool))
    usable = np.fromiter((p is None for p in problem), bool, len(problem))
    places = _places(book, source, number)
    assigner = Assigner(recipes, composer, known, series, settings)
    solution, problems = assigner.assign(columns, group, usable, places)
    for i, why in problems.items():
        problem[i] = why
    used = solution >= 0
    aside = []
    for i in np.flatnonzero(~used).tolist():
        sheet = book.sources[int(source[i])]
        place = Place(sheet.file, sheet.sheet, int(number[i]), ph_column[i] if repeated[i] else "")
        aside.append(set_aside(problem[i], place, columns, i, bool(summary[i]), composer, recipes, int(group[i])))
    columns["resolution"] = with_grid(columns)

    def place_of(i: int, name: str = "ph") -> Place:
        sheet = book.sources[int(source[i])]
        column = ph_column[i] if name == "ph" or name not in sheet.columns else sheet.columns[name][0]
        return Place(sheet.file, sheet.sheet, int(number[i]), column)

    book.notes.extend(notices(columns, place_of, _lot_places(composer)))
    book.notes.extend(of_temperatures(columns, used, place_of, float(settings["prediction.room_temperature_c"])))
    solutions, forms, used_lots, left_open = solutions_of(assigner)
    lots, forms = lots_of(composer.resolver.lots, used_lots, forms, settings)
    readings = Table("readings", {k: v[used] for k, v in columns.items()}, source[used], number[used])
    return BatchRecords(
        sheets=tuple(book.sources),
        readings=readings,
        readings_solution=solution[used],
        **{kind: _table(book, kind) for kind in BY_SHEET if kind != "readings"},  # type: ignore[arg-type]
        forms=forms,
        lots=lots,
        solutions=solutions,
        rows_read=len(number),
        set_aside=tuple(aside),
        notes=tuple(book.notes),
        without_effect=tuple(composer.resolver.used_without_effect),
        not_read=tuple(book.declared),
        open_amounts=left_open,
        solved=Solved(),
        own=own,
    )


def _lot_places(composer: Composer) -> dict[str, Place]:
    """Every lot of the recipes and of the Stocks sheets, with the place where it is first named."""
    lines = composer.lines
    found: dict[str, Place] = {}
    for i, lot in enumerate(lines.lot.tolist()):
        if lot and lot not in found:
            found[lot] = composer.reader.place(i, "")
    for lot, stocks in composer.resolver.room.by_lot.items():
        found.setdefault(lot, stocks[0].place)
    return found


def _joined(parts: list[AnyArray], empty: AnyArray) -> AnyArray:
    return np.concatenate(parts) if parts else empty


def _places(book: Book, source: AnyArray, number: AnyArray) -> dict[str, AnyArray]:
    """File, sheet, row and the names of the batch, known and series columns of every reading."""
    out = {"row": number}
    for name, value in (
        ("file", [s.file for s in book.sources]),
        ("sheet", [s.sheet for s in book.sources]),
        ("batch", [s.columns.get("batch", ("",))[0] for s in book.sources]),
        ("known", [s.columns.get("known", ("",))[0] for s in book.sources]),
        ("series", [s.columns.get("series", ("",))[0] for s in book.sources]),
    ):
        out[name] = np.array([*value, ""], object)[source] if len(source) else np.zeros(0, object)
    return out


def _table(book: Book, kind: str) -> Table:
    """All rows of one kind, in file order, summary rows included."""
    tables = list(book.of_kind(kind))
    columns = {}
    for c in BY_SHEET[kind]:
        parts = [
            t.columns[c.name].values if c.name in t.columns else missing_column(kind, c.name, len(t)) for _, t in tables
        ]
        columns[c.name] = _joined(parts, missing_column(kind, c.name, 0))
    source = _joined([np.full(len(t), i, np.intp) for i, t in tables], np.zeros(0, np.intp))
    row = _joined([t.sheet.row_numbers[t.rows] for _, t in tables], np.zeros(0, np.intp))
    return Table(kind, columns, source, row)
