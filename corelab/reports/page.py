"""The page that a partner receives: one file that opens by double click and asks nothing of any network.

The plots are drawn here as SVG, so that they print and show without a script; a short script of ours adds
brushing, hovering, sorting and filtering. A chart library would bring a megabyte, need `eval` and an install;
the page forbids both eval and every network request by its content security policy.
"""

from __future__ import annotations

import base64
import hashlib
import html
import json
import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from corelab.reports.workbook import WellReport, _number_format

Array = NDArray[np.float64]

_COLOURS = ("#2F6690", "#C07F1F", "#4C7A3D", "#7A4E8C", "#9C4A1F", "#4A5A66")
_SYMBOLS = ("circle", "square", "diamond", "triangle", "cross", "down")
LIKELY = "likely crushed"
_GAP, _TOP, _BOTTOM = 14, 46, 24
_HEIGHT = 620
_WIDTH = 1216


@dataclass(frozen=True, slots=True)
class Line:
    """A log curve beside the plugs: depths in the unit of the page, values in `unit`."""

    name: str
    unit: str
    depth: Array
    values: Array


@dataclass(frozen=True, slots=True)
class Fit:
    """A fitted trend with its band, in the units of the page."""

    name: str
    porosity: Array
    low: Array
    centre: Array
    high: Array


@dataclass(frozen=True, slots=True)
class Page:
    """What the page shows beside the report."""

    report: WellReport
    curves: Sequence[Line] = ()
    fits: Sequence[Fit] = ()
    summary: pd.DataFrame | None = None


def _name(heading: str) -> str:
    return heading.split(" [")[0]


def _column(frame: pd.DataFrame, name: str) -> str | None:
    return next((h for h in frame.columns if _name(h) == name), None)


def _values(frame: pd.DataFrame, name: str) -> Array:
    heading = _column(frame, name)
    if heading is None:
        return np.full(len(frame), np.nan)
    return pd.to_numeric(frame[heading], errors="coerce").to_numpy(dtype=np.float64)


def _safe(value: object) -> str:
    text = "".join(c for c in str(value) if c >= " " or c in "\n\t")
    return html.escape(text, quote=True)


def page_html(page: Page) -> str:
    """The whole page as text."""
    report = page.report
    results = report.results.reset_index(drop=True)
    series, looks = _series(results)
    depth_name, depth, depth_words = _depths(results, page.curves)
    style, script = _beside("page.css"), _beside("page.js")
    body = [
        _head(report),
        _bear_in_mind(report, results),
        '<section aria-labelledby="plots"><h2 id="plots">Plugs along the well</h2>',
        '<p class="hint">Drag over any plot to pick plugs out: the same plugs light up everywhere and in the '
        "table. A click on an empty place lets go. Rest on a plug to read it.</p>",
        _legend(looks),
        _depth_plot(results, depth, depth_words, series, looks, page.curves),
        "</section>",
        _cross_plot(results, series, looks, page.fits),
        _summary(page.summary),
        _table(results),
        _recovery(report),
        _methods(report),
        _cautions(report),
        '<div id="tip" role="status" aria-live="polite" hidden></div>',
    ]
    data = _json(
        {
            "columns": list(results.columns),
            "rows": [[_plain(v) for v in row] for row in results.itertuples(index=False)],
            "depth": depth_name,
        }
    )
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    policy = (
        "default-src 'none'; style-src 'unsafe-inline'; img-src data:; "
        f"script-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
    )
    title = f"Core analysis of well {report.well}"
    return (
        '<!DOCTYPE html>\n<html lang="en"><head><meta charset="utf-8">'
        f'<meta http-equiv="Content-Security-Policy" content="{policy}">'
        '<meta name="viewport" content="width=device-width, initial-scale=1">'
        f"<title>{_safe(title)}</title><style>{style}</style></head><body>\n"
        + "\n".join(body)
        + f'\n<script type="application/json" id="data">{data}</script>\n<script>{script}</script>\n'
        + "</body></html>\n"
    )


def _beside(name: str) -> str:
    return Path(__file__).with_name(name).read_text(encoding="utf-8")


