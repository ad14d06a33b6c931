"""Long records: the sparse model is the short one, bounds are bounds, planted faults show among thousands."""

from dataclasses import replace

import numpy as np
import pytest
from scipy import sparse

from reconcile.auditor import grouped
from reconcile.auditor.audit import audit
from reconcile.auditor.bounds import bound
from reconcile.auditor.components import SHORT
from reconcile.auditor.foresight import ahead, foreseen
from reconcile.auditor.layout import build_layout, evidence, one_hot
from reconcile.auditor.long_components import estimate_long
from reconcile.auditor.long_critical import scores_needed
from reconcile.auditor.long_model import LongModel
from reconcile.auditor.mixed import ShortModel, estimate
from reconcile.chemistry.predict import predict_records, repredictor
from tests.simulated.matching import match
from tests.simulated.simulator import simulate

ROOM = {"n_batches": 100, "n_meters": 6, "readings_per_batch": 3, "meter_day_sd": 0.01, "checks_per_meter": 4}
PLANTED = ("meter_offset", "lot_strength", "reading_slip")
LONG = {"n_batches": 2000, "n_meters": 12, "readings_per_batch": 3, "batches_per_lot_set": 250, "weeks": 26}


def laid_out(seed, faults=(), **room):
    simulated = simulate(seed, faults, **room)
    prediction = predict_records(simulated.records, simulated.settings)
    usable = evidence(simulated.records, prediction)
    return simulated, build_layout(simulated.records, prediction, simulated.settings, usable)


def audited(simulated, records=None):
    records = simulated.records if records is None else records
    prediction = predict_records(records, simulated.settings)
    return audit(records, prediction, repredictor(records, simulated.settings), simulated.settings)


def columns_of(layout):
    """Single readings, lots, meters, spans about pH 5, batches and whole families: short and long columns."""
    parts = [
        sparse.eye_array(len(layout)),
        layout.lot_columns,
        one_hot(layout.meter, len(layout.meters)),
        one_hot(layout.meter, len(layout.meters), layout.ph - 5.0),
        one_hot(layout.batch, len(layout.batches)),
        one_hot(layout.family, len(layout.families)),
    ]
    return sparse.csc_array(sparse.hstack(parts))


@pytest.fixture(scope="module")
def record():
    """About 300 readings, with spreads as a short record estimates them."""
    simulated, layout = laid_out(3, ("meter_offset",), **ROOM)
    return simulated, layout, estimate(layout, simulated.settings)


@pytest.mark.parametrize("own", [(), (2,), (2, 8)])
@pytest.mark.parametrize("with_fixed", [False, True])
def test_the_sparse_model_is_the_short_one(record, own, with_fixed):
    """The same algebra in another order (Woodbury's identity), so they agree to rounding."""
    _, layout, components = record
    fixed = sparse.csc_array(one_hot(layout.meter, len(layout.meters))[:, [4]]) if with_fixed else None
    short = ShortModel(layout, components, fixed, own)
    long = LongModel(layout, components, fixed, own)
    x = columns_of(layout)
    scale = short.quadratic(x).max()
    assert components.session > 0.0
    assert np.abs(long.pr - short.pr).max() < 1e-10 * np.abs(short.pr).max()
    assert np.abs(long.quadratic(x) - short.quadratic(x)).max() < 1e-10 * scale
    assert np.abs(long.covariance(x) - short.covariance(x)).max() < 1e-10 * scale
    assert np.allclose(long.variance(), short.variance(), rtol=1e-12)
    if not own:
        assert long.log_det == pytest.approx(short.log_det, abs=1e-8)
        some = np.array([3, 4, 5, 100])
        v = np.linalg.inv(ShortModel(layout, components).p)
        assert with_fixed or np.allclose(long.marginal(some), v[np.ix_(some, some)], rtol=1e-6, atol=1e-12)
    one, other = short.shares(x[:, [len(layout)]]), long.shares(x[:, [len(layout)]])
    assert np.allclose(other.known.sum(axis=0), one.known.sum(axis=0), atol=1e-9)


