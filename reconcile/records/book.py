"""BatchRecords: what the files say, checked, in columns, with the place of every row."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from reconcile.records.adjusting import OpenAmounts, Solved
from reconcile.records.arrays import AnyArray, FloatArray, IntArray, TextArray
from reconcile.records.own_substances import OwnSubstances, own_of_record
from reconcile.records.places import Place
from reconcile.records.problems import Problem
from reconcile.records.substances import Form


@dataclass(frozen=True)
class FileSource:
    """One file that was read: its path as it was given, with forward slashes; its name; its SHA-256."""

    path: str
    name: str
    sha256: str


@dataclass(frozen=True)
class SheetSource:
    """One sheet that was read, and how it was understood.

    file, sheet : as in Place
    kind : which table its rows belong to ("readings", "recipes", "stocks", ...; "" when not recognised)
    heading_row : row of the headings; 0 when none was found
    columns : field of the column table -> (column name as in Place, heading as written, unit as understood)
    ignored : headings that match no column of the table
    sha256 : of the file
    rows : counts by kind of row: "data", "blank", "title", "units", "heading repeat", "summary"
    """

    file: str
    sheet: str
    kind: str
    heading_row: int
    columns: Mapping[str, tuple[str, str, str]]
    ignored: tuple[str, ...] = ()
    sha256: str = ""
    rows: Mapping[str, int] = field(default_factory=dict)


@dataclass(frozen=True)
class Table:
    """Rows of one kind as columns of equal length.

    columns : field name (see records/columns.py) -> array (n,): float64 with NaN for numbers, object (str, "" when
        missing) for text, datetime64[s] with NaT for times. Every field of the table's kind is present.
    source : IntArray (n,), index into BatchRecords.sheets
    row : IntArray (n,), row number in that sheet
    """

    kind: str
    columns: Mapping[str, AnyArray]
    source: IntArray
    row: IntArray

    def __len__(self) -> int:
        return len(self.row)

    def __getitem__(self, name: str) -> AnyArray:
        return self.columns[name]


@dataclass(frozen=True)
class Lots:
    """Every stock lot that a used reading rests on; a lot is one bottle, whatever its contents.

    name : TextArray (l,)          lot as written; where one lot name stands for two substances, "name (substance)"
    form : IntArray (l,)           index into BatchRecords.forms of what the label says
    u_strength : FloatArray (l,)   relative standard uncertainty of the strength [-]
    strength : FloatArray (l,)     strength of a stock solution, in `unit`; NaN for a solid or when unstated
    unit : TextArray (l,)          unit of that strength
    row : IntArray (l,)            row in the stocks table; -1 when the lot is named only in recipes
    """

    name: TextArray
    form: IntArray
    u_strength: FloatArray
    strength: FloatArray
    unit: TextArray
    row: IntArray

    def __len__(self) -> int:
        return len(self.name)


@dataclass(frozen=True)
class Solutions:
    """What each solution that was read holds, as contributions of one form each.

    batch : TextArray (s,)          batch a solution belongs to ("" for a known solution)
    stage : TextArray (s,)          stage ("" when none is named)
    per_kg_water : BoolArray (s,)   True: amounts are mol per kg of water; False: mol per litre of solution at 20 °C
    known_ph : FloatArray (s,)      certified pH where the solution is a known one, else NaN
    known_u : FloatArray (s,)       its standard uncertainty, else NaN

    Contributions, (c,), sorted by solution:
    solution : IntArray     index of the solution
    form : IntArray         index into BatchRecords.forms
    lot : IntArray          lot the amount was taken from; -1 when none is named
    amount : FloatArray     final concentration of the form [mol/L or mol/kg, as per_kg_water says]
    u_amount : FloatArray   relative standard uncertainty of taking the amount (balance, pipette, volume) [-]
    by_mass : BoolArray     True where the amount was weighed, so that another form changes the amount by the molar mass
    recipe_row : IntArray   row in the recipes table; -1 when it stands in the readings sheet (wide layout)
    place : tuple of Place  cell of the amount
    stated : TextArray      amount as written, with its unit ("25 mL of lot X"), for messages

    Chains: a contribution made through stocks of stocks depends on every lot of the chain:
    chain_contribution, chain_lot : IntArray (k,), pairs; the direct lot is among them.

    without_effect : BoolArray (s,), True where the recipe names a substance declared without effect on pH (empty: none)
    known_u_temperature : FloatArray (s,), the part of known_u that comes from a temperature not recorded (empty: none)
    """

    batch: TextArray
    stage: TextArray
    per_kg_water: AnyArray
    known_ph: FloatArray
    known_u: FloatArray
    solution: IntArray
    form: IntArray
    lot: IntArray
    amount: FloatArray
    u_amount: FloatArray
    by_mass: AnyArray
    recipe_row: IntArray
    place: tuple[Place, ...]
    stated: TextArray
    chain_contribution: IntArray
    chain_lot: IntArray
    without_effect: AnyArray = field(default_factory=lambda: np.zeros(0, bool))
    known_u_temperature: FloatArray = field(default_factory=lambda: np.zeros(0))

    def __len__(self) -> int:
        return len(self.batch)


@dataclass(frozen=True)
class SetAside:
    """One row of the readings sheets that is kept out of the reckoning, and why.

    place : the row; cause : the cell that caused it (a recipe's, where the row rests on a bad recipe)
    code : key of the PROBLEMS table; read : what stood there; reason, advice : sentences
    batch, meter, lot : names as far as they could be read; several lots are parted by "; "
    summary : a mean or total row: listed and counted, but not weighed against completeness
    """

    place: Place
    cause: Place
    code: str
    read: str
    reason: str
    advice: str
    batch: str = ""
    meter: str = ""
    lot: str = ""
    summary: bool = False


@dataclass(frozen=True)
class BatchRecords:
    """Everything the importer understood.

    readings : Table, only the used rows, in file order; `solution` (IntArray in readings_solution) says what was read
    rows_read : rows of the readings sheets that hold anything in a reading's columns
    set_aside : rows_read == len(readings) + len(set_aside), always
    notes : accepted repairs and notices, none of which leaves a row out
    open_amounts : amounts left to a pH, whose contributions are NaN until `solved` says what they are
    not_read : sheets that say in their first cell that they are not read (records/columns.py, NOT_READ)
    own : the site's own substances that were known when the record was read
    files : the files as they were given, in that order; empty where the record was not read from files
    column_map : the map of columns that was used; empty where there was none
    """

    sheets: tuple[SheetSource, ...]
    readings: Table
    readings_solution: IntArray
    recipes: Table
    stocks: Table
    known: Table
    meters: Table
    calibrations: Table
    events: Table
    series: Table
    forms: tuple[Form, ...]
    lots: Lots
    solutions: Solutions
    rows_read: int
    set_aside: tuple[SetAside, ...]
    notes: tuple[Problem, ...]
    without_effect: tuple[str, ...] = ()
    open_amounts: OpenAmounts = field(default_factory=OpenAmounts)
    solved: Solved = field(default_factory=Solved)
    not_read: tuple[Place, ...] = ()
    own: OwnSubstances = field(default_factory=OwnSubstances)
    files: tuple[FileSource, ...] = ()
    column_map: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)

    def place(self, table: Table, index: int, name: str = "") -> Place:
        """Place of a row of a table, or of one field in it."""
        sheet = self.sheets[int(table.source[index])]
        column = sheet.columns[name][0] if name and name in sheet.columns else ""
        return Place(sheet.file, sheet.sheet, int(table.row[index]), column)

    def lots_of_reading(self, index: int) -> list[int]:
        """Lots that the solution of one reading rests on, in order of first use."""
        inside = self.solutions.solution == self.readings_solution[index]
        chains = np.isin(self.solutions.chain_contribution, np.flatnonzero(inside))
        return [int(lot) for lot in dict.fromkeys(self.solutions.chain_lot[chains].tolist())]


def own_of_source(source: Iterable[Path | str | BatchRecords]) -> OwnSubstances:
    """The site's own substances of a record that was read, or those that reading some files would find."""
    given = list(source)
    paths = [one for one in given if not isinstance(one, BatchRecords)]
    return next((one.own for one in given if isinstance(one, BatchRecords)), None) or own_of_record(paths)
