"""One small invented record for each thing that laboratories write down, read in three ways.

Predicted values: certified tables, and hand calculation with pKa from general handbooks (from memory: acetic acid
4.76, Tris 8.07 at 25 °C falling by 0.028 a kelvin, phosphoric acid 7.20) and Davies' coefficients.
"""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from worked import WAYS, at, audit_as, near, read_as, table

import reconcile
from reconcile.records.settings import Settings
from reconcile.records.standards import standards
from reconcile.reporter.figures.finding import finding_picture
from reconcile.reporter.lookups import Lookups

RECIPE = ("Batch", "Substance", "Lot", "Amount", "Planned amount", "Unit", "Made up to", "Made up to unit", "Step")
STOCK = ("Lot", "Substance", "Made as batch", "Strength", "Unit", "Density (g/mL)", "Assay (%)", "Factor")


def line(
    batch: str, substance: str | None, lot: str | None, amount: Any, unit: str | None, **more: Any
) -> tuple[Any, ...]:
    return (batch, substance, lot, amount, more.get("planned"), unit, more.get("to"), more.get("to_unit"),
            more.get("step"))  # fmt: skip


ACETATE = [line("A-1", "acetic acid", None, 50.0, "mM"), line("A-1", "sodium acetate", None, 50.0, "mM")]
"""pH 4.76 - 0.09 (I = 0.05) = 4.67, hardly changing with temperature."""
TRIS = [line("T-1", "Tris base", None, 50.0, "mM"), line("T-1", "hydrochloric acid", None, 25.0, "mM")]
"""pH 8.07 + 0.07 (I = 0.025) = 8.14 at 25 °C."""


# -- known solutions ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("way", WAYS)
def test_check_readings_alone(way: str, tmp_path: Path) -> None:
    sheets = {
        "Checks": [
            ("Read at", "Known solution", "Known solution lot", "Meter", "Probe", "Temperature (°C)", "pH"),
            (at(0), "phthalate", None, "M-1", "P-1", 25.0, 4.01),
            (at(0, 10), "phosphate", None, "M-1", "P-1", 20.0, 6.88),
            (at(1), "borax", None, "M-1", "P-1", 25.0, 9.19),
            (at(1, 10), "house 5", "H5-2", "M-1", "P-1", 22.5, 5.02),
            (at(2), "house 5", "H5-1", "M-1", "P-1", 22.5, 4.98),
        ],
        "Certificates": [
            ("Known solution", "Lot", "Temperature (°C)", "Certified pH", "u"),
            ("House 5", "H5-1", 20.0, 5.00, 0.005),
            ("House 5", "H5-1", 25.0, 4.98, 0.005),
            ("House 5", "H5-2", 20.0, 5.02, 0.005),
            ("House 5", "H5-2", 25.0, 5.00, 0.005),
        ],
    }
    audit = audit_as(way, tmp_path, sheets)
    # 4.005, 6.881 and 9.180: Bates 1962 and Staples and Bates 1969, from memory; house values halfway between two
    expected = [("phthalate", 4.005), ("phosphate", 6.881), ("borax", 9.180), ("house 5", 5.01), ("house 5", 4.99)]
    near(table(audit), [(name, "", "as_predicted", ph) for name, ph in expected], 0.006)
    assert audit.evidence.all()
    assert not len(audit.records.recipes)


def test_built_in_standards_agree_with_their_tables() -> None:
    for name, buffer in standards().items():
        for celsius, ph in zip(buffer.temperature_c, buffer.ph, strict=True):
            found = reconcile.records.standards.standard_ph(name, float(celsius))
            assert found is not None
            assert found[0] == pytest.approx(float(ph), abs=0.005)


@pytest.mark.parametrize(
    ("name", "ph"),
    # at 25 °C, of the certificates' usual names: Bates 1962, Staples and Bates 1969, from memory
    [("pH 9.18 borax", 9.180), ("Borax buffer, pH 9.18", 9.180), ("pH 6.86 (phosphate)", 6.865),
     ("phosphate pH 7.41", 7.413), ("Phthalate standard 4.01", 4.005), ("carbonate buffer pH 10.01", 10.012)],
)  # fmt: skip
def test_a_standard_may_be_named_by_substance_and_ph(name: str, ph: float) -> None:
    found = reconcile.records.standards.standard_ph(name, 25.0)
    assert found is not None
    assert found[0] == pytest.approx(ph, abs=0.002)


