"""Substances of a site: read from TOML, checked against the library, kept in its configuration or beside a record.

[[substance]]                      [[acid]]
name = "levulinic acid"            name = "levulinic acid"
formula = "C5H8O3"                 charge = 0          # of the fully protonated form
acid = "levulinic acid"            [[acid.step]]
protons_removed = 0                pka = 4.64          # 25 °C, ionic strength 0
source = "..."                     u = 0.03
                                   source = "..."
"""

from __future__ import annotations

import csv
import errno
import hashlib
import os
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cache, cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from reconcile.records.places import Place
from reconcile.records.problems import InputProblems, Problem
from reconcile.records.substances import Form, package_forms

if TYPE_CHECKING:
    from reconcile.records.own_checks import OwnStep

BESIDE = "substances.toml"
"""Name of the file beside a record's first file."""
FOLDER = "substances"
"""Folder of such files within the configuration."""
ENVIRONMENT = "RECONCILE_CONFIG"
"""Environment variable that names the configuration's folder, where it is not the usual one."""


@dataclass(frozen=True)
class OwnFile:
    """One file that was read: its name, SHA-256, and where it lay ("configuration", "beside the record")."""

    name: str
    sha256: str
    where: str


@dataclass(frozen=True)
class OwnSubstances:
    """A site's substances, from one file or several; equal where the files are."""

    files: tuple[OwnFile, ...] = ()
    forms: tuple[Form, ...] = field(default=(), compare=False)
    steps: tuple[OwnStep, ...] = field(default=(), compare=False)

    @cached_property
    def key(self) -> tuple[str, ...]:
        """What tells one set from another."""
        return tuple(file.sha256 for file in self.files)

    def __add__(self, other: OwnSubstances) -> OwnSubstances:
        return OwnSubstances(self.files + other.files, self.forms + other.forms, self.steps + other.steps)

    @property
    def acids(self) -> dict[str, tuple[int, int]]:
        """Acid -> charge of its fully protonated form, number of steps."""
        found: dict[str, tuple[int, int]] = {}
        for step in self.steps:
            found[step.acid] = step.charge, step.step
        return found


def configuration_folder() -> Path:
    """The folder in which a user's configuration lies; it need not exist."""
    named = os.environ.get(ENVIRONMENT)
    if named:
        return Path(named)
    if os.name == "nt" and os.environ.get("APPDATA"):
        return Path(os.environ["APPDATA"]) / "reconcile"
    return Path(os.environ.get("XDG_CONFIG_HOME") or Path.home() / ".config") / "reconcile"


def parse(
    content: bytes, name: str, where: str, known: Iterable[Form], acids: Mapping[str, tuple[int, int]], shown: str = ""
) -> OwnSubstances:
    """The substances of one file.

    Parameters
    ----------
    content, name, where
        Of the file: its bytes, its name, where it lies ("configuration" or "beside the record").
    known : iterable of Form
        Forms that exist already.
    acids : mapping
        Acids that exist already -> charge of the fully protonated form, number of steps.
    shown : str
        The file as messages name it, by default its name.

    Raises
    ------
    InputProblems
        With everything that is wrong with the file.
    """
    import tomllib  # no run without such a file waits for these

    from reconcile.records.own_checks import Checks

    checks = Checks(shown or name)
    try:
        tree = tomllib.loads(content.decode("utf-8-sig"))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise InputProblems([Problem("toml-bad", Place(shown or name), str(error))]) from None
    for key in tree:
        if key not in ("substance", "acid"):
            checks.say("own-key", key, "the file", known="[[substance]] or [[acid]]")
    steps = checks.acids(tree.get("acid", []), acids)
    own = OwnSubstances((OwnFile(name, hashlib.sha256(content).hexdigest(), where),), (), tuple(steps))
    forms = checks.forms(tree.get("substance", []), {**acids, **own.acids}, known)
    if not forms and not checks.problems:
        checks.say("own-missing", "[[substance]]", "the file")
    if checks.problems:
        raise InputProblems(checks.problems)
    return OwnSubstances(own.files, tuple(forms), own.steps)


@cache
def library_acids() -> Mapping[str, tuple[int, int]]:
    """Acids of the package -> charge of the fully protonated form, number of steps, from the table of another room."""
    found: dict[str, tuple[int, int]] = {}
    table = Path(__file__).parents[1] / "chemistry" / "acids.csv"
    with table.open(encoding="utf-8", newline="") as file:
        for row in csv.DictReader(file):
            found[row["acid"]] = int(row["charge_of_fully_protonated_form"]), int(row["step"])
    return found


def _joined(files: Iterable[tuple[Path, str]]) -> OwnSubstances:
    """What several files hold together; each is checked against those before it, and a copy of one is passed over."""
    own = OwnSubstances()
    for path, where in files:
        content = _bytes(path)
        if hashlib.sha256(content).hexdigest() not in own.key:
            own = own + _parsed(content, path.name, where, own, str(path))
    return own


def _bytes(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError as error:
        code = "file-unreadable" if path.exists() else "file-missing"
        raise InputProblems([Problem(code, Place(str(path)), error.strerror or "unreadable")]) from None


def _parsed(content: bytes, name: str, where: str, before: OwnSubstances, shown: str) -> OwnSubstances:
    forms, acids = [*package_forms(), *before.forms], {**library_acids(), **before.acids}
    return parse(content, name, where, forms, acids, shown)


def _kept() -> list[tuple[Path, str]]:
    folder = configuration_folder() / FOLDER
    return [(path, "configuration") for path in sorted(folder.glob("*.toml"))] if folder.is_dir() else []


_NONE = OwnSubstances()
_read: dict[tuple[tuple[str, int, int], ...], OwnSubstances] = {}


def own_of_user() -> OwnSubstances:
    """The substances kept in the user's configuration; raises InputProblems where a file there is not in order."""
    kept = _kept()
    if not kept:
        return _NONE
    now = tuple((str(path), path.stat().st_mtime_ns, path.stat().st_size) for path, _ in kept)
    if now not in _read:
        _read[now] = _joined(kept)
    return _read[now]


def own_of_record(paths: Iterable[Path | str]) -> OwnSubstances:
    """Those of the user, with those of a file beside the record's files."""
    folders = dict.fromkeys(Path(path).parent for path in paths)
    beside = [(folder / BESIDE, "beside the record") for folder in folders if (folder / BESIDE).is_file()]
    return _joined([*_kept(), *beside])


def keep(path: Path, beside: Path | None = None, replace: bool = False) -> tuple[OwnSubstances, Path]:
    """Check a file of substances and keep a copy of it.

    path : the file; beside : a record's folder, in place of the user's configuration; replace : a copy that is there

    Returns what the file holds, and where the copy lies. Raises InputProblems where the file is not in order, and
    FileExistsError where a copy is there already.
    """
    content = _bytes(path)
    target = configuration_folder() / FOLDER / path.with_suffix(".toml").name if beside is None else beside / BESIDE
    others = [(p, where) for p, where in _kept() if p != target and _bytes(p) != content]
    where = "configuration" if beside is None else "beside the record"
    own = _parsed(content, target.name, where, _joined(others), str(path))
    if target.exists() and not replace and target.read_bytes() != content:
        raise FileExistsError(f"{target} holds other substances already; give --replace to put this file in its place")
    if beside is not None and not beside.is_dir():
        raise NotADirectoryError(errno.ENOTDIR, "not a folder", str(beside))
    target.parent.mkdir(parents=True, exist_ok=True)
    new = target.with_name(f".{target.name}.new")
    new.write_bytes(content)
    new.replace(target)
    return own, target
