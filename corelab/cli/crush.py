"""Printing crush likelihoods, their evidence, and what verdicts of persons teach."""

from __future__ import annotations

import textwrap
from typing import Any

import typer

from corelab.cli import show

_ASSUMED = "an assumption: no share of damaged percussion plugs has been published"


def print_impact(rows: list[dict[str, Any]], *, blind: bool) -> None:
    """A table, then a paragraph a plug."""
    import pandas as pd

    from corelab.interval.impact import paragraph

    echo = typer.echo
    if not rows:
        echo("No core or rotary plugs." if blind else "No percussion plugs.")
        return
    unit = "ft" if "depth [ft]" in rows[0] else "m"
    depth = f"depth [{unit}]"
    frame = pd.DataFrame(
        [
            {
                "plug": row["plug"],
                depth: row[depth],
                "crush likelihood [v/v]": row["crush likelihood [v/v]"],
                "crush verdict": row["crush verdict"],
                "direction": row["direction"],
                "coverage": row["coverage"],
                "at prior 0.1": row["by prior"]["0.1"],
                "at 0.3": row["by prior"]["0.3"],
                "at 0.5": row["by prior"]["0.5"],
                "judged by persons": "; ".join(row["judged"]),
            }
            for row in rows
        ]
    )
    decimals = dict.fromkeys(frame.columns, 2)
    echo("\n".join(show.table(frame, decimals, wrap="judged by persons", room=show.room())[0]))
    echo()
    for row in rows:
        if not blind:
            echo(textwrap.fill(paragraph(row, unit, row[depth]), 110) + "\n")
    echo(f"Prior {rows[0]['prior']:g}: {_ASSUMED}. In brackets: what each finding adds to the log-odds.")
    if blind:
        alarms = sum(row["crush verdict"] == "likely" for row in rows)
        share = alarms / len(rows)
        echo(
            f"Judged blind, {alarms} of {len(rows)} plugs that no bullet touched are called likely "
            f"({share:.1%})."
        )


def print_recalibration(found: dict[str, Any], *, adopted: bool) -> None:
    echo = typer.echo
    echo(
        f"{found['verdicts']} percussion plugs judged by persons, {found['crushed']} of them crushed; "
        f"prior {found['prior']:g}."
    )
    for name, words in (
        ("as it is", "as it is"),
        ("recalibrated", f"recalibrated, leaving out {found['left out in turn']} in turn"),
    ):
        s = found[name]
        echo(
            f"{words}: Brier score {s['brier']:.3f} (base rate alone {s['base_brier']:.3f}), skill "
            f"{s['skill']:.2f} ({s['low']:.2f} to {s['high']:.2f}), area under the curve {s['auc']:.2f}, "
            f"mean {s['mean']:.2f} against {s['rate']:.2f} found."
        )
    if found["recalibrated"]["brier"] >= found["as it is"]["brier"]:
        echo("On plugs that it did not see, the recalibration is no better: leave things as they are.")
    if adopted:
        show.tell(f"Adopted: {found['setting']}. 'corelab setting \"crush recalibration\" none' undoes it.")
    else:
        echo(f"To adopt it ({found['setting']}): corelab recalibrate --adopt")
