"""How pore volume and permeability change with stress, where they were measured at several."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from corelab.bench.outcome import STRESS_NOT_STATED, Array, Outcome, blank_texts, groups_of, noted
from corelab.science import stress as laws


def stress_laws(outcomes: Sequence[Outcome]) -> list[Outcome]:
    """Pore-volume compressibility between neighbouring stresses; Jones's law from three stresses on."""
    made: list[Outcome] = []
    for outcome in outcomes:
        if outcome.quantity == "pore volume" and outcome.stress_mpa is not None:
            made += _compressibility(outcome)
            made += _law(outcome, "pore volume stress exponent")
        elif outcome.quantity == "klinkenberg permeability" and outcome.stress_mpa is not None:
            made += _law(outcome, "permeability stress exponent")
    return made


def _compressibility(outcome: Outcome) -> list[Outcome]:
    assert outcome.stress_mpa is not None
    stress = outcome.stress_mpa.real
    there = ~np.isnan(outcome.value.real) & (outcome.value.real > 0.0)
    order = np.lexsort((stress, outcome.at))
    order = order[there[order]]
    first, second = order[:-1], order[1:]
    pair = (outcome.at[first] == outcome.at[second]) & (stress[second] > stress[first])
    first, second = first[pair], second[pair]
    if not len(first):
        return []
    columns = {
        "pore_volume_cm3": outcome.value[first],
        "net_stress_mpa": stress[first],
        "other_pore_volume_cm3": outcome.value[second],
        "other_net_stress_mpa": stress[second],
    }
    value = noted(laws.pore_compressibility_1_mpa, columns, laws.pore_compressibility_1_mpa(**columns))
    made = Outcome(
        "pore volume compressibility",
        outcome.at[first],
        value,
        blank_texts(len(first)),
        blank_texts(len(first), "between two stresses"),
        stress_mpa=(stress[first] + stress[second]) / 2.0,
    )
    made.flag("pore volume grows with stress", value.real <= 0.0)
    return [made]


def _law(outcome: Outcome, quantity: str) -> list[Outcome]:
    """The exponent of Jones's law of each plug, direction and gas with three stresses or more."""
    assert outcome.stress_mpa is not None
    stress = outcome.stress_mpa.real
    n = len(outcome.at)
    direction = blank_texts(n) if outcome.direction is None else outcome.direction
    step = blank_texts(n) if outcome.step is None else outcome.step
    unstated = outcome.flags.get(STRESS_NOT_STATED, np.zeros(n, dtype=np.bool_))
    limited = np.zeros(n, dtype=np.bool_) if outcome.limit is None else outcome.limit != ""
    there = ~np.isnan(outcome.value.real) & (outcome.value.real > 0.0) & ~unstated & ~limited
    if there.sum() < 3:
        return []
    places, group = groups_of(outcome.at[there], direction[there], step[there])
    count = np.bincount(group)
    enough = count >= 3
    if not enough.any():
        return []
    rows = np.flatnonzero(there)[enough[group]]
    number = (np.cumsum(enough) - 1)[group[enough[group]]]
    regression = (
        laws.pore_volume_stress_regression
        if outcome.quantity == "pore volume"
        else laws.permeability_stress_regression
    )
    value: Array = regression(outcome.value[rows], stress[rows], number).stress_exponent
    reason = np.where(np.isnan(value.real), "the stresses do not differ enough", "").astype(object)
    return [
        Outcome(
            quantity,
            places[0][enough].astype(np.intp),
            value,
            reason,
            blank_texts(int(enough.sum()), "Jones 1988"),
            direction=places[1][enough].astype(object),
            step=places[2][enough].astype(object),
        )
    ]
