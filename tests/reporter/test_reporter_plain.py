"""Text on its way out does nothing but show."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reconcile.reporter.plain import LONGEST, acts_as_formula, csv_text, plain


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("B-01", "B-01"),
        ("Größe µ", "Größe µ"),
        ("a\x1b[31mb", "a\\u001b[31mb"),
        ("bell\x07", "bell\\u0007"),
        ("two\nlines", "two\\u000alines"),
        ("no\u00a0break", "no\\u00a0break"),
        ("over\u202eride", "over\\u202eride"),
        ("\ud800", "\\ud800"),
        ("c1\x9b31m", "c1\\u009b31m"),
    ],
)
def test_what_acts_is_shown_as_its_code_point(text: str, shown: str) -> None:
    assert plain(text) == shown


@given(st.text(st.characters()))
def test_plain_text_is_printable_encodable_and_settled(text: str) -> None:
    once = plain(text)
    assert once.isprintable()
    assert once.encode("utf-8").decode("utf-8") == once
    assert plain(once) == once


@given(st.text(st.characters()))
def test_no_csv_text_begins_like_a_formula(text: str) -> None:
    assert not acts_as_formula(csv_text(text))


def test_a_very_long_text_is_cut_and_says_so() -> None:
    assert plain("x" * (LONGEST + 5)).endswith(f"({LONGEST + 5} characters, cut here)")
