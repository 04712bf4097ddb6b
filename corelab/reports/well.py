"""Gathering what a partner receives of one well."""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Mapping, Sequence, Set
from typing import Any

import pandas as pd
import sqlalchemy as sa

from corelab.bench import settings as lab_settings
from corelab.formats.well_heading import WellHeading
from corelab.interval import life, other_labs, recovery, select
from corelab.interval.impact import PERCUSSION
from corelab.records import history, store
from corelab.reports import gathered
from corelab.reports.page import Page
from corelab.reports.workbook import TableSheet, WellReport
from corelab.review import entitled
from corelab.review.issued import Issuing, revisions
from corelab.sheets import SHEETS, safety
from corelab.sheets.readings import READINGS
from corelab.version import __version__


def report(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    *,
    person: str,
    recipient: str = "",
    filters: select.Filters | None = None,
    issue: Issuing | None = None,
) -> WellReport:
    """Everything that the workbook of a well shows, as the record stands now."""
    number = select.well_id(identities, well)
    filters = filters or select.Filters()
    stored = store.settings(connection)
    partner = issue.partner if issue else entitled.Partner(recipient)
    symbols = partner.units or entitled.checked_units(lab_settings.value(stored, "report units"))
    depth = filters.unit or next((u for u in symbols if u in {"m", "ft"}), "")
    filters = dataclasses.replace(filters, unit=depth)
    facts = store.in_force(connection, "wells", [number], by="well_id")
    fact = _last(facts)
    unit = select.depth_unit(facts, stored, filters.unit)
    results = select.interval(connection, identities, well, filters)
    results = entitled.in_units(entitled.of_partner(results, partner), symbols)
    plug_ids = select.plugs_of_well(identities, number)
    entries = life.entries_of_plugs(connection, plug_ids, in_force_only=True)
    sheets = partner.sheets()
    if sheets is not None and len(entries):
        entries = entries[entries["kind"].isin(sheets)]
    runs = recovery.core_runs(connection, identities, number, unit)
    shots = recovery.shots(connection, identities, number)
    shot = bool((results["source"] == PERCUSSION).any())
    used = used_methods(connection, plug_ids, {"impact"} if shot else set())
    remarks = [
        "The results hold for the samples tested, as they were received.",
        "A value below or above a limit is the limit itself, and says so in its note.",
        "Klinkenberg permeability is the limit at infinite mean pressure; where it is estimated from a "
        "published law, the note says so.",
    ]
    if shot:
        remarks.append(
            "Percussion sidewall plugs: the impact of the bullet can have changed porosity and permeability; "
            "lithology and saturations stay useful (common practice). Crush likelihood is the probability "
            "that it changed porosity by more than 0.02 or permeability by more than a factor of 2; before "
            f"any evidence {lab_settings.number(stored, 'crush prior'):g} is assumed. The measurements are "
            "not altered."
        )
    if (results["status"] == other_labs.STATUS).any():
        remarks.append(
            "What another laboratory reported is shown as it reported it, under its name; nothing of it was "
            "measured or approved here."
        )
    return WellReport(
        well=identities.name("well", number),
        cover=_cover(connection, identities, number, fact, stored, unit, runs, results, person, entries)
        | _standing(connection, results, plug_ids, issue.words if issue else ""),
        core_runs=runs.iloc[:-1],  # the workbook makes its own totals
        shots=shots,
        results=results,
        methods=[{**m, "source": m["source"].replace(" (from memory)", "")} for m in used],
        provenance=_provenance(entries, identities),
        cautions=_cautions(entries),
        remarks=remarks,
        recipient=recipient,
        tables=_tables(connection, identities, well, issue, results, partner, symbols, unit),
    )


