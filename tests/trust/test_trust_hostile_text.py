"""Whatever batch, lot, meter, remark, sheet and file are called: harmless in every file and on the terminal, and read.

What spreadsheets take for a formula when they open a CSV file, and why an apostrophe in front: OWASP, CSV Injection.
What acts on a terminal: control characters of ECMA-48. What may not stand in an XML 1.0 document: its production [2],
Char. Device names that Windows reserves: Microsoft, Naming Files, Paths, and Namespaces.
"""

from __future__ import annotations

import csv
import io
import json
import re
import zipfile
from collections.abc import Iterator
from html.parser import HTMLParser
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import openpyxl
import pytest
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st
from small_record import NOISE
from typer.testing import CliRunner

import reconcile
from reconcile.cli.app import app
from reconcile.reporter.plain import csv_text, folder_name, plain
from reconcile.reporter.write import report_files

PIECES = (
    "=HYPERLINK(\"http://invalid.example/\",\"press\")", "=cmd|' /C calc'!A0", "+1+1", "-2+3", "@SUM(A1)", "＝1",
    "\t=1", "<script>alert(1)</script>", "<img src=x onerror=alert(1)>", "\"><svg onload=alert(1)>", "&lt;b&gt;", "]]>",
    "-->", "<!--", "javascript:alert(1)", "http://invalid.example/", "{{ 7*7 }}", "{% raw %}", "%s%n", "{0}",
    "$\\frac{1}{$", "$x$", "\\", "\x1b[31m", "\x1b]0;title\x07", "\x9b2J", "\x08\x08", "\r", "\n", "\u202e", "\u200b",
    "\ufeff", "../../etc/passwd", "..\\..\\boot.ini", "C:\\", "CON", "NUL.txt", "~", "_x0007_", "'", '"', "`", "|", ";",
    ",", "'=1", "\U0001f9ea", "é", "e\u0301", "日本", "\u00ad", "A" * 300,
)  # fmt: skip
HOSTILE = st.lists(st.sampled_from(PIECES) | st.text(max_size=6), min_size=1, max_size=4).map("".join)
ANY_TEXT = HOSTILE | st.text(st.characters(), max_size=40)
ONCE = (Phase.explicit, Phase.reuse, Phase.generate)
"""No shrinking of what takes seconds to run."""
ACTING = re.compile(r"[\x00-\x09\x0b-\x1f\x7f-\x9f\u200b-\u200f\u2028-\u202e\u2066-\u2069\ufeff]")
"""What acts on a terminal or hides in a text, the line feed apart."""
FORMULA = re.compile(r"\s*[=+\-@＝＋－＠]")
NUMBER = re.compile(r"-?\d+(\.\d+)?(e-?\d+)?")


@settings(max_examples=500, deadline=None)
@given(ANY_TEXT)
def test_plain_text_shows_all_and_does_nothing(text: str) -> None:
    out = plain(text)
    assert not ACTING.search(out)
    assert "\n" not in out
    assert out.isprintable()
    assert bool(out.encode("utf-8")) == bool(text)
    kept = [c for c in text if c.isprintable()]
    shown = iter(out)
    assert all(c in shown for c in kept), "every character that shows is still there, in its order"


@settings(max_examples=500, deadline=None)
@given(ANY_TEXT)
def test_a_csv_field_is_no_formula_and_comes_back(text: str) -> None:
    field = csv_text(text)
    assert not FORMULA.match(field)
    out = io.StringIO()
    csv.writer(out, lineterminator="\n").writerow([field, "next"])
    assert list(csv.reader(io.StringIO(out.getvalue(), newline=""))) == [[field, "next"]]
    assert plain(text) in (field, field[1:])


RESERVED = {"CON", "PRN", "AUX", "NUL", *(f"{device}{n}" for device in ("COM", "LPT") for n in range(1, 10))}


@settings(max_examples=500, deadline=None)
@given(ANY_TEXT)
def test_a_folder_name_is_one_name_on_every_system(text: str) -> None:
    name = folder_name(text)
    assert name not in ("", ".", "..")
    assert not re.search(r'[<>:"/\\|?*\x00-\x1f]', name)
    assert not name.endswith((" ", "."))
    assert name.partition(".")[0].rstrip().upper() not in RESERVED
    assert len(name.encode("utf-8")) <= 255
    assert Path(name).name == name


@pytest.mark.parametrize("name", ["log", "Log 2025-03", "März_3", "a.b", "console", "日本"])
def test_an_ordinary_name_stays_as_it_is(name: str) -> None:
    assert folder_name(name) == name