def _json(value: object) -> str:
    text = json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    for mark in "<>&\u2028\u2029":
        text = text.replace(mark, f"\\u{ord(mark):04x}")
    return text


def _plain(value: Any) -> Any:
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value.item() if hasattr(value, "item") else value


# -- parts ------------------------------------------------------------------------------------------------


def _head(report: WellReport) -> str:
    shown = [
        (label, value)
        for label, value in report.cover.items()
        if value is not None and value == value and str(value).strip() and label != "well"
    ]
    items = "".join(
        f"<div><dt>{_safe(label)}</dt><dd>{_safe(f'{v:g}' if isinstance(v, float) else v)}</dd></div>"
        for label, v in shown
    )
    to = f'<p class="for">for {_safe(report.recipient)}</p>' if report.recipient.strip() else ""
    return (
        f"<header><p>Results of core analysis</p><h1>{_safe(report.well)}</h1>{to}<dl>{items}</dl></header>"
    )


def _bear_in_mind(report: WellReport, results: pd.DataFrame) -> str:
    sentences = list(report.remarks)
    crushed = int((results.get("crush verdict", pd.Series(dtype=object)) == "likely").sum())
    if crushed:
        sentences.insert(
            0, f"{crushed} percussion plugs are likely crushed: drawn hollow, and marked in the table."
        )
    sentences.append("Averages and fits leave likely crushed plugs out; tables and plots show them all.")
    items = "".join(f"<li>{_safe(s)}</li>" for s in sentences)
    return f"<section><h2>To bear in mind</h2><ul>{items}</ul></section>" if items else ""


def _series(results: pd.DataFrame) -> tuple[list[str], dict[str, tuple[str, str, bool]]]:
    """The series of each plug, and how each is drawn: colour, symbol, filled."""
    facies = results.get("facies", pd.Series("", index=results.index)).fillna("").astype(str)
    source = results.get("source", pd.Series("", index=results.index)).fillna("").astype(str)
    shot = source.str.contains("sidewall", regex=False)
    kinds = sorted(set(facies[~shot]) - {""})
    if not 1 <= len(kinds) <= 4:
        names = source.where(source != "", "plugs")
    else:
        names = facies.where(facies != "", "facies not stated").where(~shot, source)
    likely = results.get("crush verdict", pd.Series("", index=results.index)) == "likely"
    names = names.where(~likely, LIKELY)
    looks: dict[str, tuple[str, str, bool]] = {}
    for place, name in enumerate(sorted(set(names) - {LIKELY})):
        looks[name] = (_COLOURS[place % 6], _SYMBOLS[place % 6], True)
    if likely.any():
        looks[LIKELY] = ("#9C1F1F", "circle", False)
    return names.tolist(), looks


def _depths(results: pd.DataFrame, curves: Sequence[Line]) -> tuple[str, Array, str]:
    """Log depth where a log is drawn and known for most plugs, else the plugs' own."""
    own, log = _values(results, "depth"), _values(results, "log depth")
    heading = _column(results, "depth") or "depth"
    known = np.isfinite(log)
    if len(curves) and known.sum() >= 0.5 * max(len(log), 1):
        missing = int((~known & np.isfinite(own)).sum())
        words = f"log {heading}" + (f" ({missing} plugs without a log depth at their own)" if missing else "")
        return _column(results, "log depth") or heading, np.where(known, log, own), words
    return heading, own, heading