def _tables(
    connection: sa.Connection,
    identities: store.Identities,
    well: str,
    issue: Issuing | None,
    results: pd.DataFrame,
    partner: entitled.Partner,
    symbols: Sequence[str],
    unit: str,
) -> list[TableSheet]:
    """The sheets of tables that stand between the charts and the methods."""
    number = select.well_id(identities, well)
    averages = gathered.averages(connection, identities, well, partner, symbols)
    _, fitted = gathered.fits(connection, identities, well, partner, symbols)
    shifts = gathered.shifts(connection, identities, number, unit)
    crushed = pd.DataFrame()
    if gathered.allowed(partner, "porosity", "klinkenberg permeability", "crush likelihood"):
        crushed = gathered.crush_evidence(connection, identities, well, store.settings(connection), unit)
    told = (
        "Horizontal and unoriented plugs, every plug alike; duplicates and likely crushed plugs left out. "
        "Dykstra-Parsons by a line through ln k against the normal score of i/(n+1); Lorenz sorted by k over "
        "porosity."
    )
    sheets = [
        TableSheet(title, about, ((heading, words, frame),))
        for title, about, heading, words, frame in (
            ("summary", "averages of the well and its facies", "Averages", told, averages),
            (
                "trends",
                "fits of permeability on porosity",
                "Fits of log10 permeability on porosity",
                "Likely crushed plugs left out. Ranked by the error on plugs left out of the fit. The "
                "antilogarithm of a fit underestimates the mean.",
                fitted,
            ),
            (
                "depth match",
                "core and sidewall depths on the log",
                "Log depth less driller's depth",
                "",
                shifts,
            ),
            (
                "crush evidence",
                "what speaks for and against crushing of percussion plugs",
                "Evidence, and what it does to the log-odds",
                "The likelihood follows from the prior's log-odds and the sum of the effects.",
                crushed,
            ),
        )
        if len(frame)
    ]
    if issue is not None:
        before, changes = revisions(issue, results)
        shown = ["export", "issue", "at", "person", "file", "reason"]
        first = "This is the first issue to this recipient."
        same = "Nothing that was shown before has changed since the last issue."
        sheets.append(
            TableSheet(
                "revisions",
                "earlier issues to the same recipient, and what changed since the last",
                (
                    ("Issues before this one", "" if len(before) else first, before[shown]),
                    ("What changed", "" if len(changes) or not len(before) else same, changes),
                ),
            )
        )
    return sheets


def page(
    connection: sa.Connection, identities: store.Identities, made: WellReport, partner: entitled.Partner
) -> Page:
    """What the page shows: the report, and curves, fits and averages in its units."""
    number = identities.find("well", made.well) or 0
    stored = store.settings(connection)
    symbols = partner.units or entitled.checked_units(lab_settings.value(stored, "report units"))
    depth = next((c for c in made.results.columns if c.startswith("depth [")), "depth [m]")
    lines, _ = gathered.fits(connection, identities, made.well, partner, symbols)
    return Page(
        made,
        gathered.curves(connection, number, depth[7:-1]),
        lines,
        gathered.averages(connection, identities, made.well, partner, symbols),
    )


def heading(connection: sa.Connection, identities: store.Identities, well: str) -> WellHeading:
    """The facts of a well with which a file for other programs opens."""
    number = select.well_id(identities, well)
    facts = store.in_force(connection, "wells", [number], by="well_id")
    fact = _last(facts)
    job: dict[str, Any] = {}
    if fact and not pd.isna(fact.get("job_id")):
        job = _last(store.in_force(connection, "jobs", [int(fact["job_id"])], by="job_id"))
    runs = recovery.core_runs(connection, identities, number, "m").iloc[:-1]
    spans = zip(runs["top depth [m]"], runs["base depth [m]"], strict=True)
    return WellHeading(
        well=identities.name("well", number),
        company=job.get("client") or "",
        field=fact.get("field") or "",
        country=fact.get("country") or "",
        identifier=fact.get("unique_well_identifier") or "",
        laboratory=select.laboratory_of(connection, facts, store.settings(connection)),
        date=history.now_utc()[:10],
        datum=fact.get("depth_datum") or "",
        runs_m=tuple((float(top), float(base)) for top, base in spans),
    )


