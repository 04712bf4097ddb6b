"""Trends of permeability on porosity over the plugs of an interval, and the rock types of the plugs."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from functools import partial
from types import MappingProxyType
from typing import Any

import numpy as np
import pandas as pd
import sqlalchemy as sa
from numpy.typing import NDArray
from scipy import stats

from corelab.errors import Impossible, NotFound, Usage, did_you_mean, quoted
from corelab.interval import other_labs, select
from corelab.interval import where as conditions
from corelab.records import store
from corelab.science import rock_types, trends
from corelab.science.back_transform import CAVEAT, duan_factor, lognormal_factor

Array = NDArray[np.float64]

GROUPINGS = ("facies", "run", "lithology", "orientation")
ALL, UNSTATED = "all", "not stated"
_PHI, _K = "porosity [v/v]", "klinkenberg permeability [mD]"
_GAS_K, _SW = "gas permeability [mD]", "water saturation [v/v]"
_SIGNIFICANT = 0.05
#: Refits beyond which plugs are left out in bunches, by the models that must be fitted anew each time.
_MOST_REFITS = 100
#: The slopes of all pairs are too many beyond this.
_MOST_PLUGS_THEIL_SEN = 1000
#: A band from left-out residuals needs as many, for the 95th of a hundred to lie among them.
_LEAST_PLUGS_RANKED_BAND = 19
_CARBONATE = re.compile(
    r"\b(?:limestones?|lime|dolomites?|dolostones?|carbonates?|chalk|grainstone|packstone|wackestone|"
    r"boundstone|ls|lst|dol)\b",
    re.IGNORECASE,
)


@dataclass(frozen=True, slots=True)
class Plugs:
    """The columns of the plugs that a group is fitted on."""

    name: list[str]
    porosity: Array
    permeability: Array
    u_porosity: Array
    u_permeability: Array
    water_saturation: Array

    def only(self, keep: NDArray[np.bool_]) -> Plugs:
        return Plugs(
            [n for n, k in zip(self.name, keep, strict=True) if k],
            self.porosity[keep],
            self.permeability[keep],
            self.u_porosity[keep],
            self.u_permeability[keep],
            self.water_saturation[keep],
        )


@dataclass(frozen=True, slots=True)
class Fitted:
    """A model fitted to a group.

    `centre` and `band` take porosities and give lg k, and its lower and upper bound for a new plug;
    `left_out` are the residuals of the plugs used, each from the fit without it; `used` marks those plugs.
    """

    parameters: dict[str, float]
    standard_errors: dict[str, float | None]
    fit: trends.Fit
    left_out: Array
    centre: Callable[[Array], Array]
    band: Callable[[Array], tuple[Array, Array]] | None
    equation: str
    band_by: str
    used: NDArray[np.bool_]
    more: dict[str, Any] = field(default_factory=dict)
    caveats: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Model:
    """A model, and whether it is meant to foresee permeability from porosity."""

    name: str
    title: str
    method: str
    fit: Callable[[Plugs], Fitted]
    foresees: bool = True
    least_squares: bool = True


@dataclass(frozen=True, slots=True)
class Trends:
    """What was fitted: one record for each group and model, best first within a group.

    `groups` tells of each group its plugs, what was not fitted and why, its flow units, and remarks.
    """

    records: list[dict[str, Any]]
    groups: list[dict[str, Any]]


# -- models -----------------------------------------------------------------------------------------------


def _number(value: float) -> str:
    return f"{value:.4g}"


def _plus(value: float, factor: str) -> str:
    return f" {'-' if value < 0 else '+'} {_number(abs(value))} {factor}"


def _student_band(
    fit: trends.Fit, rows: Callable[[Array], Array], centre: Callable[[Array], Array]
) -> Callable[[Array], tuple[Array, Array]]:
    known = np.nan_to_num(np.real(fit.inverse_normal))
    t = float(stats.t.ppf(0.5 + trends.COVERAGE / 2.0, fit.degrees_of_freedom))

    def band(phi: Array) -> tuple[Array, Array]:
        x = rows(phi)
        half = t * float(fit.residual_sd) * np.sqrt(1.0 + np.einsum("ij,jk,ik->i", x, known, x))
        return centre(phi) - half, centre(phi) + half

    return band


def _ranked_band(left_out: Array, centre: Callable[[Array], Array]) -> Any:
    sizes = np.sort(np.abs(left_out[np.isfinite(left_out)]))
    if sizes.size < _LEAST_PLUGS_RANKED_BAND:
        return None
    half = sizes[int(np.ceil((sizes.size + 1) * trends.COVERAGE)) - 1]
    return lambda phi: (centre(phi) - half, centre(phi) + half)


_STUDENT = "95 % of new plugs, by Student's t"
_RANKED = "95 % of new plugs, by the residuals of left-out plugs"


def _named(names: tuple[str, ...], fit: trends.Fit) -> tuple[dict[str, float], dict[str, float | None]]:
    values = [float(v) for v in np.real(fit.coefficients)]
    errors = [None if np.isnan(e) else float(e) for e in np.real(fit.standard_errors)]
    return dict(zip(names, values, strict=True)), dict(zip(names, errors, strict=True))


def _ordinary(
    fit: trends.Fit, names: tuple[str, ...], rows: Callable[[Array], Array], equation: str, **more: Any
) -> Fitted:
    def centre(phi: Array) -> Array:
        return np.asarray(rows(phi) @ np.real(fit.coefficients))

    band = _student_band(fit, rows, centre)
    left_out = trends.left_out_residuals(fit)
    used = np.ones(left_out.size, dtype=np.bool_)
    return Fitted(
        *_named(names, fit), fit, left_out, centre, band, equation, _STUDENT, **{"used": used, **more}
    )


def _line_rows(phi: Array) -> Array:
    return np.column_stack([np.ones_like(phi), phi])


def _semilog(plugs: Plugs) -> Fitted:
    fit = trends.semilog_trend(plugs.porosity, plugs.permeability)
    return _ordinary(fit, ("intercept", "slope"), _line_rows, _line_equation(fit))


def _line_equation(fit: trends.Fit) -> str:
    a, b = fit.coefficients
    return f"lg k = {_number(a)}{_plus(b, 'phi')}"


def _power(plugs: Plugs) -> Fitted:
    fit = trends.power_trend(plugs.porosity, plugs.permeability)
    a, b = fit.coefficients
    rows = lambda phi: _line_rows(np.log10(phi))  # noqa: E731
    return _ordinary(fit, ("intercept", "exponent"), rows, f"lg k = {_number(a)}{_plus(b, 'lg phi')}")


def _timur(plugs: Plugs) -> Fitted:
    have = (plugs.water_saturation > 0.0) & (plugs.water_saturation <= 1.0)
    if np.sum(have) < 4:
        raise Impossible("fewer than four plugs with water saturation")
    used = plugs.only(have)
    fit = trends.timur_trend(used.porosity, used.permeability, used.water_saturation)
    a, b, c = fit.coefficients
    middle = float(np.median(used.water_saturation))

    def rows(phi: Array) -> Array:
        return np.column_stack([_line_rows(np.log10(phi)), np.full(phi.size, np.log10(middle))])

    return _ordinary(
        fit,
        ("intercept", "porosity exponent", "saturation exponent"),
        rows,
        f"lg k = {_number(a)}{_plus(b, 'lg phi')}{_plus(c, 'lg Sw')}",
        used=have,
        more={"water saturation of the band [v/v]": middle},
        caveats=("the law means irreducible water; these are the saturations measured",),
    )


def _kozeny_carman(plugs: Plugs) -> Fitted:
    found = trends.kozeny_carman_trend(plugs.porosity, plugs.permeability)
    log_b, c = (float(v) for v in found.fit.coefficients)

    def centre(phi: Array) -> Array:
        open_part = np.where(phi > c, phi - c, np.nan)
        return np.asarray(log_b + 3.0 * np.log10(open_part) - 2.0 * np.log10(1.0 - open_part))

    def rows(phi: Array) -> Array:
        if found.at_bound:
            return np.column_stack([np.ones_like(phi), np.zeros_like(phi)])
        open_part = np.where(phi > c, phi - c, np.nan)
        by_threshold = -(3.0 / open_part + 2.0 / (1.0 - open_part)) / np.log(10.0)
        return np.column_stack([np.ones_like(phi), by_threshold])

    shown = f"(phi - {_number(c)})" if c else "phi"
    equation = f"lg k = {_number(log_b)} + 3 lg {shown} - 2 lg (1 - {shown})"
    caveats = ("no threshold could be told from 0",) if found.at_bound else ()
    return Fitted(
        *_named(("intercept", "threshold"), found.fit),
        found.fit,
        found.left_out,
        centre,
        _student_band(found.fit, rows, centre),
        equation,
        _STUDENT,
        np.ones(plugs.porosity.size, dtype=np.bool_),
        {"threshold interval [v/v]": [found.low, found.high]},
        caveats,
    )


def _piecewise(plugs: Plugs) -> Fitted:
    found = trends.broken_trend(plugs.porosity, plugs.permeability)
    a, b, d, c = (float(v) for v in found.fit.coefficients)

    def centre(phi: Array) -> Array:
        return np.asarray(a + b * phi + d * np.maximum(phi - c, 0.0))

    def rows(phi: Array) -> Array:
        above = np.maximum(phi - c, 0.0)
        by_break = np.where(phi > c, -d, 0.0) if not found.at_bound else np.zeros_like(phi)
        return np.column_stack([np.ones_like(phi), phi, above, by_break])

    names = ("intercept", "slope", "change of slope", "break")
    caveats = ("the break lies at the end of what the plugs allow",) if found.at_bound else ()
    return Fitted(
        *_named(names, found.fit),
        found.fit,
        found.left_out,
        centre,
        _student_band(found.fit, rows, centre),
        f"lg k = {_number(a)}{_plus(b, 'phi')}{_plus(d, f'max(phi - {_number(c)}, 0)')}",
        _STUDENT,
        np.ones(plugs.porosity.size, dtype=np.bool_),
        {"break interval [v/v]": [found.low, found.high]},
        caveats,
    )


def _refitted(plugs: Plugs, fit: trends.Fit, again: Callable[[Plugs], Array]) -> Fitted:
    """A line that must be fitted anew to leave a plug out: one by one, or in bunches where there are many."""
    n = plugs.porosity.size
    bunch = np.arange(n) % min(n, _MOST_REFITS)
    lg = np.log10(plugs.permeability)
    left_out = np.full(n, np.nan)
    for i in range(int(bunch.max()) + 1):
        out = bunch == i
        try:
            a, b = again(plugs.only(~out))
        except Impossible:
            continue
        left_out[out] = lg[out] - a - b * plugs.porosity[out]

    def centre(phi: Array) -> Array:
        return np.asarray(_line_rows(phi) @ fit.coefficients)

    names = _named(("intercept", "slope"), fit)
    band = _ranked_band(left_out, centre)
    by = _RANKED if band else f"none: fewer than {_LEAST_PLUGS_RANKED_BAND} plugs"
    bunched = {"left out at a time": int(np.bincount(bunch).max())} if n > _MOST_REFITS else {}
    used = np.ones(n, dtype=np.bool_)
    return Fitted(*names, fit, left_out, centre, band, _line_equation(fit), by, used, bunched)


def _york(plugs: Plugs) -> Fitted:
    have = np.isfinite(plugs.u_porosity) & np.isfinite(plugs.u_permeability)
    have &= (plugs.u_porosity > 0.0) | (plugs.u_permeability > 0.0)
    if np.sum(have) < 3:
        raise Impossible("fewer than three plugs with uncertainties of porosity and permeability")
    used = plugs.only(have)
    found = trends.york_trend(used.porosity, used.permeability, used.u_porosity, used.u_permeability)

    def again(some: Plugs) -> Array:
        u_lg = some.u_permeability / (some.permeability * np.log(10.0))
        lg = np.log10(some.permeability)
        line = trends.york(some.porosity, lg, some.u_porosity, np.hypot(u_lg, found.natural_scatter))
        return np.array([line.intercept, line.slope])

    fitted = _refitted(used, found.fit, again)
    caveats: tuple[str, ...] = ()
    if found.natural_scatter > 0.0:
        caveats = (
            f"the plugs scatter beyond their uncertainties (MSWD {_number(found.mswd)}): "
            f"{_number(found.natural_scatter)} decades were added for the rock",
        )
    more = {"natural scatter [decades]": found.natural_scatter, "mswd": found.mswd}
    return replace(fitted, used=have, more={**fitted.more, **more}, caveats=caveats)


def _again(fit: Callable[..., trends.Fit], plugs: Plugs) -> Array:
    return np.asarray(fit(plugs.porosity, plugs.permeability).coefficients)


def _reduced_major_axis(plugs: Plugs) -> Fitted:
    fit = trends.reduced_major_axis_trend
    return _refitted(plugs, fit(plugs.porosity, plugs.permeability), partial(_again, fit))


def _theil_sen(plugs: Plugs) -> Fitted:
    if plugs.porosity.size > _MOST_PLUGS_THEIL_SEN:
        raise Impossible(f"more than {_MOST_PLUGS_THEIL_SEN} plugs have too many pairs")
    fit = trends.theil_sen_trend
    return _refitted(plugs, fit(plugs.porosity, plugs.permeability), partial(_again, fit))


def _huber(plugs: Plugs) -> Fitted:
    fit = trends.huber_trend
    whole = fit(plugs.porosity, plugs.permeability)
    light = [n for n, w in zip(plugs.name, whole.weights, strict=True) if w < 0.5]
    found = _refitted(plugs, whole, partial(_again, fit))
    return replace(found, more={**found.more, "plugs of less than half weight": light})


MODELS = MappingProxyType(
    {
        m.name: m
        for m in (
            Model("semilog", "lg k on porosity", "semilog-trend", _semilog),
            Model("power", "lg k on lg porosity", "power-trend", _power),
            Model(
                "kozeny-carman",
                "Kozeny-Carman with percolation threshold",
                "kozeny-carman-trend",
                _kozeny_carman,
            ),
            Model("timur", "Timur's form with saturation", "timur-trend", _timur),
            Model("piecewise", "two lines that meet", "broken-trend", _piecewise),
            Model("huber", "robust, Huber", "huber-trend", _huber, least_squares=False),
            Model("theil-sen", "robust, Theil-Sen", "theil-sen-trend", _theil_sen, least_squares=False),
            Model("york", "errors in both, York", "york-trend", _york, False, False),
            Model(
                "reduced major axis",
                "both variables alike",
                "reduced-major-axis-trend",
                _reduced_major_axis,
                False,
                False,
            ),
        )
    }
)


def model_named(name: str) -> str:
    """The model of a name, hyphens and spaces alike.

    Raises
    ------
    Usage
        If there is none; tells the nearest.
    """
    wanted = " ".join(re.split(r"[\s_-]+", name.strip().casefold()))
    for known in MODELS:
        if known.replace("-", " ") == wanted:
            return known
    raise Usage(f"There is no model {quoted(name)}; {did_you_mean(name, list(MODELS))}")


# -- plugs ------------------------------------------------------------------------------------------------


def _usable(
    connection: sa.Connection, identities: store.Identities, well: str, filters: select.Filters
) -> tuple[pd.DataFrame, dict[str, int]]:
    """The plugs of an interval that a trend may rest on, and how many were left out, by reason."""
    frame = select.interval(connection, identities, well, filters)
    number = select.well_id(identities, well)
    facts = store.in_force(connection, "plugs", select.plugs_of_well(identities, number))
    repeats = {
        identities.name("plug", int(p))
        for p, of in zip(facts["plug_id"], facts["duplicate_of_id"], strict=True)
        if not pd.isna(of)
    }
    flags = frame["flags"].str
    phi, k = frame[_PHI], frame[_K]
    asked = conditions.parse(filters.where, select.COLUMNS) if filters.where.strip() else None
    across = frame["orientation"].isin(["vertical", "oblique"])
    if asked is not None and "orientation" in conditions.named(asked):
        across &= False
    reasons = {
        "duplicate of another plug": frame["plug"].isin(repeats) & (frame["status"] != other_labs.STATUS),
        "vertical or oblique (name the orientation in --where to take them)": across,
        "permeability estimated from texture": frame["permeability basis"] == "texture",
        "no permeability": k.isna(),
        "permeability below what could be measured": flags.contains(
            "klinkenberg permeability below limit", regex=False
        ),
        "permeability above what could be measured": flags.contains(
            "klinkenberg permeability above limit", regex=False
        ),
        "permeability of zero": k <= 0.0,
        "no porosity": phi.isna(),
        "porosity of zero": phi <= 0.0,
    }
    keep = np.ones(len(frame), dtype=np.bool_)
    left_out: dict[str, int] = {}
    for reason, mask in reasons.items():
        out = keep & mask.to_numpy(dtype=np.bool_)
        if out.any():
            left_out[reason] = int(out.sum())
        keep &= ~out
    return frame[keep].reset_index(drop=True), left_out


def _plugs(frame: pd.DataFrame) -> Plugs:
    phi, k, u_phi, u_k, sw = (
        frame[c].to_numpy(dtype=np.float64) for c in (_PHI, _K, f"u {_PHI}", f"u {_K}", _SW)
    )
    return Plugs(frame["plug"].tolist(), phi, k, u_phi, u_k, sw)


def _caveats(frame: pd.DataFrame) -> list[str]:
    found = []
    crushed = (frame["crush verdict"] == "likely") | frame["flags"].str.contains(
        "judged crushed", regex=False
    )
    shot = frame["source"] == "percussion sidewall"
    if crushed.any():
        found.append(
            f"{int(crushed.sum())} of the plugs are likely crushed; leave them out with --where "
            "\"crush verdict is empty or crush verdict != 'likely'\", or all percussion plugs with "
            "\"source != 'percussion sidewall'\""
        )
    elif shot.any():
        found.append(f"{int(shot.sum())} of the plugs are percussion sidewall plugs")
    for what in ("porosity", "permeability"):
        stress = frame[f"{what} stress [MPa]"].dropna()
        if len(stress) and stress.max() - stress.min() > 0.5:
            found.append(
                f"{what} was measured at {stress.min():g} to {stress.max():g} MPa; "
                "--stress takes all at one stress"
            )
    laboratories = [name for name in frame["laboratory"].unique() if name]
    if len(laboratories) > 1:
        found.append(f"plugs of {len(laboratories)} laboratories: {', '.join(sorted(laboratories))}")
    return found


# -- the trends -------------------------------------------------------------------------------------------


def trend(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    filters: select.Filters,
    by: str = "",
    model: str = "",
) -> Trends:
    """Fits of log10 permeability on porosity, for all plugs or by group, ranked.

    Raises
    ------
    Usage
        If there is no such grouping or model.
    NotFound
        If no plug has both, or the one model asked for fits no group; says why.
    """
    if by and by not in GROUPINGS:
        raise Usage(f"--by is one of {', '.join(GROUPINGS)}; found {quoted(by)}.")
    wanted = [model_named(model)] if model else list(MODELS)
    frame, left_out = _usable(connection, identities, well, filters)
    if not len(frame):
        why = "; ".join(f"{count} {reason}" for reason, count in left_out.items())
        raise NotFound(
            f"No plug of {quoted(well)} has porosity and permeability for a trend"
            + (f" (left out: {why})." if why else ".")
        )
    column = by or "facies"
    stated = frame[column].where(frame[column] != "", UNSTATED)
    differ = _difference(frame[stated != UNSTATED], column)
    records: list[dict[str, Any]] = []
    groups: list[dict[str, Any]] = []
    for name, part in frame.groupby(stated, sort=False) if by else [(ALL, frame)]:
        made, group = _group(str(name), part, wanted)
        shared = {"groups differ": differ, "left out": left_out, "not fitted": group["not fitted"]}
        records += [{**record, **shared} for record in made]
        groups.append({**group, **shared})
    if model and not records:
        why = "; ".join(f"{g['group']}: {reason}" for g in groups for reason in g["not fitted"].values())
        raise NotFound(f"The model '{wanted[0]}' could not be fitted ({why}).")
    return Trends(records, groups)


def _difference(frame: pd.DataFrame, column: str) -> dict[str, Any] | None:
    """Whether the groups of a column have trends of their own, in numbers and words."""
    found = trends.compare_lines(
        frame[_PHI].to_numpy(dtype=np.float64),
        np.log10(frame[_K].to_numpy(dtype=np.float64)),
        frame[column].to_numpy(dtype=np.str_),
    )
    if found is None:
        return None
    questions = {"one line": found.any, "slopes": found.slopes, "levels": found.levels}
    if found.any[3] >= _SIGNIFICANT:
        words = f"one line serves all {column} (p {found.any[3]:.2g})"
    elif found.slopes[3] < _SIGNIFICANT:
        words = f"slopes differ between {column} (p {found.slopes[3]:.2g}): fit them apart"
    else:
        words = f"levels differ between {column}, slopes do not (p {found.levels[3]:.2g}): fit them apart"
    return {
        "by": column,
        "differ": bool(found.any[3] < _SIGNIFICANT),
        "finding": words,
        "test": "analysis of covariance of lg k on porosity, 5 %",
        **{
            name: dict(zip(("F", "numerator", "denominator", "p"), values, strict=True))
            for name, values in questions.items()
        },
    }


def _group(name: str, frame: pd.DataFrame, wanted: list[str]) -> tuple[list[dict[str, Any]], dict[str, Any]]:
    plugs = _plugs(frame)
    fits: dict[str, Fitted] = {}
    not_fitted: dict[str, str] = {}
    for key in wanted:
        if len(frame) < 3:
            not_fitted[key] = "fewer than three plugs"
            continue
        try:
            fits[key] = MODELS[key].fit(plugs)
        except Impossible as reason:
            not_fitted[key] = str(reason).split(": ", 1)[-1]
    order, reasons = ranked(fits)
    porosities = _porosities(plugs.porosity)
    caveats = _caveats(frame)
    units = rock_types.flow_units(rock_types.flow_zone_indicator_um(plugs.permeability, plugs.porosity))
    group = {
        "group": name,
        "plugs": len(frame),
        "porosity range [v/v]": [float(plugs.porosity.min()), float(plugs.porosity.max())],
        "flow units": _units(units, plugs),
        "flow unit criterion": rock_types.CRITERION,
        "not fitted": not_fitted,
        "caveats": caveats,
    }
    records = [
        {
            **_record(name, key, fits[key], plugs, porosities),
            "rank": place + 1,
            "preferred": place == 0 and MODELS[key].foresees and len(fits) > 1,
            "reason": reasons[key],
            "flow units": group["flow units"],
            "caveats": [*fits[key].caveats, *caveats],
        }
        for place, key in enumerate(order)
    ]
    return records, group


def error(left_out: Array) -> float:
    """Root mean square of left-out residuals [decades]; NaN where there are none."""
    known = left_out[np.isfinite(left_out)]
    return float(np.sqrt(np.mean(known**2))) if known.size else float("nan")


def ranked(fits: Mapping[str, Fitted]) -> tuple[list[str], dict[str, str]]:
    """The models, the preferred one first and the rest by their error on left-out plugs; and why.

    Preferred is the simplest of those whose squared errors on left-out plugs lie within one standard error
    of the least (the difference taken plug by plug): fewest parameters, then least squares before robust,
    then the least error. Models of errors in both variables describe how the two
    hang together and are not preferred for foreseeing; nor is one that could not use all plugs.
    """
    errors = {key: error(f.left_out) for key, f in fits.items()}
    order = sorted(fits, key=lambda k: (np.isnan(errors[k]), errors[k]))
    full = {k for k in order if fits[k].used.all() and np.isfinite(fits[k].left_out).all()}
    able = [k for k in order if k in full and MODELS[k].foresees]
    reasons: dict[str, str] = {}
    if not able:
        words = "too few plugs to leave one out"
        return order, dict.fromkeys(order, words)
    best = able[0]
    alike = [best]
    for key in able[1:]:
        gap = fits[key].left_out ** 2 - fits[best].left_out ** 2
        if np.mean(gap) <= np.std(gap, ddof=1) / np.sqrt(gap.size):
            alike.append(key)
    chosen = min(alike, key=lambda k: (len(fits[k].parameters), not MODELS[k].least_squares, errors[k]))
    order.remove(chosen)
    order.insert(0, chosen)
    for key in order:
        shown = f"{errors[key]:.3f} decades on left-out plugs"
        if key == chosen == best:
            reasons[key] = f"least error: {shown}"
        elif key == chosen:
            reasons[key] = f"simplest of those that foresee as well as {best} ({errors[best]:.3f}): {shown}"
        elif np.isnan(errors[key]):
            reasons[key] = "too few plugs to leave one out"
        elif key not in full:
            known, many = int(np.isfinite(fits[key].left_out).sum()), fits[key].used.size
            reasons[key] = f"on {known} of {many} plugs, not comparable: {shown}"
        elif not MODELS[key].foresees:
            reasons[key] = f"tells how the two hang together, not made to foresee: {shown}"
        elif key in alike and len(fits[key].parameters) > len(fits[chosen].parameters):
            reasons[key] = f"no better for its further parameters: {shown}"
        elif key in alike:
            reasons[key] = f"as good within the scatter: {shown}"
        else:
            reasons[key] = f"foresees worse: {shown}"
    return order, reasons


def _porosities(phi: Array) -> Array:
    """Round porosities across the range of the plugs, at most about fifteen."""
    low, high = float(phi.min()), float(phi.max())
    for step in (0.0025, 0.005, 0.01, 0.02, 0.05):
        first, last = np.ceil(low / step - 1e-9), np.floor(high / step + 1e-9)
        if 3 <= last - first + 1 <= 16:
            return np.asarray(np.round(np.arange(first, last + 1) * step, 6))
    return np.unique(np.linspace(low, high, 5))


def _record(name: str, key: str, fitted: Fitted, plugs: Plugs, porosities: Array) -> dict[str, Any]:
    fit = fitted.fit
    used = plugs.only(fitted.used)
    return {
        "model": key,
        "group": name,
        "plugs": int(fit.residuals.size),
        "parameters": fitted.parameters,
        "standard errors": fitted.standard_errors,
        "r squared": _finite(fit.r_squared),
        "residual standard deviation": _finite(fit.residual_sd),
        "degrees of freedom": fit.degrees_of_freedom,
        "equation": fitted.equation,
        "units": "k in mD, porosity in v/v, lg is log10",
        "method": MODELS[key].method,
        "leave-one-out error": _finite(error(fitted.left_out)),
        "corrected akaike criterion": _finite(trends.corrected_akaike(fit))
        if MODELS[key].least_squares
        else None,
        "prediction band": _band(fitted, porosities),
        "band by": fitted.band_by,
        "back-transformation": _back(key, fitted, used),
        "outlying plugs": _outlying(key, fit, used),
        **fitted.more,
    }


def _finite(value: Any) -> float | None:
    return float(value) if np.isfinite(value) else None


def _band(fitted: Fitted, phi: Array) -> list[dict[str, float | None]]:
    centre = fitted.centre(phi)
    low, high = fitted.band(phi) if fitted.band else (np.full(phi.size, np.nan),) * 2
    with np.errstate(over="ignore"):
        rows = zip(phi, 10.0**low, 10.0**centre, 10.0**high, strict=True)
    headings = (_PHI, "low [mD]", "permeability [mD]", "high [mD]")
    return [dict(zip(headings, (_finite(v) for v in row), strict=True)) for row in rows]


def _back(key: str, fitted: Fitted, plugs: Plugs) -> dict[str, Any]:
    """What the antilogarithm loses, shown with both remedies beside the measured mean."""
    residuals = np.real(fitted.fit.residuals)
    curve = 10.0 ** (np.log10(plugs.permeability) - residuals)
    duan, normal = float(duan_factor(residuals)), float(lognormal_factor(fitted.fit.residual_sd))
    p = trends.uneven_scatter_p(fitted.fit, plugs.porosity) if np.ptp(plugs.porosity) else float("nan")
    uneven = bool(p < _SIGNIFICANT)
    caveat = CAVEAT + ("; here the scatter changes with porosity, so they mislead" if uneven else "")
    return {
        "duan factor": duan,
        "log-normal factor": normal,
        "applied": False,
        "mean measured [mD]": float(plugs.permeability.mean()),
        "mean of the curve [mD]": float(curve.mean()),
        "mean of the curve times duan factor [mD]": float(curve.mean() * duan),
        "mean of the curve times log-normal factor [mD]": float(curve.mean() * normal),
        "scatter changes with porosity, p": _finite(p),
        "caveat": caveat,
    }


def _outlying(key: str, fit: trends.Fit, plugs: Plugs) -> list[str]:
    """Plugs farther from a least-squares fit than chance allows among so many (Bonferroni, 5 %)."""
    left = fit.degrees_of_freedom - 1
    if not MODELS[key].least_squares or left < 1:
        return []
    limit = float(stats.t.isf(_SIGNIFICANT / 2.0 / fit.residuals.size, left))
    far = np.abs(trends.studentised_residuals(fit)) > limit
    return [name for name, out in zip(plugs.name, far, strict=True) if out]


# -- rock types -------------------------------------------------------------------------------------------


def _units(units: rock_types.FlowUnits, plugs: Plugs) -> list[dict[str, Any]]:
    rows = []
    for number, indicator in enumerate(units.indicator_um.tolist(), start=1):
        member = units.unit == number
        rows.append(
            {
                "unit": number,
                "plugs": int(member.sum()),
                "flow zone indicator [um]": indicator,
                "porosity [v/v]": float(plugs.porosity[member].mean()),
                "geometric mean permeability [mD]": float(10 ** np.log10(plugs.permeability[member]).mean()),
            }
        )
    return rows


def rock_type_table(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    filters: select.Filters,
    percentile: int = 35,
) -> pd.DataFrame:
    """Rock types of each plug that has porosity and permeability.

    Throat radii take the gas permeability, which their authors did not correct for slip; where only the
    Klinkenberg permeability is known they take that, and `throats by` says so. Lucia's numbers stand for
    carbonates, and for plugs that are not described.
    """
    if percentile not in rock_types.PITTMAN:
        known = ", ".join(map(str, rock_types.PITTMAN))
        raise Usage(f"--percentile is one of {known}; found {percentile}.")
    frame, left_out = _usable(connection, identities, well, filters)
    if not len(frame):
        why = "; ".join(f"{count} {reason}" for reason, count in left_out.items())
        raise NotFound(f"No plug of {quoted(well)} has porosity and permeability for rock types ({why}).")
    phi, k = frame[_PHI].to_numpy(dtype=np.float64), frame[_K].to_numpy(dtype=np.float64)
    gas = frame[_GAS_K].to_numpy(dtype=np.float64)
    by_gas = gas > 0.0
    throats = np.where(by_gas, gas, k)
    indicator = rock_types.flow_zone_indicator_um(k, phi)
    r35 = rock_types.winland_r35_um(throats, phi)
    pittman = rock_types.pittman_radii_um(throats, phi)
    lithology = frame["lithology"]
    fits_lucia = ((lithology == "") | lithology.str.contains(_CARBONATE)).to_numpy(dtype=np.bool_)
    fabric = np.where(fits_lucia, rock_types.rock_fabric_number(k, phi), np.nan)
    depth = next(c for c in frame.columns if c.startswith("depth ["))
    units = rock_types.flow_units(indicator).unit
    return frame[["plug", depth, "facies", _PHI, _K]].assign(
        **{
            "reservoir quality index [um]": rock_types.reservoir_quality_index_um(k, phi),
            "flow zone indicator [um]": indicator,
            "flow unit": units.astype(object),
            "winland r35 [um]": r35,
            "throat class": rock_types.throat_class(r35),
            f"pittman r{percentile} [um]": pittman.at(percentile),
            "throats by": np.where(by_gas, "gas permeability", "klinkenberg permeability"),
            "pittman holds": np.where(pittman.rising, "no", "yes"),
            "rock fabric number": fabric,
            "lucia class": rock_types.lucia_class(np.where(fabric > 0.0, fabric, np.nan)),
        }
    )
