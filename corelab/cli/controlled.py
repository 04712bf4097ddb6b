"""Control charts on a terminal."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import typer

from corelab.cli import show
from corelab.control.charts import WORDS

if TYPE_CHECKING:
    import pandas as pd

_WIDTH = 41
_DECIMALS = {
    "bias": 5, "e_n": 2, "mean bias [%]": 3, "repeatability [%]": 3, "pooled repeatability [%]": 3,
}  # fmt: skip


def print_control(found: dict[str, pd.DataFrame], *, charts_too: bool) -> None:
    """The state of instruments in a table; with `charts_too`, every chart check by check."""
    for title in (
        "instruments", "standards", "charts", "precision", "between instruments", "duplicates",
    ):  # fmt: skip
        frame = found.get(title)
        if frame is None or not len(frame):
            continue
        typer.echo(f"{title}:")
        show.print_table(frame.drop(columns="limits", errors="ignore"), _DECIMALS, wrap="why")
        typer.echo()
    checks = found["checks"]
    if not len(checks):
        typer.echo("No check standard with a certified value was measured.")
        return
    if not charts_too:
        bad = checks[~checks["good"].astype(bool) & checks["why"].ne("")]
        for row in bad.to_dict("records")[-20:]:
            typer.echo(
                f"{row['day']}  {row['instrument']}  {row['result']} of {row['standard']}: {row['why']}"
            )
        return
    for (instrument, standard, result, _), part in checks.groupby(
        ["instrument", "standard", "result", "calibrated"], sort=False
    ):
        last = part.iloc[-1]
        typer.echo(
            f"{instrument}: {result} of {standard} [{last['unit']}], centre {last['centre']:.6g}, limits "
            f"{last['lower']:.6g} to {last['upper']:.6g} (from {last['limits']}), certified "
            f"{last['certified']:.6g}" + (f"; calibrated {last['calibrated']}" if last["calibrated"] else "")
        )
        for row in part.to_dict("records"):
            mark = "" if row["good"] else f"  {row['why']}"
            looks = [WORDS[t] for t in row["rules"].split(", ") if t and WORDS[t] not in row["why"]]
            also = f"  (worth a look: {'; '.join(looks)})" if looks else ""
            line = f"  {row['day']}  {row['value']:>11.6g}  {_line(row)}{mark}{also}"
            typer.echo(line.rstrip())
        typer.echo()


def _line(row: dict[Any, Any]) -> str:
    """A check on a line from limit to limit: the centre as a colon, the value as o, or x where it is bad."""
    span = row["upper"] - row["lower"]
    cells = [" "] * _WIDTH
    low, high = _WIDTH // 6, _WIDTH - 1 - _WIDTH // 6
    cells[low], cells[high], cells[_WIDTH // 2] = "[", "]", ":"
    if span > 0:
        place = low + (row["value"] - row["lower"]) / span * (high - low)
        at = min(max(round(place), 0), _WIDTH - 1)
        cells[at] = "o" if row["good"] else "x"
    return "".join(cells)
