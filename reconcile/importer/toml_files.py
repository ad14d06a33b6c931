"""Settings files and maps of columns (TOML), read and begun."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from reconcile.importer.headings import ColumnMap
from reconcile.records.book import BatchRecords
from reconcile.records.columns import BY_SHEET
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import Settings

_MAP_KEYS = ("field", "unit", "substance", "repeat", "meter", "probe", "stage", "standing")


def _toml(path: Path) -> dict[str, Any]:
    """A TOML file; raises InputProblems in plain words."""
    if not path.exists():
        raise InputProblems([Problem("file-missing", Place(path.name))])
    try:
        return tomllib.loads(path.read_text(encoding="utf-8-sig"))
    except OSError as error:
        raise InputProblems([Problem("file-unreadable", Place(path.name), error.strerror or "unreadable")]) from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InputProblems([Problem("toml-bad", Place(path.name), str(error))]) from None


def read_settings(path: Path | str) -> Settings:
    """Settings from a file of sections; raises InputProblems or SettingsError where it is not one."""
    return Settings.from_sections(_toml(Path(path)))


def read_column_map(path: Path | str) -> ColumnMap:
    """A map of columns: a section for each kind of sheet, `"heading as written" = "field"` in it.

    In place of the field, a table may say {field = "ph", meter = "M-01"} or {substance = "acetic acid", unit = "mM"};
    an empty text leaves the column out.
    """
    path = Path(path)
    found: dict[str, dict[str, Any]] = {}
    problems = []
    for kind, headings in _toml(path).items():
        if kind not in BY_SHEET or not isinstance(headings, Mapping):
            problems.append(Problem("map-section", Place(path.name), kind, (("known", ", ".join(BY_SHEET)),)))
            continue
        fields = {c.name for c in BY_SHEET[kind]}
        for heading, target in headings.items():
            name = target.get("field", "ph") if isinstance(target, Mapping) else target
            good = isinstance(name, str) and (name in fields or name == "")
            if isinstance(target, Mapping):
                good = good and set(target) <= set(_MAP_KEYS) and ("substance" in target or "field" in target)
            if good:
                found.setdefault(kind, {})[" ".join(str(heading).split())] = target
            else:
                words = (("heading", str(heading)), ("known", ", ".join(sorted(fields))))
                problems.append(Problem("map-field", Place(path.name), str(target), words))
    if problems:
        raise InputProblems(problems)
    return found


def quoted(text: str) -> str:
    escaped = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c.isprintable() else f"\\u{ord(c):04X}" for c in escaped) + '"'


def column_map_text(records: BatchRecords) -> str:
    """The beginning of a map of columns: what was matched, and what was not as lines to complete."""
    lines = ["# Map of columns: heading as written = field. Lines after # are headings that match no field."]
    matched: dict[str, dict[str, str]] = {}
    ignored: dict[str, dict[str, None]] = {}
    for sheet in records.sheets:
        for name, (_, heading, _) in sheet.columns.items():
            if any(c.name == name for c in BY_SHEET.get(sheet.kind, ())):
                matched.setdefault(sheet.kind, {}).setdefault(heading, name)
        for heading in sheet.ignored:
            ignored.setdefault(sheet.kind or "readings", {})[heading] = None
    for kind in BY_SHEET:
        if kind not in matched and kind not in ignored:
            continue
        lines += ["", f"[{kind}]"]
        lines += [f"{quoted(h)} = {quoted(n)}" for h, n in matched.get(kind, {}).items()]
        lines += [f"# {quoted(h)} = " for h in ignored.get(kind, {})]
        fields = ", ".join(c.name for c in BY_SHEET[kind])
        lines.append(f"# fields: {fields}")
    return "\n".join(lines) + "\n"


def write_column_map(records: BatchRecords, path: Path | str) -> None:
    """Write the beginning of a map of columns; raises FileExistsError rather than replace a file."""
    with Path(path).open("x", encoding="utf-8") as file:
        file.write(column_map_text(records))
