"""The evidence of a well, weighed: what bears and what must not, on wells simulated from a declared law."""

from __future__ import annotations

import time
from dataclasses import replace
from types import SimpleNamespace

import numpy as np
import pytest
from damaged_wells import Law, simulate, without

from corelab.interval import impact
from corelab.interval.impact import TERMS, assess
from corelab.science.impact import CAP, Recalibration, likelihood_frac, skill

WELLS = [simulate(seed) for seed in range(20, 28)]


def pooled(change=lambda e: e, prior=0.35):
    found = [assess(change(w.evidence), prior) for w in WELLS]
    return found, np.concatenate([w.damaged for w in WELLS])


def likelihoods(change=lambda e: e, prior=0.35):
    found, y = pooled(change, prior)
    return np.concatenate([a.likelihood_frac for a in found]), y


def effect(found, term):
    return np.concatenate([a.weighed.effect[:, TERMS.index(term)] for a in found])


def test_every_likelihood_is_recomputed_from_its_evidence():
    a = assess(WELLS[0].evidence, 0.35)
    for i in range(len(a.place)):
        rows = impact.evidence_rows(a, i)
        assert all(abs(row["effect"]) <= CAP + 1e-12 for row in rows)
        assert all(row["effect"] == pytest.approx(row["weight"] * row["ratio"]) for row in rows)
        total = sum(row["effect"] for row in rows)
        assert float(likelihood_frac(0.35, total)) == pytest.approx(a.likelihood_frac[i], abs=1e-12)
        assert len(rows) + len(impact.missing_words(a, i)) >= len(TERMS)


@pytest.mark.parametrize(
    "what", [("log",), ("descriptions",), ("core",), ("log", "core"), ("descriptions", "core")]
)
def test_without_evidence_the_likelihood_goes_towards_the_prior(what):
    whole, y = likelihoods()
    less, _ = likelihoods(lambda e: without(e, *what))
    away = lambda p: np.mean((p - 0.35) ** 2)  # noqa: E731
    assert away(less) < away(whole)
    assert skill(less, y).skill > 0.0
    assert abs(less.mean() - y.mean()) < 0.1


def test_without_any_evidence_it_is_the_prior_and_not_assessed():
    a = assess(without(WELLS[0].evidence, "log", "descriptions", "core"), 0.35)
    np.testing.assert_allclose(a.likelihood_frac, 0.35)
    assert set(a.verdict) == {"not assessed"} and set(a.direction) == {"none"}
    assert np.all(a.coverage == 0.0)


def test_the_rule_is_not_one_signed():
    """Low permeability or low porosity as the only sign ranks plugs of a mixed well like chance."""
    found, y = pooled()
    low_k = np.concatenate([-a.found["permeability"].difference for a in found])
    low_phi = np.concatenate([-a.found["density log"].difference for a in found])
    assert skill(low_k, y).auc < 0.6
    assert skill(low_phi, y).auc < 0.6
    assert skill(np.concatenate([a.likelihood_frac for a in found]), y).auc > 0.9
    assert skill(effect(found, "permeability"), y).auc > 0.7
    assert skill(effect(found, "density log"), y).auc > 0.7


def test_a_shifted_log_loses_its_power():
    """Placebo. The log is moved by several beds' thickness."""

    def shifted(e):
        return replace(e, log=replace(e.log, depth_m=e.log.depth_m + 4.7))

    found, y = pooled()
    placebo, _ = pooled(shifted)
    assert skill(effect(found, "density log"), y).auc > 0.75
    assert np.abs(effect(placebo, "density log")).mean() < 0.5 * np.abs(effect(found, "density log")).mean()
    p = np.concatenate([a.likelihood_frac for a in placebo])
    sound = np.concatenate([a.verdict for a in placebo])[~y]
    assert np.mean(sound == "likely") < 0.05
    assert skill(p, y).skill < skill(np.concatenate([a.likelihood_frac for a in found]), y).skill