class Parsed(HTMLParser):
    """Elements with their attributes, and the text between them."""

    def __init__(self, source: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.feed(source)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))

    def handle_data(self, data: str) -> None:
        self.words.append(data)


def record(folder: Path, texts: list[str], as_workbook: bool) -> list[Path]:
    """A record whose batches, meters, lots and remarks bear those texts; meter and lot 0 are off."""
    rows: list[list[Any]] = [["Batch", "Meter", "Temperature (°C)", "pH", "Remark"]]
    recipes: list[list[Any]] = [["Batch", "Substance", "Lot", "Amount", "Unit"]]
    for i in range(24):
        text = texts[i % len(texts)]
        batch, meter, lot = (
            f"{text} B{i}",
            f"{texts[i % 3 % len(texts)]} M{i % 3}",
            f"{texts[i % 2 % len(texts)]} L{i % 2}",
        )
        rows.append([batch, meter, 25.0, round(4.66 + NOISE[i % 7] + (0.2 if i % 3 == 0 else 0.0), 2), text])
        recipes += [[batch, "acetic acid", lot, 50, "mM"], [batch, "sodium acetate", "", 50, "mM"]]
    if as_workbook:
        book = openpyxl.Workbook()
        for name, table in (("Readings <b>", rows), ("=Recipes&", recipes)):
            sheet = book.create_sheet(name)
            for r, row in enumerate(table, 1):
                for c, value in enumerate(row, 1):
                    sheet.cell(r, c).value = value
                    if isinstance(value, str):
                        sheet.cell(r, c).data_type = "s"
        del book["Sheet"]
        book.save(folder / "<log> =1.xlsx")
        return [folder / "<log> =1.xlsx"]
    for name, table in (("=readings.csv", rows), ("<recipes>.csv", recipes)):
        with (folder / name).open("w", encoding="utf-8", newline="") as file:
            csv.writer(file).writerows(table)
    return [folder / "=readings.csv", folder / "<recipes>.csv"]


def in_cells(text: str) -> str:
    """What a workbook or a CSV file can hold of a text: XML has no control characters, and CSV ends are not ours."""
    return re.sub(r"[\x00-\x08\x0b\x0c\x0e-\x1f\r\n\ufffe\uffff]|[\ud800-\udfff]", "", text)


def check_csv(content: bytes) -> set[str]:
    cells = {cell for row in csv.reader(io.StringIO(content.decode("utf-8"), newline="")) for cell in row}
    for cell in cells:
        assert not ACTING.search(cell)
        assert not FORMULA.match(cell) or NUMBER.fullmatch(cell), cell
    return cells


def check_workbook(content: bytes) -> set[str]:
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        for name in archive.namelist():
            parts = {
                str(element.tag).rpartition("}")[2] for element in ElementTree.fromstring(archive.read(name)).iter()
            }
            assert not parts & {"hyperlink", "f", "externalReference", "ddeLink", "oleObject"}, name
            assert "external" not in name.lower()
    found = set()
    for sheet in openpyxl.load_workbook(io.BytesIO(content)).worksheets:
        for row in sheet.iter_rows():
            for cell in row:
                assert cell.data_type != "f", cell.coordinate
                assert cell.hyperlink is None
                if isinstance(cell.value, str):
                    assert not ACTING.search(cell.value)
                    found.add(cell.value)
    return found


ELEMENTS = frozenset(
    re.findall(
        r"\w+",
        "html head meta title style script body a nav p ol ul li main header h1 h2 h3 h4 table caption thead tbody tr "
        "th td section dl div dt dd span article figure img figcaption label input select option button br form",
    )
)


def check_page(content: bytes) -> str:
    page = Parsed(content.decode("utf-8"))
    assert {tag for tag, _ in page.elements} <= ELEMENTS
    assert sum(tag == "script" for tag, _ in page.elements) == 1
    for tag, attributes in page.elements:
        assert not [name for name in attributes if name.startswith("on")], tag
        assert "style" not in attributes
        for name in ("href", "src"):
            target = attributes.get(name)
            assert target is None or target.startswith(("#", "data:image/")), target
    text = "".join(page.words)
    assert not ACTING.search(text)
    return text


SVG = "{http://www.w3.org/2000/svg}"
LINK = "{http://www.w3.org/1999/xlink}href"


def check_svg(content: bytes) -> None:
    root = ElementTree.fromstring(content)
    allowed = {"svg", "metadata", "defs", "style", "g", "path", "use", "text", "tspan", "clipPath", "rect", "image"}
    for element in root.iter():
        if isinstance(element.tag, str) and element.tag.startswith(SVG):
            assert element.tag.removeprefix(SVG) in allowed
            for target in (element.get(LINK), element.get("href")):
                assert target is None or target.startswith("#")
            assert not [name for name in element.attrib if name.startswith("on")]


