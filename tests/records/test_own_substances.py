"""A site's own substances: what a file may hold, what is refused and with which words, and where copies lie."""

from __future__ import annotations

import hashlib
from collections import Counter
from pathlib import Path

import numpy as np
import pytest

import reconcile
from reconcile.chemistry.acids import acid_table
from reconcile.records.formulas import molar_mass
from reconcile.records.own_substances import BESIDE, FOLDER, keep, own_of_record, own_of_user
from reconcile.records.problems import InputProblems
from reconcile.records.substances import catalogue, package_forms

OURS = """
[[acid]]
name = "invented acid"
charge = 0
[[acid.step]]
pka = 4.60
u = 0.02
enthalpy = -1.2
source = "invented for this test"

[[substance]]
name = "invented acid"
synonyms = ["IA"]
formula = "C5H8O3"
acid = "invented acid"
source = "invented for this test"
hazard = "irritant"

[[substance]]
name = "sodium salt of invented acid"
formula = "C5H7O3Na"
acid = "invented acid"
protons_removed = 1
ions = {"Na+" = 1}
source = "invented for this test"
"""


@pytest.fixture
def configuration(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    folder = tmp_path / "configuration"
    monkeypatch.setenv("RECONCILE_CONFIG", str(folder))
    return folder


def written(folder: Path, text: str = OURS, name: str = "ours.toml") -> Path:
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text, encoding="utf-8")
    return path


def test_molar_masses_are_those_of_the_formulas() -> None:
    """Sums of standard atomic weights by hand; and every form of the library, whose masses were made elsewhere."""
    assert molar_mass("C5H8O3") == pytest.approx(5 * 12.011 + 8 * 1.008 + 3 * 15.999)
    assert molar_mass("Na2B4O7·10H2O") == pytest.approx(381.37, abs=0.01)
    assert molar_mass("Ca(OH)2") == pytest.approx(74.09, abs=0.01)
    for text in ("", "Xx2", "C5H8O3)", "(C5", "5", "C5H8O3-"):
        assert molar_mass(text) is None, text
    read = {form.name: molar_mass(form.formula) for form in package_forms()}
    wrong = [f.name for f in package_forms() if read[f.name] is None or abs(read[f.name] - f.molar_mass) > 0.02]
    assert wrong == []


def test_a_kept_file_is_known_to_every_later_run(configuration: Path, tmp_path: Path) -> None:
    before = catalogue()
    assert before.look_up("invented acid").form is None
    own, where = keep(written(tmp_path))
    assert where == configuration / FOLDER / "ours.toml"
    assert where.read_text(encoding="utf-8") == OURS
    assert [p.name for p in where.parent.iterdir()] == ["ours.toml"]
    form = catalogue().look_up("ia").form
    assert form is not None
    assert (form.name, form.hazard) == ("invented acid", "irritant")
    assert form.molar_mass == pytest.approx(116.116, abs=0.002)
    row = acid_table().of("invented acid")[0]
    assert (row.pka, row.u, row.dh_kj_mol, row.source) == (4.60, 0.02, -1.2, "invented for this test")
    assert own.files[0].sha256 == hashlib.sha256(where.read_bytes()).hexdigest()
    where.unlink()
    assert catalogue().look_up("invented acid").form is None
    assert "invented acid" not in acid_table().index


def test_a_prediction_uses_its_constant(configuration: Path, tmp_path: Path) -> None:
    """A half-neutralised acid reads its apparent pKa: two acids alike but for 4.600 and acetic acid's pKa differ so."""
    keep(written(tmp_path))
    both = [
        reconcile.predict_ph([acid, "sodium hydroxide"], np.array([[0.1, 0.05]]), temperature_c=25.0)
        for acid in ("invented acid", "acetic acid")
    ]
    apart = acid_table().of("acetic acid")[0].pka - 4.60
    assert both[1].ph[0] - both[0].ph[0] == pytest.approx(apart, abs=0.002)
    salt = reconcile.predict_ph(
        ["invented acid", "sodium salt of invented acid"], np.array([[0.05, 0.05]]), temperature_c=25.0
    )
    assert salt.ph[0] == pytest.approx(both[0].ph[0], abs=1e-9)


def test_beside_a_record_they_are_that_record_s(configuration: Path, tmp_path: Path) -> None:
    record = tmp_path / "record"
    _, where = keep(written(tmp_path), beside=written(record, name="x.csv").parent)
    assert where == record / BESIDE
    assert own_of_user().files == ()
    own = own_of_record([record / "log.csv"])
    assert [(f.name, f.where) for f in own.files] == [(BESIDE, "beside the record")]
    assert own_of_record([tmp_path / "log.csv"]).files == ()
    keep(tmp_path / "ours.toml")  # the same file in the configuration as well is one file
    assert [f.where for f in own_of_record([record / "log.csv"]).files] == ["configuration"]


def test_a_copy_is_replaced_only_when_told(configuration: Path, tmp_path: Path) -> None:
    _, where = keep(written(tmp_path))
    keep(tmp_path / "ours.toml")  # nothing would change
    changed = written(tmp_path, OURS.replace("4.60", "4.70"))
    with pytest.raises(FileExistsError, match="--replace"):
        keep(changed)
    assert acid_table().of("invented acid")[0].pka == 4.60
    keep(changed, replace=True)
    assert acid_table().of("invented acid")[0].pka == 4.70
    assert where.read_bytes() == changed.read_bytes()


