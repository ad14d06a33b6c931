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
from typing import Any

from reconcile import __version__
from reconcile.records.results import Audit
from reconcile.reporter.cautions import UNSIGNED
from reconcile.reporter.plain import plain

SCHEMA = 1
MANIFEST = "manifest.json"
LIBRARIES = ("numpy", "scipy", "matplotlib", "xlsxwriter", "jinja2")


def sha256(content: bytes) -> str:
    return hashlib.sha256(content).hexdigest()


def inputs(audit: Audit) -> list[dict[str, str]]:
    """Name and SHA-256 of every file read, in the order they were given."""
    found: dict[tuple[str, str], None] = {}
    for sheet in audit.records.sheets:
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


def _settings(audit: Audit) -> dict[str, Any]:
    return {name: list(v) if isinstance(v, tuple) else v for name, v, *_ in audit.settings.rows()}


@cache
def _id(text: str) -> str:
    digest = sha256(text.encode("utf-8"))[:16]
    return "-".join(digest[i : i + 4] for i in range(0, 16, 4))


def report_id(audit: Audit) -> str:
    """Sixteen hexadecimal digits made from the inputs' hashes, the settings and the version, in groups of four."""
    content = [sorted(i["sha256"] for i in inputs(audit)), _settings(audit), __version__]
    return _id(json.dumps(content, sort_keys=True))


def manifest(audit: Audit, outputs: Mapping[str, bytes], written_at: datetime | None = None) -> bytes:
    """manifest.json as bytes.

    outputs : path within the folder, with forward slashes -> content
    written_at : aware time of writing; now, when None
    """
    when = (written_at or datetime.now(UTC)).astimezone(UTC)
    document = {
        "schema": SCHEMA,
        "report_id": report_id(audit),
        "version": __version__,
        "written_at": when.strftime("%Y-%m-%dT%H:%M:%SZ"),
        "notice": UNSIGNED,
        "inputs": inputs(audit),
        "outputs": [{"name": name, "sha256": sha256(outputs[name])} for name in sorted(outputs)],
        "rows": audit.rows,
        "settings": _settings(audit),
        "settings_changed": sorted(audit.settings.changed),
        "constants": constants(),
        "libraries": {name: version(name) for name in LIBRARIES},
    }
    return (json.dumps(document, ensure_ascii=False, indent=2, allow_nan=False) + "\n").encode("utf-8")
