"""Printing trends."""

from __future__ import annotations

from typing import Any

import pandas as pd
import typer

from corelab.cli import show
from corelab.interval.trend import Trends

_DECIMALS = {
    "R2": 3,
    "scatter": 3,
    "left-out": 3,
    "AICc": 1,
    "porosity [v/v]": 4,
}


def print_trends(found: Trends) -> None:
    """Per group the models ranked, the preferred one with its band and what its antilogarithm loses."""
    echo = typer.echo
    for group in found.groups:
        records = [r for r in found.records if r["group"] == group["group"]]
        low, high = group["porosity range [v/v]"]
        plural = "" if group["plugs"] == 1 else "s"
        echo(f"{group['group']}: {group['plugs']} plug{plural}, porosity {low:.4f} to {high:.4f} v/v")
        if records:
            _models(records)
            _band(records[0])
            _back(records[0]["back-transformation"])
        if len(group["flow units"]) > 1:
            echo("\nflow units")
            show.print_table(pd.DataFrame(group["flow units"]), {"porosity [v/v]": 4})
        reasons = group["not fitted"]
        if not records:
            reasons = {"any model": next(iter(reasons.values()))}
        notes = [
            *(f"not fitted: {model}: {reason}" for model, reason in reasons.items()),
            *(
                f"far from {r['model']}: {', '.join(r['outlying plugs'])}"
                for r in records[:1]
                if r["outlying plugs"]
            ),
            *(f"{r['model']}: {c}" for r in records for c in r["caveats"] if c not in group["caveats"]),
            *group["caveats"],
        ]
        if notes:
            echo("")
        for note in notes:
            echo(f"- {note}")
        echo("")
    _shared(found.groups[0])


def _models(records: list[dict[str, Any]]) -> None:
    rows = [
        {
            "model": r["model"],
            "plugs": r["plugs"],
            "equation": r["equation"],
            "R2": r["r squared"],
            "scatter": r["residual standard deviation"],
            "left-out": r["leave-one-out error"],
            "AICc": r["corrected akaike criterion"],
            "why": r["reason"].split(": ")[0],
        }
        for r in records
    ]
    show.print_table(pd.DataFrame(rows), _DECIMALS, wrap="why")
    typer.echo("lg is log10, k in mD, phi in v/v; scatter and left-out errors in decades")
    for record in records:
        errors = record["standard errors"]
        shown = (
            f"{name} {show.significant(value, 6)}"
            + (f" ± {show.significant(errors[name], 3)}" if errors[name] is not None else "")
            for name, value in record["parameters"].items()
        )
        typer.echo(f"  {record['model']}: {', '.join(shown)}")


def _band(record: dict[str, Any]) -> None:
    typer.echo(f"\nband of {record['model']} ({record['band by']})")
    show.print_table(pd.DataFrame(record["prediction band"]), _DECIMALS)


def _back(back: dict[str, Any]) -> None:
    typer.echo(
        f"\nmean permeability: {show.significant(back['mean measured [mD]'])} mD measured, "
        f"{show.significant(back['mean of the curve [mD]'])} mD on the curve; factors not applied: "
        f"Duan {show.significant(back['duan factor'])}, log-normal "
        f"{show.significant(back['log-normal factor'])}\n{back['caveat']}"
    )


def _shared(group: dict[str, Any]) -> None:
    if group["groups differ"]:
        show.tell(f"By {group['groups differ']['by']}: {group['groups differ']['finding']}.")
    for reason, count in group["left out"].items():
        show.tell(f"Left out: {count} plug{'' if count == 1 else 's'}, {reason}.")
