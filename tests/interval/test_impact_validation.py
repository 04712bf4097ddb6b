"""How well crush likelihoods do, on wells held out from all else; the figures that `methods impact` prints.

Simulated wells follow the declared law of `damaged_wells` (seeds 1000 and up are used nowhere else). The core
of Norwegian well 7121/8-1 is real: contains data under the Norwegian licence for Open Government data (NLOD)
distributed by the Norwegian Offshore Directorate. Its plugs are sound, so that calling one likely is a false
alarm; and damaged by the declared law where the test says so.
"""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from damaged_wells import Law, simulate, without

from corelab.interval.impact import Evidence, assess
from corelab.science.catalogue import formulas
from corelab.science.impact import Skill, skill

HELD_OUT = range(1000, 1020)
PRIOR = 0.35
#: Harder than the declared law: more scatter, marks of any kind, worse words and depths, less core.
HARD = Law(
    within_beds=0.025,
    between_beds=0.02,
    scatter=(0.30, 0.35),
    log_noise_g_cm3=0.04,
    any_word=True,
    wrong_words=0.20,
    seen=0.6,
    core_depth_error_m=0.3,
    touched_frac=0.005,
    core=60,
    rotary=5,
)


def judged(law: Law | None = None, *less: str, prior: float = PRIOR) -> tuple[Skill, np.ndarray, np.ndarray]:
    p, y = [], []
    for seed in HELD_OUT:
        well = simulate(seed, law)
        p.append(assess(without(well.evidence, *less), prior).likelihood_frac)
        y.append(well.damaged)
    likelihood, damaged = np.concatenate(p), np.concatenate(y)
    return skill(likelihood, damaged), likelihood, damaged


def blind(law: Law | None = None) -> tuple[float, int]:
    verdicts = np.concatenate(
        [assess(simulate(seed, law).evidence, 0.3, blind=True).verdict for seed in HELD_OUT]
    )
    return float(np.mean(verdicts == "likely")), verdicts.size


def printed(pattern: str) -> list[float]:
    """Numbers of the methods text where it reads so."""
    found = re.search(pattern, formulas()["impact"].tested)
    assert found is not None, f"the methods text does not say: {pattern}"
    return [float(number) for number in found.groups()]


NUMBER = r"(\d+(?:\.\d+)?)"


def test_the_declared_law():
    found, p, y = judged()
    auc, brier_skill, low, high, mean, rate = printed(
        rf"area under the curve {NUMBER}, Brier skill {NUMBER} \(95 % interval {NUMBER} to {NUMBER}\), mean "
        rf"{NUMBER} where {NUMBER} were damaged"
    )
    assert [found.auc, found.skill, found.low, found.high, found.mean, found.rate] == pytest.approx(
        [auc, brier_skill, low, high, mean, rate], abs=0.0101
    )
    assert printed(rf"{NUMBER} plugs of {NUMBER} wells") == [p.size, len(HELD_OUT)]
    assert found.auc >= 0.93 and found.skill >= 0.5 and abs(found.mean - found.rate) <= 0.1
    assert np.mean(p[~y] >= 0.7) <= 0.05


def test_reliability():
    """Of plugs given so much, so many were damaged: within 0.15 wherever there are 30 or more."""
    _, p, y = judged()
    shown = []
    for low, high in ((0.0, 0.2), (0.2, 0.7), (0.7, 1.0001)):
        here = (p >= low) & (p < high)
        shown += [p[here].mean(), y[here].mean()]
    assert shown == pytest.approx(
        printed(
            rf"unlikely \(mean {NUMBER}\) {NUMBER} were damaged, of those possible \({NUMBER}\) {NUMBER}, of "
            rf"those likely \({NUMBER}\) {NUMBER}"
        ),
        abs=0.0101,
    )
    for low in np.arange(0.0, 1.0, 0.2):
        here = (p >= low) & (p < low + 0.2)
        if here.sum() >= 30:
            assert abs(p[here].mean() - y[here].mean()) < 0.2


def test_blind_on_core_and_rotary_plugs():
    share, count = blind()
    assert share <= 0.05
    stated, of = printed(rf"blind, {NUMBER} % of {NUMBER} core and rotary plugs")
    assert 100 * share == pytest.approx(stated, abs=0.0501)
    assert count == of


def test_harder_wells():
    found, p, y = judged(HARD)
    auc, brier_skill = printed(rf"harder wells .*?: {NUMBER} and {NUMBER}")
    assert [found.auc, found.skill] == pytest.approx([auc, brier_skill], abs=0.0101)
    assert found.auc >= 0.85 and found.skill >= 0.25 and abs(found.mean - found.rate) <= 0.1
    assert np.mean(p[~y] >= 0.7) <= 0.05
    assert blind(HARD)[0] <= 0.05


def test_wells_whose_facies_have_no_names():
    """Rock class then rests on log, neighbours and firmness; without these no false certainty comes."""
    unnamed = Law(named=False)
    found, p, y = judged(unnamed)
    assert [found.auc, found.skill] == pytest.approx(
        printed(rf"without names {NUMBER} and {NUMBER}"), abs=0.0101
    )
    for what in ((), ("log",), ("descriptions",), ("log", "descriptions")):
        found, p, y = judged(unnamed, *what)
        assert found.skill > 0.0 and abs(found.mean - found.rate) <= 0.1
        assert np.mean(p[~y] >= 0.7) <= 0.05


