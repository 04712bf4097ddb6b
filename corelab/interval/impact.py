"""Percussion plugs of a well: the evidence for and against damage by the bullet, and the likelihood of it.

`Evidence` is what the record holds of a well, as arrays; `assess` weighs it. Rotary and core plugs are the
references: what they say of a plug never rests on the plug itself.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import asdict, dataclass, field
from typing import Any, Protocol

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray
from scipy import special

from corelab import units
from corelab.bench import settings as lab_settings
from corelab.errors import Problem, Refused
from corelab.records import logs, store
from corelab.science import impact as science
from corelab.science import texture

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
Texts = NDArray[Any]

PERCUSSION = "percussion sidewall"
REFERENCES = ("core", "rotary sidewall")
#: Marks that keep a core or rotary plug from serving as a reference.
_DAMAGED = frozenset({"powdered", "cracked", "crumbled", "disked"})
TERMS = ("permeability", "density log", "neighbours", "packing", "fines", "condition")

#: Fewest undamaged plugs for a trend of permeability (common practice).
FEWEST = 8
#: A plug that its density contradicts counts half: mud or poor cleaning moves porosity too (assumed).
DOUBTED = 0.5
#: Porosity of the whole facies, far from the plug, counts half: beds differ (assumed).
FAR = 0.5
#: How far neighbours of a bed are asked, and how their weight falls (assumed; beds are metres thick).
NEIGHBOURS_M, FALL_M = 3.0, 1.0
#: Half the height over which the log is averaged: core is compared with logs at 0.3 to 0.6 m.
HALF_HEIGHT_M = 0.3
#: Scatter of plug porosity about the log before any plug is compared: 2 porosity units (judgement in the
#: trade: 2 to 3), worth four degrees of freedom (assumed).
LOG_SCATTER_FRAC, LEVEL_FREEDOM, LEVEL_PLUGS = 0.02, 4.0, 0.25
#: Ambient over in-situ porosity, before any plug is compared: 1 to 3 units in soft sand, less in hard.
AMBIENT_FRAC = (0.005, 0.020)
#: Scatter of porosity and of the share of fines in a facies, before any plug is compared (assumed).
FACIES_SCATTER_FRAC, FINES_SCATTER_FRAC = 0.02, 0.03
#: Share of damage that rearranges grains and adds no fines (assumed; bands of grain flow hardly have any).
NO_FINES_SHARE = 0.5
#: Share of the difference from the log that neighbours repeat, with too few plugs to tell (assumed).
SHARED = 0.5
#: Log-odds of soft rock by firmness; by porosity, its middle and its step (assumed).
SOFT_BY_FIRMNESS: Mapping[str, float] = {"loose": 3.0, "friable": 2.0, "firm": -0.5, "hard": -3.0}
SOFT_MIDDLE_FRAC, SOFT_STEP_FRAC, SOFT_MOST = 0.22, 0.03, 2.0
SOFT_LIMIT = 3.0
#: Rock is surely soft or hard from odds of 4 to 1 (assumed).
SURE = float(np.log(4.0))
MATRIX_G_CM3, FLUID_G_CM3 = 2.65, 1.0
#: Washed out beyond the bit by so much, or corrected by more: the pad has lost the wall (common practice).
WASHOUT_MM, CORRECTION_G_CM3 = 38.0, 0.10
#: Scatter of grain density in a facies, before any plug is compared; off by more than so much, and by so many
#: times its scatter, it is strange (assumed).
GRAIN_SCATTER_G_CM3, OFF_DENSITY_G_CM3, OFF_DENSITY_T = 0.01, 0.03, 3.0
#: The sand limit, and the sieves that come near it (mm).
FINES_MM, FINES_WITHIN_MM = 0.0625, (0.053, 0.080)


@dataclass(frozen=True, slots=True)
class DensityLog:
    """The bulk density log of a well on log depth; `bad` where the hole does not let the pad touch rock."""

    depth_m: Array
    density_g_cm3: Array
    bad: Mask


class Curve(Protocol):
    """A logged curve on log depth."""

    @property
    def mnemonic(self) -> str: ...
    @property
    def unit(self) -> str: ...
    @property
    def depth_m(self) -> Array: ...
    @property
    def values(self) -> Array: ...


#: Units of density and of a caliper as logs have them, and what they are worth in g/cm3 and mm.
_DENSITY_UNITS = {"g/cm3": 1.0, "g/c3": 1.0, "g/cc": 1.0, "gm/cc": 1.0, "k/m3": 1e-3, "kg/m3": 1e-3}
_LENGTH_UNITS = {"in": 25.4, "inch": 25.4, "inches": 25.4, "mm": 1.0, "cm": 10.0, "m": 1000.0}
#: A bulk density lies within; what lies about zero in the same unit is its correction.
_BULK_G_CM3 = (1.2, 3.2)


def density_of(curves: Sequence[Curve], bit_mm: float = np.nan) -> DensityLog | None:
    """The density log among the curves of a well: the last one loaded, with what tells of the hole.

    It is bad where the correction curve, or the caliper over the bit, says that the pad had no touch. A bit
    not known is taken from the smallest tenth of the caliper's readings.
    """
    density: Curve | None = None
    correction: Curve | None = None
    caliper: Curve | None = None
    for curve in curves:
        unit = curve.unit.strip().casefold()
        if unit in _DENSITY_UNITS and np.isfinite(curve.values).any():
            middle = np.nanmedian(curve.values) * _DENSITY_UNITS[unit]
            if _BULK_G_CM3[0] <= middle <= _BULK_G_CM3[1]:
                density = curve
            elif abs(middle) < _BULK_G_CM3[0] / 2.0:
                correction = curve
        elif unit in _LENGTH_UNITS and curve.mnemonic.upper().startswith(("CAL", "HCAL", "C1", "LCAL")):
            caliper = curve
    if density is None:
        return None
    depth = np.asarray(density.depth_m, dtype=np.float64)
    bad = np.zeros(depth.shape, dtype=np.bool_)
    if correction is not None:
        factor = _DENSITY_UNITS[correction.unit.strip().casefold()]
        bad |= np.abs(_at(correction, depth)) * factor > CORRECTION_G_CM3
    if caliper is not None:
        hole_mm = _at(caliper, depth) * _LENGTH_UNITS[caliper.unit.strip().casefold()]
        if np.isnan(bit_mm) and np.isfinite(hole_mm).any():
            bit_mm = float(np.nanquantile(hole_mm, 0.1))
        bad |= hole_mm - bit_mm > WASHOUT_MM
    g_cm3 = np.asarray(density.values, dtype=np.float64) * _DENSITY_UNITS[density.unit.strip().casefold()]
    return DensityLog(depth, g_cm3, bad)


def _at(curve: Curve, depth_m: Array) -> Array:
    """A curve at other depths; NaN where it has nothing."""
    there = np.isfinite(curve.values) & np.isfinite(curve.depth_m)
    if not there.any():
        return np.full(depth_m.shape, np.nan)
    at, values = np.asarray(curve.depth_m)[there], np.asarray(curve.values)[there]
    order = np.argsort(at, kind="stable")
    return np.interp(depth_m, at[order], values[order], left=np.nan, right=np.nan)


@dataclass(frozen=True, slots=True)
class Evidence:
    """What the record holds of the plugs of a well: one element a plug, NaN or empty where not known.

    `log_permeability` is log10 of *measured* Klinkenberg permeability [mD]; `reason_permeability` says why it
    is not there.
    """

    source: Texts
    depth_m: Array
    facies: Texts
    horizontal: Mask
    duplicate: Mask
    porosity_frac: Array
    grain_density_g_cm3: Array
    log_permeability: Array
    reason_permeability: Texts
    firmness: Texts
    condition: Texts
    sorting_phi: Array
    fines_frac: Array
    log: DensityLog | None = None

    def __len__(self) -> int:
        return len(self.source)


@dataclass(slots=True)
class Found:
    """One kind of evidence for the judged plugs: a difference from the references, and its scale."""

    difference: Array
    scale: Array
    freedom: Array
    count: NDArray[np.intp]
    label: Texts
    weight: Array
    reason: Texts
    more: dict[str, Array] = field(default_factory=dict)

    @classmethod
    def none(cls, n: int) -> Found:
        return cls(
            np.full(n, np.nan),
            np.ones(n),
            np.full(n, science.MOST_FREEDOM),
            np.zeros(n, dtype=np.intp),
            np.full(n, "", dtype=object),
            np.ones(n),
            np.full(n, "", dtype=object),
        )


@dataclass(frozen=True, slots=True)
class Assessment:
    """The likelihood for each judged plug (places in the evidence), and what it rests on."""

    place: NDArray[np.intp]
    likelihood_frac: Array
    verdict: Texts
    direction: Texts
    soft_share: Array
    assessed: Mask
    coverage: Array
    weighed: science.Weighed
    adjustment: Array
    found: Mapping[str, Found]
    prior_frac: float
    evidence: Evidence


def assess(
    evidence: Evidence,
    prior_frac: float,
    *,
    blind: bool = False,
    recalibration: science.Recalibration | None = None,
) -> Assessment:
    """Weigh the evidence for percussion plugs; `blind`: for core and rotary plugs instead, as if shot.

    A core or rotary plug judged blind is compared with the others, never with itself.
    """
    judged = np.flatnonzero(
        np.isin(evidence.source, REFERENCES) & ~evidence.duplicate & evidence.horizontal
        if blind
        else evidence.source == PERCUSSION
    )
    rock = _Rock(evidence, judged)
    n = judged.size
    porosity = evidence.porosity_frac[judged]
    permeability = rock.permeability()
    log, difference = rock.density_log()
    found = {
        "permeability": permeability,
        "density log": log,
        "neighbours": rock.neighbours(log.difference, difference),
        "packing": rock.packing(),
        "fines": rock.fines(),
        "condition": rock.condition(),
    }
    grains = rock.grain_density()
    off = (np.abs(grains.difference) > OFF_DENSITY_G_CM3) & (
        np.abs(grains.difference) > OFF_DENSITY_T * grains.scale
    )
    for name in ("permeability", "density log", "neighbours", "packing"):
        found[name].weight = np.where(off, DOUBTED * found[name].weight, found[name].weight)
    found["grain density"] = grains
    grains.more["off"] = off.astype(np.float64)
    slope = permeability.more["slope"]
    changes = science.damage(np.where(np.isnan(porosity), SOFT_MIDDLE_FRAC, porosity), slope, rock.soft_share)
    weighed = science.weigh(_terms(found, porosity, changes), changes)
    assessed = np.isfinite(np.stack([found[t].difference for t in TERMS], axis=1))
    adjust = np.zeros(n)
    if recalibration is not None:
        adjust = recalibration.intercept + (recalibration.slope - 1.0) * weighed.total
        adjust = np.where(assessed.any(axis=1), adjust, 0.0)
    likelihood = science.likelihood_frac(prior_frac, weighed.total + adjust)
    verdict = science.verdicts(likelihood, assessed.any(axis=1))
    kinds = np.array(science.KINDS, dtype=object)[np.argmax(weighed.kinds, axis=1)] if n else np.zeros(0)
    direction = np.where((verdict == "unlikely") | (verdict == "not assessed"), "none", kinds)
    return Assessment(
        judged,
        np.asarray(likelihood),
        verdict,
        direction,
        rock.soft_share,
        np.asarray(assessed.any(axis=1)),
        assessed.mean(axis=1),
        weighed,
        adjust,
        found,
        prior_frac,
        evidence,
    )


def _terms(found: Mapping[str, Found], porosity: Array, changes: science.Damage) -> list[science.Term]:
    """The fit of each kind of evidence to no damage and to each change."""
    dphi, decades = changes.porosity_change_frac, changes.permeability_change_decades
    terms = []

    def wide(values: Array) -> Array:
        return values[:, np.newaxis]

    def add(name: str, sound: Array, damaged: Array) -> None:
        terms.append(science.Term(name, sound, damaged, found[name].weight))

    k = found["permeability"]
    slope = np.nan_to_num(k.more["slope"])
    sound_slide = np.hypot(science.SOUND_DECADES, slope * science.SOUND_FRAC)
    zero = np.zeros(1)
    add(
        "permeability",
        science.permeability_fit(k.difference, np.hypot(k.scale, sound_slide), k.freedom, slope, zero, zero),
        science.permeability_fit(
            wide(k.difference),
            np.hypot(wide(k.scale), changes.width_decades),
            wide(k.freedom),
            wide(slope),
            dphi,
            decades,
        ),
    )
    d = found["density log"]
    add(
        "density log",
        science.density_fit(d.difference, np.hypot(d.scale, science.SOUND_FRAC), d.freedom, zero),
        science.density_fit(wide(d.difference), wide(d.scale), wide(d.freedom), dphi),
    )
    e = found["neighbours"]
    shared = e.more["shared"]
    add(
        "neighbours",
        science.neighbours_fit(
            e.difference, np.hypot(e.scale, (1.0 - shared) * science.SOUND_FRAC), e.freedom, shared, zero
        ),
        science.neighbours_fit(wide(e.difference), wide(e.scale), wide(e.freedom), wide(shared), dphi),
    )
    limit = found["packing"].more["limit"]
    add(
        "packing",
        science.packing_fit(porosity, limit, zero),
        science.packing_fit(wide(porosity), wide(limit), dphi),
    )
    f = found["fines"]
    most = np.array([science.FINES_ADDED_FRAC[kind] for kind in science.KINDS])[changes.kind]
    reach = np.array([science.MOST_CHANGE_FRAC[kind] for kind in science.KINDS])[changes.kind]
    added = most * np.abs(dphi) / reach
    no_fines = science.fines_fit(f.difference, f.scale, f.freedom, zero)
    add(
        "fines",
        no_fines,
        special.logsumexp(
            [
                np.log(NO_FINES_SHARE) + np.broadcast_to(wide(no_fines), dphi.shape),
                np.log1p(-NO_FINES_SHARE)
                + science.fines_fit(wide(f.difference), wide(f.scale), wide(f.freedom), added),
            ],
            axis=0,
        ),
    )
    mark = found["condition"].label.astype(np.str_)
    by_kind = np.stack([science.condition_fit(mark, kind) for kind in science.KINDS], axis=1)
    add("condition", science.condition_fit(mark, "sound"), by_kind[:, changes.kind])
    return terms


class _Rock:
    """The judged plugs among their references."""

    def __init__(self, evidence: Evidence, judged: NDArray[np.intp]) -> None:
        e = self.evidence = evidence
        self.judged, self.n = judged, judged.size
        marks = np.array([bool(_DAMAGED & _words(text)) for text in e.condition], dtype=np.bool_)
        self.reference = np.isin(e.source, REFERENCES) & ~e.duplicate & e.horizontal & ~marks
        self.log_frac, self.log_roughness = _log_porosity(e.log, e.depth_m, MATRIX_G_CM3)
        self.own_soft = _by_firmness(e.firmness), _by_porosity(e.porosity_frac)
        self.soft_log_odds = self._soft()
        self.soft_share = 1.0 / (1.0 + np.exp(-self.soft_log_odds[judged]))
        self.rock_class = self.soft_log_odds > 0.0

    def _soft(self) -> Array:
        """Log-odds that the rock of each plug is soft, from others of its facies and bed where possible."""
        e, (firmness, porosity) = self.evidence, self.own_soft
        by_log = np.nan_to_num(_by_porosity(self.log_frac))
        own = np.nan_to_num(firmness) + np.nan_to_num(porosity)
        soft = np.where(self.reference, own, np.nan_to_num(firmness) / 2.0 + by_log)
        known = self.reference & (np.isfinite(firmness) | np.isfinite(porosity))
        others = np.flatnonzero(~self.reference)
        if others.size and known.any():
            near = np.abs(e.depth_m[others, np.newaxis] - e.depth_m[known])
            same = (e.facies[others, np.newaxis] == e.facies[known]) & (e.facies[others] != "")[:, np.newaxis]
            fall = np.exp(-np.nan_to_num(near, nan=np.inf) / NEIGHBOURS_M)
            weight = np.where(same, 0.02 + fall, 0.0)
            total = weight.sum(axis=1)
            of_facies = weight @ own[known] / np.where(total > 0.0, total, 1.0) + 0.5 * by_log[others]
            closest = np.exp(-np.nan_to_num(near, nan=np.inf) / FALL_M)
            of_bed = 0.5 * (closest @ own[known]) / (0.5 + closest.sum(axis=1)) + soft[others]
            soft[others] = np.where(total > 0.0, of_facies, of_bed)
        return np.clip(soft, -SOFT_LIMIT, SOFT_LIMIT)

    def groups(self, usable: Mask, fewest: int) -> list[tuple[NDArray[np.intp], NDArray[np.intp], str]]:
        """Judged plugs (places among them) with the references that speak of them, and what these are called.

        References of the same facies and rock class where there are enough, else of the rock class; where
        that is not sure either, all of them, which scatter more.
        """
        e, found = self.evidence, []
        facies, soft = e.facies[self.judged], self.rock_class[self.judged]
        sure = np.abs(self.soft_log_odds[self.judged]) >= SURE
        pool = self.reference & usable
        kinds = zip(facies.tolist(), soft.tolist(), sure.tolist(), strict=True)
        for name, is_soft, is_sure in dict.fromkeys(kinds):
            at = np.flatnonzero((facies == name) & (soft == is_soft) & (sure == is_sure))
            of_class = pool & (self.rock_class == is_soft)
            own = of_class & (e.facies == name)
            if name and np.count_nonzero(own) >= FEWEST:
                found.append((at, np.flatnonzero(own), name))
            elif np.count_nonzero(of_class if is_sure else pool) >= fewest:
                label = ("soft rock" if is_soft else "hard rock") if is_sure else "any rock"
                found.append((at, np.flatnonzero(of_class if is_sure else pool), label))
        return found

    def _put(
        self,
        into: Found,
        at: NDArray[np.intp],
        fit: NDArray[np.intp],
        values: Array,
        predicted: science.Prediction,
        own: science.Prediction,
        label: str,
    ) -> None:
        """Differences from what others predict: `predicted` (one a plug, or one), or `own` within the fit."""
        place = {int(plug): i for i, plug in enumerate(fit)}
        inside = np.array([place.get(int(p), -1) for p in self.judged[at]], dtype=np.intp)
        part = inside >= 0
        for name, target in (("centre", None), ("scale", into.scale), ("freedom", into.freedom)):
            chosen = np.array(np.broadcast_to(getattr(predicted, name), at.shape))
            chosen[part] = getattr(own, name)[inside[part]]
            if target is None:
                into.difference[at] = values[at] - chosen
            else:
                target[at] = np.minimum(chosen, science.MOST_FREEDOM) if name == "freedom" else chosen
        into.count[at] = fit.size - part
        into.label[at] = label

    def permeability(self) -> Found:
        """Measured permeability against the trend of undamaged plugs of the same facies or rock class.

        Where residuals of neighbours go together, what those within reach tell of the bed is taken off, in
        the share that their own neighbours show.
        """
        e = self.evidence
        found = Found.none(self.n)
        found.more["slope"], found.more["bed"] = np.full(self.n, np.nan), np.zeros(self.n)
        phi, log_k = e.porosity_frac, e.log_permeability
        usable = np.isfinite(phi) & np.isfinite(log_k)
        found.reason[:] = f"fewer than {FEWEST} undamaged plugs with porosity and measured permeability"
        for at, fit, label in self.groups(usable, FEWEST):
            fit = _without_strays(phi, log_k, fit)
            if np.ptp(phi[fit]) == 0.0:
                continue
            line = science.predict_line(phi[fit], log_k[fit], np.nan_to_num(phi[self.judged[at]]))
            if not np.all(line.own.scale > 0.0):
                continue
            self._put(found, at, fit, log_k[self.judged], line.predicted, line.own, label)
            found.more["slope"][at] = line.slope
            residual = log_k[fit] - line.own.centre
            bed = _from_neighbours(e.depth_m, residual, fit, fit, 0.0)
            if np.count_nonzero(bed.near) < FEWEST:
                continue
            share = _slope(bed.local[bed.near], residual[bed.near], 1.0)
            left = residual[bed.near] - share * bed.local[bed.near]
            here = _from_neighbours(e.depth_m, residual, fit, self.judged[at], 0.0)
            found.difference[at] -= share * here.local
            found.scale[at] *= np.where(here.near, np.std(left) / np.std(residual[bed.near]), 1.0)
            found.more["bed"][at] = np.where(here.near, share, 0.0)
        there = usable[self.judged]
        found.difference[~there] = np.nan
        reason = np.where(
            np.isnan(phi[self.judged]), "porosity not known", e.reason_permeability[self.judged]
        )
        found.reason[~there] = reason[~there]
        return found

    def density_log(self) -> tuple[Found, Array]:
        """Plug porosity against the density log, centred on the same of undamaged plugs.

        Also the same difference for every plug of the well as a reference sees it (NaN where not known).
        """
        e = self.evidence
        found, whole = Found.none(self.n), np.full(len(e), np.nan)
        usable = np.isfinite(e.porosity_frac - self.log_frac)
        for at, fit, label in self.groups(usable, 0):
            log_frac, _ = _log_porosity(e.log, e.depth_m, _matrix(e.grain_density_g_cm3, fit))
            difference = e.porosity_frac - log_frac
            soft = bool(self.rock_class[self.judged[at[0]]])
            rough = self.log_roughness[fit]
            scale = LOG_SCATTER_FRAC
            for _ in range(3):
                weights = scale**2 / (scale**2 + rough**2)
                predicted, own = science.predict_level(
                    difference[fit], weights, AMBIENT_FRAC[soft], LOG_SCATTER_FRAC, LEVEL_PLUGS, LEVEL_FREEDOM
                )
                scale = float(predicted.scale) / np.sqrt(1.0 + 1.0 / (LEVEL_PLUGS + weights.sum()))
            self._put(found, at, fit, difference[self.judged], predicted, own, label)
            found.scale[at] = np.hypot(found.scale[at], self.log_roughness[self.judged[at]])
            whole[fit] = difference[fit] - own.centre
        there = usable[self.judged]
        found.difference[~there] = np.nan
        found.reason[~there] = "no density log at its depth"
        if e.log is not None:
            washed = np.isnan(self.log_frac) & ~np.isnan(
                _log_porosity(e.log, e.depth_m, MATRIX_G_CM3, True)[0]
            )
            found.reason[washed[self.judged]] = "density log not used: hole washed out"
        found.reason[np.isnan(e.porosity_frac[self.judged])] = "porosity not known"
        return found, whole

    def neighbours(self, gap: Array, gap_of_references: Array) -> Found:
        """Plug porosity against core and rotary plugs of its bed, else of its facies.

        What the log told already (`gap`, and the same of each reference) is taken off: the share of it that
        comes again is the slope of one difference on the other among the references.
        """
        e = self.evidence
        found = Found.none(self.n)
        found.more["shared"], found.more["near"] = np.zeros(self.n), np.zeros(self.n)
        phi = e.porosity_frac
        found.reason[:] = "no core or rotary plug of its facies or rock class"
        for at, fit, label in self.groups(np.isfinite(phi), 2):
            of_fit = _from_neighbours(e.depth_m, phi[fit], fit, fit)
            expected = _from_neighbours(e.depth_m, phi[fit], fit, self.judged[at])
            few = np.count_nonzero(of_fit.near) < 2
            far = phi[fit] - of_fit.far
            scatter = float(np.std(far)) if fit.size >= FEWEST else FACIES_SCATTER_FRAC
            for near, with_log in ((True, True), (True, False), (False, True), (False, False)):
                here = ((expected.near & (not few)) == near) & (np.isfinite(gap[at]) == with_log)
                if not here.any():
                    continue
                residual = phi[fit] - (of_fit.local if near else of_fit.far)
                used = of_fit.near if near else np.ones(fit.size, dtype=np.bool_)
                beta = 0.0
                if with_log:
                    used = used & np.isfinite(gap_of_references[fit])
                    beta = _slope(gap_of_references[fit][used], residual[used])
                    residual = residual - beta * gap_of_references[fit]
                left = residual[used]
                predicted, own = science.predict_level(
                    left, np.ones(left.size), 0.0, scatter, LEVEL_PLUGS, LEVEL_FREEDOM
                )
                values = np.full(self.n, np.nan)
                values[at] = phi[self.judged[at]] - (expected.local if near else expected.far)
                values = values - (beta * gap if with_log else 0.0)
                put = at[here]
                self._put(found, put, fit[used], values, predicted, own, label)
                found.more["shared"][put], found.more["near"][put] = beta, float(near)
                found.count[put] = expected.count[here] if near else found.count[put]
                found.weight[put] = 1.0 if near else FAR
        missing = np.isnan(phi[self.judged])
        found.difference[missing] = np.nan
        found.reason[missing] = "porosity not known"
        return found

    def packing(self) -> Found:
        """Porosity against what grains of its sorting can be packed to: soft rock only."""
        e = self.evidence
        found = Found.none(self.n)
        sorting = e.sorting_phi[self.judged].copy()
        for name in dict.fromkeys(e.facies[self.judged].tolist()):
            of_facies = e.sorting_phi[self.reference & (e.facies == name) & np.isfinite(e.sorting_phi)]
            if name and of_facies.size:
                sorting[e.facies[self.judged] == name] = np.median(of_facies)
        sorting[~(sorting > 0.0)] = np.nan
        limit = texture.packing_porosity_frac(sorting)
        found.more["limit"] = np.asarray(limit)
        phi = e.porosity_frac[self.judged]
        found.difference = phi - limit
        found.reason[np.isnan(sorting)] = "sorting not described"
        found.reason[np.isnan(phi)] = "porosity not known"
        hard = ~self.rock_class[self.judged]
        within = ~(phi > limit)
        found.reason[within & np.isfinite(found.difference)] = "porosity is within what its sorting allows"
        found.reason[hard] = "in hard rock cement fills what packing leaves"
        found.difference[hard | within] = np.nan
        found.more["limit"][hard | within] = np.nan
        return found

    def fines(self) -> Found:
        """Share of fines against undamaged plugs of the facies, where sieved."""
        e = self.evidence
        found = Found.none(self.n)
        usable = np.isfinite(e.fines_frac)
        found.reason[:] = "no sieved reference of its facies"
        for at, fit, label in self.groups(usable, 2):
            predicted, own = science.predict_level(
                e.fines_frac[fit],
                np.ones(fit.size),
                float(np.median(e.fines_frac[fit])),
                FINES_SCATTER_FRAC,
                LEVEL_PLUGS,
                LEVEL_FREEDOM,
            )
            self._put(found, at, fit, e.fines_frac[self.judged], predicted, own, label)
        missing = ~usable[self.judged]
        found.difference[missing] = np.nan
        found.reason[missing] = "not sieved"
        return found

    def condition(self) -> Found:
        found = Found.none(self.n)
        mark = science.telling_mark(self.evidence.condition[self.judged].astype(np.str_))
        found.label = mark.astype(object)
        found.difference = np.where(mark == "", np.nan, 0.0)
        found.reason[mark == ""] = "condition not described"
        return found

    def grain_density(self) -> Found:
        """Grain density against undamaged plugs: not evidence of crushing, but it can take trust from it."""
        density = self.evidence.grain_density_g_cm3
        found = Found.none(self.n)
        usable = np.isfinite(density)
        for at, fit, label in self.groups(usable, 3):
            predicted, own = science.predict_level(
                density[fit],
                np.ones(fit.size),
                float(np.median(density[fit])),
                GRAIN_SCATTER_G_CM3,
                LEVEL_PLUGS,
                LEVEL_FREEDOM,
            )
            self._put(found, at, fit, density[self.judged], predicted, own, label)
        found.difference[~usable[self.judged]] = np.nan
        return found


def _words(text: object) -> set[str]:
    return {word.strip() for word in str(text).casefold().split(",")}


def _by_firmness(firmness: Texts) -> Array:
    return np.array([SOFT_BY_FIRMNESS.get(str(word), np.nan) for word in firmness], dtype=np.float64)


def _by_porosity(porosity_frac: Array) -> Array:
    return np.clip((porosity_frac - SOFT_MIDDLE_FRAC) / SOFT_STEP_FRAC, -SOFT_MOST, SOFT_MOST)


def _slope(x: Array, y: Array, most: float = 0.9) -> float:
    """Share of x that comes again in y."""
    if x.size < FEWEST or np.ptp(x) == 0.0:
        return SHARED
    centred = x - x.mean()
    return float(np.clip(centred @ (y - y.mean()) / (centred @ centred), 0.0, most))


def _matrix(grain_density_g_cm3: Array, fit: NDArray[np.intp]) -> float:
    known = grain_density_g_cm3[fit]
    known = known[np.isfinite(known)]
    return float(np.median(known)) if known.size >= 3 else MATRIX_G_CM3


def _without_strays(phi: Array, log_k: Array, fit: NDArray[np.intp]) -> NDArray[np.intp]:
    """Undamaged plugs without those that stand out of the trend beyond chance."""
    if fit.size <= FEWEST or np.ptp(phi[fit]) == 0.0:
        return fit
    own = science.predict_line(phi[fit], log_k[fit], np.zeros(0)).own
    kept = fit[~science.left_out_mask(own, log_k[fit])]
    return kept if kept.size >= FEWEST else fit


@dataclass(frozen=True, slots=True)
class _Expected:
    """What is expected of plugs from those within `NEIGHBOURS_M`, and from all of the group."""

    local: Array
    far: Array
    near: Mask
    count: NDArray[np.intp]


def _from_neighbours(
    depth_m: Array,
    values: Array,
    fit: NDArray[np.intp],
    targets: NDArray[np.intp],
    level: float | None = None,
) -> _Expected:
    """What references (`values` of each) other than the plug itself let one expect, the nearer the more.

    Without near ones, their mean, or `level` where that is known.
    """
    away = np.abs(depth_m[targets, np.newaxis] - depth_m[fit])
    itself = targets[:, np.newaxis] == fit
    close = (away <= NEIGHBOURS_M) & ~itself
    weight = np.where(close, np.exp(-np.where(close, away, 0.0) / FALL_M), 0.0)
    others = np.maximum((~itself).sum(axis=1), 1)
    far = (values.sum() - np.where(itself, values, 0.0).sum(axis=1)) / others
    if level is not None:
        far = np.full(targets.shape, level)
    local = (weight @ values + LEVEL_PLUGS * far) / (weight.sum(axis=1) + LEVEL_PLUGS)
    return _Expected(local, far, close.any(axis=1), close.sum(axis=1))


def _log_porosity(
    log: DensityLog | None, depth_m: Array, matrix_g_cm3: float, all_hole: bool = False
) -> tuple[Array, Array]:
    """Porosity from the density log about each depth, and how much it changes there [v/v].

    The mean within 0.3 m; half the difference of the means within 0.45 m above and below.
    """
    nothing = np.full(depth_m.shape, np.nan)
    if log is None or not log.depth_m.size:
        return nothing, np.zeros(depth_m.shape)
    good = np.isfinite(log.density_g_cm3) & (log.density_g_cm3 > 0.0)
    if not all_hole:
        good &= ~log.bad
    at = log.depth_m[good]
    order = np.argsort(at, kind="stable")
    at, density = at[order], log.density_g_cm3[good][order]
    porosity = np.asarray(science.density_porosity_frac(density, matrix_g_cm3, FLUID_G_CM3))
    sums = np.concatenate([[0.0], np.cumsum(porosity)])

    def mean(top: Array, base: Array) -> Array:
        first, last = np.searchsorted(at, top, side="left"), np.searchsorted(at, base, side="right")
        count = last - first
        return np.where(count > 0, (sums[last] - sums[first]) / np.maximum(count, 1), np.nan)

    z = np.nan_to_num(depth_m, nan=-1e9)
    wide = 1.5 * HALF_HEIGHT_M
    rough = 0.5 * np.abs(mean(z - wide, z) - mean(z, z + wide))
    return mean(z - HALF_HEIGHT_M, z + HALF_HEIGHT_M), np.nan_to_num(rough)


# ---- from the record


def gather(connection: sa.Connection, frame: pd.DataFrame, log: DensityLog | None = None) -> Evidence:
    """The evidence of a well from its plugs: `plug_id` and the columns of an interval, in metres."""
    ids = frame["plug_id"].to_numpy(dtype=np.int64)
    numbers = set(ids.tolist())
    place = pd.Series(np.arange(len(ids)), index=ids)
    described = {
        int(row["plug_id"]): row for row in store.rows_of(store.in_force(connection, "descriptions", numbers))
    }
    facts = {int(row["plug_id"]): row for row in store.rows_of(store.in_force(connection, "plugs", numbers))}
    rows = [described.get(int(number), {}) for number in ids]

    def words(column: str) -> Texts:
        return np.array([row.get(column) or "" for row in rows], dtype=object)

    sorting = np.array([row.get("sorting_phi", np.nan) for row in rows], dtype=np.float64)
    by_word = texture.described_sorting_phi(
        words("sorting_class").astype(np.str_), words("sorting_scale").astype(np.str_)
    )
    k, basis = frame["klinkenberg permeability [mD]"].to_numpy(np.float64), frame["permeability basis"]
    flags = frame["flags"].astype(str)
    reason = np.full(len(ids), "not measured", dtype=object)
    reason[(basis == "texture").to_numpy()] = "permeability from texture tells nothing of crushing"
    limit = flags.str.contains("klinkenberg permeability (?:below|above) limit").to_numpy(dtype=np.bool_)
    reason[limit] = "permeability beyond a limit"
    measured = basis.isin(["measured", "reported"]).to_numpy() & ~limit & (k > 0.0)
    duplicate = [not pd.isna(facts.get(int(number), {}).get("duplicate_of_id", np.nan)) for number in ids]
    return Evidence(
        source=frame["source"].to_numpy(dtype=object),
        depth_m=frame["log depth [m]"].to_numpy(dtype=np.float64),
        facies=np.array([str(f).strip().casefold() for f in frame["facies"]], dtype=object),
        horizontal=frame["orientation"].isin(["horizontal", ""]).to_numpy(),
        duplicate=np.array(duplicate, dtype=np.bool_),
        porosity_frac=frame["porosity [v/v]"].to_numpy(dtype=np.float64),
        grain_density_g_cm3=frame["grain density [g/cm3]"].to_numpy(dtype=np.float64),
        log_permeability=np.log10(np.where(measured, k, np.nan)),
        reason_permeability=reason,
        firmness=words("firmness"),
        condition=words("condition"),
        sorting_phi=np.where(np.isnan(sorting), by_word, sorting),
        fines_frac=_fines(connection, place),
        log=log,
    )


def _fines(connection: sa.Connection, place: pd.Series[int]) -> Array:
    """Share by mass that passes the sieve at the sand limit, for each plug; NaN where none comes near it."""
    fines = np.full(len(place), np.nan)
    sieves = store.in_force(connection, "sieve", set(place.index.tolist()))
    for number, rows in sieves.groupby("plug_id"):
        aperture, mass = rows["aperture_mm"].to_numpy(), rows["mass_retained_g"].to_numpy()
        at_limit = aperture[(aperture >= FINES_WITHIN_MM[0]) & (aperture <= FINES_WITHIN_MM[1])]
        if at_limit.size and mass.sum() > 0.0:
            cut = at_limit[np.argmin(np.abs(at_limit - FINES_MM))]
            fines[place[number]] = mass[aperture < cut].sum() / mass.sum()
    return fines


def density_log(connection: sa.Connection, well: int) -> DensityLog | None:
    """The density log of a well, with the places where the hole is too wide for it."""
    facts = store.in_force(connection, "wells", [well], by="well_id")
    bit_mm = float(facts["bit_diameter_mm"].iloc[-1]) if len(facts) else np.nan
    return density_of(logs.curves(connection, well), bit_mm)


def of_well(
    connection: sa.Connection,
    well: int,
    frame: pd.DataFrame,
    stored: Mapping[str, str],
    prior_frac: float | None = None,
    *,
    blind: bool = False,
) -> Assessment:
    """The assessment of a well, from its plugs as `select.of_well` gives them."""
    prior = lab_settings.number(stored, "crush prior") if prior_frac is None else prior_frac
    evidence = gather(connection, frame, density_log(connection, well))
    return assess(evidence, prior, blind=blind, recalibration=recalibration(stored))


def recalibration(stored: Mapping[str, str]) -> science.Recalibration | None:
    """What the laboratory adopted; None where nothing."""
    text = lab_settings.value(stored, "crush recalibration")
    found = re.fullmatch(lab_settings.RECALIBRATION, text)
    return science.Recalibration(float(found[1]), float(found[2])) if found else None


def add_columns(frame: pd.DataFrame, assessment: Assessment) -> None:
    """Likelihood, verdict and flags of percussion plugs, in the columns of an interval."""
    at, verdict = assessment.place, assessment.verdict
    likelihood = np.full(len(frame), np.nan)
    likelihood[at] = np.where(assessment.assessed, assessment.likelihood_frac, np.nan)
    frame["crush likelihood [v/v]"] = likelihood
    words = frame["crush verdict"].to_numpy(dtype=object, copy=True)
    words[at] = verdict
    frame["crush verdict"] = words
    flags = frame["flags"].to_numpy(dtype=object, copy=True)
    told = {
        "likely": "crush likely",
        "possible": "crush possible",
        "not assessed": "crush likelihood: no evidence bears on it",
    }
    for place, word in zip(at, verdict, strict=True):
        if word in told:
            flags[place] = "; ".join(part for part in (flags[place], told[word]) if part)
    frame["flags"] = flags


# ---- what persons judged


@dataclass(frozen=True, slots=True)
class Labelled:
    """Percussion plugs that persons judged: evidence on the log-odds, the verdict, and the well."""

    evidence_log_odds: Array
    damaged: Array
    well: Texts


def labelled(
    connection: sa.Connection, frames: Mapping[int, pd.DataFrame], stored: Mapping[str, str]
) -> Labelled:
    """Plugs of these wells judged crushed or not; where judges part evenly, or are unsure, left out."""
    odds: list[float] = []
    damaged: list[float] = []
    wells: list[int] = []
    prior = lab_settings.number(stored, "crush prior")
    for well, frame in frames.items():
        ids = frame["plug_id"].to_numpy(dtype=np.int64)
        judged = store.in_force(connection, "crush verdicts", set(ids.tolist()))
        votes = judged["crushed"].map({"yes": 1, "no": -1, "unsure": 0}).groupby(judged["plug_id"]).sum()
        if not len(votes):
            continue
        found = assess(gather(connection, frame, density_log(connection, well)), prior)
        for place, total, assessed in zip(found.place, found.weighed.total, found.assessed, strict=True):
            vote = votes.get(ids[place], 0)
            if vote and assessed:
                odds.append(float(total))
                damaged.append(float(vote > 0))
                wells.append(well)
    return Labelled(np.array(odds), np.array(damaged), np.array(wells, dtype=object))


FOLDS = 10


def folds(judged: Labelled) -> NDArray[np.intp]:
    """A well at a time where there are three or more; else tenths with like shares of both verdicts."""
    wells, of_well = np.unique(judged.well.astype(np.int64), return_inverse=True)
    if wells.size >= 3:
        return of_well
    fold = np.empty(judged.damaged.size, dtype=np.intp)
    fold[np.argsort(judged.damaged, kind="stable")] = np.arange(fold.size) % FOLDS
    return fold


def recalibrated(judged: Labelled, stored: Mapping[str, str]) -> dict[str, Any]:
    """Two parameters from persons' verdicts, and the skill without and with them, cross-validated.

    Raises
    ------
    Refused
        If there are fewer than 30 verdicts, or fewer than 5 of a kind.
    """
    prior = lab_settings.number(stored, "crush prior")
    y = judged.damaged
    fewest = min(int(y.sum()), int(y.size - y.sum()))
    if y.size < science.RECALIBRATION_LABELS or fewest < FEWEST_OF_A_KIND:
        raise Refused(
            [
                Problem(
                    f"{y.size} percussion plugs judged crushed or not, {int(y.sum())} of them crushed",
                    f"{science.RECALIBRATION_LABELS} or more, {FEWEST_OF_A_KIND} or more of each",
                    "load more 'crush verdicts'",
                )
            ],
            "Verdicts of persons are too few to learn from.",
        )
    fitted = science.recalibrate(judged.evidence_log_odds, y, prior)
    fold = folds(judged)
    before = np.asarray(science.likelihood_frac(prior, judged.evidence_log_odds))
    after = science.cross_validated_frac(judged.evidence_log_odds, y, prior, fold)
    return {
        "verdicts": int(y.size),
        "crushed": int(y.sum()),
        "prior": prior,
        "intercept": fitted.intercept,
        "slope": fitted.slope,
        "left out in turn": "wells" if np.unique(judged.well).size >= 3 else "tenths of the plugs",
        "as it is": asdict(science.skill(before, y)),
        "recalibrated": asdict(science.skill(after, y)),
        "setting": f"intercept {fitted.intercept:.4f}, slope {fitted.slope:.4f}",
    }


FEWEST_OF_A_KIND = 5


# ---- in words


def table(assessment: Assessment, frame: pd.DataFrame, unit: str) -> list[dict[str, Any]]:
    """What `corelab impact` shows: one object a plug, with its evidence and how the answer moves.

    Depths are in metres, and in `unit` beside where that is another.
    """
    made = []
    depth_m = frame["depth [m]"].to_numpy(dtype=np.float64)
    shown = np.asarray(units.convert(depth_m, units.unit("m", "length"), units.unit(unit, "length"))).round(9)
    for i, place in enumerate(assessment.place):
        total = float(assessment.weighed.total[i] + assessment.adjustment[i])
        made.append(
            {
                "well": frame["well"].iloc[place],
                "plug": frame["plug"].iloc[place],
                "depth [m]": float(depth_m[place]),
                **({} if unit == "m" else {f"depth [{unit}]": float(shown[place])}),
                "crush likelihood [v/v]": float(assessment.likelihood_frac[i]),
                "crush verdict": str(assessment.verdict[i]),
                "direction": str(assessment.direction[i]),
                "coverage": round(float(assessment.coverage[i]), 4),
                "prior": assessment.prior_frac,
                "soft rock [v/v]": round(float(assessment.soft_share[i]), 4),
                "by prior": {f"{p:.1f}": round(float(science.likelihood_frac(p, total)), 4) for p in PRIORS},
                "evidence": evidence_rows(assessment, i),
                "missing": missing_words(assessment, i),
            }
        )
    return made


PRIORS = (0.1, 0.2, 0.3, 0.4, 0.5)


def evidence_rows(assessment: Assessment, i: int) -> list[dict[str, Any]]:
    """The terms that bear on one plug; the effects sum to what is added to the log-odds of the prior."""
    rows = []
    for t, term in enumerate(TERMS):
        found = assessment.found[term]
        if not np.isfinite(found.difference[i]):
            continue
        rows.append(
            {
                "term": term,
                "finding": _FINDINGS[term](assessment, found, i),
                "weight": float(found.weight[i]),
                "ratio": float(assessment.weighed.ratio[i, t]),
                "effect": float(assessment.weighed.effect[i, t]),
            }
        )
    grains = assessment.found["grain density"]
    if grains.more["off"][i] > 0.0:
        rows.append(
            {
                "term": "grain density",
                "finding": f"grain density differs by {_signed(grains.difference[i], 3)} g/cm3 from "
                f"{_plugs(grains, i)}: this points to mud solids or poor cleaning, not to crushing; "
                "porosity and permeability count half",
                "weight": 0.0,
                "ratio": 0.0,
                "effect": 0.0,
            }
        )
    if assessment.adjustment[i] != 0.0:
        rows.append(
            {
                "term": "recalibration",
                "finding": "correction learnt from the verdicts of persons in this laboratory",
                "weight": 1.0,
                "ratio": float(assessment.adjustment[i]),
                "effect": float(assessment.adjustment[i]),
            }
        )
    return rows


def missing_words(assessment: Assessment, i: int) -> list[str]:
    return [
        f"{term}: {assessment.found[term].reason[i]}"
        for term in TERMS
        if not np.isfinite(assessment.found[term].difference[i])
    ]


def _signed(value: float, decimals: int) -> str:
    return f"{value:+.{decimals}f}".replace("-", "−")


def _plugs(found: Found, i: int) -> str:
    count = int(found.count[i])
    return f"{count} undamaged plug{'' if count == 1 else 's'} of {found.label[i]}"


def _rock_words(assessment: Assessment, i: int) -> str:
    share = assessment.soft_share[i]
    return "soft rock" if share > 0.7 else "hard rock" if share < 0.3 else "rock neither soft nor hard"


def _scatters(found: Found, i: int) -> str:
    return f"{abs(found.difference[i]) / found.scale[i]:.1f} times the scatter"


def _permeability_words(assessment: Assessment, found: Found, i: int) -> str:
    k = 10.0 ** assessment.evidence.log_permeability[assessment.place[i]]
    side = "below" if found.difference[i] < 0.0 else "above"
    rock = _rock_words(assessment, i)
    sign = {"soft rock": "low", "hard rock": "high"}.get(rock, "either")
    bed = ", its neighbours' own part taken off" if found.more["bed"][i] > 0.0 else ""
    return (
        f"measured {k:.4g} mD lies a factor of {10.0 ** abs(found.difference[i]):.2g} {side} the trend of "
        f"{_plugs(found, i)} at its porosity{bed} ({_scatters(found, i)}); in {rock} {sign} is suspicious"
    )


def _density_words(assessment: Assessment, found: Found, i: int) -> str:
    side = "below" if found.difference[i] < 0.0 else "above"
    against = (
        f"where {_plugs(found, i)} stand" if found.count[i] else "where undamaged rock is assumed to stand"
    )
    return (
        f"porosity is {100.0 * abs(found.difference[i]):.1f} porosity units {side} {against} "
        f"against the density log ({_scatters(found, i)})"
    )


def _neighbour_words(assessment: Assessment, found: Found, i: int) -> str:
    side = "below" if found.difference[i] < 0.0 else "above"
    where = f"within {NEIGHBOURS_M:g} m" if found.more["near"][i] > 0.0 else "elsewhere in the well"
    less = ", what the log told taken off" if found.more["shared"][i] > 0.0 else ""
    return (
        f"porosity is {100.0 * abs(found.difference[i]):.1f} porosity units {side} that of "
        f"{_plugs(found, i)} {where}{less} ({_scatters(found, i)})"
    )


def _packing_words(assessment: Assessment, found: Found, i: int) -> str:
    phi = assessment.evidence.porosity_frac[assessment.place[i]]
    limit = found.more["limit"][i]
    if phi > science.CUBIC_PACKING_FRAC:
        return f"porosity {phi:.3f} is looser than the loosest regular packing of spheres, 0.476"
    if found.difference[i] > science.PACKING_MARGIN_FRAC:
        return (
            f"porosity {phi:.3f} passes the {limit:.3f} of packed sand of its sorting by more than 0.05: "
            "loosened, or the bulk volume is wrong"
        )
    return f"porosity {phi:.3f} is possible for its sorting (packed sand {limit:.3f}, and 0.05 more)"


def _fines_words(assessment: Assessment, found: Found, i: int) -> str:
    side = "less" if found.difference[i] < 0.0 else "more"
    return (
        f"{100.0 * abs(found.difference[i]):.1f} % {side} fines by mass than {_plugs(found, i)} "
        f"({_scatters(found, i)})"
    )


def _condition_words(assessment: Assessment, found: Found, i: int) -> str:
    return f"described as {assessment.evidence.condition[assessment.place[i]]}"


_FINDINGS: Mapping[str, Callable[[Assessment, Found, int], str]] = {
    "permeability": _permeability_words,
    "density log": _density_words,
    "neighbours": _neighbour_words,
    "packing": _packing_words,
    "fines": _fines_words,
    "condition": _condition_words,
}


def paragraph(row: Mapping[str, Any], unit: str, depth: float) -> str:
    """One plug in prose that a geologist can argue with."""
    verdict = row["crush verdict"]
    head = f"{row['plug']} at {depth:.2f} {unit}: "
    if verdict == "not assessed":
        return f"{head}not assessed, for want of evidence. " + "; ".join(row["missing"]) + "."
    kind = "" if row["direction"] == "none" else f", if so {row['direction']}"
    told = [f"{item['finding']} ({_signed(item['effect'], 2)})" for item in row["evidence"]]
    moves = f"from {row['by prior']['0.1']:.2f} at a prior of 0.1 to {row['by prior']['0.5']:.2f} at 0.5"
    return (
        f"{head}crush {verdict}, {row['crush likelihood [v/v]']:.2f}{kind}; {moves}. "
        + " ".join(f"{_capital(text)}." for text in told)
        + (f" Without: {'; '.join(row['missing'])}." if row["missing"] else "")
    )


def _capital(text: str) -> str:
    return text[:1].upper() + text[1:]
