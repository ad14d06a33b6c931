"""The ledger of rows set aside, and the question asked where one choice would settle many of them."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

from reconcile.importer.compose import Composer
from reconcile.importer.lines import Recipes
from reconcile.importer.tables import TableCells
from reconcile.records.arrays import AnyArray
from reconcile.records.book import SetAside
from reconcile.records.places import Place
from reconcile.records.problems import Problem, shown

CHOICES: Mapping[str, str] = {
    "decimal": 'Say it in the settings: [reading] decimal = "," or decimal = ".".',
    "date_order": 'Say it in the settings: [reading] date_order = "day-month" or "month-day".',
    "year": "Write years with four digits and export the record again.",
}
MANY_SHARE, MANY_LEAST = 0.05, 3


def ask_where_many(tables: Sequence[TableCells]) -> list[Problem]:
    """A problem for every column in which 5 % of the rows, and at least 3, have one fault that a choice settles."""
    found = []
    for table in tables:
        for name, parsed in table.columns.items():
            for choice, rows in parsed.open_choice.items():
                if len(rows) < MANY_LEAST or len(rows) < MANY_SHARE * len(table):
                    continue
                words = (("count", str(len(rows))), ("rows", str(len(table))), ("choice", CHOICES[choice]))
                found.append(Problem("too-many-alike", table.place(rows[0], name), parsed.bad[rows[0]].read, words))
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
    lot = _lot_of(problem, composer, group) or columns["known_lot"][i]
    cause = problem.place
    return SetAside(
        place=place,
        cause=cause,
        code=problem.code,
        read=problem.read,
        reason=problem.reason,
        advice=problem.advice,
        batch=batch,
        meter=columns["meter"][i],
        lot=lot,
        summary=summary,
    )


def _lot_of(problem: Problem, composer: Composer, group: int) -> str:
    """Lot of the recipe line that caused it; where the cause is the reading itself, the lots of its whole recipe."""
    lines = composer.by_group.get(group, [])
    L = composer.lines
    mine = [i for i in lines if composer.reader.place(i, "") == replace(problem.place, column="")]
    named = [L.lot[i] for i in (mine or lines) if L.lot[i]]
    return "; ".join(dict.fromkeys(named))


__all__ = ["ask_where_many", "set_aside", "shown"]