def test_informations_are_bounded_from_above_and_exact_near_significance(record):
    """Leaving random effects out of V can only make x' V^-1 x larger (V is larger in the order of quadratic forms)."""
    _, layout, components = record
    model = LongModel(layout, components)
    x = columns_of(layout)
    own = np.full(x.shape[1], -1)
    lots = layout.effects["lot"]
    own[len(layout) : len(layout) + len(lots.subjects)] = np.arange(lots.first, lots.last)
    exact = model.quadratic(x)
    known = bound(model.base, x, own, steady=False)
    assert (known.value >= exact * (1.0 - 1e-9) - 1e-9).all()
    inside = own >= 0
    assert known.exact[inside].all()
    assert np.allclose(known.value[inside], exact[inside], rtol=1e-8)
    slope = np.asarray(x.T @ model.pr)
    z = slope / np.sqrt(np.maximum(exact, 1e-12))
    found = model.information(x, slope, own)
    assert (np.abs(z) > 3.5).any()
    assert np.allclose(found[np.abs(z) > 3.5], exact[np.abs(z) > 3.5], rtol=1e-8)


@pytest.mark.parametrize("session_sd", [0.002, 0.015])
def test_what_goes_to_the_diagonal_makes_tests_conservative(record, monkeypatch, session_sd):
    """With V taken too large, V' >= V, a score x'P'r has the variance x'P'VP'x <= x'P'x that it is taken to have."""
    _, layout, components = record
    components = replace(components, session=session_sd**2)
    monkeypatch.setattr(grouped, "EXPLICIT", 0)
    fresh = replace(layout, kept={})  # without the factored covariances of other tests
    long = LongModel(fresh, components)
    assert not (set(range(*_span(fresh, "session"))) & set(long.columns.tolist()))
    short = ShortModel(layout, components)
    x = columns_of(layout)
    assert (long.quadratic(x) <= short.quadratic(x) * (1.0 + 1e-9) + 1e-9).all()
    dense = layout.dense * np.sqrt(short.g)
    tau = short.batch_sd()
    v = np.diag(short.d) + dense @ dense.T + np.where(layout.same_batch, np.outer(tau, tau), 0.0)
    px = long.project(x.toarray())
    true_variance = np.einsum("ij,ij->j", px, v @ px)
    assert (true_variance <= long.quadratic(x) * (1.0 + 1e-8) + 1e-9).all()


def _span(layout, sort):
    effects = layout.effects[sort]
    return effects.first, effects.last


@pytest.mark.parametrize("room", [{}, {"meter_day_sd": 0.015}, {"noise_shape": "t4"}, {"noise": 0.03}])
def test_spreads_of_a_long_record_are_those_of_a_short_one(room):
    """Blocks instead of the whole likelihood: the noise within 8 %, the noise and session together within 6 %."""
    simulated, layout = laid_out(7, n_batches=390, n_meters=8, readings_per_batch=3, weeks=12, **room)
    short, long = estimate(layout, simulated.settings), estimate_long(layout, simulated.settings)
    assert len(layout) <= SHORT
    assert long.noise**0.5 == pytest.approx(short.noise**0.5, rel=0.08)
    assert (long.noise + long.session) ** 0.5 == pytest.approx((short.noise + short.session) ** 0.5, rel=0.06)
    assert abs(long.session**0.5 - short.session**0.5) < 0.2 * short.noise**0.5
    assert np.abs(np.log(long.meter_ratio / short.meter_ratio)).max() < 0.35


