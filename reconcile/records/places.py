"""Where a value stood in the files that were read."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, order=True)
class Place:
    """One cell (or one row, or one whole file) as the spreadsheet itself names it.

    file : name of the file, without folders
    sheet : name of the sheet; "" for a CSV file
    row : row number as shown by the spreadsheet, line number of a CSV file; 0 for the whole sheet
    column : column letters ("E") in a workbook, the heading in a CSV file; "" for the whole row
    """

    file: str
    sheet: str = ""
    row: int = 0
    column: str = ""

    @property
    def cell(self) -> str:
        """Name of the cell: E17 in a workbook, 17:pH (line:heading) in a CSV file."""
        if not self.row:
            return self.column
        if not self.column:
            return str(self.row)
        return f"{self.column}{self.row}" if self.sheet else f"{self.row}:{self.column}"

    def words(self) -> str:
        """The place as a message begins: log.xlsx, sheet "March", cell E17."""
        parts = [self.file] if self.file else []
        if self.sheet:
            parts.append(f'sheet "{self.sheet}"')
        if self.row and self.column and self.sheet:
            parts.append(f"cell {self.cell}")
        elif self.row and self.column:
            parts.append(f'line {self.row}, column "{self.column}"')
        elif self.row:
            parts.append(f"{'row' if self.sheet else 'line'} {self.row}")
        elif self.column:
            parts.append(f"column {self.column}" if self.sheet else f'column "{self.column}"')
        return ", ".join(parts)


def column_letters(index: int) -> str:
    """Letters of a column counted from 0: 0 is A, 25 is Z, 26 is AA."""
    letters = ""
    index += 1
    while index:
        index, rest = divmod(index - 1, 26)
        letters = chr(65 + rest) + letters
    return letters
