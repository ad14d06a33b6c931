"""The house keeps its arrows: which room may import which, files of one subject, and a start that loads little."""

from __future__ import annotations

import ast
import re
import subprocess
import sys
from pathlib import Path

import pytest

import reconcile

PACKAGE = Path(reconcile.__file__).parent
ARROWS: dict[str, set[str]] = {
    "records": set(),
    "importer": {"records"},
    "chemistry": {"records"},
    "auditor": {"records"},
    "fitter": {"records", "chemistry"},
    "reporter": {"records"},
    "pipeline": {"records", "importer", "chemistry", "auditor", "fitter"},
    "replay": {"pipeline", "reporter", "records"},
    "cli": {"pipeline", "replay", "reporter", "records"},
    "__main__": {"cli"},
    "__init__": {"chemistry", "pipeline", "replay", "reporter"},  # the doors, each opened when first used
}
"""Room -> the rooms it may import, beside itself and the version number."""
LONGEST = 300
_NAME = re.compile(r"reconcile(\.\w+)+")
FILES = sorted(PACKAGE.rglob("*.py"))


def room_of(path: Path) -> str:
    """The room that a file of the package belongs to."""
    return path.relative_to(PACKAGE).parts[0].removesuffix(".py")


def modules_imported(source: str, package: str) -> set[str]:
    """Every module that a source names in an import, inside functions too, and in import_module("...")."""
    found: set[str] = set()
    for node in ast.walk(ast.parse(source)):
        if isinstance(node, ast.Import):
            found.update(alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            base = node.module or ""
            if node.level:
                parent = package.split(".")[: len(package.split(".")) - node.level + 1]
                base = ".".join([*parent, base]).rstrip(".")
            found.update([base] if base != "reconcile" else [f"reconcile.{alias.name}" for alias in node.names])
        elif isinstance(node, ast.Constant) and isinstance(node.value, str) and _NAME.fullmatch(node.value):
            found.add(node.value)
    return found


def rooms_imported(source: str, package: str) -> set[str]:
    """Rooms of the house among the modules that a source imports."""
    ours = (name.split(".") for name in modules_imported(source, package) if name.startswith("reconcile."))
    return {parts[1] for parts in ours if parts[1] in ARROWS}


def package_of(path: Path) -> str:
    return ".".join(["reconcile", *path.relative_to(PACKAGE).parts[:-1]])


def test_every_file_belongs_to_a_room_with_arrows() -> None:
    assert {room_of(path) for path in FILES} <= set(ARROWS)


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_arrows(path: Path) -> None:
    room = room_of(path)
    wrong = rooms_imported(path.read_text(encoding="utf-8"), package_of(path)) - ARROWS[room] - {room}
    assert not wrong, f"{path.relative_to(PACKAGE)} imports {', '.join(sorted(wrong))}"


@pytest.mark.parametrize(
    ("source", "rooms"),
    [
        ("import reconcile.chemistry.solve", {"chemistry"}),
        ("from reconcile.reporter import write", {"reporter"}),
        ("from reconcile import pipeline", {"pipeline"}),
        ("from reconcile import __version__", set()),
        ("def late():\n    from reconcile.auditor.audit import audit", {"auditor"}),
        ("from ..chemistry import solve", {"chemistry"}),
        ("import_module('reconcile.fitter.fit')", {"fitter"}),
    ],
)
def test_an_import_is_seen_wherever_it_stands(source: str, rooms: set[str]) -> None:
    assert rooms_imported(source, "reconcile.cli") == rooms


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(PACKAGE)))
def test_files_stay_short(path: Path) -> None:
    assert len(path.read_text(encoding="utf-8").splitlines()) <= LONGEST


def test_the_engine_needs_numpy_alone() -> None:
    allowed = {"numpy", "reconcile", "__future__"} | set(sys.stdlib_module_names)
    for path in sorted((PACKAGE / "chemistry").rglob("*.py")):
        top = {name.split(".")[0] for name in modules_imported(path.read_text(encoding="utf-8"), package_of(path))}
        assert top <= allowed, f"{path.name} imports {top - allowed}"


def modules_after(code: str) -> set[str]:
    """Top-level modules loaded once some code has run in a fresh interpreter."""
    done = subprocess.run(
        [sys.executable, "-c", f"{code}\nimport sys; print('\\n' + ' '.join(sys.modules))"],
        capture_output=True,
        text=True,
        check=True,
    )
    return {name.split(".")[0] for name in done.stdout.splitlines()[-1].split()}


HEAVY = {"pandas", "matplotlib", "scipy", "openpyxl", "python_calamine", "xlsxwriter", "jinja2"}


def test_import_of_the_package_is_light() -> None:
    assert not modules_after("import reconcile") & (HEAVY | {"numpy", "rich", "typer"})


def test_import_of_the_command_line_is_light() -> None:
    assert not modules_after("import reconcile.cli.app") & HEAVY


def test_a_prediction_loads_numpy_alone() -> None:
    code = (
        "from typer.testing import CliRunner; from reconcile.cli.app import app;"
        "r = CliRunner().invoke(app, ['predict', '0.1 M acetic acid']); assert r.exit_code == 0, r.output"
    )
    assert not modules_after(code) & HEAVY