@pytest.mark.parametrize(
    "name", ["borax pH 6.86", "phosphate pH 7.00", "acetate pH 4.01", "pH 7.00", "phthalate 25.00"]
)
def test_what_is_no_standard_is_none(name: str) -> None:
    assert reconcile.records.standards.standard_ph(name, 25.0) is None


# -- stocks from stocks ---------------------------------------------------------------------------------------------

NESTED = {
    "Readings": [("Batch", "pH"), ("A-9", 4.67), ("W-9", 4.67)],
    "Recipes": [
        RECIPE,
        line("A-9", None, "X10", "10x", None),
        line("X-10", "acetic acid", "GL", 28.70, "mL", to=1.0, to_unit="L"),
        line("X-10", "sodium hydroxide", "NA", 249.5, "mL", planned=250.0),
        line("W-9", "acetic acid", "GL", 3.012, "g"),
        line("W-9", "sodium acetate", None, 4.102, "g", planned=4.1),
        line("W-9", "purified water", None, "q.s. to 1 kg", None),
    ],
    "Stocks": [
        STOCK,
        ("X10", None, "X-10", None, None, None, None, None),
        ("GL", "acetic acid", None, None, None, 1.049, 99.7, None),
        ("NA", "sodium hydroxide", None, 1.0, "N", None, None, 1.002),
    ],
}


@pytest.mark.parametrize("way", WAYS)
def test_stocks_made_from_stocks(way: str, tmp_path: Path) -> None:
    records = read_as(way, tmp_path, NESTED)
    s, forms = records.solutions, records.forms
    held = {(s.batch[k], forms[f].name): a for k, f, a in zip(s.solution, s.form, s.amount, strict=True)}
    # by hand: 28.70 mL x 1.049 g/mL x 0.997 / 60.052 g/mol = 0.49982 mol in 1 L, a tenth of it; 249.5 mL of 1.002 N;
    # glacial acid 1.049 g/mL, 99.7 %: from memory of general handbooks
    assert held["A-9", "acetic acid"] == pytest.approx(0.049982, rel=1e-4)
    assert held["A-9", "sodium hydroxide"] == pytest.approx(0.1 * 0.2495 * 1.002, rel=1e-6)
    # 3.012 g of 99.7 % and 4.102 g over 82.034 g/mol in 1000 g: water 1000 - 3.003 - 4.102 g
    water = (1000.0 - 3.012 * 0.997 - 4.102) / 1000.0
    assert held["W-9", "acetic acid"] == pytest.approx(3.012 * 0.997 / 60.052 / water, rel=1e-4)
    assert held["W-9", "sodium acetate"] == pytest.approx(4.102 / 82.034 / water, rel=1e-4)
    chains = [{str(records.lots.name[i]) for i in records.lots_of_reading(n)} for n in range(2)]
    assert chains == [{"X10", "GL", "NA"}, {"GL"}]


def test_a_cycle_of_stocks_is_refused(tmp_path: Path) -> None:
    stocks = [*NESTED["Stocks"][:2], ("GL", None, "X-10", None, None, None, None, None), NESTED["Stocks"][3]]
    records = read_as("workbook", tmp_path, {**NESTED, "Stocks": stocks})
    assert {(row.code, row.cause.sheet) for row in records.set_aside} == {("stock-cycle", "Stocks")}


def test_a_parents_fault_is_named_at_the_parent(tmp_path: Path) -> None:
    """Five stocks are made from one bottle of acid that is 1.25 times as strong as it says."""
    rng = np.random.default_rng(11)
    readings: list[Any] = [("Read at", "Batch", "Meter", "Temperature (°C)", "pH")]
    recipes, stocks = [RECIPE], [STOCK, ("GL", "acetic acid", None, 1.0, "M", None, None, None)]
    stocks.append(("G2", "acetic acid", None, 1.0, "M", None, None, None))
    for i in range(5):
        recipes.append(line(f"X-{i}", "acetic acid", "GL", 200.0, "mL", to=1.0, to_unit="L"))
        recipes.append(line(f"X-{i}", "sodium acetate", "SA", 16.407, "g"))
        stocks.append((f"XL-{i}", None, f"X-{i}", None, None, None, None, None))
    for i in range(24):
        from_parent = i < 15
        if from_parent:
            recipes.append(line(f"B-{i}", None, f"XL-{i % 5}", 200.0, "mL", to=1.0, to_unit="L"))
        else:
            recipes.append(line(f"B-{i}", "acetic acid", "G2", 40.0, "mL", to=1.0, to_unit="L"))
            recipes.append(line(f"B-{i}", "sodium acetate", "SA", 3.281, "g"))
        shift = -np.log10(1.25) if from_parent else 0.0
        for meter in ("M-1", "M-2", "M-3"):
            readings.append((at(i), f"B-{i}", meter, 25.0, round(4.673 + shift + rng.normal(0.0, 0.008), 2)))
    audit = audit_as("workbook", tmp_path, {"Readings": readings, "Recipes": recipes, "Stocks": stocks})
    (finding,) = audit.findings
    assert (finding.kind, finding.subject) == ("lot_strength", "GL")
    assert finding.estimate == pytest.approx(1.25, rel=0.05)


