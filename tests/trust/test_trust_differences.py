"""Where two contents of a file differ, in the words of that kind of file."""

from __future__ import annotations

import json

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from reconcile.reporter.differences import ALIGNED, Difference, differences


def places(name: str, now: str, again: str) -> list[tuple[str, str, str]]:
    return [(d.where, d.reads, d.recomputed) for d in differences(name, now.encode(), again.encode())]


def test_the_same_bytes_have_none() -> None:
    assert places("a.csv", "x", "x") == []


@pytest.mark.parametrize(
    ("now", "again", "found"),
    [
        ("a,b\n1,2\n", "a,b\n1,3\n", [("line 2, b", "2", "3")]),
        ("a,b\n1,2\n9,9\n3,4\n", "a,b\n1,2\n3,4\n", [("line 3", "9, 9", "no such row")]),
        ("a,b\n3,4\n", "a,b\n1,2\n3,4\n", [("line 2", "no such row", "1, 2")]),
        ("a,b\n1,2,3\n", "a,b\n1,2\n", [("line 2, field 3", "3", "")]),
        ("", "a\n", [("line 1", "no such row", "a")]),
        ('a\n"1\n2"\n', "a\n1\n", [("line 2, a", "1\n2", "1")]),
    ],
)
def test_tables(now: str, again: str, found: list[tuple[str, str, str]]) -> None:
    assert places("t.csv", now, again) == found


def test_the_same_cells_in_another_form_are_a_difference_all_the_same() -> None:
    assert places("t.csv", 'a,"b"\n', "a,b\n") == [("", "other content, 6 bytes", "4 bytes")]


def test_long_tables_are_compared_row_by_row() -> None:
    rows = [f"{i}" for i in range(ALIGNED + 10)]
    found = places("t.csv", "\n".join(rows[5:]), "\n".join(rows[:-1]))
    assert len(found) == len(rows) - 1


def test_documents_by_path_id_and_name() -> None:
    again = {"findings": [{"id": "F1", "size": 1.0}, {"id": "F2", "size": 2.0}], "rows": [1, 2], "none": None}
    now = {"findings": [{"id": "F2", "size": 2.5}], "rows": [1, 3, 4], "none": None, "more": "x"}
    assert places("f.json", json.dumps(now), json.dumps(again)) == [
        ("findings/F1", "null", '{"id": "F1", "size": 1.0}'),
        ("findings/F2/size", "2.5", "2.0"),
        ("rows/2", "3", "2"),
        ("rows/3", "4", "null"),
        ("more", "x", "null"),
    ]


def test_true_is_not_one() -> None:
    assert places("f.json", '{"a": true}', '{"a": 1}') == [("a", "true", "1")]


def test_pages_name_the_heading_above() -> None:
    now = '<h2 id="x">The <b>whole</b> record</h2>\n<p>pH 4.67</p>'
    assert places("p.html", now, now.replace("4.67", "4.66")) == [
        ("line 2, under The whole record", "<p>pH 4.67</p>", "<p>pH 4.66</p>")
    ]


def test_long_lines_are_cut_around_what_differs() -> None:
    line = "x" * 1000
    ((_, reads, wanted),) = places("p.html", f"{line}1{line}", f"{line}2{line}")
    assert reads == f"…{'x' * 40}1{'x' * 40}…"
    assert wanted == f"…{'x' * 40}2{'x' * 40}…"


@pytest.mark.parametrize("name", ["f.json", "w.xlsx", "t.csv", "p.html"])
def test_what_cannot_be_read_is_a_difference(name: str) -> None:
    (found,) = differences(name, b"\xff\xfe{", b"{}")
    assert found.reads.startswith("cannot be read")


CELLS = st.lists(st.lists(st.sampled_from(["", "1", "2", "a,b"]), min_size=1, max_size=3), max_size=6)


@settings(max_examples=300, deadline=None)
@given(CELLS, CELLS)
def test_any_two_tables_differ_where_their_cells_do(one: list[list[str]], other: list[list[str]]) -> None:
    """As many rows: the cells that differ are told one by one, and no others."""
    length = min(len(one), len(other))
    one, other = one[:length], other[:length]
    texts = ["\n".join(",".join(f'"{cell}"' for cell in row) for row in rows) for rows in (one, other)]
    found = list(differences("t.csv", *(text.encode() for text in texts)))
    expected = 0
    for a, b in zip(one, other, strict=True):
        width = max(len(a), len(b))
        padded = [row + [""] * (width - len(row)) for row in (a, b)]
        expected += sum(x != y for x, y in zip(*padded, strict=True))
    if expected:
        assert len(found) == expected
    else:
        assert found == [] or found[0] == Difference("", found[0].reads, found[0].recomputed)