def _symbol(kind: str, x: float, y: float, r: float) -> str:
    if kind == "circle":
        return f"M{x - r:.1f},{y:.1f}a{r},{r} 0 1,0 {2 * r},0a{r},{r} 0 1,0 {-2 * r},0"
    if kind == "square":
        return f"M{x - r:.1f},{y - r:.1f}h{2 * r}v{2 * r}h{-2 * r}z"
    if kind == "diamond":
        d = 1.3 * r
        return f"M{x:.1f},{y - d:.1f}l{d:.1f},{d:.1f}l{-d:.1f},{d:.1f}l{-d:.1f},{-d:.1f}z"
    if kind == "triangle":
        return f"M{x:.1f},{y - 1.3 * r:.1f}l{1.2 * r:.1f},{2.1 * r:.1f}h{-2.4 * r:.1f}z"
    if kind == "down":
        return f"M{x:.1f},{y + 1.3 * r:.1f}l{1.2 * r:.1f},{-2.1 * r:.1f}h{-2.4 * r:.1f}z"
    w = 0.5 * r
    return (
        f"M{x - w:.1f},{y - r:.1f}h{2 * w:.1f}v{r - w:.1f}h{r - w:.1f}v{2 * w:.1f}h{w - r:.1f}v{r - w:.1f}"
        f"h{-2 * w:.1f}v{w - r:.1f}h{w - r:.1f}v{-2 * w:.1f}h{r - w:.1f}z"
    )


def _legend(looks: Mapping[str, tuple[str, str, bool]]) -> str:
    items = []
    for name, (colour, symbol, filled) in looks.items():
        fill = colour if filled else "none"
        mark = (
            f'<svg width="16" height="16" aria-hidden="true"><path d="{_symbol(symbol, 8, 8, 4.5)}" '
            f'fill="{fill}" stroke="{colour}" stroke-width="1.4"/></svg>'
        )
        items.append(f"<span>{mark}{_safe(name)}</span>")
    return f'<p class="legend">{"".join(items)}</p>'


@dataclass(frozen=True, slots=True)
class _Scale:
    """From values to places on the page; `log` on a logarithm."""

    low: float
    high: float
    start: float
    end: float
    log: bool = False

    def __call__(self, values: Array) -> Array:
        v = np.asarray(values, dtype=np.float64)
        if self.log:
            with np.errstate(divide="ignore", invalid="ignore"):
                v = np.log10(v)
            share = (v - math.log10(self.low)) / (math.log10(self.high) - math.log10(self.low))
        else:
            share = (v - self.low) / (self.high - self.low)
        return np.asarray(self.start + share * (self.end - self.start))

    def ticks(self, about: int) -> list[float]:
        if self.log:
            first, last = round(math.log10(self.low)), round(math.log10(self.high))
            leap = max(1, math.ceil((last - first) / about))
            return [10.0**p for p in range(first, last + 1, leap)]
        step = _round_step((self.high - self.low) / about)
        first = math.ceil(self.low / step - 1e-9)
        last = math.floor(self.high / step + 1e-9)
        return [round(n * step, 10) for n in range(first, last + 1)]


def _round_step(raw: float) -> float:
    power = 10.0 ** math.floor(math.log10(raw)) if raw > 0 else 1.0
    return next(power * part for part in (1.0, 2.0, 2.5, 5.0, 10.0) if power * part >= raw * 0.999)


def _scale(
    values: Array, start: float, end: float, *, log: bool = False, zero: bool = False
) -> _Scale | None:
    known = values[np.isfinite(values) & ((values > 0) | (not log))]
    if not len(known):
        return None
    low, high = float(known.min()), float(known.max())
    if log:
        bottom, top = math.floor(math.log10(low)), math.ceil(math.log10(high))
        return _Scale(10.0**bottom, 10.0 ** max(top, bottom + 1), start, end, True)
    if zero:
        low = min(low, 0.0)
    if high == low:
        low, high = low - 0.5, high + 0.5
    step = _round_step((high - low) / 6)
    return _Scale(math.floor(low / step) * step, math.ceil(high / step) * step, start, end)


def _tick_text(value: float) -> str:
    return f"{value:g}" if 1e-4 <= abs(value) < 1e6 or value == 0 else f"{value:.0e}"


def _points(
    x: Array,
    y: Array,
    series: Sequence[str],
    looks: Mapping[str, tuple[str, str, bool]],
    below: NDArray[np.bool_] | None = None,
) -> str:
    made = []
    for i in np.flatnonzero(np.isfinite(x) & np.isfinite(y)).tolist():
        colour, symbol, filled = looks[series[i]]
        at_limit = below is not None and below[i]
        kind, fill = ("down", "#F2C94C") if at_limit else (symbol, colour if filled else "none")
        made.append(
            f'<path class="p" data-i="{i}" data-x="{x[i]:.1f}" data-y="{y[i]:.1f}" '
            f'd="{_symbol(kind, float(x[i]), float(y[i]), 3.4)}" fill="{fill}" stroke="{colour}"/>'
        )
    return "".join(made)


