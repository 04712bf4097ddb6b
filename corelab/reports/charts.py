"""Charts for screen and paper, from one description each."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from corelab.errors import NotFound, Unavailable, Usage

if TYPE_CHECKING:
    import pandas as pd

INK, QUIET, ACCENT = "#26313A", "#8A8F94", "#9C4A1F"


def altair() -> Any:
    """The library that describes charts, or what to install."""
    try:
        import altair as drawn
    except ModuleNotFoundError as missing:
        raise Unavailable("Charts need the package altair: install corelab[charts].") from missing
    drawn.data_transformers.disable_max_rows()
    return drawn


def save(chart: Any, path: Path) -> None:
    """Write a chart as a page that needs no network (.html) or as a picture (.svg, .png).

    Raises
    ------
    Usage
        For another ending.
    """
    from corelab.formats.tables_out import write_bytes

    ending = path.suffix.lower()
    if ending not in {".html", ".svg", ".png"}:
        raise Usage(f"Charts are written as .html, .svg or .png, not '{path.name}'.")
    try:
        import vl_convert
    except ModuleNotFoundError as missing:
        raise Unavailable("Charts need the package vl-convert-python: install corelab[charts].") from missing
    description = chart.to_json(indent=None)
    if ending == ".html":
        content = vl_convert.vegalite_to_html(description, bundle=True).encode()
    elif ending == ".svg":
        content = vl_convert.vegalite_to_svg(description).encode()
    else:
        content = vl_convert.vegalite_to_png(description, scale=2)
    write_bytes(path, content)


def control_charts(checks: pd.DataFrame) -> Any:
    """A chart of individuals and one of moving ranges for each instrument, standard and result."""
    if not len(checks):
        raise NotFound("No check standard with a certified value was measured: there is nothing to draw.")
    alt = altair()
    columns = [
        "day", "value", "centre", "lower", "upper", "certified", "moving_range", "range_upper", "good",
        "rules", "why",
    ]  # fmt: skip
    drawn = []
    for (instrument, standard, result), part in checks.groupby(
        ["instrument", "standard", "result"], sort=False
    ):
        rows = part[columns].assign(check=range(1, len(part) + 1))
        base = alt.Chart(rows, width=460, height=170).encode(
            x=alt.X("check:O", title="check", axis=alt.Axis(labelAngle=0))
        )
        unit = part["unit"].iloc[0]
        scale = alt.Scale(zero=False)
        value = alt.Y("value:Q", title=f"{result} [{unit}]", scale=scale)
        line = base.mark_line(color=QUIET).encode(y=value)
        points = base.mark_point(filled=True, size=60).encode(
            y=value,
            color=alt.condition("datum.good", alt.value(INK), alt.value(ACCENT)),
            shape=alt.condition("datum.good", alt.value("circle"), alt.value("triangle-up")),
            tooltip=["day", "value", "certified", "rules", "why"],
        )
        rules = [
            base.mark_rule(color=colour, strokeDash=dash).encode(y=alt.Y(f"{name}:Q", scale=scale))
            for name, colour, dash in (
                ("centre", INK, [1, 0]),
                ("lower", ACCENT, [6, 3]),
                ("upper", ACCENT, [6, 3]),
                ("certified", QUIET, [2, 2]),
            )
        ]
        ranges = alt.Chart(rows, width=460, height=80).encode(x=alt.X("check:O", title=None))
        moving = alt.Y("moving_range:Q", title=f"range [{unit}]")
        below = alt.layer(
            ranges.mark_line(color=QUIET).encode(y=moving),
            ranges.mark_point(filled=True, color=INK).encode(y=moving, tooltip=["day", "moving_range"]),
            ranges.mark_rule(color=ACCENT, strokeDash=[6, 3]).encode(y="range_upper:Q"),
        )
        title = f"{instrument}: {result} of {standard} (limits from {part['limits'].iloc[0]})"
        drawn.append(alt.vconcat(alt.layer(line, *rules, points).properties(title=title), below))
    return alt.concat(*drawn, columns=2).configure(font="Arial")


def well_charts(results: pd.DataFrame) -> Any:
    """Results against depth and against each other; a stretch of depth drawn in one lights up in all."""
    alt = altair()
    depth = next(c for c in results.columns if c.startswith("depth ["))
    phi, k = "porosity [v/v]", "klinkenberg permeability [mD]"
    names = {depth: "depth", phi: "porosity", k: "permeability"}
    rows = results.rename(columns=names)[["plug", "facies", "source", "flags", *names.values()]]
    picked = alt.selection_interval(name="picked", encodings=["y"])
    base = (
        alt.Chart(rows)
        .mark_point(filled=True, size=45)
        .encode(
            color=alt.condition(picked, "facies:N", alt.value("#D9D3C5")),
            shape="source:N",
            tooltip=["plug", "facies", "source", "depth", "porosity", "permeability", "flags"],
        )
    )
    down = alt.Y("depth:Q", title=depth, scale=alt.Scale(reverse=True, zero=False))
    lg = alt.Scale(type="log")
    return alt.hconcat(
        base.encode(x=alt.X("porosity:Q", title=phi), y=down)
        .properties(width=200, height=420)
        .add_params(picked),
        base.transform_filter("datum.permeability > 0")
        .encode(x=alt.X("permeability:Q", title=k, scale=lg), y=down)
        .properties(width=200, height=420),
        base.transform_filter("datum.permeability > 0")
        .encode(x=alt.X("porosity:Q", title=phi), y=alt.Y("permeability:Q", title=k, scale=lg))
        .properties(width=340, height=420),
    )
