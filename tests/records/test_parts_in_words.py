"""Parts of a solution in words, and what they come to once made up."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from reconcile.records.parts import Composition, compose, parse_part, parse_total
from reconcile.records.problems import InputProblems
from reconcile.records.substances import catalogue


def made(*parts: str, to: str = "") -> Composition:
    return compose([parse_part(part) for part in parts], to)


def code(*parts: str, to: str = "") -> str:
    with pytest.raises(InputProblems) as refused:
        made(*parts, to=to)
    return refused.value.problems[0].code


# Amounts by arithmetic; molar masses as sums of IUPAC 2021 abridged standard atomic weights
AMOUNTS = [
    ("0.1 M acetic acid", "", 0.1, "mol/L"),
    ("0.1M HCl", "", 0.1, "mol/L"),
    ("50 mM of Tris", "", 0.05, "mol/L"),
    ("250 µM HCl", "", 2.5e-4, "mol/L"),
    ("1 N H2SO4", "", 0.5, "mol/L"),
    ("5.844 g/L NaCl", "", 5.844 / 58.44, "mol/L"),
    ("0.9 % w/v NaCl", "", 9.0 / 58.44, "mol/L"),
    ("25 mL of 0.1 M sodium hydroxide", "100 mL", 0.025, "mol/L"),
    ("1 mL of 40 % w/v NaOH", "100 mL", 400 / 39.997 / 100, "mol/L"),
    ("5 mL of 37 % w/w HCl, 1.18 g/mL", "1 L", 5 * 1.18 * 0.37 / 36.458, "mol/L"),
    ("10 g of 1 M HCl, 1.02 g/mL", "1 L", 0.01 / 1.02, "mol/L"),
    ("2 mmol HCl", "100 mL", 0.02, "mol/L"),
    ("5 g 3,3-dimethylglutaric acid", "1 L", 5 / 160.169, "mol/L"),
    ("0.025 mol/kg KH2PO4", "", 0.025, "mol/kg"),
    ("5.844 g NaCl", "1 kg", 0.1 / (1 - 5.844e-3), "mol/kg"),
    ("1 g/kg NaCl", "", 1 / 58.44 / 0.999, "mol/kg"),
]


@pytest.mark.parametrize(("part", "to", "amount", "unit"), AMOUNTS)
def test_amounts(part: str, to: str, amount: float, unit: str) -> None:
    found = made(part, to=to)
    assert found.amounts == pytest.approx([amount], rel=2e-4)
    assert found.unit == unit


def test_the_water_of_a_hydrate_is_water() -> None:
    """1 mol of CaCl2 (110.98 g) in 1 kg of solution leaves 889.0 g of water, from whichever hydrate it came."""
    dry, wet = made("110.98 g CaCl2", to="1 kg"), made("147.01 g CaCl2.2H2O", to="1 kg")
    assert dry.amounts == pytest.approx([1 / 0.88902], rel=1e-4)
    assert wet.amounts == pytest.approx(dry.amounts, rel=2e-4)


REFUSED = [
    (("acetic acid",), "", "part-unreadable"),
    (("0,1 M HCl",), "", "part-unreadable"),
    (("-1 M HCl",), "", "part-unreadable"),
    (("0.1 M",), "", "part-unreadable"),
    (("10 x PBS",), "", "part-unreadable"),
    (("0.1 m HCl",), "", "part-unit"),
    (("5 % HCl",), "1 L", "unit-percent"),
    (("5 mL of 37 % HCl",), "1 L", "unit-percent"),
    (("0.1 M unobtainium",), "", "substance-unknown"),
    (("0.1 M EDTA",), "", "substance-ambiguous"),
    (("5 mL HCl",), "1 L", "part-strength-missing"),
    (("5 mL of 37 % w/w HCl",), "1 L", "part-density-missing"),
    (("5 g NaCl",), "", "part-without-total"),
    (("5 g NaCl",), "a bucket", "total-unreadable"),
    (("5 g NaCl",), "0 mL", "total-unreadable"),
    (("150 mL of 1 M HCl",), "100 mL", "parts-over-total"),
    (("2 kg NaCl",), "1 kg", "parts-over-total"),
    (("0.1 M HCl", "0.1 mol/kg NaCl"), "", "parts-mixed-bases"),
    (("1 N glucose",), "", "unit-needs"),
]


@pytest.mark.parametrize(("parts", "to", "expected"), REFUSED)
def test_refusals(parts: tuple[str, ...], to: str, expected: str) -> None:
    assert code(*parts, to=to) == expected


def test_no_part_at_all_is_refused() -> None:
    with pytest.raises(InputProblems):
        compose([])


@given(st.sampled_from(sorted(catalogue().by_name)), st.floats(1e-6, 5.0))
def test_every_name_of_the_library_is_understood(name: str, amount: float) -> None:
    found = parse_part(f"{amount!r} mol/L {name}")
    assert found.form.name == name
    assert compose([found]).amounts[0] == pytest.approx(amount)


@given(st.text(max_size=40))
def test_any_text_is_read_or_refused_in_words(text: str) -> None:
    messages = []
    try:
        parse_part(text)
    except InputProblems as refused:
        messages = [problem.message() for problem in refused.problems]
    assert all(messages)


@given(st.floats(0.001, 1000.0), st.sampled_from([("mL", 1e-3), ("L", 1.0)]))
def test_totals(number: float, unit: tuple[str, float]) -> None:
    assert parse_total(f"{number!r} {unit[0]}") == (pytest.approx(number * unit[1]), "volume")