# -- stages and repeats ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("way", WAYS)
def test_stages_repeats_means_and_standings(way: str, tmp_path: Path) -> None:
    sheets = {
        "Readings": [
            ("Read at", "Batch", "Meter", "Stage", "pH 1", "pH 2", "Readings averaged", "Standing", "Temperature (°C)"),
            (at(0, 9), "S-1", "M-1", "acid", 2.89, 2.90, None, None, 25.0),
            (at(0, 10), "S-1", "M-1", "final", 4.65, None, 3, None, 25.0),
            (at(0, 11), "S-1", "M-1", "after sterilising", 4.64, None, None, None, 25.0),
            (at(0, 12), "S-1", "M-1", "final", 5.67, None, None, "void", 25.0),
            (at(0, 13), "S-1", "M-1", "final", 4.66, None, None, "retest", 25.0),
        ],
        "Recipes": [
            RECIPE,
            line("S-1", "acetic acid", "AA", 100.0, "mM", step="acid"),
            line("S-1", "sodium acetate", "SA", 100.0, "mM", step="final"),
        ],
    }
    audit = audit_as(way, tmp_path, sheets)
    # the acid alone: (4.76 - log 0.1) / 2 = 2.88; then 4.76 - 0.11 (I = 0.1); after sterilising nothing was added
    near(
        table(audit),
        [
            ("S-1", "acid", "as_predicted", 2.88),
            ("S-1", "acid", "as_predicted", 2.88),
            ("S-1", "final", "as_predicted", 4.65),
            ("S-1", "after sterilising", "as_predicted", 4.65),
            ("S-1", "final", "void", 4.65),
            ("S-1", "final", "as_predicted", 4.65),
        ],
        0.015,
    )
    assert audit.evidence.tolist() == [True, True, True, True, False, True]
    # repeats come in the order of their columns, which one of the ways turns round
    assert sorted(audit.records.readings["repeat"].tolist()[:2]) == [1, 2]
    assert audit.records.readings["repeat"].tolist()[2:] == [1, 1, 1, 1]
    # a mean of three has a third of the variance of reading, and the spread of everything else
    one, three = audit.spreads.noise[[3, 2]]
    assert three == pytest.approx(one / 3**0.5)
    assert audit.u_residual[2] > three * 1.5
    assert audit.records.readings["standing"].tolist()[-2:] == ["void", "retest"]
    assert len(set(audit.records.readings_solution.tolist())) == 3


# -- temperatures ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("way", WAYS)
def test_temperatures(way: str, tmp_path: Path) -> None:
    sheets = {
        "Readings": [
            ("Batch", "Meter", "Temperature (°C)", "Reference temperature (°C)", "pH"),
            ("T-1", "M-1", 37.0, None, 7.81),
            ("T-1", "M-1", 37.0, 25.0, 8.14),
            ("T-1", "M-1", None, None, 8.22),
            ("A-1", "M-1", None, None, 4.67),
        ],
        "Recipes": [RECIPE, *TRIS, *ACETATE],
    }
    audit = audit_as(way, tmp_path, sheets)
    # 12 K above and 3 K below 25 °C at -0.028 a kelvin
    near(table(audit), [("T-1", "", "as_predicted", ph) for ph in (7.81, 8.14, 8.22)]
         + [("A-1", "", "as_predicted", 4.67)], 0.02)  # fmt: skip
    assert audit.prediction.temperature_c.tolist() == [37.0, 25.0, 22.0, 22.0]
    # "0.06 pH for Tris at 2 °C, nothing for acetate": a half-width of 2 K at 0.028 a kelvin, over root 3
    assert audit.prediction.budget["temperature"][2:] == pytest.approx([0.056 / 3**0.5, 0.0], abs=0.002)
    codes = {note.code: note for note in audit.records.notes}
    assert "readings without a temperature: 2," in codes["temperature-missing"].message()
    assert "22 °C" in codes["temperature-missing"].message()
    assert "readings stated at a reference temperature: 1" in codes["temperature-reference"].message()