def _cover(
    connection: sa.Connection,
    identities: store.Identities,
    number: int,
    fact: Mapping[str, Any],
    stored: Mapping[str, str],
    unit: str,
    runs: pd.DataFrame,
    results: pd.DataFrame,
    person: str,
    entries: pd.DataFrame,
) -> dict[str, str | float | None]:
    job: dict[str, Any] = {}
    job_name = ""
    if fact and not pd.isna(fact.get("job_id")):
        job_name = identities.name("job", int(fact["job_id"]))
        jobs = store.in_force(connection, "jobs", [int(fact["job_id"])], by="job_id")
        job = _last(jobs)
    cored = ""
    if len(runs):
        top, base = runs[f"top depth [{unit}]"].iloc[-1], runs[f"base depth [{unit}]"].iloc[-1]
        cored = f"{top:.2f} to {base:.2f} {unit}, driller's depth"
    bases = sorted({b for b in results["depth basis"] if b})
    return {
        "well": identities.name("well", number),
        "field": fact.get("field"),
        "country": fact.get("country"),
        "unique well identifier": fact.get("unique_well_identifier"),
        "job": job_name,
        "client": job.get("client"),
        "partners": job.get("partners"),
        "report number": job.get("report_number"),
        "laboratory": job.get("laboratory") or lab_settings.value(stored, "laboratory name"),
        "cored interval": cored,
        "depth unit": unit,
        "depth basis": ", ".join(f"{b}'s depth" if b == "driller" else f"{b} depth" for b in bases),
        "depth datum": fact.get("depth_datum"),
        "units": "as the headings say; porosity and saturations as fractions, permeability in millidarcy",
        "results": "at the lowest net confining stress measured; saturations of the ambient pore volume",
        "plugs": float(len(results)),
        "measured": _period(entries),
        "written on": history.now_utc()[:16].replace("T", " ") + " UTC",
        "written by": person,
        "program": f"corelab {__version__}",
        "seal": history.last_seal(connection),
    }


def _standing(
    connection: sa.Connection, results: pd.DataFrame, plug_ids: list[int], issue: str
) -> dict[str, str | float | None]:
    """What of the results is approved, by whom, and which issue this is."""
    counts = results["status"].value_counts()
    words = {
        "approved": "approved",
        "newer waits": "approved, and something newer waits",
        "computed": "not reviewed",
        other_labs.STATUS: "of another laboratory, as reported",
    }
    newest = store.approvals(connection, plug_ids)
    by = sorted(set(newest.loc[newest["verdict"] == "approved", "person"]))
    return {
        "review": ", ".join(f"{counts[s]} {text}" for s, text in words.items() if s in counts),
        "approved by": ", ".join(by),
        "issue": issue,
    }


def _period(entries: pd.DataFrame) -> str:
    """From the first to the last day on which something was measured."""
    days = sorted({str(d)[:10] for d in entries["measured_on"] if d}) if len(entries) else []
    return "" if not days else days[0] if days[0] == days[-1] else f"{days[0]} to {days[-1]}"


def _last(frame: pd.DataFrame) -> dict[str, Any]:
    """The last row of a frame as a mapping; empty where there is none."""
    return {str(k): v for k, v in frame.iloc[-1].to_dict().items()} if len(frame) else {}


def used_methods(
    connection: sa.Connection, plug_ids: list[int], asked: Set[str] = frozenset()
) -> list[dict[str, str]]:
    """The calculations behind the stored results of these plugs and those `asked`, in the code's words."""
    from corelab.science.catalogue import formulas

    known = formulas()
    stored = store.results(connection, plug_ids)["method"].unique()
    methods = {m for text in stored for m in text.split(" + ")} | asked
    for key in list(methods):
        methods |= set(_RESTS_ON.get(key, ()))
    return [described(known[key]) for key in known if key in methods]


#: The calculations that stand behind another without giving a result of their own.
_RESTS_ON: Mapping[str, tuple[str, ...]] = {
    "grain-volume-gas-expansion": ("calibration-cup",),
    "pore-volume-gas-expansion": ("calibration-holder",),
    "gas-permeability": ("gas-viscosity", "flow-rate-conversion"),
    "bulk-volume-displacement": ("mercury-density",),
    "saturations": ("water-mass", "brine-volume", "oil-mass"),
    "impact": (
        "impact-permeability",
        "impact-density-log",
        "impact-neighbours",
        "impact-packing",
        "impact-fines",
        "impact-condition",
        "permeability-change-kozeny-carman",
        "density-porosity",
        "packing-porosity",
    ),
}
#: Arguments of an estimator that are no quantity of an equation.
_NO_QUANTITY = {"group", "refused", "demanded", "rising", "covariance", "covariance_md_kpa"}