def test_shuffled_facies_lose_power_without_false_certainty():
    """Placebo. Facies and firmness of references are dealt out anew."""

    def shuffled(e):
        order = np.random.default_rng(9).permutation(len(e))
        return replace(e, facies=e.facies[order], firmness=e.firmness[order])

    whole, y = likelihoods()
    placebo, _ = likelihoods(shuffled)
    assert skill(placebo, y).skill < skill(whole, y).skill - 0.1
    assert np.mean(placebo[~y] >= 0.7) < 0.1


def test_permeability_from_texture_is_no_evidence():
    e = WELLS[0].evidence
    texture = replace(
        e,
        log_permeability=np.full(len(e), np.nan),
        reason_permeability=np.full(len(e), "permeability from texture tells nothing of crushing", object),
    )
    a = assess(texture, 0.35)
    assert np.all(a.weighed.effect[:, 0] == 0.0)
    assert "from texture" in impact.missing_words(a, 0)[0]


def test_firmness_chooses_the_sign_and_is_no_evidence():
    e = WELLS[0].evidence
    silent = replace(e, firmness=np.full(len(e), "", object))
    a, b = assess(e, 0.35), assess(silent, 0.35)
    assert np.mean(np.abs(a.likelihood_frac - b.likelihood_frac)) < 0.05
    bare = without(e, "log", "core")
    loose = replace(
        bare, firmness=np.full(len(bare), "loose", object), condition=np.full(len(bare), "", object)
    )
    a = assess(replace(loose, log_permeability=np.full(len(bare), np.nan)), 0.35)
    np.testing.assert_allclose(a.likelihood_frac, 0.35)


def test_a_plugs_own_porosity_and_permeability_do_not_choose_its_sign():
    e = WELLS[0].evidence
    shot = e.source == "percussion sidewall"
    moved = replace(
        e,
        porosity_frac=np.where(shot, e.porosity_frac + 0.05, e.porosity_frac),
        log_permeability=np.where(shot, e.log_permeability - 1.0, e.log_permeability),
    )
    np.testing.assert_array_equal(assess(e, 0.35).soft_share, assess(moved, 0.35).soft_share)


def test_off_grain_density_points_to_mud_and_halves_what_rests_on_volumes():
    e = WELLS[0].evidence
    dense = e.grain_density_g_cm3.copy()
    dense[0] += 0.08  # 5 % of barite in the solids
    a, b = assess(e, 0.35), assess(replace(e, grain_density_g_cm3=dense), 0.35)
    rows = {row["term"]: row for row in impact.evidence_rows(b, 0)}
    assert rows["grain density"]["effect"] == 0.0
    assert "mud" in rows["grain density"]["finding"] and "not to crushing" in rows["grain density"]["finding"]
    assert rows["permeability"]["weight"] == 0.5
    assert abs(b.weighed.effect[0, 0]) < abs(a.weighed.effect[0, 0])
    np.testing.assert_array_equal(a.likelihood_frac[1:], b.likelihood_frac[1:])


def test_a_plug_is_never_its_own_reference():
    """Blind, a core plug moved out of line sees the prediction of the others, which it does not move."""
    e = WELLS[0].evidence
    at = int(np.flatnonzero(e.source == "core")[10])
    log_k = e.log_permeability.copy()
    log_k[at] += 3.0
    before, after = assess(e, 0.35, blind=True), assess(replace(e, log_permeability=log_k), 0.35, blind=True)
    i = int(np.flatnonzero(before.place == at)[0])
    moved = after.found["permeability"].difference[i] - before.found["permeability"].difference[i]
    assert moved == pytest.approx(3.0, abs=0.05)


def test_damaged_percussion_plugs_never_enter_the_references():
    e = WELLS[0].evidence
    shot = np.flatnonzero(e.source == "percussion sidewall")
    log_k = e.log_permeability.copy()
    log_k[shot[1:]] = -6.0
    one = assess(e, 0.35).found["permeability"].difference[0]
    assert assess(replace(e, log_permeability=log_k), 0.35).found["permeability"].difference[0] == one


def test_a_washed_out_hole_is_not_evidence():
    e = WELLS[0].evidence
    washed = replace(e, log=replace(e.log, bad=np.ones(e.log.depth_m.size, bool)))
    a = assess(washed, 0.35)
    assert np.all(np.isnan(a.found["density log"].difference))
    assert "washed out" in " ".join(impact.missing_words(a, 0))