def test_without_one_kind_of_evidence_after_another():
    stated = printed(
        rf"Skill without the log {NUMBER}, without descriptions {NUMBER}, without core and rotary {NUMBER}, "
        rf"with descriptions alone {NUMBER}"
    )
    less = (("log",), ("descriptions",), ("core",), ("log", "core"))
    found = [judged(None, *what)[0] for what in less]
    assert [s.skill for s in found] == pytest.approx(stated, abs=0.0101)
    for s in found:
        assert abs(s.mean - s.rate) <= 0.1
    nothing = judged(None, "log", "descriptions", "core")[1]
    np.testing.assert_allclose(nothing, PRIOR)


def test_a_wrong_prior_moves_the_mean_and_not_the_order():
    right, low = judged()[0], judged(prior=0.1)[0]
    assert low.auc == pytest.approx(right.auc, abs=0.005)
    assert low.mean < right.mean
    assert low.skill > 0.5


def test_twins():
    """A twin's porosity and permeability label the plug, with noise: they agree with the likelihood."""
    p, y = [], []
    law = Law(twins=True, rotary=30)
    for seed in HELD_OUT:
        well = simulate(seed, law)
        e = well.evidence
        n = law.rotary
        twin = slice(law.percussion + law.core, None)
        same = e.facies[:n] == e.facies[twin]
        gap = np.abs(e.porosity_frac[:n] - e.porosity_frac[twin]) > 0.02
        ratio = np.abs(e.log_permeability[:n] - e.log_permeability[twin]) > np.log10(2.0)
        clear = same & (gap == ratio)  # where both agree on the event
        # the twins themselves stay out of the evidence
        alone = without(e, "rotary")
        p.append(assess(alone, PRIOR).likelihood_frac[:n][clear])
        y.append(gap[clear])
    found = skill(np.concatenate(p), np.concatenate(y))
    assert found.auc == pytest.approx(printed(rf"twins .*? area {NUMBER}")[0], abs=0.0101)
    assert found.auc > 0.7


# ---- a real core


@pytest.fixture(scope="module")
def norwegian_core(open_data: Path) -> pd.DataFrame:
    frame = pd.read_csv(open_data / "norway_7121_8-1" / "nod_7121_8-1_core_plugs.csv")
    return frame[(frame["kKl_h"] > 0) & frame["por_h"].notna()].reset_index(drop=True)


def as_evidence(frame: pd.DataFrame, source: np.ndarray, phi: np.ndarray, log_k: np.ndarray) -> Evidence:
    n = len(frame)
    empty = np.full(n, "", object)
    sizes = frame["desc"].str.extract(r"\.((?:V?[FMC])(?:/V?[FMC])?)-gr")[0].fillna("").to_numpy(object)
    return Evidence(
        source=source,
        depth_m=frame["depth_m"].to_numpy(float),
        facies=sizes,
        horizontal=np.ones(n, bool),
        duplicate=np.zeros(n, bool),
        porosity_frac=phi,
        grain_density_g_cm3=frame["gd"].to_numpy(float),
        log_permeability=log_k,
        reason_permeability=empty,
        firmness=empty,
        condition=empty,
        sorting_phi=np.full(n, np.nan),
        fines_frac=np.full(n, np.nan),
    )


def test_false_alarms_on_a_real_core(norwegian_core):
    phi, log_k = norwegian_core["por_h"].to_numpy() / 100, np.log10(norwegian_core["kKl_h"].to_numpy())
    core = np.full(len(phi), "core", object)
    found = assess(as_evidence(norwegian_core, core, phi, log_k), 0.3, blind=True)
    share = float(np.mean(found.verdict == "likely"))
    stated, count = printed(rf"real core .*? blind, {NUMBER} % of {NUMBER} plugs")
    assert len(found.place) == count
    assert 100 * share == pytest.approx(stated, abs=0.0501)
    assert share <= 0.05


def test_real_plugs_damaged_by_the_declared_law(norwegian_core):
    """A failure case: with neither log nor descriptions, a trend that scatters over decades tells little."""
    scores = []
    for seed in range(10):
        rng = np.random.default_rng(seed)
        phi = norwegian_core["por_h"].to_numpy() / 100
        log_k = np.log10(norwegian_core["kKl_h"].to_numpy())
        n = phi.size
        shot = rng.random(n) < 0.4
        hit = shot & (rng.random(n) < PRIOR)
        phi[hit] += rng.uniform(0.021, 0.05, n)[hit]
        log_k[hit] += rng.uniform(np.log10(3.0), np.log10(30.0), n)[hit]
        source = np.where(shot, "percussion sidewall", "core").astype(object)
        p = assess(as_evidence(norwegian_core, source, phi, log_k), PRIOR).likelihood_frac
        scores.append((p, hit[shot]))
    found = skill(*map(np.concatenate, zip(*scores, strict=True)))
    auc, brier_skill = printed(rf"shattered by the same law, .*? only {NUMBER} and {NUMBER}")
    assert [found.auc, found.skill] == pytest.approx([auc, brier_skill], abs=0.0101)
    assert abs(found.mean - found.rate) <= 0.1
