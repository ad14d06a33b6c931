"""Heading rows found and matched through the one table of columns; titles, units and further tables told apart."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from reconcile.importer.qualified_headings import staged_limit, stated_at
from reconcile.records.columns import BY_SHEET, Column, heading_key
from reconcile.records.substances import Catalogue
from reconcile.records.units import Unit, find_unit

ColumnMap = Mapping[str, Mapping[str, Any]]
"""Kind of sheet -> heading as written -> field name, or {"field", "unit", "substance", "meter"}."""

_BRACKET = re.compile(r"^(.*?)\s*[(\[]\s*([^()\[\]]*(?:\([^()]*\)[^()]*)?)\s*[)\]]\s*$", re.DOTALL)
_COMMA_UNIT = re.compile(r"^(.*?)\s*[,/]\s*(\S+)\s*$", re.DOTALL)
_REPEAT = re.compile(r"^(?:ph|ph reading|reading|ph rep|ph repeat)\s*(\d{1,2})$")
_LOT_WORDS = (" lot", " lot no", " lot number", " bottle", " stock lot")
_PLAIN_UNITS = {"°c", "ºc", "c", "degc", "deg c", "ph", "", "-", "h", "min"}


@dataclass(frozen=True)
class Match:
    """What one heading means.

    kind : sheet kind; "wide" for a substance column, "wide lot" for the lot beside it, "repeat" for pH 1, pH 2, ...
    name : field name, or the substance as written
    unit : unit text of the heading, "" when none
    fixed : values that the heading settles for the row (a meter, where each meter has its own column)
    """

    kind: str
    name: str
    unit: str = ""
    repeat: int = 0
    fixed: tuple[tuple[str, str], ...] = ()


@dataclass
class Block:
    """One table of one sheet: its kind, its heading row, and which column holds what (indices from 0).

    staged : (column, field, stage) of limits that hold for one stage alone
    """

    kind: str
    heading: int
    first: int
    last: int
    columns: dict[str, int] = field(default_factory=dict)
    units: dict[str, str] = field(default_factory=dict)
    fixed: dict[str, tuple[tuple[str, str], ...]] = field(default_factory=dict)
    repeats: list[tuple[int, int]] = field(default_factory=list)
    wide: list[tuple[int, str, str, int]] = field(default_factory=list)
    staged: list[tuple[int, str, str]] = field(default_factory=list)
    time_of_day: int = -1
    ignored: list[int] = field(default_factory=list)
    twice: list[tuple[str, list[int]]] = field(default_factory=list)
    units_row: int = -1
    title: str = ""
    labels: dict[int, str] = field(default_factory=dict)

    def used(self) -> list[int]:
        """Every column that is read."""
        own = [*self.columns.values(), *(c for c, _ in self.repeats)]
        own += [c for c, _, _ in self.staged]
        own += [c for c, _, _, _ in self.wide] + [lot for _, _, _, lot in self.wide if lot >= 0]
        return own + ([self.time_of_day] if self.time_of_day >= 0 else [])


def split_heading(text: str) -> tuple[str, str]:
    """Name and unit of a heading: "Acetic acid (mM)" gives ("Acetic acid", "mM")."""
    bracket = _BRACKET.match(text)
    if bracket:
        return bracket.group(1).strip(), bracket.group(2).strip()
    comma = _COMMA_UNIT.match(text)
    if comma and _is_unit(comma.group(2)):
        return comma.group(1).strip(), comma.group(2)
    words = text.rsplit(None, 1)
    if len(words) == 2 and len(words[1]) > 1 and _is_unit(words[1]):
        return words[0], words[1]
    return text.strip(), ""


def _is_unit(text: str) -> bool:
    return find_unit(text) is not None or text.casefold() in ("°c", "ºc", "degc", "°f", "mv")


_KEYS: Mapping[str, Mapping[str, Column]] = {
    kind: {heading_key(h): c for c in columns for h in (c.title, *c.headings)} for kind, columns in BY_SHEET.items()
}
_ANY = {key for keys in _KEYS.values() for key in keys}


def heading_matches(row: Sequence[Any]) -> int:
    """How many cells of a row are headings of some kind of sheet."""
    return sum(1 for cell in row if isinstance(cell, str) and cell.strip() and known_heading(cell))


def known_heading(text: str) -> bool:
    """Whether a text is a heading of some kind of sheet."""
    if len(text) > 80:
        return False
    name, unit = split_heading(text)
    return any(heading_key(t) in _ANY for t in (text, name, f"{name} {unit}"))


def match_heading(text: str, kind: str, column_map: ColumnMap, catalogue: Catalogue) -> Match | None:
    """What a heading means on a sheet of one kind, or None."""
    mapped = column_map.get(kind, {}).get(text.strip())
    if mapped is not None:
        return _mapped(kind, mapped)
    name, unit = split_heading(text)
    keys = _KEYS[kind]
    if kind == "readings":
        if at := stated_at(text):
            return Match(kind, "ph", "", 0, (("reference_temperature", at),))
        if (staged := staged_limit(text, name, unit)) is not None and heading_key(text) not in keys:
            return Match("staged", staged[0], "", 0, (("stage", staged[1]),))
    column = keys.get(heading_key(text)) or (keys.get(heading_key(f"{name} {unit}")) if "(" in text else None)
    if column is not None:
        return Match(kind, column.name, unit)
    column = keys.get(heading_key(name))
    if column is not None and (find_unit(unit) or unit.casefold() in _PLAIN_UNITS or column.unit):
        return Match(kind, column.name, unit)
    if kind not in ("readings", "recipes"):
        return None
    repeat = _REPEAT.match(heading_key(name))
    if repeat and kind == "readings":
        return Match("repeat", "ph", unit, int(repeat.group(1)))
    key = heading_key(text)
    for word in _LOT_WORDS:
        if key.endswith(word) and len(key) > len(word):
            return Match("wide lot", text.strip()[: -len(word)].strip())
    measured = find_unit(unit)
    if unit and measured is not None and _may_be_substance(name, measured, catalogue):
        return Match("wide", name, unit)
    if kind == "readings" and keys_of("recipes").get(heading_key(name)) is not None:
        column = keys_of("recipes")[heading_key(name)]
        if column.name in ("made_up_to", "made_up_to_unit") and heading_key(name) not in ("volume",):
            return Match("recipes", column.name, unit)
    return None


def keys_of(kind: str) -> Mapping[str, Column]:
    """heading_key -> column, for one kind of sheet."""
    return _KEYS[kind]


def _may_be_substance(name: str, unit: Unit, catalogue: Catalogue) -> bool:
    """A name of the library, or an unknown name under a unit in which only substances are measured."""
    found = catalogue.look_up(name)
    if found.form is not None or found.several:
        return unit.measures != "percent"
    return unit.measures in ("molar", "molal", "normal", "mass_volume", "mass_mass")


def _mapped(kind: str, mapped: Any) -> Match | None:
    if isinstance(mapped, str):
        return Match(kind, mapped) if mapped else None
    if "substance" in mapped:
        return Match("wide", str(mapped["substance"]), str(mapped.get("unit", "")))
    fixed = tuple((k, str(v)) for k, v in mapped.items() if k in ("meter", "probe", "stage", "standing"))
    name = str(mapped.get("field", "ph"))
    if name == "ph" and "repeat" in mapped:
        return Match("repeat", "ph", str(mapped.get("unit", "")), int(mapped["repeat"]), fixed)
    if name == "ph" and fixed:
        return Match("repeat", "ph", str(mapped.get("unit", "")), 0, fixed)
    return Match(kind, name, str(mapped.get("unit", "")), 0, fixed)


def understand(row: Sequence[Any], kind: str, column_map: ColumnMap, catalogue: Catalogue) -> Block | None:
    """A row read as the headings of one kind of sheet; None where it cannot be that."""
    block = Block(kind, 0, 0, 0)
    lots: dict[str, int] = {}
    places: dict[str, list[int]] = {}
    wide: list[tuple[int, str, str]] = []
    for index, cell in enumerate(row):
        if not isinstance(cell, str) or not cell.strip():
            continue
        match = match_heading(cell, kind, column_map, catalogue)
        if match is None:
            block.ignored.append(index)
        elif match.kind == "wide":
            wide.append((index, match.name, match.unit))
        elif match.kind == "wide lot":
            lots[heading_key(match.name)] = index
        elif match.kind == "staged":
            block.staged.append((index, match.name, match.fixed[0][1]))
        elif match.kind == "repeat":
            block.repeats.append((index, match.repeat))
            block.fixed[str(index)] = match.fixed
        else:
            places.setdefault(match.name, []).append(index)
            block.units.setdefault(match.name, match.unit)
            if match.name == "ph" and match.fixed:
                block.fixed["ph"] = match.fixed
    _separate_date_and_time(row, places, block)
    for name, indices in places.items():
        block.columns[name] = indices[0]
        if name in ("remark", "analyst"):  # a second column of remarks does no harm
            block.ignored.extend(indices[1:])
            continue
        if len(indices) > 1:
            block.twice.append((name, indices))
    for index, name, unit in wide:
        keys = (heading_key(str(row[index])), heading_key(name))
        lot = next((lots.pop(k) for k in keys if k in lots), -1)
        block.wide.append((index, name, unit, lot))
    block.ignored.extend(lots.values())
    block.ignored.sort()
    return block if _complete(block) else None


def _separate_date_and_time(row: Sequence[Any], places: dict[str, list[int]], block: Block) -> None:
    """Date and Time in two columns are one time."""
    indices = places.get("read_at", [])
    if len(indices) == 2:
        keys = [heading_key(split_heading(str(row[i]))[0]) for i in indices]
        if "time" in keys and keys.count("time") == 1 and any("date" in k for k in keys):
            block.time_of_day = indices.pop(keys.index("time"))


def _complete(block: Block) -> bool:
    """Whether the needed columns are there."""
    have = set(block.columns)
    if block.kind == "readings":
        has_ph = "ph" in have or bool(block.repeats)
        return has_ph and bool(have & {"batch", "known", "series"})
    if block.kind == "recipes":
        if "batch" in have and block.wide and "substance" not in have:
            return True
        return {"batch", "substance"} <= have and bool(have & {"amount", "planned"})
    if block.kind == "stocks":
        return (
            "lot" in have
            and bool(have & {"substance", "batch"})
            and bool(have & {"strength", "assay", "factor", "density", "tolerance", "opened", "expiry", "batch"})
        )
    if block.kind == "events":
        return {"at", "what"} <= have and bool(have & {"meter", "probe"})
    return all(c.name in have for c in BY_SHEET[block.kind] if c.needed)


def best_kind(row: Sequence[Any], column_map: ColumnMap, catalogue: Catalogue) -> list[Block]:
    """The kinds of sheet that a row may head, best first: most columns matched, then the order of the table."""
    found = []
    for kind in BY_SHEET:
        block = understand(row, kind, column_map, catalogue)
        if block is not None:
            found.append(block)
    found.sort(key=lambda b: -(len(b.columns) + len(b.wide) + len(b.repeats)))
    if found and found[0].kind == "readings" and not set(found[0].columns) & {"batch", "meter", "probe", "read_at"}:
        certified = [b for b in found if b.kind == "known"]
        return certified + [b for b in found if b.kind != "known"]
    return found
