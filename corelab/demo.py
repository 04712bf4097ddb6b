"""The demo lab: one invented field, from empty folder to a partner's workbook."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from corelab.errors import Unavailable

if TYPE_CHECKING:
    import pandas as pd

    from corelab.lab import Lab

PEOPLE = (
    ("Ida Sandvoll", "manager"),
    ("Tomas Reyl", "technician"),
    ("Mirela Oskan", "reviewer"),
    ("Jonah Abeki", "geologist"),
)
SETTINGS = {"laboratory name": "Skarvholm Core Laboratory", "time zone": "Europe/Oslo"}


def sheets_folder() -> Path:
    """The filled-in bench sheets: in the installed package, else beside it in a checkout."""
    package = Path(__file__).resolve().parent
    for folder in (package / "_demo_lab", package.parent / "demo_lab"):
        if (folder / "bench").is_dir():
            return folder
    raise Unavailable("the demo lab is missing from this installation: install corelab again")


def build(folder: Path, tell: Callable[[str], None], show: Callable[[str], None]) -> None:
    """Build the demo lab in `folder`; the same again changes nothing."""
    from corelab.lab import Lab

    bench = sheets_folder() / "bench"
    try:
        folder.mkdir(parents=True, exist_ok=True)
    except OSError as trouble:
        raise Unavailable(f"{folder} cannot be made: {trouble.strerror}.") from trouble
    database = folder / "lab.db"
    tell(f"1/4  making the lab in {database}")
    with Lab(str(database), PEOPLE[0][0]) as lab:
        if lab.setup().made:
            for name, role in PEOPLE:
                lab.person_add(name, role)
            for name, value in SETTINGS.items():
                lab.setting(name, value)
    with Lab(str(database), PEOPLE[1][0]) as lab:
        tell("2/4  loading the bench sheets")
        report = lab.load([bench], told=lambda text: tell(f"     {text}"))
        if report.changes:
            tell(f"     {report.changes} entries, {report.plugs} plugs computed")
        else:
            tell("     nothing changed: the record has all of them already")
        for notice in report.notices[:6]:
            tell(f"     worth a question: {notice.place}: {notice.found}")
        if len(report.notices) > 6:
            tell(f"     … and {len(report.notices) - 6} more")
        tell("3/4  what the intervals are like")
        wells = lab.well_list()["well"].tolist()
        for well in wells:
            for line in summary(lab, well):
                show(line)
        tell("4/4  writing what a partner would get")
        for well in wells:
            out = folder / f"{well} core results.xlsx"
            if report.changes or not out.exists():
                lab.write_workbook(well, out)
            tell(f"     {out}")
    tell(f'Look further:  corelab --database "{database}" interval {wells[0]}')


def summary(lab: Lab, well: str) -> list[str]:
    """What a geologist would like to read first of a well."""
    frame = lab.interval(well)
    runs = lab.recovery(well)["core runs"]
    shots = lab.recovery(well)["sidewall shots"]
    depth = next(c for c in frame.columns if c.startswith("depth ["))
    unit = depth[-3:].strip("[] ")
    lines = ["", f"{well}: {len(frame)} plugs"]
    if len(runs):
        total = runs.iloc[-1]
        lines.append(
            f"  cored {total[f'top depth [{unit}]']:.1f}-{total[f'base depth [{unit}]']:.1f} {unit} in "
            f"{len(runs) - 1} run{'s' if len(runs) > 2 else ''}, recovery {total['recovery [%]']:.1f} %"
        )
    for row in shots.to_dict("records"):
        lines.append(
            f"  {row['tool']} sidewalls {row['gun run']}: {row['shots']} shots, {row['recovered']} "
            f"recovered, {row['partial']} partial, {row['misfired']} misfired, {row['lost']} lost, "
            f"{row['empty']} empty"
        )
    lines.append(
        f"  {'facies':18}{'plugs':>6}{'porosity':>22}{'k, mD (geometric)':>28}{'grain density':>15}{'Sw':>7}"
    )
    core = frame[frame["source"].isin(["core", "whole core", "rotary sidewall"])]
    for facies, group in core.groupby("facies", sort=False):
        lines.append(_facies_line(str(facies) or "not stated", group))
    lines.append("  core and rotary plugs; percussion plugs are left out: impact can have changed them")
    low = frame["flags"].str.contains("below limit").sum()
    none = frame["klinkenberg permeability [mD]"].isna().sum()
    lines.append(f"  permeability: {none} plugs without a value, {low} below the limit of the instrument")
    return lines


def _facies_line(name: str, group: pd.DataFrame) -> str:
    import numpy as np

    porosity = group["porosity [v/v]"].dropna()
    k = group.loc[~group["flags"].str.contains("limit"), "klinkenberg permeability [mD]"].dropna()
    horizontal = group["orientation"] != "vertical"
    k = k[horizontal.reindex(k.index)]
    spread = f"{porosity.mean():.3f} ({porosity.min():.3f}-{porosity.max():.3f})" if len(porosity) else ""
    perm = ""
    if len(k):
        mean, low, high = (f"{float(f'{v:.3g}'):g}" for v in (np.exp(np.log(k).mean()), k.min(), k.max()))
        perm = f"{mean} ({low}-{high})"
    density, water = group["grain density [g/cm3]"].mean(), group["water saturation [v/v]"].mean()
    return f"  {name:18}{len(group):>6}{spread:>22}{perm:>28}{density:>15.3f}" + (
        f"{water:>7.2f}" if water == water else ""
    )