def curve(mnemonic: str, unit: str, values: list[float]) -> SimpleNamespace:
    array = np.array(values)
    return SimpleNamespace(mnemonic=mnemonic, unit=unit, depth_m=np.arange(array.size) * 0.5, values=array)


def test_the_density_log_is_found_among_the_curves_and_knows_where_the_hole_is_bad():
    gamma = curve("GR", "GAPI", [30.0, 40.0, 50.0, 40.0])
    density = curve("RHOB", "K/M3", [2200.0, 2250.0, np.nan, 2300.0])
    correction = curve("DRHO", "G/C3", [0.01, 0.15, 0.0, -0.02])
    caliper = curve("CALI", "IN", [8.5, 8.5, 8.6, 11.0])
    found = impact.density_of([gamma, correction, density, caliper], bit_mm=215.9)
    np.testing.assert_allclose(found.density_g_cm3, [2.2, 2.25, np.nan, 2.3])
    assert found.bad.tolist() == [False, True, False, True]
    assert impact.density_of([density, caliper]).bad.tolist() == [False, False, False, True]
    assert impact.density_of([density]).bad.tolist() == [False] * 4
    assert impact.density_of([gamma, correction, caliper]) is None


def test_fines_beyond_the_facies_speak_for_damage():
    e = WELLS[0].evidence
    rng = np.random.default_rng(2)
    fines = np.where(e.source == "core", 0.04 + rng.normal(0, 0.008, len(e)), np.nan)
    fines[0], fines[1] = 0.13, 0.04
    a = assess(replace(e, fines_frac=fines), 0.35)
    t = TERMS.index("fines")
    assert a.weighed.effect[0, t] > 0.5
    assert -0.8 < a.weighed.effect[1, t] < 0.0
    assert np.all(a.weighed.effect[2:, t] == 0.0)


def test_porosity_beyond_the_packing_speaks_for_loosening():
    e = WELLS[0].evidence
    soft = int(np.flatnonzero((e.source == "percussion sidewall") & (e.facies == "bar sand"))[0])
    phi = e.porosity_frac.copy()
    phi[soft] = 0.49
    a = assess(without(replace(e, porosity_frac=phi), "log"), 0.35)
    i = int(np.flatnonzero(a.place == soft)[0])
    row = next(row for row in impact.evidence_rows(a, i) if row["term"] == "packing")
    assert row["effect"] > 0.3 or a.weighed.effect[i].sum() > 2.0
    assert "looser than the loosest" in row["finding"]
    assert a.direction[i] == "loosened"


def test_the_direction_is_found():
    found, y = pooled()
    direction = np.concatenate([a.direction for a in found])
    likely = np.concatenate([a.verdict for a in found]) == "likely"
    truth = np.concatenate([w.kind for w in WELLS])
    assert np.mean(direction[likely & y] == truth[likely & y]) > 0.9
    assert set(direction[np.concatenate([a.verdict for a in found]) == "unlikely"]) == {"none"}


def test_recalibration_is_a_row_of_the_evidence():
    a = assess(WELLS[0].evidence, 0.35, recalibration=Recalibration(-0.4, 0.5))
    plain = assess(WELLS[0].evidence, 0.35)
    for i in range(3):
        rows = impact.evidence_rows(a, i)
        assert rows[-1]["term"] == "recalibration"
        total = sum(row["effect"] for row in rows)
        assert total == pytest.approx(-0.4 + 0.5 * plain.weighed.total[i])
        assert float(likelihood_frac(0.35, total)) == pytest.approx(a.likelihood_frac[i])


def test_five_hundred_plugs_take_less_than_half_a_second():
    well = simulate(1, Law(percussion=500, core=300))
    assess(well.evidence, 0.35)
    began = time.perf_counter()
    assess(well.evidence, 0.35)
    assert time.perf_counter() - began < 0.5


def test_a_well_without_percussion_plugs_has_nothing_to_judge():
    e = WELLS[0].evidence
    none = replace(e, source=np.where(e.source == "percussion sidewall", "rotary sidewall", e.source))
    a = assess(none, 0.35)
    assert a.place.size == 0 and a.likelihood_frac.size == 0
