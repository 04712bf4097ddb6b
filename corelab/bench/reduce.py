"""From readings in force to results: whole trays at once, every missing value with its reason.

Nothing here knows a database.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import numpy as np

from corelab.bench.expansion import calibrated
from corelab.bench.flow import gas_permeability, liquid_permeability
from corelab.bench.gather import Tray
from corelab.bench.outcome import Array, Bench, Call, Outcome, blank_texts, noting_calls
from corelab.bench.saturations import saturations_of
from corelab.bench.stressed import stress_laws
from corelab.bench.texture import sieved
from corelab.bench.volumes import masses_of, salt_of, shape_of, stressed, volumes_of
from corelab.quantities import RESULTS

__all__ = ["Call", "Outcome", "calibrated", "noting_calls", "reduce", "rows"]


@np.errstate(invalid="ignore", divide="ignore", over="ignore")  # what is missing is NaN and flows through
def reduce(tray_: Tray) -> list[Outcome]:
    """All results of a tray of plugs."""
    bench = Bench.of(tray_)
    if not bench.n:
        return []
    shape = shape_of(bench)
    masses = masses_of(bench)
    salt = salt_of(bench, masses)
    volume = volumes_of(bench, shape, masses, salt)
    flow = gas_permeability(bench, shape)
    fluid = saturations_of(bench, masses, volume)
    outcomes = [
        *volume.outcomes,
        *stressed(bench, volume),
        *flow,
        *liquid_permeability(bench, shape),
        *fluid,
        *sieved(bench, volume.porosity.value),
    ]
    for outcome in outcomes:
        endless = np.isinf(outcome.value)
        outcome.value = np.where(endless, np.nan, outcome.value)
        outcome.reason[endless] = "the readings are too far apart to give a number"
        outcome.flags = {text: mask & ~endless for text, mask in outcome.flags.items()}
    outcomes += stress_laws(outcomes)
    _mark_not_measured(bench, outcomes)
    _mark_implausible(outcomes)
    return outcomes


_TESTS = {
    "permeability": ("gas permeability", "klinkenberg permeability", "slip factor", "liquid permeability"),
    "gas permeability": ("gas permeability", "klinkenberg permeability", "slip factor"),
    "klinkenberg permeability": ("klinkenberg permeability", "slip factor"),
    "saturations": ("oil saturation", "water saturation", "gas saturation"),
    "distillation": ("oil saturation", "water saturation", "gas saturation"),
    "retort": ("oil saturation", "water saturation", "gas saturation"),
    "dimensions": ("bulk volume",),
    "immersion": ("bulk volume",),
    "masses": ("dry mass",),
}


def _mark_not_measured(bench: Bench, outcomes: list[Outcome]) -> None:
    """Put the stated reason where a test was not made; a plug without any line of a test gets a row."""
    readings = bench.kind("not measured")
    stated: dict[tuple[int, str], str] = {}
    for place, test, reason in zip(readings.at, readings.text("test"), readings.text("reason"), strict=True):
        for quantity in _TESTS.get(test, (test,)):
            stated[int(place), quantity] = f"not measured: {reason}"
    have: dict[str, set[int]] = {}
    for outcome in outcomes:
        have.setdefault(outcome.quantity, set()).update(outcome.at.tolist())
        for i in np.flatnonzero(np.isnan(outcome.value.real)):
            reason = stated.get((int(outcome.at[i]), outcome.quantity))
            if reason and outcome.reason[i] in {"", "no readings"}:
                outcome.reason[i] = reason
    for quantity in ("klinkenberg permeability",):
        absent = [p for p in range(bench.n) if p not in have.get(quantity, set())]
        if absent:
            outcomes.append(
                Outcome(
                    quantity,
                    np.array(absent, dtype=np.intp),
                    np.full(len(absent), np.nan),
                    np.array([stated.get((p, quantity), "no readings") for p in absent], dtype=object),
                    blank_texts(len(absent)),
                )
            )


def _mark_implausible(outcomes: list[Outcome]) -> None:
    for outcome in outcomes:
        if outcome.quantity not in RESULTS:
            continue
        low, high = RESULTS[outcome.quantity].plausible
        odd = (outcome.value.real < low) | (outcome.value.real > high)
        outcome.flag(f"{outcome.quantity} outside the usual range", odd)


#: What an instrument gives as a result of its own has no formula here.
REPORTED = "reported"
_METHODS: dict[tuple[str, str], str] = {
    ("bulk volume", "caliper"): "bulk-volume-caliper",
    ("bulk volume", "displacement"): "bulk-volume-displacement",
    ("bulk volume", "buoyancy"): "bulk-volume-buoyancy",
    ("bulk volume", "pore and grain"): "porosity-pore-grain",
    ("grain volume", "gas expansion"): "grain-volume-gas-expansion",
    ("grain volume", "bulk less pore"): "porosity-bulk-pore",
    ("pore volume", "bulk less grain"): "porosity-bulk-grain",
    ("pore volume", "saturation"): "pore-volume-saturation",
    ("pore volume", "gas expansion"): "pore-volume-gas-expansion",
    ("pore volume", "summation of fluids"): "summation-of-fluids",
    ("porosity", "bulk-grain"): "porosity-bulk-grain",
    ("porosity", "bulk-pore"): "porosity-bulk-pore",
    ("porosity", "pore-grain"): "porosity-pore-grain",
    ("porosity", "summation of fluids"): "summation-of-fluids",
    ("klinkenberg permeability", "measured"): "klinkenberg-regression",
    ("klinkenberg permeability", "estimated"): "slip-corrected",
    ("slip factor", "measured"): "klinkenberg-regression",
    ("slip factor", "estimated"): "slip-corrected",
}
_METHOD_OF = {
    "median grain size": "sieve-statistics",
    "mean grain size": "sieve-statistics",
    "sorting": "sieve-statistics",
    "skewness": "sieve-statistics",
    "kurtosis": "sieve-statistics",
    "trask sorting": "sieve-statistics",
    "pore volume compressibility": "pore-compressibility",
    "permeability stress exponent": "permeability-stress-regression",
    "pore volume stress exponent": "pore-volume-stress-regression",
    "dry mass": "grain-mass",
    "grain density": "grain-density",
    "bulk density": "bulk-density",
    "gas permeability": "gas-permeability",
    "mean pressure": "mean-pressure",
    "liquid permeability": "liquid-permeability",
}
_SATURATION_METHODS = {"distillation": "saturations", "retort": "summation-of-fluids"}


def _method(outcome: Outcome, i: int, basis: str, step: str) -> str:
    """The key of the calculation that gave a value."""
    quantity = outcome.quantity
    if outcome.methods is not None:
        return str(outcome.methods[i])
    if REPORTED in (basis, step) and basis != "estimated":
        return REPORTED
    if quantity.endswith("saturation"):
        return _SATURATION_METHODS[basis]
    return _METHODS.get((quantity, basis)) or _METHOD_OF[quantity]


def _number(values: Array | None, i: int) -> float | None:
    if values is None or np.isnan(values[i].real):
        return None
    return float(values[i].real)


def rows(tray_: Tray, outcomes: Iterable[Outcome], versions: dict[str, int]) -> list[dict[str, Any]]:
    """The outcomes as rows of the table of results, in a fixed order."""
    made: list[dict[str, Any]] = []
    for o in (o for o in outcomes if o.quantity in RESULTS):
        size = len(o.at)
        stress = np.zeros(size) if o.stress_mpa is None else o.stress_mpa
        flags: list[list[str]] = [[] for _ in range(size)]
        for text, mask in o.flags.items():
            for flagged in np.flatnonzero(mask):
                flags[flagged].append(text)
        values = o.value.real
        for i in range(size):
            missing = bool(np.isnan(values[i]))
            place = int(o.at[i])
            step = "" if o.step is None else str(o.step[i])
            basis = "" if missing else str(o.basis[i])
            method = "" if missing else _method(o, i, basis, step)
            made.append(
                {
                    "plug_id": int(tray_.plug_ids[place]),
                    "quantity": o.quantity,
                    "direction": "" if o.direction is None else str(o.direction[i]),
                    "stress_mpa": float(stress[i]) + 0.0,
                    "step": step,
                    "value": None if missing else float(values[i]),
                    "uncertainty": _number(o.uncertainty, i),
                    "value_limit": None if o.limit is None or missing else (o.limit[i] or None),
                    "basis": basis,
                    "method": method,
                    "version": max((versions.get(part, 1) for part in method.split(" + ")), default=1),
                    "flags": "; ".join(flags[i]),
                    "reason": str(o.reason[i]) if missing else "",
                    "fingerprint": tray_.fingerprints[place],
                }
            )
    made.sort(key=lambda r: (r["plug_id"], r["quantity"], r["direction"], r["stress_mpa"], r["step"]))
    return made
