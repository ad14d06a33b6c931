"""Cases 62 and 64 to the end: what a hostile record may write into a report, and what a refusal leaves behind."""

from __future__ import annotations

import csv
import html.parser
import json
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any

import openpyxl
import pytest
import xlsxwriter
from wild_case import FIRST, HEAD, RECIPES, book, reading, readings

import reconcile
from reconcile.records.problems import InputProblems

STARTS = ("=", "+", "-", "@", "\t", "\r", "\n", "＝", "＋", "－", "＠")
"""OWASP, "CSV Injection": characters at which a spreadsheet may take a field for a formula."""
TELL = "HOSTILE"
BATCHES = [
    f'=cmd|"/c {TELL}"!A1', f"+1+{TELL}", f"-2+{TELL}", f"@SUM({TELL})", f"<script>alert('{TELL}')</script>",
    f'=HYPERLINK("http://x.example/{TELL}";"click")', f"</td><img src=x onerror={TELL}>", f"\t={TELL}", f"＝{TELL}",
    f"{TELL}\u202e\x1b[31m", f"{{{{ {TELL} }}}}", f"http://x.example/{TELL}",
]  # fmt: skip
METERS = [f"=1+1+{TELL}", f"@{TELL}", f"<b>{TELL}</b>"]


def hostile_book(path: Path) -> Path:
    """Every name, unit and remark of a record tries to act; all cells are typed as text or numbers."""
    rows: list[list[Any]] = [[*HEAD, "Remark", "Stage"]]
    recipes: list[list[Any]] = [list(RECIPES[0])]
    for i, batch in enumerate(BATCHES):
        for k, meter in enumerate(METERS):
            ph = 5.68 if i == k == 1 else 4.66 + 0.01 * ((i + k) % 3)  # one slip, so that a finding names its subjects
            rows.append([*reading(3 * i + k, ph=ph, batch=batch, meter=meter), f'=1+"{TELL}"', f"-{TELL}"])
        recipes += [
            [batch, "acetic acid", f"=L1{TELL}", 50.0, "mM"],
            [batch, "sodium acetate", f"@L2{TELL}", 50.0, "mM"],
        ]
    rows += [
        [*reading(90, ph=f"=4.7 {TELL}"), "=1+1", ""],
        [*reading(91, batch=f'=nobody("{TELL}")', meter=METERS[0]), "", ""],
        [*reading(92, at=f"@{TELL}"), "", ""],
        [*reading(93, batch=f"-worse {TELL}"), "", ""],
    ]
    recipes.append([f"-worse {TELL}", f"+powder {TELL}", "", 1.0, f"={TELL}"])
    out = xlsxwriter.Workbook(path)
    moment = out.add_format({"num_format": "yyyy-mm-dd hh:mm"})
    for name, content in (("=Readings", rows), ("@Recipes", recipes)):
        sheet = out.add_worksheet(name)
        for r, row in enumerate(content):
            for c, value in enumerate(row):
                if isinstance(value, str):
                    sheet.write_string(r, c, value)
                elif isinstance(value, datetime):
                    sheet.write_datetime(r, c, value, moment)
                else:
                    sheet.write_number(r, c, value)
    out.close()
    return path


