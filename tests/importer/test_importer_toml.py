"""Settings files and maps of columns."""

from __future__ import annotations

from pathlib import Path

import pytest
from builders import workbook
from wild_case import HEAD, RECIPES, book, readings

from reconcile.importer.read import read_books
from reconcile.importer.toml_files import column_map_text, read_column_map, read_settings, write_column_map
from reconcile.records.problems import InputProblems
from reconcile.records.settings import SettingsError


def written(folder: Path, text: str, name: str = "x.toml") -> Path:
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


def test_settings_are_read_and_checked(tmp_path: Path) -> None:
    chosen = read_settings(written(tmp_path, '[reading]\ndecimal = ","\n[uncertainty]\nvolume_percent = 0.5\n'))
    assert (chosen["reading.decimal"], chosen["uncertainty.volume_percent"]) == (",", 0.5)
    assert set(chosen.changed) == {"reading.decimal", "uncertainty.volume_percent"}


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ('[reading]\ndecimal = ";"\n', "one of auto"),
        ("[reading]\ndecimals = 1\n", "no setting is called reading.decimals"),
        ("reading = 3\n", "must be a section"),
        ("[reading\n", "not valid TOML"),
    ],
)
def test_a_bad_settings_file_says_what_is_wrong(tmp_path: Path, text: str, says: str) -> None:
    with pytest.raises((SettingsError, InputProblems), match=says):
        read_settings(written(tmp_path, text))


def test_a_missing_or_undecodable_file_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputProblems, match="no such file"):
        read_settings(tmp_path / "none.toml")
    (tmp_path / "bad.toml").write_bytes(b'a = "\xff"')
    with pytest.raises(InputProblems, match="not valid TOML"):
        read_column_map(tmp_path / "bad.toml")


def test_a_map_names_fields_substances_and_what_to_leave_out(tmp_path: Path) -> None:
    head = ("When", "Vessel", "Reading A", "Ac", "pH", "Batch")
    rows = [head, ("2026-03-01", "V1", 4.71, 50.0, 9.9, "x")]
    path = workbook(tmp_path / "r.xlsx", {"Log": rows})
    text = """
    [readings]
    "When" = "read_at"
    "Vessel" = "batch"
    "Reading A" = "ph"
    "Ac" = { substance = "acetic acid", unit = "mM" }
    "pH" = ""
    "Batch" = ""
    """
    records = read_books([path], column_map=read_column_map(written(tmp_path, text)))
    assert records.readings["ph"].tolist() == [4.71]
    assert records.readings["batch"].tolist() == ["V1"]
    assert records.solutions.amount.tolist() == pytest.approx([0.05])
    assert records.sheets[0].ignored == ("pH", "Batch")


@pytest.mark.parametrize(
    "text",
    [
        '[reading]\n"x" = "ph"\n',
        '[readings]\n"x" = "acidity"\n',
        '[readings]\n"x" = { unit = "mM" }\n',
        '[readings]\n"x" = 3\n',
    ],
)
def test_a_map_that_means_nothing_is_refused(tmp_path: Path, text: str) -> None:
    with pytest.raises(InputProblems) as refused:
        read_column_map(written(tmp_path, text))
    assert {p.code for p in refused.value.problems} <= {"map-section", "map-field"}


def test_a_map_that_was_begun_reads_the_same_file_alike(tmp_path: Path) -> None:
    path = book(tmp_path, [[*r, 1.0] for r in readings(3)], head=(*HEAD, "Conductivity"))
    records = read_books([path])
    out = tmp_path / "columns.toml"
    write_column_map(records, out)
    again = read_books([path], column_map=read_column_map(out))
    assert again.readings["ph"].tolist() == records.readings["ph"].tolist()
    assert '# "Conductivity" = ' in column_map_text(records)
    assert '"Amount" = "amount"' in column_map_text(records)
    assert RECIPES[0][0] == records.sheets[1].columns["batch"][1]