def test_readings_to_come_are_foreseen_as_by_the_whole_covariance(record):
    """Best linear prediction from V written out: c' V^-1 r, and the variance that it takes off."""
    _, layout, components = record
    short, long = ShortModel(layout, components), LongModel(layout, components)
    templates = np.array([0, 17, 40, -1])
    rng = np.random.default_rng(1)
    z_new = np.asarray(layout.z[np.maximum(templates, 0)].toarray()) * rng.uniform(0.5, 1.5, (4, 1))
    sd_new = np.array([0.004, 0.002, 0.005, 0.0])
    tau = short.batch_sd()
    shared = np.zeros((len(layout), 4))
    for j, template in enumerate(templates):
        same = layout.batch == layout.batch[template]
        shared[same, j] = tau[same] * sd_new[j] if template >= 0 else 0.0
    c = np.asarray(layout.z @ (z_new * short.g).T) + shared
    weighted = short.project(c)
    seen = ahead(long.base, z_new, templates, long.batch_sd(), sd_new)
    mean, variance = foreseen(seen, layout.r, None, np.zeros((4, 0)))
    assert np.allclose(mean, weighted.T @ layout.r, atol=1e-9)
    assert np.allclose(-variance, np.einsum("ij,ij->j", c, weighted), rtol=1e-8)
    fixed = sparse.csc_array(one_hot(layout.meter, len(layout.meters))[:, [4]])
    x_new = np.array([[1.0], [0.0], [1.0], [1.0]])
    inner = 1.0 / float(fixed.toarray().ravel() @ short.project(fixed.toarray().ravel()))
    beta = inner * float(fixed.toarray().ravel() @ short.pr)
    gap = x_new.ravel() - np.asarray(fixed.T @ weighted).ravel()
    mean, variance = foreseen(seen, layout.r, fixed, x_new)
    assert np.allclose(mean, x_new.ravel() * beta + weighted.T @ (layout.r - fixed @ np.array([beta])), atol=1e-9)
    assert np.allclose(variance, gap**2 * inner - np.einsum("ij,ij->j", c, weighted), atol=1e-12)


def test_scores_needed_by_halving_have_the_probability_asked(record):
    _, layout, components = record
    model = LongModel(layout, components)
    df = np.array([[30.0, 8.0], [10.0, 8.0], [6.0, 8.0], [4.5, 8.0]])[: len(components.tails)]
    needed = scores_needed(model, df, np.array([1e-3, 1e-5]))
    from reconcile.auditor.alarm import mixed_p

    assert np.allclose(mixed_p(model, df, needed), [1e-3, 1e-5], rtol=1e-6)


@pytest.fixture(scope="module")
def long_audit():
    simulated = simulate(1, PLANTED, **LONG)
    return simulated, audited(simulated)


def test_faults_in_six_thousand_readings_are_named_and_nothing_else(long_audit):
    simulated, found = long_audit
    assert len(simulated.records.readings) == 6000 > SHORT
    matched = match(found.findings, simulated.truth)
    assert [o.outcome for o in matched.outcomes] == ["named"] * len(PLANTED)
    assert not matched.stray
    for outcome in matched.outcomes:
        if outcome.planted.fault != "reading_slip":
            low, high = outcome.finding.interval95
            assert low <= outcome.planted.size <= high
            assert outcome.finding.next_check


def test_silence_of_a_long_record_has_a_size_for_every_meter_and_lot(long_audit):
    simulated, found = long_audit
    told = {(s.kind, s.subject) for s in found.smallest_detectable}
    meters = {("meter_offset", f"Meter {i + 1}") for i in range(LONG["n_meters"])}
    used = {("lot_strength", name) for name in simulated.records.lots.name}
    silent = {(s.kind, s.subject) for s in found.not_testable}
    assert meters <= told
    assert used <= told | silent


def test_order_of_rows_and_names_of_meters_change_nothing(long_audit):
    simulated, found = long_audit
    records = simulated.records
    order = np.random.default_rng(5).permutation(len(records.readings))
    columns = {name: column[order] for name, column in records.readings.columns.items()}
    table = replace(records.readings, columns=columns, row=records.readings.row[order])
    names = {f"Meter {i + 1}": f"{chr(97 + (7 * i) % 12)} probe bench" for i in range(LONG["n_meters"])}
    columns["meter"] = np.array([names[m] for m in columns["meter"]], object)
    meters = replace(
        records.meters,
        columns={**records.meters.columns, "meter": np.array([names[m] for m in records.meters["meter"]], object)},
    )
    again = audited(
        simulated,
        replace(records, readings=table, readings_solution=records.readings_solution[order], meters=meters),
    )
    assert len(again.findings) == len(found.findings)
    for one, other in zip(found.findings, again.findings, strict=True):
        subject = one.subject
        renamed = names.get(subject, subject) if isinstance(subject, str) else tuple(names.get(s, s) for s in subject)
        assert (other.kind, other.subject) == (one.kind, renamed)
        assert other.estimate == pytest.approx(one.estimate, rel=1e-6)
        assert other.log_likelihood_gain == pytest.approx(one.log_likelihood_gain, rel=1e-6)
        assert len(other.rivals) == len(one.rivals)