def _below(results: pd.DataFrame) -> NDArray[np.bool_]:
    flags = results.get("flags", pd.Series("", index=results.index)).fillna("")
    return flags.str.contains("permeability (?:below|above) limit", regex=True).to_numpy(dtype=np.bool_)


def _depth_plot(
    results: pd.DataFrame,
    depth: Array,
    depth_words: str,
    series: Sequence[str],
    looks: Mapping[str, tuple[str, str, bool]],
    curves: Sequence[Line],
) -> str:
    known = depth[np.isfinite(depth)]
    if not len(known):
        return "<p>No plug has a depth to draw.</p>"
    pad = max(0.02 * float(np.ptp(known)), 0.5)
    inner = _HEIGHT - _TOP - _BOTTOM
    low, high = float(known.min()) - pad, float(known.max()) + pad
    vertical = _Scale(low, high, _TOP, _TOP + inner)
    panels: list[tuple[str, Any]] = []
    for line in curves:
        inside = (line.depth >= low) & (line.depth <= high) & np.isfinite(line.values)
        if inside.sum() > 1:
            panels.append(("curve", line))
    for name, log in (("porosity", False), ("klinkenberg permeability", True)):
        if np.isfinite(_values(results, name)).any():
            panels.append((name, log))
    if any(np.isfinite(_values(results, f"{f} saturation")).any() for f in ("oil", "water")):
        panels.append(("saturations", False))
    if np.isfinite(_values(results, "grain density")).any():
        panels.append(("grain density", False))
    if not panels:
        return "<p>There is nothing to draw along depth.</p>"
    left = 64
    width = (_WIDTH - left - _GAP * len(panels)) / len(panels)
    parts = [_depth_axis(vertical, depth_words, left)]
    y = vertical(depth)
    for place, (kind, what) in enumerate(panels):
        x0 = left + place * (width + _GAP)
        frame = (
            f'<rect class="frame" x="{x0:.1f}" y="{_TOP}" width="{width:.1f}" height="{inner}"/>'
            + "".join(
                f'<line class="grid" x1="{x0:.1f}" x2="{x0 + width:.1f}" y1="{v:.1f}" y2="{v:.1f}"/>'
                for v in vertical(np.array(vertical.ticks(12)))
            )
        )
        if kind == "curve":
            parts.append(frame + _curve(what, vertical, x0, width, low, high))
            continue
        columns = ["oil saturation", "water saturation"] if kind == "saturations" else [kind]
        values = [_values(results, c) for c in columns]
        scale = _scale(
            np.concatenate(values), x0 + 6, x0 + width - 6, log=bool(what), zero=kind != "grain density"
        )
        if scale is None:
            continue
        heading = _column(results, columns[0]) or columns[0]
        title = heading if kind != "saturations" else f"saturation {heading[heading.find('[') :]}"
        parts.append(frame + _across(scale, title, x0, width))
        if kind == "saturations":
            parts.append(
                f'<text class="note" x="{x0 + width - 4:.1f}" y="{_TOP + 12}" text-anchor="end">'
                "oil ▲ water ▼</text>"
            )
            for v, symbol, colour in ((values[0], "triangle", "#4C7A3D"), (values[1], "down", "#2F6690")):
                one = {name: (colour, symbol, look[2]) for name, look in looks.items()}
                parts.append(_points(scale(v), y, series, one))
        else:
            below = _below(results) if kind == "klinkenberg permeability" else None
            parts.append(_points(scale(values[0]), y, series, looks, below))
    return (
        f'<svg class="plot" data-kind="depth" viewBox="0 0 {_WIDTH} {_HEIGHT}" role="img" '
        f'aria-label="Results against depth">{"".join(parts)}'
        '<rect class="brush" width="0" height="0"/></svg>'
    )