def test_room_temperature_in_words_is_no_temperature_in_particular(tmp_path: Path) -> None:
    rows = [("Batch", "Meter", "Temperature (°C)", "pH"), ("T-1", "M-1", "RT", 8.22), ("T-1", "M-1", "ambient", 8.22)]
    audit = audit_as("workbook", tmp_path, {"Readings": rows, "Recipes": [RECIPE, *TRIS]})
    assert audit.prediction.temperature_c.tolist() == [22.0, 22.0]
    assert audit.prediction.budget["temperature"] == pytest.approx(0.056 / 3**0.5, abs=0.002)
    assert {"missing-mark", "temperature-missing"} <= {note.code for note in audit.records.notes}


@pytest.mark.parametrize(
    "heading", ["pH (25 °C)", "pH at 25 °C", "pH @ 25°C", "pH 25 °C", "Measured pH (25.0 °C)", "pH (ref. 25 ºC)"]
)
def test_a_heading_may_state_the_temperature(heading: str, tmp_path: Path) -> None:
    sheets = {
        "Readings": [("Batch", "Temperature (°C)", heading), ("T-1", 37.0, 8.14)],
        "Recipes": [RECIPE, *TRIS],
    }
    records = read_as("workbook", tmp_path, sheets)
    assert records.readings["reference_temperature"].tolist() == [25.0]
    assert records.readings["ph"].tolist() == [8.14]


def test_a_known_solution_at_an_unknown_temperature_is_less_certain(tmp_path: Path) -> None:
    rows = [("Known solution", "Meter", "Temperature (°C)", "pH"), ("borax", "M", None, 9.2), ("borax", "M", 22.0, 9.2)]
    records = read_as("workbook", tmp_path, {"Readings": rows})
    unknown, known = records.solutions.known_u
    # borax falls by about 0.0085 a kelvin near 22 °C (9.225 at 20, 9.180 at 25 °C: Staples and Bates 1969, from memory)
    assert unknown == pytest.approx(np.hypot(known, 0.009 * 2.0 / 3**0.5), rel=0.1)


# -- meters, probes, calibrations, events ---------------------------------------------------------------------------


def moved_probe(error: float) -> dict[str, list[Any]]:
    """Three meters; probes P-1 and P-2 change places on day 15; P-1 reads high by `error`."""
    rng = np.random.default_rng(3)
    readings: list[Any] = [("Read at", "Batch", "Meter", "Probe", "Temperature (°C)", "pH")]
    recipes = [RECIPE]
    for i in range(30):
        recipes += [line(f"B-{i}", "acetic acid", f"AA-{i % 3}", 50.0, "mM")]
        recipes += [line(f"B-{i}", "sodium acetate", f"SA-{i % 2}", 50.0, "mM")]
        probes = {"M-1": "P-1", "M-2": "P-2", "M-3": "P-3"}
        if i >= 15:
            probes |= {"M-1": "P-2", "M-2": "P-1"}
        for meter, probe in probes.items():
            shown = 4.673 + error * (probe == "P-1") + rng.normal(0.0, 0.01)
            readings.append((at(i), f"B-{i}", meter, probe, 25.0, round(shown, 2)))
    return {
        "Readings": readings,
        "Recipes": recipes,
        "Calibrations": [
            ("Meter", "Probe", "Calibrated at", "Slope (%)", "Offset (mV)"),
            *(
                (meter, probe, at(day, 8), 98.0, 2.0)
                for day in range(0, 30, 5)
                for meter, probe in zip(
                    ("M-1", "M-2", "M-3"), ("P-1", "P-2", "P-3") if day < 15 else ("P-2", "P-1", "P-3"), strict=True
                )
            ),
        ],
        "Events": [("Meter", "Probe", "Date", "What was done"), (None, "P-1", at(15, 7), "moved to M-2")],
    }


