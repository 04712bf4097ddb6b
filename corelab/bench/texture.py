"""Texture by sieving, and the permeability that it lets one expect: an estimate, never a measurement."""

from __future__ import annotations

import numpy as np

from corelab.bench.gather import Texts, Whole
from corelab.bench.outcome import Array, Bench, Outcome, blank_texts
from corelab.science import texture

#: Permeability from texture scatters by about this many units of ln k about the best texture models
#: (a factor of 3.5; from memory, Garn sandstone, 215 samples).
SCATTER_LN_K = 1.26
TEXTURE = "texture"


def sieved(bench: Bench, porosity: Array) -> list[Outcome]:
    """Graphic statistics of each sieve curve, and the permeability it lets one expect."""
    readings = bench.kind("sieve")
    if not len(readings):
        return []
    places, group = np.unique(readings.at, return_inverse=True)
    curves = texture.sieve_statistics(
        readings.numbers["aperture_mm"].real, readings.number("mass_retained_g"), group
    )
    at = places.astype(np.intp)
    median = 2.0**-curves.median_phi
    made = [
        _outcome(at, "median grain size", median, curves),
        _outcome(at, "mean grain size", curves.mean_phi, curves),
        _outcome(at, "sorting", curves.sorting_phi, curves),
        _outcome(at, "skewness", curves.skewness, curves),
        _outcome(at, "kurtosis", curves.kurtosis, curves),
        _outcome(at, "trask sorting", curves.trask_sorting, curves),
    ]
    size, phi = 2.0**-curves.mean_phi, porosity.real[at]
    known = np.isfinite(size) & np.isfinite(curves.sorting_phi)
    packed = texture.permeability_krumbein_monk_md(
        np.where(known, size, np.nan), np.where(known, curves.sorting_phi, np.nan)
    )
    by_porosity = texture.permeability_kozeny_carman_md(
        np.where(known, size, np.nan), np.where((phi > 0) & (phi < 1), phi, np.nan)
    )
    with_porosity = np.isfinite(by_porosity)
    k = np.where(with_porosity, by_porosity, packed)
    estimate = Outcome(
        "klinkenberg permeability",
        at,
        k,
        np.where(np.isnan(k), "the sieve curve is open: its percentiles are not known", "").astype(object),
        blank_texts(len(at), TEXTURE),
        direction=blank_texts(len(at)),
        stress_mpa=np.zeros(len(at)),
        step=blank_texts(len(at), TEXTURE),
        scatter=SCATTER_LN_K * k,
        methods=np.where(with_porosity, "permeability-kozeny-carman", "permeability-krumbein-monk").astype(
            object
        ),
    )
    estimate.flag("permeability estimated from texture", np.ones(len(at), dtype=np.bool_))
    return [*made, estimate]


def _outcome(at: Whole, quantity: str, value: Array, curves: texture.SieveCurves) -> Outcome:
    open_class: Texts = np.where(
        curves.open_coarse,
        "grains coarser than the coarsest sieve: the curve is open",
        np.where(
            curves.open_fine, "too much in the pan: the curve is open", "the curve has no such percentile"
        ),
    ).astype(object)
    reason = np.where(np.isnan(value), open_class, "").astype(object)
    outcome = Outcome(quantity, at, value, reason, blank_texts(len(at), "sieve"))
    outcome.flag("more than 95 % on one sieve", curves.one_sieve)
    return outcome
