"""Printing summaries of intervals."""

from __future__ import annotations

import math
from typing import Any

import pandas as pd
import typer

from corelab.cli import show

_STATISTICS = (
    "count", "minimum", "maximum", "arithmetic mean", "geometric mean", "harmonic mean", "median",
    "standard deviation", "coefficient of variation",
)  # fmt: skip


def print_summary(found: list[dict[str, Any]]) -> None:
    """Two tables of averages over the groups, then what else is to be said of each group."""
    for what, unit, decimals in (("porosity", "v/v", 4), ("klinkenberg permeability", "mD", -1)):
        rows = [
            {
                "group": r["group"],
                **{s: _shown(r[what][s], decimals if s != "count" else 0) for s in _STATISTICS},
            }
            for r in found
        ]
        typer.echo(f"{what} [{unit}], weights: {found[0]['weights']}")
        show.print_table(pd.DataFrame(rows))
        typer.echo("")
    depths = [key for key in found[0] if key.startswith(("top depth", "base depth"))]
    rows = [
        {
            "group": r["group"],
            "plugs": r["plugs"],
            **{key: _shown(r[key], 2) for key in depths},
            "Dykstra-Parsons": _shown(r["dykstra-parsons coefficient"], 4),
            "Lorenz": _shown(r["lorenz coefficient"], 4),
            "kv/kh": _shown(r["vertical to horizontal ratio"], 3),
            "pairs": r["vertical to horizontal pairs"],
            "kv/kh of layers": _shown(r["vertical to horizontal of layers"], -1),
            "flow capacity [mD.m]": _shown(r["flow capacity [mD.m]"], -1),
            "storage capacity [m]": _shown(r["storage capacity [m]"], -1),
            "net/gross": _shown(r["net to gross [v/v]"], 3),
            "pay/gross": _shown(r["pay to gross [v/v]"], 3),
        }
        for r in found
    ]
    show.print_table(pd.DataFrame(rows))
    first = found[0]
    cuts = first["cut-offs"]
    typer.echo("")
    for line in (
        f"Dykstra-Parsons: {first['dykstra-parsons convention']}.",
        "Lorenz: sorted by permeability over porosity.",
        f"kv/kh: {first['vertical to horizontal convention']}.",
        f"lengths, for capacities and net to gross: {first['length rule']}.",
        f"net: porosity from {cuts['porosity [v/v]']:g} v/v and permeability from "
        f"{cuts['klinkenberg permeability [mD]']:g} mD; pay: water saturation to "
        f"{cuts['water saturation [v/v]']:g} v/v besides.",
    ):
        typer.echo(f"- {line}")
    for r in found:
        _more(r)


def _more(r: dict[str, Any]) -> None:
    k, phi = r["klinkenberg permeability"], r["porosity"]
    lines = []
    if phi.get("confidence"):
        low, high = phi["confidence"]["arithmetic mean"]
        lines.append(f"arithmetic mean porosity {low:.4f} to {high:.4f} v/v at 95 % (resampling)")
    if k.get("confidence") and "geometric mean" in k["confidence"]:
        low, high = k["confidence"]["geometric mean"]
        lines.append(f"geometric mean permeability {low:.3g} to {high:.3g} mD at 95 % (resampling)")
    if k.get("variation"):
        lines.append(
            f"permeability is {k['variation']}: {math.ceil(k['samples for 20 %'])} samples give the "
            f"arithmetic mean to 20 %, these {k['count']} give it to {k['tolerance of the mean [%]']:.0f} %"
        )
    kinds = [f"{k[w]} {w}" for w in ("zero", "below detection", "above limit", "not measured") if k[w]]
    if kinds:
        method = f" ({k['below detection taken as']})" if k["below detection taken as"] else ""
        texture = r["left out"]["permeability from texture"]
        estimated = f"; {texture} of them estimated from texture, which never counts" if texture else ""
        lines.append(f"permeability: {', '.join(kinds)}{method}{estimated}")
    if k["above limit"]:
        lines.append("permeabilities above a limit are taken at it: means and spread are too low")
    if r["dykstra-parsons confidence"]:
        low, high = r["dykstra-parsons confidence"]
        lines.append(f"Dykstra-Parsons {low:.3f} to {high:.3f} at 95 % (resampling)")
    for what in ("net", "pay"):
        share = r[f"{what} to gross [v/v]"]
        moved = [s[f"{what} to gross [v/v]"] for s in r["net to gross sensitivity"]]
        shares = [m for m in moved if m is not None]
        if share is not None and shares:
            water = "" if what == "net" else ", water saturation x0.5 to x1.5"
            lines.append(
                f"{what} to gross {share:.3f} on {r[f'{what} rests on']} plugs; {min(shares):.3f} to "
                f"{max(shares):.3f} as one cut-off moves: porosity x0.5 to x1.5, "
                f"permeability x0.1 to x10{water}"
            )
    hidden = r["vertical plugs below or above a limit, in no ratio"]
    if hidden:
        lines.append(f"kv/kh: {hidden} vertical plugs below or above a limit are in no ratio")
    if r["without depth"]:
        lines.append(f"{r['without depth']} plugs without a depth stand for no length")
    out = r["left out"]
    if out["plugs"]:
        why = "; ".join(f"{count} {reason}" for reason, count in out["why"].items())
        lines.append(f"left out: {why}")
    if out["difference"]:
        with_, without = out["difference"]["with"], out["difference"]["without"]
        lines.append(
            "with them: "
            f"porosity {_shown(with_['porosity arithmetic mean'], 4)} for "
            f"{_shown(without['porosity arithmetic mean'], 4)} v/v, permeability "
            f"{_shown(with_['klinkenberg permeability geometric mean'], -1)} for "
            f"{_shown(without['klinkenberg permeability geometric mean'], -1)} mD (geometric mean)"
        )
    typer.echo(f"\n{r['group']}:")
    for line in lines:
        typer.echo(f"- {line}")


def _shown(value: float | None, decimals: int) -> str:
    """A number with so many decimals; three significant digits for -1."""
    if value is None:
        return ""
    return f"{value:.{decimals}f}" if decimals >= 0 else f"{value:.4g}"