def test_a_fault_goes_along_with_a_probe(tmp_path: Path) -> None:
    audit = audit_as("workbook", tmp_path, moved_probe(0.09))
    (finding,) = audit.findings
    assert (finding.kind, finding.subject_type, finding.subject) == ("meter_offset", "probe", "P-1")
    assert finding.estimate == pytest.approx(0.09, abs=0.01)
    assert finding.text.startswith("Probe P-1 reads")
    assert "meter P-1" not in finding.text + finding.next_check
    assert len(finding.readings) == 30
    assert "on meter M-2" in finding.next_check  # where the probe is now
    drawn = finding_picture(audit, Lookups(audit), finding)
    moved = (at(15, 7) - datetime(1970, 1, 1)).total_seconds() / 86400.0
    for panel in drawn.axes:
        dotted = [line for line in panel.lines if line.get_linestyle() == "--" or line.is_dashed()]
        assert [float(np.mean(line.get_xdata())) for line in dotted] == pytest.approx([moved])
    assert "logged event" in {text.get_text() for legend in drawn.legends for text in legend.get_texts()}


def test_a_fault_that_stays_is_the_meters(tmp_path: Path) -> None:
    sheets = moved_probe(0.0)
    sheets["Readings"] = [row if row[2] != "M-1" else (*row[:5], round(row[5] + 0.09, 2)) for row in sheets["Readings"]]
    (finding,) = audit_as("workbook", tmp_path, sheets).findings
    assert (finding.kind, finding.subject_type, finding.subject) == ("meter_offset", "meter", "M-1")


@pytest.mark.parametrize("way", WAYS)
def test_moved_probes_without_a_fault_raise_nothing(way: str, tmp_path: Path) -> None:
    audit = audit_as(way, tmp_path, moved_probe(0.0))
    assert audit.findings == ()
    assert audit.records.events["what"].tolist() == ["moved to M-2"]


# -- limits and impact ----------------------------------------------------------------------------------------------


def with_limits(error: float) -> dict[str, list[Any]]:
    """Meter M-1 is off; batches near their low limit of pH 4.60."""
    sheets = moved_probe(0.0)
    rows: list[Any] = [
        ("Read at", "Batch", "Meter", "Temperature (°C)", "pH", "Stage", "Low limit (final)", "High limit (final)")
    ]
    for moment, batch, meter, _, celsius, ph in sheets["Readings"][1:]:
        shown = ph + error * (meter == "M-1")
        rows.append((moment, batch, meter, celsius, round(shown, 2), "final", 4.60, 4.80))
    rows.append((at(40), "B-0", "M-1", 25.0, 4.55, "in process", 4.60, 4.80))
    sheets["Readings"] = rows
    del sheets["Calibrations"], sheets["Events"]
    return sheets


@pytest.mark.parametrize("way", WAYS)
def test_a_finding_lists_what_would_change_place(way: str, tmp_path: Path) -> None:
    audit = audit_as(way, tmp_path, with_limits(-0.12))
    (finding,) = audit.findings
    assert (finding.kind, finding.subject) == ("meter_offset", "M-1")
    ph, low = audit.records.readings["ph"], audit.records.readings["low_limit"]
    assert np.isnan(low[-1])  # the limits are of the final stage
    mine = np.flatnonzero((audit.records.readings["meter"] == "M-1") & (ph < 4.60) & np.isfinite(low))
    # pH 4.67 and a noise of 0.01 lie 0.07 above the limit: far beyond 1.645 standard uncertainties of about 0.012
    assert sorted(finding.impact.tolist()) == mine.tolist()
    assert len(mine) >= 25
    assert finding.impact_open.tolist() == []
    assert "would change place against the limits" in finding.text


def test_within_the_guard_band_the_place_is_left_open(tmp_path: Path) -> None:
    sheets = with_limits(-0.12)
    sheets["Readings"] = [sheets["Readings"][0]] + [(*row[:6], 4.67, 4.80) for row in sheets["Readings"][1:]]
    (finding,) = audit_as("workbook", tmp_path, sheets).findings
    # what M-1 reads, less the error, is 4.67 give or take 0.01: at the limit itself
    assert len(finding.impact_open) >= 25
    assert "too near to a limit to say" in finding.text


# -- what cannot be predicted ---------------------------------------------------------------------------------------