@pytest.mark.parametrize(
    ("change", "found", "words"),
    [
        (("pka = 4.60", "pka = 46.0"), ["own-value"], ["pka of step 1 of invented acid", "46.0", "-5 to 20"]),
        (("pka = 4.60", 'pka = "4,60"'), ["own-value"], ["pka of step 1 of invented acid", "4,60", "a number"]),
        (("pka = 4.60", "pka = nan"), ["own-value"], ["pka of step 1"]),
        (("u = 0.02\n", ""), ["own-missing"], ["step 1 of invented acid has no u"]),
        (("u = 0.02", "u = 0"), ["own-value"], ["u of step 1 of invented acid", "above 0"]),
        (('source = "invented for this test"\n\n', "\n"), ["own-missing"], ["step 1 of invented acid has no source"]),
        (("enthalpy = -1.2", "enthalpi = -1.2"), ["own-key"], ["enthalpi", "heat_capacity"]),
        (("charge = 0", "charge = 1"), ["own-charge"] * 2, ["the charge +1"]),
        (("charge = 0", "charge = 0.5"), ["own-value"], ["charge of invented acid", "a whole number"]),
        (('formula = "C5H8O3"', 'formula = "C5H8Q3"'), ["own-value"], ["C5H8Q3", "molar_mass"]),
        (('formula = "C5H8O3"', 'formula = "C5H8O3"\nmolar_mass = 161.116'), ["own-value"], ["161.116", "116.11"]),
        (('formula = "C5H8O3"', 'formula = "C5H8O3"\nmolar_mass = -1'), ["own-value"], ["above 0"]),
        (("protons_removed = 1", "protons_removed = 2"), ["own-value", "own-charge"], ["from 0 to 1"]),
        (('ions = {"Na+" = 1}\n', ""), ["own-charge"], ["the charge -1"]),
        (('"Na+" = 1', '"Na" = 1'), ["own-value"], ["ions of sodium salt of invented acid", "Na+"]),
        (('"Na+" = 1', '"Na+" = "one"'), ["own-value"], ["Na+ of sodium salt", "a number above 0"]),
        (('"Na+" = 1', '"Na+" = inf'), ["own-value"], ["a number above 0"]),
        (('synonyms = ["IA"]', 'synonyms = ["acetic acid"]'), ["own-known"], ["acetic acid"]),
        (('synonyms = ["IA"]', "synonyms = [7]"), ["own-value"], ["synonyms of invented acid"]),
        (('name = "sodium salt of invented acid"', 'name = "a\\nb"'), ["own-value"], ["text of one line"]),
        (('name = "sodium salt of invented acid"', 'name = " "'), ["own-missing"], ["has no name"]),
        (("[[substance]]", "[[substances]]"), ["own-key"], ["substances"]),
        (("[[acid]]", "[acid"), ["toml-bad"], ["not valid TOML"]),
        (('acid = "invented acid"\nprotons_removed = 1', "protons_removed = 1"), ["own-missing"], ["has no acid"]),
        (('acid = "invented acid"\nprotons', 'acid = "unheard acid"\nprotons'), ["own-value"], ["unheard acid"]),
    ],
)
def test_what_is_wrong_is_said(
    change: tuple[str, str], found: list[str], words: list[str], configuration: Path, tmp_path: Path
) -> None:
    assert change[0] in OURS
    path = written(tmp_path, OURS.replace(*change))
    with pytest.raises(InputProblems) as refused:
        keep(path)
    problems = refused.value.problems
    assert not Counter(found) - Counter(p.code for p in problems)
    text = "\n".join(p.message() for p in problems)
    assert all(word in text for word in [*words, str(path), "Expected"]), text
    assert not configuration.exists()


def test_a_constant_of_the_library_is_not_changed_so(configuration: Path, tmp_path: Path) -> None:
    with pytest.raises(InputProblems) as refused:
        keep(written(tmp_path, OURS.replace('"invented acid"', '"Acetic acid"', 1)))
    assert "own-known" in [p.code for p in refused.value.problems]


def test_steps_ascend_and_all_is_said_at_once(configuration: Path, tmp_path: Path) -> None:
    further = '[[acid.step]]\npka = 3.0\nu = 0.02\nsource = "invented"\n\n[[substance]]'
    text = OURS.replace("[[substance]]", further, 1).replace("C5H7O3Na", "C5H7O3Zz")
    with pytest.raises(InputProblems) as refused:
        keep(written(tmp_path, text))
    said = "\n".join(p.message() for p in refused.value.problems)
    assert "ascending" in said
    assert "C5H7O3Zz" in said


@pytest.mark.parametrize("content", [b"\xff\xfe\x00", b"", b"\xef\xbb\xbf", b"substance = 3", b"acid = [1, 2]"])
def test_what_is_no_such_file_is_refused(content: bytes, configuration: Path, tmp_path: Path) -> None:
    path = tmp_path / "other.toml"
    path.write_bytes(content)
    with pytest.raises(InputProblems):
        keep(path)
    with pytest.raises(InputProblems):
        keep(tmp_path / "not there.toml")
    with pytest.raises(InputProblems):
        keep(tmp_path)


def test_a_kept_file_that_was_spoilt_is_named_with_its_folder(configuration: Path, tmp_path: Path) -> None:
    _, where = keep(written(tmp_path))
    where.write_text("[[acid", encoding="utf-8")
    with pytest.raises(InputProblems) as refused:
        catalogue()
    assert str(where) in str(refused.value)