def described(formula: Any) -> dict[str, str]:
    """One calculation in words: what `methods` shows and the workbook prints."""
    symbols = [s for s in (*formula.inputs, *formula.outputs) if s.name not in _NO_QUANTITY]
    return {
        "key": formula.key,
        "version": str(formula.version),
        "title": formula.title,
        "equation": formula.equation,
        "symbols": "; ".join(
            f"{s.symbol or s.name} {s.meaning}" + (f" [{s.unit}]" if s.unit else "") for s in symbols
        ),
        "valid": formula.valid,
        "source": formula.source,
        "tested": formula.tested,
        "caution": _caution(formula.key),
    }


#: The sheets on which the readings of a calculation are taken, where taking them can hurt.
_TAKEN_ON: Mapping[str, tuple[str, ...]] = {
    **dict.fromkeys(
        (
            "bulk-volume-displacement", "bulk-volume-buoyancy", "volume-uncoated", "mercury-density",
            "toluene-density", "ethanol-density",
        ),
        ("immersion",),
    ),
    **dict.fromkeys(
        ("grain-volume-gas-expansion", "calibration-cup", "reference-volume-at-cup-temperature"),
        ("grain volume",),
    ),
    **dict.fromkeys(
        ("pore-volume-gas-expansion", "calibration-holder", "pore-compressibility", "net-confining-stress"),
        ("pore volume",),
    ),
    "pore-volume-stress-regression": ("pore volume",),
    **dict.fromkeys(
        (
            "gas-permeability", "gas-permeability-geometric", "klinkenberg-regression",
            "flow-rate-conversion", "forchheimer-regression", "slip-inertia-regression", "slip-corrected",
            "permeability-stress-regression",
        ),
        ("gas permeability",),
    ),
    "liquid-permeability": ("liquid permeability",),
    "pore-volume-saturation": ("masses", "treatments"),
    **dict.fromkeys(("grain-mass", "grain-density", "bulk-density"), ("masses", "treatments")),
    **dict.fromkeys(
        ("water-mass", "brine-volume", "oil-mass", "saturations", "salt-mass"), ("distillation", "treatments")
    ),
    **dict.fromkeys(("summation-of-fluids", "retort-bulk-volume", "porosity-summation"), ("retort",)),
    **dict.fromkeys(("sieve-statistics", "sieve-recovery", "folk-ward"), ("sieve",)),
}  # fmt: skip


def _caution(key: str) -> str:
    """The cautions of the sheets on which the readings of a calculation are taken, each sentence once."""
    texts = [SHEETS[kind].caution.removesuffix(safety.DEFER).strip() for kind in _TAKEN_ON.get(key, ())]
    return " ".join([*dict.fromkeys(texts), safety.DEFER]) if texts else ""


def _provenance(entries: pd.DataFrame, identities: store.Identities) -> pd.DataFrame:
    shown = {sheet.kind for sheet in READINGS} | {"treatments", "descriptions", "not measured"}
    rows = [
        {
            "plug": identities.name("plug", int(e["plug_id"])),
            "kind": e["kind"],
            "reading": int(e["number"]),
            "measured on": e["measured_on"] or "",
            "measured by": e["measured_by"] or "",
            "instrument": ""
            if pd.isna(e["instrument_id"])
            else identities.name("instrument", int(e["instrument_id"])),
            "entered on": str(e["at"])[:16].replace("T", " "),
            "entered by": e["person"],
            "file": e["file"],
            "sheet": e["sheet"],
            "row": None if pd.isna(e["row"]) else int(e["row"]),
            "entry": ", ".join(
                f"{h} {v}" for h, v in json.loads(e["entered"]).items() if h not in {"well", "plug"}
            ),
        }
        for e in (entries.to_dict("records") if len(entries) else [])
        if e["kind"] in shown
    ]
    columns = [
        "plug", "kind", "reading", "measured on", "measured by", "instrument",
        "entered on", "entered by", "file", "sheet", "row", "entry",
    ]  # fmt: skip
    rows.sort(key=lambda r: (select.natural_key(str(r["plug"])), int(str(r["reading"]))))
    return pd.DataFrame(rows, columns=columns)


def _cautions(entries: pd.DataFrame) -> list[str]:
    kinds = set(entries["kind"]) if len(entries) else set()
    found = {sheet.kind: sheet.caution for sheet in SHEETS.values() if sheet.kind in kinds and sheet.caution}
    return [f"{SHEETS[kind].title}: {caution}" for kind, caution in found.items()]