def strings(thing: Any) -> Iterator[str]:
    if isinstance(thing, str):
        yield thing
    for inner in thing.items() if isinstance(thing, dict) else thing if isinstance(thing, (list, tuple)) else ():
        yield from strings(inner)


def check_report(files: dict[str, bytes], texts: list[str]) -> None:
    seen = check_csv(files["residuals.csv"]) | check_csv(files["set_aside.csv"])
    book, page = check_workbook(files["residuals.xlsx"]), check_page(files["report.html"])
    for name in files:
        assert re.fullmatch(r"(plots/)?[a-zA-Z0-9_]+\.[a-z]+", name), "no file is called by what a cell held"
        if name.endswith(".svg"):
            check_svg(files[name])
        if name.endswith(".json"):
            assert not any(ACTING.search(text) or "\n" in text for text in strings(json.loads(files[name])))
    for text in texts:  # readable: the words of each are still there
        for word in re.findall(r"\w{3,}", text):
            assert any(word in cell for cell in seen), word
            assert any(word in cell for cell in book), word
            assert word in page, word


@pytest.mark.parametrize("as_workbook", [False, True], ids=["csv", "xlsx"])
@settings(max_examples=4, deadline=None, phases=ONCE, suppress_health_check=list(HealthCheck))
@given(texts=st.lists(HOSTILE.map(in_cells).filter(lambda t: t.strip() != ""), min_size=6, max_size=24))
def test_a_whole_report_on_hostile_names(
    tmp_path_factory: pytest.TempPathFactory, texts: list[str], as_workbook: bool
) -> None:
    files = record(tmp_path_factory.mktemp("hostile"), texts, as_workbook)
    check_report(report_files(reconcile.audit(*files), lambda what, share: None), [])


@pytest.mark.parametrize("as_workbook", [False, True], ids=["csv", "xlsx"])
def test_every_piece_once(tmp_path: Path, as_workbook: bool) -> None:
    pieces = [in_cells(piece) for piece in PIECES if in_cells(piece).strip()]
    for begin in range(0, len(pieces), 24):
        folder = tmp_path / str(begin)
        folder.mkdir()
        texts = pieces[begin : begin + 24]
        found = reconcile.audit(*record(folder, texts, as_workbook))
        assert found.findings, "the meter that is off is found by its hostile name"
        readable = [t for t in texts if len(t) < 100 and t != "_x0007_"]  # in a workbook this is the bell itself
        check_report(report_files(found, lambda what, share: None), readable)


@pytest.mark.parametrize("as_workbook", [False, True], ids=["csv", "xlsx"])
@pytest.mark.parametrize("command", ["audit", "read", "meters"])
def test_the_terminal(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, as_workbook: bool, command: str) -> None:
    monkeypatch.chdir(tmp_path)
    pieces = [in_cells(piece) for piece in PIECES if in_cells(piece).strip()][-24:]
    files = [str(path) for path in record(tmp_path, pieces, as_workbook)]
    for words in ([], ["--json"]):
        done = CliRunner().invoke(app, [command, *files, *words, *(["--replace"] if command != "read" else [])])
        assert done.exit_code in (0, 4), done.stderr
        assert not ACTING.search(done.stdout + done.stderr)


@pytest.mark.parametrize("command", ["audit", "read"])
def test_messages_about_hostile_cells(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, command: str) -> None:
    """Rows set aside, a refused file and one that is not there: quoted with their hidden characters seen."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "log\x1b[31m.csv").write_text(
        "Batch,Meter,pH\n" + "".join(f"B{i},M\x1b]0;x\x07,4.6" + "\x1b[2J" * (i % 2) + "\n" for i in range(8)),
        encoding="utf-8",
    )
    for name in ("log\x1b[31m.csv", "not\x1b[31m there.csv"):
        done = CliRunner().invoke(app, [command, name])
        assert not ACTING.search(done.stdout + done.stderr)
        assert "\\u001b" in done.stdout + done.stderr


@pytest.mark.parametrize("stem", ["CON", "..", "a:b", "x\ny"])
def test_the_default_folder_of_a_hostile_file_name(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, stem: str) -> None:
    monkeypatch.chdir(tmp_path)
    files = record(tmp_path, ["x"], False)
    joined = tmp_path / f"{stem}.csv"
    files[0].rename(joined)
    done = CliRunner().invoke(app, ["audit", f"./{joined.name}", files[1].name])
    assert done.exit_code == 0, done.stderr
    (made,) = (tmp_path / "reports").iterdir()
    assert made.name == folder_name(joined.stem)
    assert (made / "manifest.json").exists()
