"""Tying core to logs: the shift at which a run's own measurement follows the log best.

Depths are in metres; shift is log depth minus driller's depth, positive where the core lies deeper on the
log. The likelihood of a shift is that of a straight line (gain, offset) between what the core shows and what
the log shows there, so neither needs to be calibrated against the other.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from corelab.science.formula import Array

#: Vertical resolution to which core and log are brought [m], the standard deviation of a Gaussian: logs
#: resolve 0.3 to 0.6 m (common practice).
COMMON_RESOLUTION_M = 0.20
GRID_M = 0.02
#: Fewer samples than this say nothing of where a run lies.
FEWEST = 8
#: Log and core that differ by a squeeze within a run, and gridding, move a shift by about so much (assumed).
MODEL_ERROR_M = 0.02
# What is called certain; chosen on simulated wells, and held on others (see the tests).
LEAST_CORRELATION = 0.50
LEAST_PROBABILITY = 0.98
MOST_UNCERTAINTY_M = 0.06
NEAR_M = 0.25
#: Plugs are points where a log smears over beds: shifts by plugs erred by twice the spread of their
#: likelihood on trial wells, so that this many of them are worth one sample (assumed).
POINTS = 4.0
#: A second peak whose correlation comes as near as this is as good: what sets them apart is noise (assumed).
NEARLY = 0.03


@dataclass(frozen=True, slots=True)
class Signal:
    """What a run of core shows along its depth.

    `sign` is 1 where core and log rise together, -1 where one falls as the other rises. `smooth` says
    whether the samples lie dense enough to be smoothed to the common resolution.
    """

    depth_m: Array
    values: Array
    sign: int = 1
    smooth: bool = True


@dataclass(frozen=True, slots=True)
class Match:
    """Where a run lies on the log.

    `probability` is that of lying within `NEAR_M` of the shift, given that it lies within the search;
    `second_shift_m` is the best shift beyond, with its correlation: NaN where there is none. `reason` says
    why a match is not certain.
    """

    shift_m: float
    uncertainty_m: float
    correlation: float
    probability: float
    second_shift_m: float
    second_correlation: float
    certain: bool
    reason: str


@dataclass(frozen=True, slots=True)
class _Scan:
    """Correlation and log-likelihood of every shift on the grid."""

    shifts: Array
    correlation: Array
    log_likelihood: Array
    samples: float


def smoothed(depth_m: ArrayLike, values: ArrayLike, resolution_m: float) -> Array:
    """Values smoothed with a Gaussian of standard deviation `resolution_m`; NaN left out of the mean."""
    z, v = np.asarray(depth_m, dtype=np.float64), np.asarray(values, dtype=np.float64)
    there = np.isfinite(v)
    made = np.full(v.shape, np.nan)
    if not there.any():
        return made
    order = np.argsort(z[there], kind="stable")
    zs, vs = z[there][order], v[there][order]
    low = np.searchsorted(zs, z - 4 * resolution_m)
    high = np.searchsorted(zs, z + 4 * resolution_m)
    for i in range(len(z)):
        near = zs[low[i] : high[i]]
        if len(near):
            w = np.exp(-0.5 * ((near - z[i]) / resolution_m) ** 2)
            made[i] = np.sum(w * vs[low[i] : high[i]]) / np.sum(w)
    return made


def _on_grid(depth_m: Array, values: Array, resolution_m: float) -> tuple[Array, Array]:
    """A log on an even grid, smoothed; NaN where it has a gap of more than a few resolutions."""
    there = np.isfinite(values) & np.isfinite(depth_m)
    z, v = depth_m[there], values[there]
    order = np.argsort(z, kind="stable")
    z, v = z[order], v[order]
    grid = np.arange(z[0], z[-1] + GRID_M / 2, GRID_M)
    even = np.interp(grid, z, v)
    half = int(np.ceil(4 * resolution_m / GRID_M))
    kernel = np.exp(-0.5 * (np.arange(-half, half + 1) * GRID_M / resolution_m) ** 2)
    weight = np.convolve(np.ones(len(grid)), kernel, mode="same")
    even = np.convolve(even, kernel, mode="same") / weight
    after = np.clip(np.searchsorted(z, grid), 1, len(z) - 1)
    gap = z[after] - z[after - 1]
    return grid, np.where(gap > max(1.0, 4 * resolution_m), np.nan, even)


def _scan(signal: Signal, log_depth_m: Array, log_values: Array, low: float, high: float) -> _Scan | None:
    z, v = signal.depth_m, signal.values
    there = np.isfinite(v) & np.isfinite(z)
    z, v = z[there], v[there]
    if len(v) < FEWEST or np.isfinite(log_values).sum() < FEWEST:
        return None
    order = np.argsort(z, kind="stable")
    z, v = z[order], v[order]
    if signal.smooth:
        v = smoothed(z, v, COMMON_RESOLUTION_M)
    if np.ptp(v) == 0:
        return None
    grid, log = _on_grid(log_depth_m, log_values, COMMON_RESOLUTION_M)
    shifts = np.round(np.arange(np.ceil(low / GRID_M), np.floor(high / GRID_M) + 1) * GRID_M, 6)
    at = z[None, :] + shifts[:, None]
    seen = np.interp(at, grid, np.nan_to_num(log), left=np.nan, right=np.nan)
    blind = np.interp(at, grid, np.isnan(log).astype(float), left=1.0, right=1.0) > 0
    seen = np.where(blind, np.nan, seen)
    known = np.isfinite(seen)
    count = known.sum(axis=1)
    enough = count >= np.maximum(FEWEST, 0.8 * len(v))
    safe = np.maximum(count, 1)
    x = np.where(known, seen, 0.0)
    y = np.where(known, v[None, :], 0.0)
    mx, my = x.sum(axis=1) / safe, y.sum(axis=1) / safe
    dx, dy = np.where(known, seen - mx[:, None], 0.0), np.where(known, v[None, :] - my[:, None], 0.0)
    sxx, syy, sxy = (dx**2).sum(axis=1), (dy**2).sum(axis=1), (dx * dy).sum(axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        r = signal.sign * sxy / np.sqrt(sxx * syy)
    r = np.where(enough & np.isfinite(r), r, -1.0)
    best = int(np.argmax(r))
    if r[best] <= 0:
        return None
    residual = dy[best] - dx[best] * (sxy[best] / sxx[best])
    effective = _independent(residual[known[best]])
    if not signal.smooth:
        effective = max(effective / POINTS, 3.0)
    kept = np.where(r > 0, r, 0.0)
    log_likelihood = -0.5 * max(effective - 2.0, 1.0) * np.log1p(-(np.minimum(kept, 0.999999) ** 2))
    return _Scan(shifts, r, np.where(r > -1.0, log_likelihood, -np.inf), effective)


def _independent(residual: Array) -> float:
    """How many independent samples neighbouring ones that err alike are worth.

    Errors are taken to lose their likeness exponentially with distance; n/(1 + 2 sum of correlations).
    """
    n = len(residual)
    e = residual - residual.mean()
    variance = float(np.mean(e**2))
    if n < 3 or variance <= 0:
        return float(n)
    total = 0.0
    for lag in range(1, min(n - 1, 40)):
        rho = float(np.mean(e[lag:] * e[:-lag])) / variance * (n - lag) / n
        if rho <= 0.05:
            break
        total += rho
    return float(max(n / (1.0 + 2.0 * total), 3.0))


def match_run(
    signals: Sequence[tuple[Signal, Array, Array]], low: float, high: float
) -> tuple[Match | None, _Scan | None]:
    """Match one run by itself.

    Parameters
    ----------
    signals
        What the core shows, each with the depths [m] and values of the log that shows the same.
    low, high
        Ends of the search [m].

    Returns
    -------
    Match or None
        None where nothing can be told. And the scan, for the joint choice.
    """
    scans = [s for s in (_scan(*signal, low, high) for signal in signals) if s is not None]
    if not scans:
        return None, None
    together = scans[0]
    if len(scans) > 1:
        weight = np.array([s.samples for s in scans])
        r = np.average([s.correlation for s in scans], axis=0, weights=weight)
        total = np.sum([s.log_likelihood for s in scans], axis=0)
        together = _Scan(together.shifts, r, total, float(weight.sum()))
    return _judged(together, together.log_likelihood), together


def _judged(scan: _Scan, log_likelihood: Array) -> Match | None:
    if not np.isfinite(log_likelihood).any():
        return None
    best = int(np.argmax(log_likelihood))
    weight = np.exp(log_likelihood - log_likelihood[best])
    weight /= weight.sum()
    near = np.abs(scan.shifts - scan.shifts[best]) <= NEAR_M + 1e-9
    probability = float(weight[near].sum())
    shift = float(np.sum(weight[near] * scan.shifts[near]) / weight[near].sum())
    spread = float(np.sqrt(np.sum(weight[near] * (scan.shifts[near] - shift) ** 2) / weight[near].sum()))
    uncertainty = float(np.hypot(spread, MODEL_ERROR_M))
    peak = np.zeros(len(log_likelihood), dtype=np.bool_)
    peak[1:-1] = (log_likelihood[1:-1] >= log_likelihood[:-2]) & (log_likelihood[1:-1] > log_likelihood[2:])
    far = np.abs(scan.shifts - scan.shifts[best]) > 2 * NEAR_M
    other = np.where(peak & far, log_likelihood, -np.inf)
    second = int(np.argmax(other)) if np.isfinite(other).any() else -1
    correlation = float(scan.correlation[best])
    reasons = []
    if correlation < LEAST_CORRELATION:
        reasons.append(f"core and log agree poorly (correlation {correlation:.2f})")
    rival = second >= 0 and correlation - float(scan.correlation[second]) < NEARLY
    if probability < LEAST_PROBABILITY or rival:
        again = f", {scan.shifts[second]:+.2f} m fits nearly as well" if second >= 0 else ""
        reasons.append(f"ambiguous{again}")
    if uncertainty > MOST_UNCERTAINTY_M:
        reasons.append(f"the peak is broad (standard uncertainty {uncertainty:.2f} m)")
    if best in (0, len(scan.shifts) - 1):
        reasons.append("the best shift lies at the end of the search")
    return Match(
        shift,
        uncertainty,
        correlation,
        probability,
        float(scan.shifts[second]) if second >= 0 else float("nan"),
        float(scan.correlation[second]) if second >= 0 else float("nan"),
        not reasons,
        "; ".join(reasons),
    )


def match_runs(
    runs: Sequence[tuple[float, float, Sequence[tuple[Signal, Array, Array]]]],
    search_m: float = 5.0,
    slack_m: float = 0.1,
) -> list[Match | None]:
    """Match the runs of a well together: they keep their order and never overlap.

    Parameters
    ----------
    runs
        Of each run, from the top down: top and base [m] of what was recovered, and its signals.
    search_m
        Shifts up to this either way are tried.
    slack_m
        Depths of two runs may cross by this much, the error of lengths.

    Returns
    -------
    list
        A match a run, None where nothing can be told of it.

    Notes
    -----
    The most likely chain of shifts is found by a forward and a backward pass over the grids (dynamic
    programming on the sums of likelihoods, so that each run's likelihood is what is left of it beside all
    choices of the others). Own method.
    """
    scans = [match_run(signals, -search_m, search_m)[1] for _, _, signals in runs]
    used = [i for i, s in enumerate(scans) if s is not None]
    made: list[Match | None] = [None] * len(runs)
    forward: list[Array] = []
    for place, i in enumerate(used):
        scan = scans[i]
        assert scan is not None
        own = scan.log_likelihood.copy()
        if place:
            before = used[place - 1]
            own = own + _reach(
                scans[before], forward[-1], scan, runs[before][1], runs[i][0], slack_m, below=True
            )
        forward.append(own - np.max(own) if np.isfinite(own).any() else own)
    backward: list[Array] = [np.zeros(0)] * len(used)
    for place in range(len(used) - 1, -1, -1):
        i = used[place]
        scan = scans[i]
        assert scan is not None
        behind = np.zeros(len(scan.shifts))
        if place + 1 < len(used):
            after = used[place + 1]
            later = scans[after]
            assert later is not None
            behind = _reach(
                later, later.log_likelihood + backward[place + 1], scan, runs[i][1], runs[after][0], slack_m,
                below=False,
            )  # fmt: skip
        backward[place] = behind
        total = forward[place] + behind
        made[i] = _judged(scan, total if np.isfinite(total).any() else scan.log_likelihood)
    return made


def _reach(
    other: _Scan | None,
    weight: Array,
    scan: _Scan,
    upper_base: float,
    lower_top: float,
    slack_m: float,
    *,
    below: bool,
) -> Array:
    """Log of the summed likelihood of the other run's shifts that leave room for each shift of this one."""
    assert other is not None
    peak = np.max(weight)
    if not np.isfinite(peak):
        return np.zeros(len(scan.shifts))
    mass = np.exp(weight - peak)
    room = lower_top - upper_base + slack_m
    if below:  # this run is the lower one: the upper may shift by no more than this one and the room
        total = np.concatenate([[0.0], np.cumsum(mass)])
        allowed = np.searchsorted(other.shifts, scan.shifts + room + 1e-9, side="right")
        sums = total[allowed]
    else:
        total = np.concatenate([[0.0], np.cumsum(mass[::-1])])[::-1]
        allowed = np.searchsorted(other.shifts, scan.shifts - room - 1e-9, side="left")
        sums = total[allowed]
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(sums / mass.sum()))
