"""Which finding counts as naming what was planted."""

import dataclasses

import numpy as np

from reconcile.records.results import Finding
from reconcile.records.substances import catalogue
from tests.simulated.matching import SAME_MEANING, acts_alike, match
from tests.simulated.planted import Planted
from tests.simulated.simulator import FAULTS


def finding(kind, subject, rivals=(), explain=None, interval=None, also=()):
    return Finding(
        kind,
        subject,
        "lot",
        None,
        "",
        interval,
        10.0,
        0.001,
        np.zeros(0, np.intp),
        "",
        would_explain=explain,
        rivals=rivals,
        also=also,
    )


def planted(fault, subject, **detail):
    kind = SAME_MEANING[fault][0]
    return Planted(kind, subject, "lot", None, "", fault, detail)


def outcomes(findings, *truth):
    matched = match(findings, truth)
    return [o.outcome for o in matched.outcomes], len(matched.stray)


def test_named_rival_missed_and_stray():
    offset = planted("meter_offset", "Meter 1")
    right, wrong = finding("meter_offset", "Meter 1"), finding("lot_strength", "A")
    assert outcomes([right], offset) == (["named"], 0)
    assert outcomes([wrong, right], offset) == (["named"], 1)
    assert outcomes([finding("lot_strength", "A", (right,))], offset) == (["rival"], 0)
    assert outcomes([finding("lot_strength", "A", (wrong, wrong, wrong, right))], offset) == (["missed"], 1)
    assert outcomes([finding("meter_step", "Meter 1")], offset) == (["missed"], 1)
    assert outcomes([], offset) == (["missed"], 0)


def test_each_finding_serves_one_planted_fault():
    one, other = planted("meter_offset", "Meter 1"), planted("meter_offset", "Meter 2")
    both = finding("meter_offset", "Meter 1", (finding("meter_offset", "Meter 2"),))
    assert outcomes([both], one, other) == (["named", "missed"], 0)


def test_identity_needs_the_substance_and_close_acids_count_as_one():
    wrong_bottle = planted("lot_identity", "A", substance="formic acid")
    assert outcomes([finding("lot_identity", "A", explain={"substance": "formic acid"})], wrong_bottle)[0] == ["named"]
    assert outcomes([finding("lot_identity", "A", explain={"substance": "citric acid"})], wrong_bottle)[0] == ["missed"]
    listed = finding("lot_identity", "A", explain={"substance": "citric acid"}, also=("formic acid",))
    assert outcomes([listed], wrong_bottle)[0] == ["named"]
    forms = catalogue().by_name
    # lactic 3.863, glycolic 3.834, formic 3.745 (acids.csv): 0.029 apart is one, 0.118 is not
    assert acts_alike(forms["lactic acid"], forms["glycolic acid"])
    assert not acts_alike(forms["lactic acid"], forms["formic acid"])
    assert not acts_alike(forms["lactic acid"], forms["sodium glycolate"])
    assert acts_alike(forms["sodium acetate"], forms["sodium acetate trihydrate"])


def test_a_hydrate_in_a_lot_is_a_strength_when_the_interval_holds_its_factor():
    hydrate = planted("lot_hydrate", "A", substance="sodium acetate trihydrate", factor=0.603)
    assert outcomes([finding("lot_strength", "A", interval=(0.58, 0.62))], hydrate)[0] == ["named"]
    assert outcomes([finding("lot_strength", "A", interval=(0.7, 0.8))], hydrate)[0] == ["missed"]


def test_a_constant_is_named_with_its_step():
    constant = planted("acid_constant", "citric acid", step=2)
    constant = dataclasses.replace(constant, subject_type="acid")
    assert outcomes([finding("acid_constant", "citric acid, step 2")], constant)[0] == ["named"]
    assert outcomes([finding("acid_constant", "citric acid, step 3")], constant)[0] == ["missed"]


def test_every_fault_says_what_names_it():
    assert set(SAME_MEANING) == set(FAULTS)
