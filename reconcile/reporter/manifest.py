"""manifest.json: what went in, what came out, with which version and settings. The one place with a clock."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from datetime import UTC, datetime
from functools import cache
from importlib.metadata import version
from importlib.resources import files
from importlib.resources.abc import Traversable
from typing import Any, Protocol

from reconcile import __version__
from reconcile.records.book import BatchRecords
from reconcile.records.over_time import Before
from reconcile.records.results import Audit
from reconcile.records.settings import Settings
from reconcile.reporter.cautions import UNSIGNED
from reconcile.reporter.plain import plain

SCHEMA = 1
MANIFEST = "manifest.json"
AUDIT = "audit"
LIBRARIES = ("numpy", "scipy", "matplotlib", "xlsxwriter", "jinja2")


class Reported(Protocol):
    """What every result that a report is written of has: an audit, meters through time."""

    @property
    def records(self) -> BatchRecords: ...

    @property
    def settings(self) -> Settings: ...

    @property
    def rows(self) -> dict[str, int]: ...


def sha256(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()


def inputs(result: Reported) -> list[dict[str, str]]:
    """Name and SHA-256 of every file read, in the order they were given, with its path as it was given."""
    if result.records.files:
        return [{"name": plain(f.name), "sha256": f.sha256, "path": plain(f.path)} for f in result.records.files]
    found: dict[tuple[str, str], None] = {}
    for sheet in result.records.sheets:
        found.setdefault((sheet.file, sheet.sha256))
    return [{"name": plain(name), "sha256": digest} for name, digest in found]


def _walk(folder: Traversable, path: str = "") -> list[tuple[str, str]]:
    found = []
    for entry in folder.iterdir():
        name = f"{path}/{entry.name}" if path else entry.name
        if entry.is_dir() and not entry.name.startswith(("_", ".")):
            found += _walk(entry, name)
        elif entry.name.endswith(".csv"):
            found.append((name, sha256(entry.read_bytes())))
    return found


@cache
def constants() -> Mapping[str, str]:
    """SHA-256 of each table of constants, substances and columns that comes with the package."""
    return dict(sorted(_walk(files("reconcile"))))


def _settings(result: Reported) -> dict[str, Any]:
    return {name: list(v) if isinstance(v, tuple) else v for name, v, *_ in result.settings.rows()}


@cache
def _id(text: str) -> str:
    digest = sha256(text.encode("utf-8"))[:16]
    return "-".join(digest[i : i + 4] for i in range(0, 16, 4))


def report_id(result: Reported, command: str = AUDIT) -> str:
    """Sixteen hexadecimal digits made from the inputs' hashes, the settings and the version, in groups of four.

    command : what the report is of; another report on the same files has another id
    """
    content: list[Any] = [sorted(i["sha256"] for i in inputs(result)), _settings(result), __version__]
    if result.records.own.files:
        content.append(sorted(result.records.own.key))
    if result.records.column_map:
        content.append(result.records.column_map)
    before = _before(result)
    if before is not None:
        content.append(before.sha256)
    if command != AUDIT:
        content.append(command)
    return _id(json.dumps(content, sort_keys=True))


def _before(result: Reported) -> Before | None:
    return result.before if isinstance(result, Audit) else None


def manifest(
    result: Reported,
    outputs: Mapping[str, bytes],
    written_at: datetime | None = None,
    command: str = AUDIT,
    question: Mapping[str, Any] | None = None,
) -> bytes:
    """manifest.json as bytes.

    outputs : path within the folder, with forward slashes -> content
    written_at : aware time of writing; now, when None
    command : that makes the same report again
    question : what was asked of the readings, where the command asks something
    """
    records, before = result.records, _before(result)
    when = (written_at or datetime.now(UTC)).astimezone(UTC)
    document = {
        "schema": SCHEMA,
        "report_id": report_id(result, command),
        "command": command,
        "version": __version__,
        "written_at": when.strftime("%Y-%m-%dT%H:%M:%SZ"),
        "notice": UNSIGNED,
        "inputs": inputs(result),
        "outputs": [{"name": name, "sha256": sha256(outputs[name])} for name in sorted(outputs)],
        "rows": result.rows,
        "settings": _settings(result),
        "settings_changed": sorted(result.settings.changed),
        **({"column_map": records.column_map} if records.column_map else {}),
        **({"question": question} if question else {}),
        **({"previous": {"report_id": plain(before.report_id), "sha256": before.sha256}} if before else {}),
        "constants": constants(),
        "own_substances": [
            {"name": file.name, "sha256": file.sha256, "where": file.where} for file in records.own.files
        ],
        "libraries": {name: version(name) for name in LIBRARIES},
    }
    return manifest_text(document)


def manifest_text(document: Mapping[str, Any]) -> bytes:
    """A manifest's document as it is written."""
    return (json.dumps(document, ensure_ascii=False, indent=2, allow_nan=False) + "\n").encode("utf-8")
