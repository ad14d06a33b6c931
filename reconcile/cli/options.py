"""The options that commands share, each declared once."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

DEBUG = "reconcile.debug"
"""Key in the context under which the edge finds whether a traceback is wanted."""


def _remember_debug(context: typer.Context, value: bool) -> bool:
    context.meta[DEBUG] = value
    return value


Files = Annotated[
    list[Path],
    typer.Argument(metavar="FILE", help="Workbooks (.xlsx, .xlsm) or CSV files of one record.", show_default=False),
]
Out = Annotated[
    Path | None,
    typer.Option(
        "--out",
        metavar="DIR",
        help="Folder of the report [default: reports/<name of the first file>, of meters with _meters behind it].",
    ),
]
Replace = Annotated[bool, typer.Option("--replace", help="Replace a report that is already there.")]
Json = Annotated[bool, typer.Option("--json", help="Print the result as JSON, and nothing else, on standard output.")]
Quiet = Annotated[bool, typer.Option("--quiet", help="No messages and no progress on standard error.")]
SettingsFile = Annotated[
    Path | None,
    typer.Option("--settings", metavar="FILE.toml", help="Settings that differ from the defaults."),
]
ColumnsFile = Annotated[
    Path | None,
    typer.Option("--columns", metavar="FILE.toml", help="Which of your headings stands for which column."),
]
Strict = Annotated[bool, typer.Option("--strict", help="Exit with 3 when something was flagged.")]
Debug = Annotated[
    bool,
    typer.Option("--debug", help="Show where an error arose.", callback=_remember_debug),
]


def example(*lines: str) -> str:
    """The closing lines of a command's help, kept as they stand."""
    return "\n".join(["\b", "Examples:" if len(lines) > 1 else "Example:", *(f"  {line}" for line in lines)])
