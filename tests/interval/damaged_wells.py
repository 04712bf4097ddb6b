"""Wells simulated from a declared law of damage, to hold the likelihood against truth: simulated, not real.

The law. Beds 2 to 5 m thick of a soft and a hard sand in turn: porosity of a bed wanders about 0.29 and 0.15
(sd 0.012 from bed to bed, 0.012 within), log10 k = a + b porosity + scatter (soft 13 decades per unit of
porosity and 0.15 decades, hard 17 and 0.20). A share of the percussion plugs is damaged: soft ones compacted
(two of three: porosity less 0.025 to 0.07, permeability along the trend and times 0.4 to 0.9) or loosened
(porosity more by 0.025 to 0.06, permeability times 1 to 1.5), hard ones shattered (porosity more by 0.021 to
0.05, permeability times 3 to 30). Sound percussion plugs change by nothing.

What is seen: porosity to 0.005, log10 k to 0.03, a density log with 0.02 g/cm3 of noise a sample (every
0.1524 m) over 0.4 m of rock in situ (0.015 less porosity in the soft sand), conditions of which one in seven
is wrong and three in ten of the damaged ones are missed, firmness of which one in ten is wrong. Matching
leaves core depths off by 0.1 m (sd).
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from corelab.interval.impact import DensityLog, Evidence
from corelab.science.impact import kozeny_carman_change_decades

LOOKS = {"compacted": "powdered", "loosened": "crumbled", "shattered": "cracked"}
MARKS = ("powdered", "crumbled", "cracked", "chipped")


@dataclass(frozen=True)
class Simulated:
    """What the laboratory would hold, and the truth of each percussion plug in its order."""

    evidence: Evidence
    damaged: NDArray[np.bool_]
    kind: NDArray[np.str_]
    log_depth_m: NDArray[np.float64]  # true, of every plug
    gamma_gapi: NDArray[np.float64]  # of the log, at its depths
    core_gamma: NDArray[np.float64]  # (n, 2): driller's depth and reading
    shift_m: float  # log depth less driller's depth of the core


@dataclass(frozen=True)
class Law:
    """How a well is made; the defaults are the declared law, other values ask how far it holds."""

    percussion: int = 60
    core: int = 120
    rotary: int = 12
    rate: float = 0.35
    porosity: tuple[float, float] = (0.29, 0.15)  # soft, hard
    between_beds: float = 0.012
    within_beds: float = 0.012
    scatter: tuple[float, float] = (0.15, 0.20)  # decades
    #: Permeability of compacted plugs: along the trend, or as porosity alone takes after Kozeny and Carman.
    along_trend: bool = True
    crushed: tuple[float, float] = (0.4, 0.9)
    loosened: tuple[float, float] = (1.0, 1.5)
    shattered: tuple[float, float] = (3.0, 30.0)
    log_noise_g_cm3: float = 0.02
    seen: float = 0.7
    wrong_words: float = 0.15
    any_word: bool = False
    named: bool = True
    touched_frac: float = 0.0
    core_depth_error_m: float = 0.1
    core_share: float = 0.6  # of the height in which plugs were shot
    twins: bool = False  # each rotary plug is drilled within 0.1 m of a shot


def simulate(seed: int, law: Law | None = None) -> Simulated:
    law = law or Law()
    rng = np.random.default_rng(seed)
    top, length = 2500.0, 80.0
    step = 0.05
    z = np.arange(top - 10, top + length + 10, step)
    soft, phi = np.empty(z.size, bool), np.empty(z.size)
    at, turn = 0, bool(rng.integers(2))
    while at < z.size:
        end = min(at + int(rng.uniform(2, 5) / step), z.size)
        soft[at:end] = turn
        bed = law.porosity[0 if turn else 1] + rng.normal(0, law.between_beds)
        phi[at:end] = bed + rng.normal(0, law.within_beds, end - at)
        at, turn = end, not turn
    in_situ = phi - np.where(soft, 0.015, 0.003)
    rho = 2.65 * (1 - in_situ) + 1.02 * in_situ
    log_z = np.arange(z[0] + 1, z[-1] - 1, 0.1524)
    log_rho = np.interp(log_z, z, np.convolve(rho, np.ones(8) / 8, "same"))
    log_rho += rng.normal(0, law.log_noise_g_cm3, log_z.size)

    n = law.percussion + law.core + law.rotary
    sources = ["percussion sidewall", "core", "rotary sidewall"]
    source = np.repeat(np.array(sources, object), [law.percussion, law.core, law.rotary])
    shot = source != "core"
    depth = rng.uniform(top, top + length, n)
    core_top = top + 0.5 * (1 - law.core_share) * length
    spaced = np.linspace(core_top, core_top + law.core_share * length, law.core)
    depth[~shot] = spaced + rng.uniform(-0.05, 0.05, law.core)
    if law.twins:
        beside = rng.uniform(-0.1, 0.1, law.rotary)
        depth[source == "rotary sidewall"] = depth[: law.rotary] + beside
    place = np.clip(np.searchsorted(z, depth), 0, z.size - 1)
    is_soft, true = soft[place], phi[place].copy()
    a, b = np.where(is_soft, -0.9, -2.6), np.where(is_soft, 13.0, 17.0)
    log_k = a + b * true + rng.normal(0, np.where(is_soft, *law.scatter))
    percussion = source == "percussion sidewall"
    hit = percussion & (rng.random(n) < law.rate)
    if_soft = np.where(rng.random(n) < 2 / 3, "compacted", "loosened")
    kind = np.where(~hit, "none", np.where(is_soft, if_soft, "shattered"))
    sizes = {"compacted": (-0.07, -0.025), "loosened": (0.025, 0.06), "shattered": (0.021, 0.05)}
    for name, size in sizes.items():
        here = kind == name
        change = rng.uniform(*size, n)[here]
        factors = {"compacted": law.crushed, "loosened": law.loosened, "shattered": law.shattered}[name]
        log_k[here] += rng.uniform(*np.log10(factors), n)[here]
        if name == "compacted":
            alone = kozeny_carman_change_decades(true[here], true[here] + change)
            log_k[here] += b[here] * change if law.along_trend else alone
        true[here] += change
    touched = percussion & ~hit
    true[touched] += rng.normal(0, 1, n)[touched] * law.touched_frac

    words = np.array([LOOKS.get(k, "intact") for k in kind], object)
    words[hit & (rng.random(n) > law.seen)] = "intact"
    if law.any_word:
        marked = words != "intact"
        words[marked] = rng.choice(MARKS, n)[marked]
    wrong = (rng.random(n) < law.wrong_words) & (shot | (rng.random(n) < 0.3))
    words[wrong] = rng.choice(MARKS, n)[wrong]
    firmness = np.where(is_soft, "friable", "hard").astype(object)
    odd = rng.random(n) < 0.1
    firmness[odd] = rng.choice(["loose", "friable", "firm", "hard"], n)[odd]
    names = np.where(is_soft, "bar sand", "quartzitic sand") if law.named else np.full(n, "")
    evidence = Evidence(
        source=source,
        depth_m=np.where(shot, depth, depth + rng.normal(0, law.core_depth_error_m)),
        facies=names.astype(object),
        horizontal=np.ones(n, bool),
        duplicate=np.zeros(n, bool),
        porosity_frac=true + rng.normal(0, 0.005, n),
        grain_density_g_cm3=2.65 + rng.normal(0, 0.006, n),
        log_permeability=log_k + rng.normal(0, 0.03, n),
        reason_permeability=np.full(n, "", object),
        firmness=firmness,
        condition=words,
        sorting_phi=np.where(is_soft, 0.5, 0.8),
        fines_frac=np.full(n, np.nan),
        log=DensityLog(log_z, log_rho, np.zeros(log_z.size, bool)),
    )
    shale = np.convolve(rng.normal(0, 60, z.size), np.hanning(30) / np.hanning(30).sum(), "same")
    gamma = np.where(soft, 35.0, 60.0) + shale
    gamma_log = np.interp(log_z, z, np.convolve(gamma, np.ones(6) / 6, "same"))
    gamma_log += rng.normal(0, 1.5, log_z.size)
    shift = float(rng.uniform(-2.5, 2.5))
    scanned = np.arange(core_top - 1, core_top + law.core_share * length + 1, 0.1)
    read = 0.9 * np.interp(scanned, z, np.convolve(gamma, np.ones(3) / 3, "same")) + 4
    read = np.maximum(read + rng.normal(0, 2.5, scanned.size), 0.0)
    return Simulated(
        evidence,
        hit[percussion],
        kind[percussion].astype(str),
        depth,
        gamma_log,
        np.stack([scanned - shift, read], axis=1),
        shift,
    )


def write_sheets(well: Simulated, name: str, folder: Path) -> Path:
    """Bench sheets of a simulated well, as a technician would have filled them in, and its log as LAS.

    Returns
    -------
    Path
        The log; the sheets lie in `folder / "bench"`.
    """
    bench = folder / "bench"
    bench.mkdir(parents=True, exist_ok=True)
    e = well.evidence
    core = e.source == "core"
    names = [f"{'C' if c else 'S'}{i}" for i, c in enumerate(core)]
    # what is shot is measured smaller
    length, diameter = np.where(core, 50.0, 30.0), np.where(core, 38.0, 24.0)
    bulk = np.pi / 4 * diameter**2 * length / 1000
    grain = bulk * (1 - e.porosity_frac)
    drilled = well.log_depth_m - well.shift_m

    def put(kind: str, rows: list[dict[str, object]]) -> None:
        pd.DataFrame(rows).to_csv(bench / f"{kind}.csv", index=False)

    ids = [{"well": name, "plug": p} for p in names]
    put("jobs", [{"job": "simulated", "laboratory": "simulated"}])
    put("wells", [{"well": name, "job": "simulated", "depth unit": "m"}])
    top, base = well.core_gamma[0, 0], well.core_gamma[-1, 0]
    cut = {"top depth [m]": top, "base depth [m]": base, "recovered length [m]": base - top}
    put("core runs", [{"well": name, "run": "1", **cut}])
    tools = np.where(e.source == "percussion sidewall", "percussion", "rotary")
    shots = [
        {"well": name, "gun run": t, "shot": i, "depth [m]": round(z, 3), "tool": t, "outcome": "recovered"}
        for i, (t, z, c) in enumerate(zip(tools, well.log_depth_m, core, strict=True))
        if not c
    ]
    put("sidewall shots", shots)
    plugs: list[dict[str, object]] = []
    for i, row in enumerate(ids):
        from_core = {"from": "core", "run": "1", "depth [m]": round(drilled[i], 3)}
        from_wall = {"from": "sidewall", "gun run": tools[i], "shot": f"{i}"}
        from_wall["depth [m]"] = round(well.log_depth_m[i], 3)
        plugs.append(row | {"facies": e.facies[i]} | (from_core if core[i] else from_wall))
    put("plugs", plugs)
    put(
        "descriptions",
        [
            row | {"lithology": "sandstone", "firmness": f, "condition": c}
            for row, f, c in zip(ids, e.firmness, e.condition, strict=True)
        ],
    )
    sizes = zip(ids, length, diameter, strict=True)
    put("dimensions", [row | {"length 1 [mm]": a, "diameter 1 [mm]": d} for row, a, d in sizes])
    mass = np.round(grain * e.grain_density_g_cm3, 4)
    put("masses", [row | {"condition": "dry", "mass [g]": m} for row, m in zip(ids, mass, strict=True)])
    volume = zip(ids, np.round(grain, 4), strict=True)
    put("grain volume", [row | {"instrument": "POR", "grain volume [cm3]": v} for row, v in volume])
    put(
        "reported permeability",
        [
            row | {"permeameter": "PD", "klinkenberg permeability [mD]": f"{10.0**k:.5g}"}
            for row, k in zip(ids, e.log_permeability, strict=True)
        ],
    )
    put(
        "core gamma",
        [
            {"well": name, "run": "1", "depth [m]": round(z, 2), "gamma [gAPI]": round(g, 1)}
            for z, g in well.core_gamma
        ],
    )
    assert e.log is not None
    z = e.log.depth_m
    lines = [
        "~Version", "VERS. 2.0 :", "WRAP. NO :", "~Well", f"STRT.M {z[0]:.4f} :", f"STOP.M {z[-1]:.4f} :",
        f"STEP.M {z[1] - z[0]:.4f} :", "NULL. -999.25 :", f"WELL. {name} :", "~Curve", "DEPT.M :",
        "GR.GAPI : gamma ray", "RHOB.G/C3 : bulk density", "~ASCII",
    ]  # fmt: skip
    columns = zip(z, well.gamma_gapi, e.log.density_g_cm3, strict=True)
    lines += [f"{d:.4f} {g:.3f} {r:.4f}" for d, g, r in columns]
    path = folder / f"{name}.las"
    path.write_text("\n".join([*lines, ""]), encoding="ascii")
    return path


def without(evidence: Evidence, *what: str) -> Evidence:
    """The same well without its log, descriptions, `core` and rotary plugs, or `rotary` ones only."""
    n = len(evidence)
    if "log" in what:
        evidence = replace(evidence, log=None)
    if "descriptions" in what:
        empty = np.full(n, "", object)
        evidence = replace(evidence, condition=empty, firmness=empty, sorting_phi=np.full(n, np.nan))
    if "core" in what or "rotary" in what:
        gone = ["core", "rotary sidewall"] if "core" in what else ["rotary sidewall"]
        kept = ~np.isin(evidence.source, gone)
        columns = {name: getattr(evidence, name)[kept] for name in Evidence.__slots__ if name != "log"}
        evidence = Evidence(**columns, log=evidence.log)
    return evidence
