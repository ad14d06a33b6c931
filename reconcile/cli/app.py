"""The command `reconcile`: its commands, and the one place where errors become plain messages and exit codes."""

from __future__ import annotations

import os
import sys
from collections.abc import Sequence
from typing import Annotated, Any

import typer
from typer.core import TyperGroup

from reconcile.cli import audit, meters, newbook, pka, predict, read, recheck, substances
from reconcile.cli.exits import DONE, INTERRUPTED, REFUSED, USAGE
from reconcile.cli.options import DEBUG
from reconcile.cli.printed import CannotPrint, flushed
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import SettingsError
from reconcile.reporter.plain import plain

SHOWN = 20
"""Problems printed before the rest is only counted."""
WRITE_REPORTS = ("audit", "meters", "pka")
"""Commands that leave a whole report folder or nothing."""


def _say(*lines: str) -> None:
    for line in lines:
        print(plain(line), file=sys.stderr)


def _refusal(problems: Sequence[Problem]) -> list[str]:
    """Every problem as a message, the first SHOWN of them, and a count of the rest."""
    lines = [problem.message() for problem in problems[:SHOWN]]
    rest = len(problems) - SHOWN
    if rest > 0:
        lines.append(f"... and {rest} more problem{'s' if rest > 1 else ''} of this kind or another.")
    return lines


class Edge(TyperGroup):
    """Runs a command; turns what the library raises into messages on standard error and an exit code."""

    def invoke(self, ctx: Any) -> Any:
        try:
            return super().invoke(ctx)
        except (typer.Exit, typer.Abort, BrokenPipeError):
            raise
        except KeyboardInterrupt:
            _say("Interrupted.")
            raise typer.Exit(INTERRUPTED) from None
        except Exception as error:
            if ctx.meta.get(DEBUG):
                raise
            code, lines = _explained(error)
            if code is None:
                raise
            unwritten = code == REFUSED and ctx.invoked_subcommand in WRITE_REPORTS
            nothing = ["Nothing was written."] if unwritten and not isinstance(error, CannotPrint) else []
            _say(*lines, *nothing)
            raise typer.Exit(code) from None


def _explained(error: Exception) -> tuple[int | None, list[str]]:
    """Exit code and message of an error; no code for the parser's own errors, which it prints itself."""
    if isinstance(error, InputProblems):
        return REFUSED, _refusal(error.problems)
    if isinstance(error, SettingsError):
        return REFUSED, [f"{error}."]
    if isinstance(error, FileExistsError):
        there = f"{error.filename} already exists; name another file" if error.filename else str(error)
        return USAGE, [f"{there}."]
    if isinstance(error, MemoryError):
        return REFUSED, ["There is not enough memory for this record."]
    if isinstance(error, OSError):
        where = f"{error.filename}: " if error.filename else "standard output: "
        return REFUSED, [f"{where}{error.strerror or error}"]
    if hasattr(error, "exit_code"):
        return None, []
    return REFUSED, [
        f"reconcile met an error of its own: {type(error).__name__}: {error}",
        "Run the same command with --debug to see where it arose.",
    ]


app = typer.Typer(
    name="reconcile",
    cls=Edge,
    help="Audits pH readings against batch recipes by full chemical equilibrium.",
    epilog="Every command has its own help: reconcile audit --help",
    no_args_is_help=True,
    add_completion=False,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
)


def _version(value: bool) -> None:
    if value:
        from reconcile import __version__

        print(f"reconcile {__version__}")
        raise typer.Exit


@app.callback()
def reconcile(
    version: Annotated[
        bool, typer.Option("--version", help="Print the version.", callback=_version, is_eager=True)
    ] = False,
) -> None:
    """Audits pH readings against batch recipes by full chemical equilibrium."""


for module in (read, predict, audit, meters, pka, substances, newbook, recheck):
    module.add_to(app)


THREADS = ("OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "OMP_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")
"""Where the libraries of linear algebra look for their number of threads, when numpy is first imported."""


def main() -> None:
    """Entry point of the console script."""
    for name in THREADS:  # one thread: the matrices are small, and sums in one order give the same bytes everywhere
        os.environ.setdefault(name, "1")
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):  # a terminal that lacks a character shows a mark in its place
            stream.reconfigure(errors="replace")
    try:
        app(prog_name="reconcile")
    except SystemExit as done:
        sys.exit(flushed(done.code if isinstance(done.code, int) else DONE))
    except OSError as error:  # from help and the like, which are printed before a command is run
        _say(*_explained(error)[1])
        sys.exit(flushed(REFUSED))