@pytest.fixture(scope="module")
def hostile(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """The report folders of an audit and of the meters of one hostile record."""
    folder = tmp_path_factory.mktemp("hostile")
    path = hostile_book(folder / "=record.xlsx")
    records = reconcile.read(path)
    assert len(records.readings) == len(BATCHES) * len(METERS)
    assert len(records.set_aside) == 4
    audit, history = reconcile.audit(records), reconcile.meters(records)
    assert any(TELL in finding.text for finding in audit.findings)
    return {
        "audit": reconcile.write_report(audit, folder / "audit"),
        "meters": reconcile.write_report(history, folder / "meters"),
    }


def is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


@pytest.mark.parametrize("report", ["audit", "meters"])
def test_62_no_field_of_a_csv_file_acts_as_a_formula(hostile: dict[str, Path], report: str) -> None:
    files = sorted(hostile[report].glob("*.csv"))
    assert {"audit": "residuals.csv", "meters": "meters.csv"}[report] in {f.name for f in files}
    told = 0
    for path in files:
        with path.open(encoding="utf-8", newline="") as file:
            for line in csv.reader(file):
                for field in line:
                    told += TELL in field
                    assert is_number(field) or not field.lstrip(" ").startswith(STARTS), (path.name, field)
                    assert field.isprintable(), (path.name, field)
    assert told


def test_62_names_can_be_got_back_from_the_csv_file(hostile: dict[str, Path]) -> None:
    with (hostile["audit"] / "residuals.csv").open(encoding="utf-8", newline="") as file:
        batches = {line["batch"] for line in csv.DictReader(file)}
    assert {f"'{b}" for b in BATCHES[:4]} <= batches
    assert BATCHES[4] in batches


def test_62_every_text_of_the_workbook_is_typed_as_text(hostile: dict[str, Path]) -> None:
    told = 0
    for path in [p for folder in hostile.values() for p in folder.glob("*.xlsx")]:
        for sheet in openpyxl.load_workbook(path):
            for cell in (c for row in sheet.iter_rows() for c in row):
                told += TELL in str(cell.value)
                assert cell.data_type != "f", (sheet.title, cell.coordinate)
                assert cell.hyperlink is None, (sheet.title, cell.coordinate)
                if isinstance(cell.value, str) and cell.value.startswith(STARTS):
                    assert cell.quotePrefix, (sheet.title, cell.coordinate)  # stays text when it is edited
    assert told


class Page(html.parser.HTMLParser):
    """Elements and attributes of a page into which a text of the record found its way as markup."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.acting: list[str] = []
        self.told = 0
        self._script = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self._script = tag == "script"
        for name, value in attrs:
            if TELL in name or (TELL in (value or "") and (name.startswith("on") or name in ("href", "src", "style"))):
                self.acting.append(f"{tag} {name}={value}")
        if TELL in tag:
            self.acting.append(tag)

    def handle_endtag(self, tag: str) -> None:
        self._script = False

    def handle_data(self, data: str) -> None:
        self.told += TELL in data
        if self._script and "alert(" in data:
            self.acting.append(data)


def test_62_no_text_of_the_record_is_markup_in_a_page_or_a_picture(hostile: dict[str, Path]) -> None:
    pages = [p for folder in hostile.values() for p in (*folder.glob("*.html"), *folder.glob("plots/*.svg"))]
    assert {p.suffix for p in pages} == {".html", ".svg"}
    for path in pages:
        page = Page()
        page.feed(path.read_text(encoding="utf-8"))
        assert page.acting == [], path.name
        assert page.told or path.suffix == ".svg", path.name


def test_62_no_terminal_escape_and_no_turned_text_in_any_file(hostile: dict[str, Path]) -> None:
    for path in [p for folder in hostile.values() for p in folder.rglob("*") if p.suffix in (".csv", ".html", ".json")]:
        text = path.read_text(encoding="utf-8")
        assert "\x1b" not in text, path.name
        assert "\u202e" not in text, path.name
        if path.suffix == ".json":
            json.loads(text)


def files_of(folder: Path) -> dict[str, bytes]:
    return {str(p.relative_to(folder)): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


DOORS: dict[str, Callable[..., Any]] = {"audit": reconcile.audit, "meters": reconcile.meters}


@pytest.mark.parametrize("door", list(DOORS))
def test_64_the_same_input_twice_gives_the_same_bytes(tmp_path: Path, door: str) -> None:
    rows = [reading(k, ph=4.68 + 0.01 * (k % 3) + 0.2 * (k % 2), meter=f"M{k % 2}") for k in range(12)]
    path = book(tmp_path, [*rows, reading(20, ph="x"), reading(21, batch="B9")])
    before = path.read_bytes()
    one, two = (
        files_of(reconcile.write_report(DOORS[door](path), tmp_path / "one" / name)) for name in ("here", "there")
    )
    assert path.read_bytes() == before
    manifests = [json.loads(files.pop("manifest.json")) for files in (one, two)]
    assert len(one) > 5
    assert one == two
    for manifest in manifests:
        manifest.pop("written_at")
    assert manifests[0] == manifests[1]


@pytest.mark.parametrize("door", list(DOORS))
def test_64_a_refusal_leaves_no_folder_and_no_file(tmp_path: Path, door: str) -> None:
    good = book(tmp_path, readings(4))
    bad = tmp_path / "bad.xlsx"
    bad.write_bytes(good.read_bytes()[:900])
    before = files_of(tmp_path)
    with pytest.raises(InputProblems):
        reconcile.write_report(DOORS[door](good, bad), tmp_path / "reports" / "record")
    assert files_of(tmp_path) == before
    assert not (tmp_path / "reports").exists()


def test_64_a_failure_while_writing_leaves_the_old_report_and_nothing_else(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    audit = reconcile.audit(book(tmp_path, [reading(k, at=FIRST) for k in range(3)]))
    folder = reconcile.write_report(audit, tmp_path / "report")
    before = files_of(tmp_path)
    opened, count = Path.open, 0

    def full(self: Path, mode: str = "r", *more: Any, **named: Any) -> Any:
        nonlocal count
        count += mode == "xb"
        if count == 4:
            raise OSError(28, "No space left on device", str(self))
        return opened(self, mode, *more, **named)

    monkeypatch.setattr(Path, "open", full)
    with pytest.raises(OSError, match="No space"):
        reconcile.write_report(audit, folder, replace=True)
    monkeypatch.undo()
    assert count == 4
    assert files_of(tmp_path) == before