def _depth_axis(vertical: _Scale, words: str, left: float) -> str:
    ticks = vertical.ticks(12)
    places = vertical(np.array(ticks))
    labels = "".join(
        f'<text x="{left - 6}" y="{p + 4:.1f}" text-anchor="end">{_tick_text(t)}</text>'
        for t, p in zip(ticks, places, strict=True)
    )
    middle = (vertical.start + vertical.end) / 2
    return (
        f'{labels}<text class="axis" transform="translate(14,{middle:.0f}) rotate(-90)" '
        f'text-anchor="middle">{_safe(words)}</text>'
    )


def _across(scale: _Scale, title: str, x0: float, width: float) -> str:
    ticks = scale.ticks(max(2, int(width // 60)))
    places = scale(np.array(ticks))
    return (
        f'<text class="axis" x="{x0 + width / 2:.1f}" y="14" text-anchor="middle">{_safe(title)}</text>'
        + "".join(
            f'<text x="{p:.1f}" y="{_TOP - 8}" text-anchor="{_anchor(p, x0, width)}">{_tick_text(t)}</text>'
            f'<line class="grid" x1="{p:.1f}" x2="{p:.1f}" y1="{_TOP}" y2="{_HEIGHT - _BOTTOM}"/>'
            for t, p in zip(ticks, places, strict=True)
        )
    )


def _anchor(place: float, x0: float, width: float) -> str:
    """Labels near an end of a panel lean inwards, so that they do not meet those of the next."""
    if place < x0 + 14:
        return "start"
    return "end" if place > x0 + width - 14 else "middle"


def _curve(line: Line, vertical: _Scale, x0: float, width: float, low: float, high: float) -> str:
    inside = (line.depth >= low) & (line.depth <= high)
    depth, values = line.depth[inside], line.values[inside]
    scale = _scale(values, x0 + 4, x0 + width - 4)
    if scale is None:
        return ""
    x, y = scale(values), vertical(depth)
    thin = max(1, len(x) // 1500)
    pieces, pen = [], "M"
    for a, b in zip(x[::thin], y[::thin], strict=True):
        if not np.isfinite(a):
            pen = "M"
            continue
        pieces.append(f"{pen}{a:.1f},{b:.1f}")
        pen = "L"
    title = f"{line.name} [{line.unit}]" if line.unit else line.name
    return _across(scale, title, x0, width) + f'<path class="log" d="{"".join(pieces)}"/>'


def _cross_plot(
    results: pd.DataFrame,
    series: Sequence[str],
    looks: Mapping[str, tuple[str, str, bool]],
    fits: Sequence[Fit],
) -> str:
    phi, k = _values(results, "porosity"), _values(results, "klinkenberg permeability")
    both = np.isfinite(phi) & (k > 0)
    if both.sum() < 2:
        return ""
    width, height, left, bottom, top = 820, 560, 70, 46, 12
    across = _scale(phi[both], left, width - 12, zero=True)
    up = _scale(k[both], height - bottom, top, log=True)
    if across is None or up is None:
        return ""
    parts = [
        f'<rect class="frame" x="{left}" y="{top}" width="{width - 12 - left}" '
        f'height="{height - bottom - top}"/>'
    ]
    for t, p in zip(across.ticks(8), across(np.array(across.ticks(8))), strict=True):
        parts.append(
            f'<line class="grid" x1="{p:.1f}" x2="{p:.1f}" y1="{top}" y2="{height - bottom}"/>'
            f'<text x="{p:.1f}" y="{height - bottom + 16}" text-anchor="middle">{_tick_text(t)}</text>'
        )
    for t, p in zip(up.ticks(9), up(np.array(up.ticks(9))), strict=True):
        parts.append(
            f'<line class="grid" x1="{left}" x2="{width - 12}" y1="{p:.1f}" y2="{p:.1f}"/>'
            f'<text x="{left - 6}" y="{p + 4:.1f}" text-anchor="end">{_tick_text(t)}</text>'
        )
    x_title, y_title = _column(results, "porosity"), _column(results, "klinkenberg permeability")
    parts.append(
        f'<text class="axis" x="{(left + width) / 2:.0f}" y="{height - 8}" text-anchor="middle">'
        f"{_safe(x_title)}</text>"
        f'<text class="axis" transform="translate(14,{height / 2:.0f}) rotate(-90)" text-anchor="middle">'
        f"{_safe(y_title)}</text>"
    )
    clip = (
        f'<clipPath id="inside"><rect x="{left}" y="{top}" width="{width - 12 - left}" '
        f'height="{height - bottom - top}"/></clipPath>'
    )
    drawn = []
    for place, fit in enumerate(fits):
        colour = looks.get(fit.name, (_COLOURS[place % 6], "", True))[0]
        x, low, mid, high = across(fit.porosity), up(fit.low), up(fit.centre), up(fit.high)
        banded = np.isfinite(x) & np.isfinite(low) & np.isfinite(high)
        if banded.sum() > 1:
            edge = [f"{a:.1f},{b:.1f}" for a, b in zip(x[banded], high[banded], strict=True)]
            edge += [f"{a:.1f},{b:.1f}" for a, b in zip(x[banded][::-1], low[banded][::-1], strict=True)]
            drawn.append(f'<path class="band" fill="{colour}" d="M{"L".join(edge)}z"/>')
        there = np.isfinite(x) & np.isfinite(mid)
        line = "L".join(f"{a:.1f},{b:.1f}" for a, b in zip(x[there], mid[there], strict=True))
        if line:
            drawn.append(f'<path class="fit" stroke="{colour}" d="M{line}"/>')
    parts.append(f'{clip}<g clip-path="url(#inside)">{"".join(drawn)}</g>')
    parts.append(_points(across(np.where(both, phi, np.nan)), up(k), series, looks, _below(results)))
    named = "".join(f"<li>{_safe(fit.name)}</li>" for fit in fits)
    told = (
        f"<p>Lines: fits of log permeability on porosity; bands hold 95 % of new plugs.</p><ul>{named}</ul>"
        if fits
        else ""
    )
    return (
        '<section aria-labelledby="cross"><h2 id="cross">Permeability against porosity</h2>'
        f'<svg class="plot" data-kind="cross" viewBox="0 0 {width} {height}" role="img" '
        f'aria-label="Permeability against porosity">{"".join(parts)}'
        f'<rect class="brush" width="0" height="0"/></svg>{told}'
        '<p class="hint">Yellow: known only as a limit.</p></section>'
    )


# -- tables -----------------------------------------------------------------------------------------------


def _shown(heading: str, value: Any) -> str:
    value = _plain(value)
    if value is None or value == "":
        return ""
    if isinstance(value, (int, float)) and not isinstance(value, bool):
        return _formatted(heading, float(value))
    return _safe(value)


def _formatted(heading: str, value: float) -> str:
    """A number with the decimals that the workbook shows."""
    code = _number_format(heading, value)
    if code == "General":
        return f"{value:g}"
    if "E" in code:
        return f"{value:.{code.count('0') - 3}e}"
    decimals = len(code.partition(".")[2].replace("#", ""))
    return f"{value:.{decimals}f}"


def _rows_html(frame: pd.DataFrame, *, keyed: bool = False) -> str:
    made = []
    for i, row in enumerate(frame.itertuples(index=False)):
        cells = "".join(
            f'<td class="{"n" if isinstance(_plain(v), (int, float)) else "t"}"'
            f"{_screen_only(str(h)) if keyed else ''}>{_shown(str(h), v)}</td>"
            for h, v in zip(frame.columns, row, strict=True)
        )
        made.append(f'<tr data-i="{i}">{cells}</tr>' if keyed else f"<tr>{cells}</tr>")
    return "".join(made)


#: Columns of the table of results that stand on the screen and not on paper, where there is no room.
_SCREEN_ONLY = {
    "laboratory", "depth basis", "bulk volume", "grain volume", "pore volume", "dry mass", "porosity route",
    "porosity stress", "bulk density", "gas permeability", "gas", "mean pressure", "slip factor",
    "slip basis", "permeability basis", "permeability stress", "lithology",
}  # fmt: skip


def _screen_only(heading: str) -> str:
    return ' data-screen=""' if _name(heading) in _SCREEN_ONLY else ""


def _plain_table(frame: pd.DataFrame) -> str:
    heads = "".join(f"<th scope='col'>{_safe(h)}</th>" for h in frame.columns)
    body = _rows_html(frame)
    return f"<div class='wide'><table><thead><tr>{heads}</tr></thead><tbody>{body}</tbody></table></div>"


def _table(results: pd.DataFrame) -> str:
    notes: dict[str, int] = {}
    marks = []
    for text in results.get("flags", pd.Series("", index=results.index)).fillna(""):
        numbers = [notes.setdefault(f, len(notes) + 1) for f in str(text).split("; ") if f]
        marks.append(", ".join(map(str, sorted(numbers))))
    shown = results.drop(columns=[c for c in ("well", "flags") if c in results])
    empty = [c for c in shown.columns if shown[c].isna().all() or (shown[c].astype(str) == "").all()]
    shown = shown.drop(columns=empty)
    once = [
        c
        for c in shown.columns
        if c not in {"plug", "status"}
        and "[" not in c
        and len(shown) > 1
        and shown[c].nunique(dropna=False) == 1
    ]
    same = "; ".join(f"{c} {shown[c].iloc[0]}" for c in once)
    told = f"<p>The same for every plug: {_safe(same)}.</p>" if once else ""
    shown = shown.drop(columns=once).assign(notes=marks)
    heads = "".join(
        f'<th scope="col" tabindex="0" aria-sort="none" data-c="{i}"{_screen_only(h)}>{_safe(h)}</th>'
        for i, h in enumerate(shown.columns)
    )
    listed = "".join(f"<li>{_safe(n)}</li>" for n in notes)
    return (
        '<section aria-labelledby="results"><h2 id="results">Results</h2>'
        f'{told}<p class="tools">'
        '<label>Only rows with <input id="filter" type="search" placeholder="any text" autocomplete="off">'
        '</label> <label><input id="lit" type="checkbox"> only plugs lit up</label> '
        '<span id="count"></span></p>'
        f'<div class="wide"><table id="table"><thead><tr>{heads}</tr></thead>'
        f"<tbody>{_rows_html(shown, keyed=True)}</tbody></table></div>"
        '<p class="paper">Further columns stand on the screen and in the workbook.</p>'
        f"<h3>Notes</h3><ol class='notes'>{listed}</ol></section>"
    )


def _summary(summary: pd.DataFrame | None) -> str:
    if summary is None or not len(summary):
        return ""
    return f"<section><h2>Averages</h2>{_plain_table(summary)}</section>"


def _recovery(report: WellReport) -> str:
    parts = [
        f"<h3>{title}</h3>{_plain_table(frame)}"
        for title, frame in (("Core runs", report.core_runs), ("Sidewall shots", report.shots))
        if len(frame)
    ]
    return f"<section><h2>Core and recovery</h2>{''.join(parts)}</section>" if parts else ""


def _methods(report: WellReport) -> str:
    if not report.methods:
        return ""
    rows: Iterable[str] = (
        f"<tr><td class='t'>{_safe(m.get('title', ''))}</td><td class='t'>{_safe(m.get('equation', ''))}</td>"
        f"<td class='t'>{_safe(m.get('source', ''))}</td></tr>"
        for m in report.methods
    )
    heads = "".join(f"<th scope='col'>{h}</th>" for h in ("calculation", "equation", "source"))
    return (
        "<section><h2>Methods</h2><div class='wide'><table><thead><tr>"
        f"{heads}</tr></thead><tbody>{''.join(rows)}</tbody></table></div></section>"
    )


def _cautions(report: WellReport) -> str:
    if not report.cautions:
        return ""
    items = "".join(f"<li>{_safe(c)}</li>" for c in report.cautions)
    return (
        "<section><details><summary>Cautions of the methods, for who repeats them</summary>"
        f"<ul>{items}</ul></details></section>"
    )
