"""Cases 1 to 10 of the ways in which real spreadsheets go wrong: the file itself."""

from __future__ import annotations

import zipfile
from pathlib import Path

import openpyxl
import pytest
from openpyxl.comments import Comment
from wild_case import aside, book, change_part, csv_log, noted, read, readings, refusal

from reconcile.importer.read import read_books
from reconcile.records.settings import Settings

OLE = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"


def written(folder: Path, name: str, content: bytes) -> Path:
    path = folder / name
    path.write_bytes(content)
    return path


def test_01_a_password_protected_workbook_is_refused(tmp_path: Path) -> None:
    content = OLE + b"\x00" * 600 + "EncryptedPackage".encode("utf-16-le") + b"\x00" * 600
    assert refusal(written(tmp_path, "log.xlsx", content)) == {("", "", "file-encrypted")}


def test_02_content_decides_and_not_the_name(tmp_path: Path) -> None:
    path = book(tmp_path, readings(3))
    records = read(written(tmp_path, "old.xls", path.read_bytes()))
    assert len(records.readings) == 3
    assert ("", "", "file-name-differs") in noted(records)


@pytest.mark.parametrize(
    ("content", "what"),
    [
        (b"<html><body><table><tr><td>pH</td></tr></table></body></html>", "web page"),
        (b'<?xml version="1.0"?><Workbook xmlns="urn:schemas-microsoft-com:office:spreadsheet"/>', "XML"),
        (b"MIME-Version: 1.0\r\nContent-Type: multipart/related\r\n\r\n", "MIME"),
        (b"%PDF-1.7\n", "PDF"),
        (OLE + b"\x00" * 512, "OLE"),
    ],
)
def test_02_other_kinds_of_content_are_refused_by_name(tmp_path: Path, content: bytes, what: str) -> None:
    path = written(tmp_path, "log.xls", content)
    assert refusal(path) == {("", "", "file-type")}
    with pytest.raises(Exception, match=what):
        read_books([path])


def test_03_a_truncated_workbook_is_damaged(tmp_path: Path) -> None:
    whole = book(tmp_path, readings(3)).read_bytes()
    for part in (len(whole) // 3, len(whole) - 30, 40):
        assert refusal(written(tmp_path, "cut.xlsx", whole[:part])) == {("", "", "file-damaged")}


def test_03_flipped_bytes_in_a_part_are_damage(tmp_path: Path) -> None:
    whole = bytearray(book(tmp_path, readings(3)).read_bytes())
    at = whole.find(b"sheet1.xml") + 40
    whole[at : at + 8] = b"\xff" * 8
    assert {code for _, _, code in refusal(written(tmp_path, "bad.xlsx", bytes(whole)))} == {"file-damaged"}


def test_03_a_lock_file_is_named_as_such(tmp_path: Path) -> None:
    assert refusal(written(tmp_path, "~$log.xlsx", b"\x07Someone" + b" " * 150)) == {("", "", "file-lock")}


def test_03_missing_and_empty_files_are_refused(tmp_path: Path) -> None:
    assert refusal(tmp_path / "none.xlsx") == {("", "", "file-missing")}
    assert refusal(written(tmp_path, "empty.csv", b"")) == {("", "", "file-empty")}
    assert refusal(written(tmp_path, "blank.csv", b"\xef\xbb\xbf \r\n\r\n")) == {("", "", "file-empty")}


def test_03_every_bad_file_is_named_at_once(tmp_path: Path) -> None:
    bad = [tmp_path / "none.xlsx", written(tmp_path, "empty.csv", b"")]
    assert {code for _, _, code in refusal(bad)} == {"file-missing", "file-empty"}


@pytest.mark.parametrize("honest", [True, False])
def test_04_what_inflates_beyond_the_cap_is_refused(tmp_path: Path, honest: bool) -> None:
    path = tmp_path / "bomb.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/workbook.xml", "<workbook/>")
        archive.writestr("xl/worksheets/sheet1.xml", b"\x00" * (3 << 20))
    if not honest:  # the directory says that the part is small
        data = path.read_bytes()
        path.write_bytes(data.replace((3 << 20).to_bytes(4, "little"), (1000).to_bytes(4, "little")))
    small = Settings.from_sections({"limits": {"inflated_mib": 1}})
    with pytest.raises(Exception, match=r"inflates|damaged"):
        read_books([path], small)


@pytest.mark.parametrize("declaration", ['<!DOCTYPE x [<!ENTITY a "b">]>', '<!DOCTYPE x SYSTEM "file:///etc/passwd">'])
def test_05_entities_are_refused(tmp_path: Path, declaration: str) -> None:
    path = book(tmp_path, readings(2))
    for part in ("xl/worksheets/sheet1.xml", "xl/workbook.xml"):
        changed = change_part(path, part, lambda text: declaration + text)
        assert refusal(changed) == {("", "", "file-entities")}


def test_06_a_file_of_exactly_the_old_limit_may_be_cut(tmp_path: Path) -> None:
    lines = ["Batch,pH"] + ["B1,4.71"] * 65535
    records = read(csv_log(tmp_path, "\n".join(lines) + "\n"))
    assert records.rows_read == 65535
    assert ("", "", "file-maybe-cut") in noted(records)


def test_07_macros_are_noted_and_not_run(tmp_path: Path) -> None:
    records = read(written(tmp_path, "log.xlsm", book(tmp_path, readings(2)).read_bytes()))
    assert ("", "", "file-macros") in noted(records)


def test_07_08_binary_and_opendocument_files_are_refused(tmp_path: Path) -> None:
    for name, parts in (
        ("log.xlsb", {"[Content_Types].xml": "x", "xl/workbook.bin": "x"}),
        ("log.ods", {"mimetype": "application/vnd.oasis.opendocument.spreadsheet", "content.xml": "x"}),
    ):
        path = tmp_path / name
        with zipfile.ZipFile(path, "w") as archive:
            for part, text in parts.items():
                archive.writestr(part, text)
        assert refusal(path) == {("", "", "file-type")}


def test_09_defects_in_filters_and_styles_do_no_harm(tmp_path: Path) -> None:
    path = book(tmp_path, readings(3))
    filtered = '<autoFilter ref="A1:E4"><filterColumn colId="4"><customFilters><customFilter operator="equal" val=""/>'
    filtered += "</customFilters></filterColumn></autoFilter>"
    changed = change_part(
        path, "xl/worksheets/sheet1.xml", lambda t: t.replace("</sheetData>", "</sheetData>" + filtered)
    )
    changed = change_part(changed, "xl/styles.xml", lambda t: t.replace("<fonts", '<fonts bad="x"', 1), "again.xlsx")
    assert len(read(changed).readings) == 3


def test_10_what_lies_beside_the_cells_is_counted_and_comments_are_quoted(tmp_path: Path) -> None:
    path = book(tmp_path, readings(3))
    workbook = openpyxl.load_workbook(path)
    workbook["Readings"]["E3"].comment = Comment("read twice, 4.69 first", "AB")
    workbook.save(path)
    records = read(path)
    assert ("Readings", "", "beside-the-cells") in noted(records)
    assert ("Readings", "E3", "cell-comment") in noted(records)
    assert any("4.69 first" in n.read for n in records.notes)
    assert aside(records) == set()