ODD = {
    "Readings": [
        ("Batch", "Meter", "Temperature (°C)", "pH"),
        ("B-1", "M-1", 25.0, 4.7),
        ("B-2", "M-1", 25.0, 4.7),
        ("B-3", "M-1", 25.0, 4.7),
        ("B-4", "M-1", 25.0, 6.3),
        ("purified water", "M-1", 25.0, 5.9),
        ("B-5", "M-1", 25.0, 12.9),
        ("B-6", "M-1", 25.0, 4.7),
    ],
    "Recipes": [
        RECIPE,
        *(line(f"B-{i}", *rest) for i in (1, 2, 3, 6) for rest in (("acetic acid", None, 50.0, "mM"),
                                                                  ("sodium acetate", None, 50.0, "mM"))),
        line("B-1", "marker protein", None, 1.0, "g/L"),
        line("B-2", "ethanol", None, 200.0, "g/L"),
        line("B-3", "aluminium hydroxide gel", None, 1.0, "g/L"),
        line("B-4", "sodium chloride", None, 10.0, "mM"),
        line("B-5", "sodium hydroxide", None, 100.0, "mM"),
    ],
}  # fmt: skip


@pytest.mark.parametrize("way", WAYS)
def test_what_cannot_be_predicted_says_so(way: str, tmp_path: Path) -> None:
    audit = audit_as(way, tmp_path, ODD)
    assert [(row.batch, row.code) for row in audit.records.set_aside] == [
        ("B-1", "substance-unknown"),
        ("B-2", "solvent-mixed"),
        ("B-3", "suspension"),
    ]
    assert 'without_effect = ["marker protein"]' in audit.records.set_aside[0].advice
    # 0.1 mol/L of hydroxide: 14 - 1 - 0.1; water and a neutral salt: 7
    expected = [
        ("B-4", "", "unbuffered", 7.0),
        ("purified water", "", "unbuffered", 7.0),
        ("B-5", "", "outside_electrode_range", 12.88),
        ("B-6", "", "as_predicted", 4.67),
    ]
    near(table(audit), expected, 0.02)
    assert audit.evidence.tolist() == [False, False, False, True]


@pytest.mark.parametrize(("amount", "unit"), [(50.0, "% v/v"), (300.0, "mL"), (400.0, "g/L")])
def test_a_mixed_solvent_is_called_one_however_its_amount_is_stated(amount: float, unit: str, tmp_path: Path) -> None:
    recipe = [RECIPE, *ACETATE, line("A-1", "methanol", None, amount, unit, to=1.0, to_unit="L")]
    sheets = {"Readings": [("Batch", "pH"), ("A-1", 5.1), ("water blank", 6.0)], "Recipes": recipe}
    records = read_as("workbook", tmp_path, sheets)
    assert [(row.batch, row.code) for row in records.set_aside] == [("A-1", "solvent-mixed")]
    assert records.readings["batch"].tolist() == ["water blank"]


def test_a_declared_substance_costs_its_allowance(tmp_path: Path) -> None:
    settings = Settings.from_sections({"substances": {"without_effect": ["marker protein", "aluminium hydroxide gel"]}})
    audit = audit_as("workbook", tmp_path, ODD, settings)
    u = dict(zip(audit.records.readings["batch"], audit.prediction.u, strict=True))
    assert u["B-1"] == u["B-3"] == pytest.approx(np.hypot(u["B-6"], 0.02))
    assert audit.prediction.budget["declared without effect"].tolist()[0] == 0.02
    assert replace(audit).records.without_effect == ("marker protein", "aluminium hydroxide gel")


@pytest.mark.parametrize("way", WAYS)
def test_limits_in_one_cell(way: str, tmp_path: Path) -> None:
    said = [
        "4.5 - 4.8",
        "4,5–4,8",
        "pH 4.50 to 4.80",
        "4.7 ± 0.1",
        "NLT 4.5",
        "not more than 4.8",
        "> 4.5",
        "see SOP",
        None,
    ]
    rows: list[Any] = [("Batch", "Meter", "Temperature (°C)", "pH", "Specification")]
    rows += [("A-1", "M-1", 25.0, 4.66, text) for text in said]
    records = read_as(way, tmp_path, {"Readings": rows, "Recipes": [RECIPE, *ACETATE]})
    nan = np.nan
    low, high = records.readings["low_limit"], records.readings["high_limit"]
    assert low.tolist() == pytest.approx([4.5, 4.5, 4.5, 4.6, 4.5, nan, 4.5, nan, nan], nan_ok=True)
    assert high.tolist() == pytest.approx([4.8, 4.8, 4.8, 4.8, nan, 4.8, nan, nan, nan], nan_ok=True)
    (note,) = [n for n in records.notes if n.code == "cell-not-used"]
    assert note.read == "see SOP"
    assert len(records.readings) == len(said)
