"""Recomputes a report from its inputs and compares: which input, file or figure no longer holds."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import islice
from pathlib import Path
from typing import TYPE_CHECKING, Any

from reconcile import pipeline
from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.settings import BY_NAME, Settings, SettingsError
from reconcile.reporter.differences import Difference, between_documents, differences
from reconcile.reporter.manifest import MANIFEST, manifest_text
from reconcile.reporter.previous import COPY, previous_of, since_previous
from reconcile.reporter.working_place import settle
from reconcile.reporter.write import LITTER, report_files

if TYPE_CHECKING:
    from reconcile.records.book import FileSource
    from reconcile.records.meter_results import MeterHistory
    from reconcile.records.pka_results import PkaFit
    from reconcile.records.results import Audit

MOST = 1_000
"""Differences of one file that are gathered; beyond, the rest is not counted."""
SAME, CHANGED, MISSING = "the same", "changed", "missing"
NEEDED = ("report_id", "command", "version", "written_at", "inputs", "outputs", "settings")
MADE_WITH = ("version", "libraries")
"""Keys of a manifest that say what made the report: told as notes, for they are no figures of it."""


_UNKNOWN = Difference("", "no such file", "a file")


@dataclass(frozen=True)
class InputCheck:
    """One input: its name, where it was found ("" for nowhere), its SHA-256 when the report was made and now."""

    name: str
    found: str
    sha256: str
    now: str

    @property
    def standing(self) -> str:
        return MISSING if not self.now else SAME if self.now == self.sha256 else CHANGED


@dataclass(frozen=True)
class FileCheck:
    """One file of the report.

    standing : the same (as recomputed; as the manifest has it, where nothing could be recomputed), changed, missing
    as_written : whether it still has the SHA-256 that the manifest gives it
    differences : where it differs from what was recomputed, at most MOST
    """

    name: str
    standing: str
    as_written: bool
    differences: tuple[Difference, ...] = ()


@dataclass(frozen=True)
class Recheck:
    """What became of a report.

    why_not : why nothing could be recomputed; "" where it was
    notes : what bears on the comparison and is no difference: other versions, files that are no part of the report
    """

    folder: Path
    report_id: str
    command: str
    version: str
    written_at: str
    inputs: tuple[InputCheck, ...]
    files: tuple[FileCheck, ...]
    notes: tuple[str, ...]
    why_not: str = ""

    @property
    def holds(self) -> bool:
        """Whether every input is the same and every file is what was recomputed."""
        standings = [x.standing for x in self.inputs] + [x.standing for x in self.files]
        return not self.why_not and all(standing == SAME for standing in standings)


def recheck(folder: Path | str, *files: Path | str, progress: pipeline.Progress | None = None) -> Recheck:
    """Recompute a report from its inputs, and compare every file of it, figure by figure.

    Parameters
    ----------
    folder : of a report that `audit`, `meters` or `pka` wrote
    files : its inputs, or folders that hold them, where they do not lie where they lay; they are known by their SHA-256
    progress : told what is being done

    Raises
    ------
    InputProblems : the folder holds no report
    """
    place = Path(folder).resolve()
    settle(place.parent)
    document = _manifest(place)
    inputs = [_located(entry, place, [Path(f) for f in files]) for entry in document["inputs"]]
    checks = tuple(check for check, _ in inputs)
    held = {p.relative_to(place).as_posix(): p for p in sorted(place.rglob("*")) if p.is_file()}
    listed = {str(o["name"]): str(o["sha256"]) for o in document["outputs"]}
    notes = [f"{name} is no part of this report" for name in held if name not in {*listed, MANIFEST} and _own(name)]
    again: dict[str, bytes] = {}
    why_not = _missing(checks)
    if not why_not:
        try:
            result = _result(document, [path for _, path in inputs], progress)
            result = _since(result, document, place)
            result = _as_it_was_given(result, document["inputs"])
            again = report_files(result, progress or (lambda what, share: None))
            notes += _made_with(document, json.loads(again[MANIFEST]))
        except (InputProblems, SettingsError, _Unusable) as refused:
            why_not = str(refused)
    names = dict.fromkeys([*again, *listed])
    compared = [_file(name, held.get(name), listed.get(name, ""), again) for name in names if name != MANIFEST]
    same_inputs = all(check.standing == SAME for check in checks)
    if again:
        compared.append(_of_manifest(document, (place / MANIFEST).read_bytes(), again[MANIFEST], same_inputs))
    report_id, command, version, written_at = (
        str(document[key]) for key in ("report_id", "command", "version", "written_at")
    )
    return Recheck(place, report_id, command, version, written_at, checks, tuple(compared), tuple(notes), why_not)


class _Unusable(ValueError):
    """The manifest says something that no report was ever made with."""


def _own(name: str) -> bool:
    return name.rpartition("/")[2] not in LITTER


def _manifest(folder: Path) -> dict[str, Any]:
    """The manifest of a report; raises InputProblems where there is none that could be one."""
    if not folder.is_dir():
        raise InputProblems([Problem("report-missing", Place(str(folder)))])
    try:
        document = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
        whole = all(key in document for key in NEEDED) and isinstance(document["settings"], dict)
        named = [(str(e["name"]), str(e["sha256"])) for e in (*document["inputs"], *document["outputs"])]
    except FileNotFoundError:
        raise InputProblems([Problem("report-missing", Place(str(folder)))]) from None
    except (OSError, ValueError, KeyError, TypeError) as error:
        raise InputProblems([Problem("report-manifest", Place(str(folder)), str(error))]) from None
    if not (whole and named):
        raise InputProblems([Problem("report-manifest", Place(str(folder)), "not all that a manifest holds")])
    return dict(document)


def _located(entry: Mapping[str, Any], folder: Path, given: Sequence[Path]) -> tuple[InputCheck, Path]:
    """An input as it is found now: with the right content if there is one such file, else the first of its name."""
    name, wanted = str(entry["name"]), str(entry["sha256"])
    path = Path(str(entry.get("path", name)))
    near = [*given, *(place / name for place in given)]
    near += [path, *(parent / path for parent in (folder, *folder.parents))]
    near += [Path(name), *(parent / name for parent in (folder, *folder.parents))]
    first: tuple[InputCheck, Path] | None = None
    for candidate in dict.fromkeys(near):
        try:
            if not candidate.is_file():
                continue
            with candidate.open("rb") as file:
                now = hashlib.file_digest(file, "sha256").hexdigest()
        except (OSError, ValueError):
            continue
        found = InputCheck(name, str(candidate), wanted, now), candidate
        if now == wanted:
            return found
        if first is None and candidate.name == path.name:
            first = found
    return first or (InputCheck(name, "", wanted, ""), path)


def _missing(inputs: Iterable[InputCheck]) -> str:
    gone = [check.name for check in inputs if check.standing == MISSING]
    if not gone:
        return ""
    return f"{' and '.join(gone)} cannot be found; name the files, or a folder that holds them, after the report"


def _settings(document: Mapping[str, Any]) -> Settings:
    sections: dict[str, dict[str, Any]] = {}
    for name, value in document["settings"].items():
        if name in BY_NAME:
            sections.setdefault(BY_NAME[name].section, {})[BY_NAME[name].key] = value
    return Settings.from_sections(sections)


def _result(
    document: Mapping[str, Any], paths: Sequence[Path], progress: pipeline.Progress | None
) -> Audit | MeterHistory | PkaFit:
    """What the command of a manifest gives today; raises _Unusable where there is no such command."""
    settings, columns = _settings(document), document.get("column_map")
    if columns is not None and not (
        isinstance(columns, dict) and all(isinstance(headings, dict) for headings in columns.values())
    ):
        raise _Unusable(f"{MANIFEST}, column_map: no map of columns")
    command = str(document["command"]).partition(" ")[0]
    if command == "audit":
        return pipeline.audit(*paths, settings=settings, columns=columns, progress=progress)
    if command == "meters":
        return pipeline.meters(*paths, settings=settings, columns=columns, progress=progress)
    question = document.get("question")
    if command != "pka" or not isinstance(question, dict):
        raise _Unusable(f"{MANIFEST}, command: {document['command']} makes no report")
    asked: dict[str, Any] = {key: tuple(value) if isinstance(value, list) else value for key, value in question.items()}
    try:
        return pipeline.fit_pka(*paths, settings=settings, columns=columns, progress=progress, **asked)
    except TypeError as error:
        raise _Unusable(f"{MANIFEST}, question: {error}") from None


def _since(result: Any, document: Mapping[str, Any], place: Path) -> Any:
    """The result compared with the earlier report whose findings this report keeps, if it was so compared."""
    named = document.get("previous")
    if named is None:
        return result
    try:
        return since_previous(result, previous_of((place / COPY).read_bytes(), str(named["report_id"]), COPY))
    except (OSError, KeyError, TypeError) as error:
        raise _Unusable(f"{COPY}: {error}") from None


def _as_it_was_given(result: Any, inputs: Sequence[Mapping[str, Any]]) -> Any:
    """The result as of files at the paths that the report names, wherever they lie now."""
    files: list[FileSource] = [
        replace(file, path=str(entry.get("path", file.path)))
        for file, entry in zip(result.records.files, inputs, strict=False)
    ]
    return replace(result, records=replace(result.records, files=tuple(files)))


def _file(name: str, path: Path | None, listed: str, again: Mapping[str, bytes]) -> FileCheck:
    if path is None:
        return FileCheck(name, MISSING, False) if listed else FileCheck(name, CHANGED, True, (_UNKNOWN,))
    content = path.read_bytes()
    as_written = hashlib.sha256(content).hexdigest() == listed
    if not again:
        return FileCheck(name, SAME if as_written else CHANGED, as_written)
    if name not in again:
        return FileCheck(name, CHANGED, as_written, (Difference("", "a file", "no such file"),))
    found = tuple(islice(differences(name, content, again[name]), MOST))
    return FileCheck(name, CHANGED if found else SAME, as_written, found)


def _of_manifest(document: Mapping[str, Any], content: bytes, again: bytes, same_inputs: bool) -> FileCheck:
    """The manifest, its clock and what made the report apart; with other inputs its hashes are others of course."""
    wanted = json.loads(again)
    wanted |= {key: document[key] for key in ("written_at", *MADE_WITH) if key in document}
    if not same_inputs or document["version"] != json.loads(again)["version"]:
        wanted |= {key: document[key] for key in ("report_id", "inputs", "outputs", "rows") if key in document}
    found = tuple(islice(between_documents(dict(document), wanted), MOST))
    if not found and content != manifest_text(wanted):
        found = (Difference("", "other bytes", "the same values in another form"),)
    return FileCheck(MANIFEST, CHANGED if found else SAME, not found, found)


def _made_with(document: Mapping[str, Any], now: Mapping[str, Any]) -> list[str]:
    """Versions that differ from those that the report was made with."""
    pairs = {"reconcile": (document["version"], now["version"])}
    then = document.get("libraries")
    pairs |= {k: (then.get(k) if isinstance(then, dict) else None, v) for k, v in now["libraries"].items()}
    return [
        f"made with {name} {was or 'unknown'}, here is {here}" for name, (was, here) in pairs.items() if was != here
    ]
