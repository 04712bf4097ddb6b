"""The commands. Heavy libraries are imported by the command that needs them."""

from __future__ import annotations

import errno
import os
import re
import sys
import traceback
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from corelab import __version__
from corelab.cli import show
from corelab.errors import CorelabError, Refused, Usage, did_you_mean, quoted

if TYPE_CHECKING:
    import pandas as pd

    from corelab.bench.load import LoadReport
    from corelab.lab import Lab

app = typer.Typer(
    name="corelab",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    help="A core laboratory's record: wells, cores, sidewall shots, plugs, every reading, and what follows.",
)
sheet_app = typer.Typer(
    no_args_is_help=True, rich_markup_mode=None, help="Bench sheets: kinds, blank ones, loading."
)
well_app = typer.Typer(no_args_is_help=True, rich_markup_mode=None, help="Wells.")
plug_app = typer.Typer(no_args_is_help=True, rich_markup_mode=None, help="Plugs.")
person_app = typer.Typer(no_args_is_help=True, rich_markup_mode=None, help="People.")
write_app = typer.Typer(no_args_is_help=True, rich_markup_mode=None, help="What leaves the laboratory.")
app.add_typer(sheet_app, name="sheet")
app.add_typer(well_app, name="well")
app.add_typer(plug_app, name="plug")
app.add_typer(person_app, name="person")
export_app = typer.Typer(
    no_args_is_help=True,
    rich_markup_mode=None,
    help="Files that were issued: listed, written again, checked.",
)
partner_app = typer.Typer(
    no_args_is_help=True, rich_markup_mode=None, help="Partners, and what they are entitled to."
)
app.add_typer(partner_app, name="partner")
read_app = typer.Typer(
    no_args_is_help=True, rich_markup_mode=None, help="What comes in: logs, other laboratories' results."
)
app.add_typer(write_app, name="write")
app.add_typer(read_app, name="read")
app.add_typer(export_app, name="export")

_DECIMALS = {
    "depth [m]": 2, "log depth [m]": 2, "depth [ft]": 2, "log depth [ft]": 2,
    "bulk volume [cm3]": 3, "grain volume [cm3]": 3, "pore volume [cm3]": 3, "dry mass [g]": 3,
    "porosity [v/v]": 4, "grain density [g/cm3]": 3, "bulk density [g/cm3]": 3, "mean pressure [kPa]": 1,
    "oil saturation [v/v]": 3, "water saturation [v/v]": 3, "gas saturation [v/v]": 3,
    "porosity stress [MPa]": 1, "permeability stress [MPa]": 1, "recovery [%]": 1,
}  # fmt: skip
#: Columns of an interval that a narrow terminal shows first.
_WANTED_FIRST = (
    "plug", "depth", "flags", "porosity", "klinkenberg permeability", "facies", "water saturation",
    "grain density", "source", "depth basis", "orientation", "gas permeability", "lithology",
    "oil saturation", "crush verdict", "slip basis", "log depth", "run",
)  # fmt: skip
_LENGTHS = {
    f"{c} [{u}]": 2 for c in ("top depth", "base depth", "cut", "recovered", "lost") for u in ("m", "ft")
}

Well = Annotated[str, typer.Argument(metavar="WELL", help="Name of the well.")]
Plug = Annotated[str, typer.Argument(metavar="PLUG", help="Name of the plug.")]
Top = Annotated[float | None, typer.Option(metavar="DEPTH", help="Shallowest depth, inclusive.")]
Base = Annotated[float | None, typer.Option(metavar="DEPTH", help="Deepest depth, inclusive.")]
Basis = Annotated[
    str, typer.Option("--depth", metavar="driller|log", help="Depths asked for; else each plug's own.")
]
DepthUnit = Annotated[
    str, typer.Option("--unit", metavar="m|ft", help="Unit of depths; else the well's own.")
]
Where = Annotated[
    str, typer.Option(metavar="EXPR", help="Condition, such as \"porosity > 0.12 and facies = 'sand'\".")
]
Stress = Annotated[
    float | None, typer.Option(metavar="MPA", help="Net confining stress; else the lowest measured.")
]
Uniaxial = Annotated[
    float | None,
    typer.Option(
        metavar="POISSON", help="The stress is uniaxial; take the hydrostatic one that compacts alike."
    ),
]
Uncertain = Annotated[bool, typer.Option("--with-uncertainty", help="Add the standard uncertainties.")]
Format = Annotated[
    str,
    typer.Option(
        "--format", metavar="table|csv|json|parquet", help="How to show it; else as the file is named."
    ),
]
TableOrJson = Annotated[str, typer.Option("--format", metavar="table|json", help="How to show it.")]
Out = Annotated[
    Path | None, typer.Option("--out", metavar="FILE", help="Write to a file instead of the terminal.")
]
OutFile = Annotated[Path, typer.Option("--out", metavar="FILE", help="File to write.")]
Partner = Annotated[str, typer.Option("--for", metavar="PARTNER", help="Whom it is for.")]
Reason = Annotated[str, typer.Option("--reason", metavar="TEXT", help="Why; kept in the history.")]


class _State:
    database = "corelab.db"
    by = ""


def _hidden(text: str) -> str:
    """A text in which no address of a server shows its password."""
    return re.sub(r"(://[^/@\s:]*:)\S*@", r"\1***@", text)


def _lab() -> Lab:
    from corelab.lab import Lab

    return Lab(_State.database, _State.by, _password)


def _password(person: str) -> str:
    """The acting person's password: from the environment, else typed where there is somebody to type."""
    given = os.environ.get("CORELAB_PASSWORD", "")
    if given or not sys.stdin.isatty():
        return given
    return str(typer.prompt(f"Password of {person}", hide_input=True, err=True))


def _one_of(option: str, value: str, *allowed: str) -> str:
    if value not in allowed:
        raise Usage(f"{option} is one of {', '.join(allowed)}; found {quoted(value)}.")
    return value


def _show(frame: pd.DataFrame, form: str, *, wrap: str = "") -> None:
    if form == "json":
        show.print_json(show.json_records(frame))
    else:
        show.print_table(frame, _DECIMALS | _LENGTHS, wrap=wrap)


def _show_parts(parts: dict[str, pd.DataFrame], form: str, *, wrap: str) -> None:
    """Several tables; as JSON one list, whose objects say of which `part` they are."""
    if form == "json":
        show.print_json(
            [{"part": p, **row} for p, frame in parts.items() for row in show.json_records(frame)]
        )
        return
    for part, frame in parts.items():
        typer.echo(f"{part}:")
        _show(frame, form, wrap=wrap)
        typer.echo()


def _version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"corelab {__version__}")
        raise typer.Exit


@app.callback()
def _options(
    database: Annotated[
        str,
        typer.Option(
            envvar="CORELAB_DATABASE", metavar="URL_OR_FILE", help="The lab: an SQLite file or a URL."
        ),
    ] = "corelab.db",
    by: Annotated[
        str, typer.Option(envvar="CORELAB_BY", metavar="PERSON", help="Who acts; else the login name.")
    ] = "",
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Show the version.")
    ] = False,
) -> None:
    _State.database, _State.by = database, by


@app.command()
def setup(
    manager: Annotated[
        str, typer.Option(metavar="NAME", help="Register the first person, a manager who registers others.")
    ] = "",
) -> None:
    """Make the database, or bring it to the newest schema."""
    with _lab() as lab:
        done = lab.setup(manager)
        where = _hidden(_State.database)
        if done.made:
            show.tell(f"Made a new lab in {where} (schema {done.after}).")
        elif done.before != done.after:
            show.tell(f"Brought {where} from schema {done.before} to {done.after}.")
        else:
            show.tell(f"{where} is up to date (schema {done.after}).")
        if done.backup:
            show.tell(f"The lab as it was before is kept in {done.backup}.")


@app.command()
def setting(
    name: Annotated[str, typer.Argument(metavar="[NAME]", help="Name of a setting.")] = "",
    value: Annotated[
        str | None, typer.Argument(metavar="[VALUE]", help="New value, with a unit if not its own.")
    ] = None,
    form: TableOrJson = "table",
) -> None:
    """Show the laboratory's settings, or change one."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.setting(name, value)
    _show(frame, form, wrap="meaning")


@app.command()
def demo(
    folder: Annotated[Path, typer.Argument(metavar="[FOLDER]", help="Where to build it.")] = Path("demo-lab"),
) -> None:
    """Build the demo lab in FOLDER, compute everything, and write what a partner would get."""
    from corelab.demo import build

    build(folder, show.tell, typer.echo)


@sheet_app.command("kinds")
def sheet_kinds(
    kind: Annotated[str, typer.Argument(metavar="[KIND]", help="A kind, to see its columns.")] = "",
) -> None:
    """List the bench sheets, or the columns of one."""
    from corelab.sheets import SHEETS, kind_named

    if not kind:
        for sheet in SHEETS.values():
            sort = "readings" if sheet.reading else "register"
            typer.echo(f"{sheet.kind:24}  {sort:8}  {sheet.title}")
        return
    found = kind_named(kind)
    if found is None:
        raise Usage(f"There is no bench sheet {quoted(kind)}; {did_you_mean(kind, list(SHEETS), 40)}")
    sheet = SHEETS[found]
    typer.echo(f"{sheet.title} ({sheet.kind})")
    for column in sheet.columns:
        marks = [w for w, on in (("must be filled in", column.required), ("identity", column.key)) if on]
        marks += [f"one of: {', '.join(column.choices)}"] if column.choices else []
        marks += [f"default {column.default}"] if column.default else []
        typer.echo(f"  {column.heading:34}  {column.note}" + (f" ({'; '.join(marks)})" if marks else ""))
    if sheet.caution:
        typer.echo(f"Caution: {sheet.caution}")


@sheet_app.command("blank")
def sheet_blank(
    kinds: Annotated[
        list[str], typer.Argument(metavar="KIND…", help="Kinds of sheets; 'all' for every one.")
    ],
    out: OutFile,
    well: Annotated[str, typer.Option(metavar="WELL", help="Fill in the plugs of this well.")] = "",
) -> None:
    """Write empty bench sheets, ready to fill in."""
    from corelab.sheets import SHEETS, kind_named

    chosen: list[str] = []
    for kind in list(SHEETS) if kinds == ["all"] else kinds:
        found = kind_named(kind)
        if found is None:
            raise Usage(f"There is no bench sheet {quoted(kind)}; {did_you_mean(kind, list(SHEETS), 40)}")
        chosen.append(found)
    if out.suffix.lower() != ".xlsx":
        raise Usage(f"A blank sheet is an Excel workbook: name it .xlsx, not {quoted(out.name)}.")
    if out.exists():
        raise Usage(f"{out} is there already, perhaps filled in: name another file, or remove it first.")
    with _lab() as lab:
        lab.sheet_blank(chosen, out, well)
    show.tell(f"Wrote {out}: {', '.join(chosen)}.")


@sheet_app.command("load")
def sheet_load(
    paths: Annotated[
        list[Path], typer.Argument(metavar="PATH…", help=".xlsx or .csv files, or folders of them.")
    ],
    check: Annotated[bool, typer.Option("--check", help="Only report what a load would do.")] = False,
    reason: Reason = "",
    decimal_comma: Annotated[
        bool, typer.Option("--decimal-comma", help="CSV numbers have decimal commas, and ; between columns.")
    ] = False,
) -> None:
    """Load bench sheets: all or nothing, every problem named."""
    with _lab() as lab:
        report = lab.load(paths, check=check, reason=reason, decimal_comma=decimal_comma, told=show.tell)
    _tell_load(report)


def _tell_load(report: LoadReport) -> None:
    def counted(words: str, counts: dict[str, int]) -> None:
        if counts:
            total = sum(counts.values())
            show.tell(f"{words} {total}: " + ", ".join(f"{n} of {kind}" for kind, n in counts.items()))

    if report.ignored:
        show.tell(f"passed over: {', '.join(report.ignored[:8])}" + (" …" if len(report.ignored) > 8 else ""))
    if report.notices:
        show.tell(f"Worth a question ({len(report.notices)}):")
        show.print_lines([f"  {notice}" for notice in report.notices], 40)
    if report.doubtful:
        show.tell(f"Results that ask for a second look at the readings ({len(report.doubtful)}):")
        show.print_lines([f"  {line}" for line in report.doubtful], 40)
    would = "Would be " if report.checked_only else ""
    counted(f"{would}new" if would else "New", report.new)
    counted(f"{would}corrected" if would else "Corrected", report.corrected)
    counted("Unchanged", report.unchanged)
    if report.changes and report.checked_only:
        show.tell("No problem found; nothing was written.")
    elif report.changes:
        show.tell(f"Computed the results of {report.plugs} plugs.")
        if report.not_computed:
            show.tell("Not computed, with the number of plugs:")
            show.print_lines([f"  {line}" for line in report.not_computed], 40)
        show.tell(f"Seal {report.seal}")
    else:
        show.tell("Nothing changed: the record has all of this already.")


@app.command()
def withdraw(
    number: Annotated[int, typer.Argument(metavar="NUMBER", help="Number of the reading, from 'plug show'.")],
    reason: Reason = "",
) -> None:
    """Take a reading out of force, for one entered on the wrong plug."""
    with _lab() as lab:
        row = lab.withdraw(number, reason)
    show.tell(f"Withdrew {row['kind']} {number}; the results were computed anew.")


@well_app.command("list")
def well_list(form: TableOrJson = "table") -> None:
    """List the wells."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.well_list()
    _show(frame, form)


@plug_app.command("list")
def plug_list(well: Well, form: TableOrJson = "table") -> None:
    """List the plugs of a well."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.plug_list(well)
    _show(frame, form)


@plug_app.command("show")
def plug_show(well: Well, plug: Plug, form: TableOrJson = "table") -> None:
    """Show all that is recorded of a plug, with the numbers of its readings, and its results."""
    from corelab.quantities import RESULTS

    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        found = lab.plug_show(well, plug)
    if "results" in found:
        results = found["results"]
        results.insert(1, "unit", [RESULTS[q].unit if q in RESULTS else "" for q in results["quantity"]])
        if form == "table":
            found["entries"] = found["entries"].drop(columns=["measured on", "measured by"])
    _show_parts(found, form, wrap="entry" if "entries" in found else "as entered")


@plug_app.command("explain")
def plug_explain(
    well: Well,
    plug: Plug,
    result: Annotated[str, typer.Argument(metavar="RESULT", help="Name of a result, such as porosity.")],
    stress: Stress = None,
    direction: Annotated[
        str, typer.Option(metavar="axial|max|90|vertical", help="Which direction of flow.")
    ] = "",
    approved: Annotated[
        bool, typer.Option("--approved", help="As it was approved, from the readings in force then.")
    ] = False,
    form: TableOrJson = "table",
) -> None:
    """How a result came about, from the entered readings to the number with its uncertainty."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        found = lab.explain(well, plug, result, stress=stress, direction=direction, approved=approved)
    if form == "json":
        show.print_json([found])
    else:
        from corelab.cli import explained

        explained.print_explanation(found)


@person_app.command("add")
def person_add(
    name: Annotated[str, typer.Argument(metavar="NAME", help="The person's name.")],
    role: Annotated[
        str, typer.Option(metavar="technician|reviewer|geologist|manager", help="The person's role.")
    ],
) -> None:
    """Register a person, or give one another role; the first must be a manager."""
    with _lab() as lab:
        lab.person_add(name, role)
    show.tell(f"Registered {' '.join(name.split())} as {role}.")


@person_app.command("list")
def person_list(form: TableOrJson = "table") -> None:
    """Who is registered, in which role, and whether they sign in with a password."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.person_list()
    _show(frame, form)


@person_app.command("roles")
def person_roles(form: TableOrJson = "table") -> None:
    """What each role may do."""
    from corelab.lab import role_table

    _one_of("--format", form, "table", "json")
    _show(role_table(), form)


@person_app.command("leave")
def person_leave(name: Annotated[str, typer.Argument(metavar="NAME", help="The person's name.")]) -> None:
    """Note that a person has left: what they did stays, and they may do nothing more."""
    with _lab() as lab:
        lab.person_leave(name)
    show.tell(f"{' '.join(name.split())} may do nothing more here.")


@person_app.command("password")
def person_password(
    name: Annotated[str, typer.Argument(metavar="NAME", help="The person's name.")],
) -> None:
    """Set a person's password (typed twice, or the one line on standard input)."""
    if sys.stdin.isatty():
        new = str(typer.prompt("New password", hide_input=True, confirmation_prompt=True, err=True))
    else:
        new = sys.stdin.readline().rstrip("\r\n")
    with _lab() as lab:
        lab.person_password(name, new)
    show.tell(f"{' '.join(name.split())} now signs in with a password at every change of the record.")


@partner_app.command("set")
def partner_set(
    name: Annotated[str, typer.Argument(metavar="NAME", help="The partner's name.")],
    wells: Annotated[
        list[str] | None, typer.Option("--well", metavar="WELL", help="A well; may be repeated; else all.")
    ] = None,
    columns: Annotated[
        list[str] | None,
        typer.Option("--column", metavar="COLUMN", help="A result column; may be repeated; else all."),
    ] = None,
    units: Annotated[
        str, typer.Option("--units", metavar="UNITS", help="Units of what is written, such as 'ft, psi, %'.")
    ] = "",
) -> None:
    """Say what a partner is entitled to, in the place of what was said before."""
    with _lab() as lab:
        lab.partner_set(name, wells=wells or [], columns=columns or [], units=units)
        frame = lab.partner_list()
    _show(frame, "table", wrap="columns")


@partner_app.command("list")
def partner_list(form: TableOrJson = "table") -> None:
    """The partners and what they are entitled to."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.partner_list()
    _show(frame, form, wrap="columns")


@app.command()
def review(well: Well, unit: DepthUnit = "", form: TableOrJson = "table") -> None:
    """What waits for review, with what is odd about it first."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.review(well, unit=unit)
    if form == "json":
        show.print_json(show.json_records(frame, ("odd", "blocked", "measured by")))
    elif len(frame):
        marks, notes = show.numbered(frame["odd"].tolist())
        shown = frame.drop(columns=["blocked", "oddities"]).assign(odd=marks)
        show.print_table(shown, _DECIMALS)
        typer.echo("\n".join(["", "odd:", *notes] if notes else []))
    show.tell(f"{len(frame)} plug{'' if len(frame) == 1 else 's'} of {well} wait for review.")


Plugs = Annotated[list[str] | None, typer.Argument(metavar="PLUG…", help="Names of the plugs.")]


@app.command()
def approve(
    well: Well,
    plugs: Plugs = None,
    reason: Reason = "",
    everything: Annotated[bool, typer.Option("--all", help="All that waits in the well.")] = False,
) -> None:
    """Approve results: they are frozen as they are now."""
    if everything and plugs:
        raise Usage("Name plugs, or say --all; not both.")
    with _lab() as lab:
        count = lab.approve(well, plugs or [], reason, everything=everything)
    show.tell(f"Approved {count} results; later corrections will wait for review beside them.")


@app.command()
def revoke(well: Well, plugs: Plugs = None, reason: Reason = "") -> None:
    """Take back the approval of plugs: their results are shown as computed again."""
    with _lab() as lab:
        lab.revoke(well, plugs or [], reason)
    show.tell("Revoked; what was approved stays in the history.")


@app.command()
def release(well: Well, plugs: Plugs = None, reason: Reason = "") -> None:
    """Let results stand that control blocks; the reason travels with them."""
    with _lab() as lab:
        lab.release(well, plugs or [], reason)
    show.tell("Released; the reason stands with the results.")


@app.command()
def control(
    instrument: Annotated[
        str, typer.Argument(metavar="[INSTRUMENT]", help="Only this instrument, with its charts.")
    ] = "",
    charts: Annotated[
        Path | None, typer.Option("--charts", metavar="FILE", help="Draw them: .html, .svg or .png.")
    ] = None,
    on: Annotated[
        str, typer.Option("--on", metavar="DATE", help="The state on a day, such as 2026-03-14; else today.")
    ] = "",
    form: TableOrJson = "table",
) -> None:
    """Whether instruments are in calibration and in control: state, charts, bias, precision."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        found = lab.control(instrument, on)
        if charts is not None:
            lab.write_control_charts(charts, instrument, on)
            show.tell(f"Wrote {charts}.")
    if form == "json":
        show.print_json(
            [{"part": p, **row} for p, frame in found.items() for row in show.json_records(frame, ())]
        )
    else:
        from corelab.cli import controlled

        controlled.print_control(found, charts_too=bool(instrument))
    wrong = "out of control|overdue|ran out"
    if any(f["state"].str.contains(wrong).any() for f in found.values() if "state" in f):
        raise typer.Exit(1)


@app.command()
def verify(
    seal: Annotated[str, typer.Option(metavar="VALUE", help="A seal kept from before.")] = "",
    form: TableOrJson = "table",
) -> None:
    """Prove that nothing was altered behind the program's back."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        found = lab.verify(seal)
    if form == "json":
        show.print_json(
            [
                {
                    "seal": found.seal,
                    "events": found.events,
                    "rows": found.rows,
                    "results": found.results,
                    "faults": found.faults,
                }
            ]
        )
    else:
        for fault in found.faults:
            typer.echo(f"  {fault}")
        typer.echo(f"Seal {found.seal}")
    counted = f"{found.events} events, {found.rows} rows, {found.results} results"
    if found.faults:
        show.tell(f"{len(found.faults)} faults in {counted}: keep this file as it is, and restore a backup.")
        raise typer.Exit(1)
    since = " The record still holds what was sealed then." if seal else ""
    show.tell(f"Nothing was altered: {counted}.{since}")


@app.command()
def backup(file: Annotated[Path, typer.Argument(metavar="FILE", help="File to write.")]) -> None:
    """Copy the lab into one file while it is in use, and check the copy."""
    with _lab() as lab:
        seal = lab.backup(file)
    show.tell(f"Wrote {file}; keep it on another disk. Seal {seal}")


@app.command()
def restore(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="A file written by 'corelab backup'.")],
    over_newer: Annotated[
        bool, typer.Option("--over-newer", help="The lab here holds what the backup lacks, and it may go.")
    ] = False,
) -> None:
    """Bring back a lab from a backup, and check it by its seal."""
    with _lab() as lab:
        done = lab.restore(file, over_newer=over_newer)
    show.tell(f"Restored {_hidden(_State.database)}. Seal of the backup {done.seal}")
    if done.kept:
        show.tell(f"The lab as it was before is kept in {done.kept}.")


@export_app.command("list")
def export_list(
    well: Annotated[str, typer.Argument(metavar="[WELL]", help="Only this well.")] = "",
    form: TableOrJson = "table",
) -> None:
    """The files that were issued: when, by whom, for whom."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.export_list(well)
    _show(frame.drop(columns="sha256") if form == "table" else frame, form, wrap="reason")


@export_app.command("again")
def export_again(
    number: Annotated[int, typer.Argument(metavar="NUMBER", help="Number from 'export list'.")], out: OutFile
) -> None:
    """Write a file that was issued again, byte for byte."""
    with _lab() as lab:
        lab.export_again(number, out)
    show.tell(f"Wrote {out}, the same as was issued.")


@export_app.command("check")
def export_check(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="A file that somebody received.")],
) -> None:
    """Tell whether a file is what was issued, unaltered."""
    with _lab() as lab:
        frame = lab.export_check(file)
    if not len(frame):
        show.tell(f"{file} is not, byte for byte, a file that this lab issued.")
        raise typer.Exit(1)
    _show(frame.drop(columns=["sha256"]), "table")


@app.command()
def recovery(well: Well, unit: DepthUnit = "", form: TableOrJson = "table") -> None:
    """Core runs and sidewall shots: cut, recovered, lost, and why."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        found = lab.recovery(well, unit)
    _show_parts(found, form, wrap="notes")


@app.command()
def board(
    well: Annotated[str, typer.Argument(metavar="[WELL]", help="Only this well.")] = "",
    form: TableOrJson = "table",
) -> None:
    """Where every plug is and what it waits for."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.board(well)
    _show(frame, form, wrap="not measured")


@app.command()
def interval(
    well: Well,
    top: Top = None,
    base: Base = None,
    depth: Basis = "",
    unit: DepthUnit = "",
    where: Where = "",
    stress: Stress = None,
    uniaxial: Uniaxial = None,
    with_uncertainty: Uncertain = False,
    form: Format = "",
    out: Out = None,
) -> None:
    """The plugs of an interval and their results."""
    forms = ("table", "csv", "json", "parquet")
    suffix = out.suffix.lower().removeprefix(".") if out else ""
    form = _one_of("--format", form or (suffix if suffix in forms else "table"), *forms)
    if out is not None and out.suffix.lower() in {".xlsx", ".xls", ".ods"}:
        raise Usage(f"For a workbook use 'corelab write workbook {well} --out {out.name}'.")
    if form == "parquet" and out is None:
        raise Usage("Parquet is for files: name one with --out FILE.")
    with _lab() as lab:
        frame = lab.interval(
            well,
            top,
            base,
            depth=depth,
            unit=unit,
            where=where,
            stress=stress,
            uniaxial=uniaxial,
            with_uncertainty=with_uncertainty,
        )
    from corelab.formats import tables_out

    if out is not None and form == "parquet":
        tables_out.write_parquet(out, frame)
    elif out is not None and form == "csv":
        tables_out.write_csv(out, frame)
    else:
        if form == "json":
            text = show.as_json(show.json_records(frame))
        elif form == "csv":
            text = frame.to_csv(index=False, lineterminator="\n").rstrip("\n")
        else:
            text = _interval_table(frame, None if out else show.room())
        if out is None:
            typer.echo(text)
            return
        tables_out.write_text(out, f"{text}\n")
    show.tell(f"Wrote {len(frame)} plug{'' if len(frame) == 1 else 's'} to {out}.")


@app.command()
def impact(
    well: Well,
    prior: Annotated[
        float | None, typer.Option(metavar="P", help="Likelihood before any evidence; else the setting.")
    ] = None,
    blind: Annotated[
        bool, typer.Option("--blind", help="Judge core and rotary plugs as if shot: the false alarms.")
    ] = False,
    form: TableOrJson = "table",
) -> None:
    """Percussion plugs: crush likelihood and the evidence for it."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        rows = lab.impact(well, prior, blind=blind)
    if form == "json":
        show.print_json(rows)
    else:
        from corelab.cli import crush

        crush.print_impact(rows, blind=blind)


@app.command()
def recalibrate(
    adopt: Annotated[
        bool, typer.Option("--adopt", help="Use it from now on; recorded as a setting.")
    ] = False,
    form: TableOrJson = "table",
) -> None:
    """Learn from persons' crush verdicts: shows the cross-validated skill, and adopts it if asked."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        found = lab.impact_recalibrate(adopt=adopt)
    if form == "json":
        show.print_json([found])
        return
    from corelab.cli import crush

    crush.print_recalibration(found, adopted=adopt)


def _interval_table(frame: pd.DataFrame, room: int | None) -> str:
    """As many columns as there is room for, the most wanted first; flags as numbers of notes below."""
    marks, notes = show.numbered(frame["flags"].tolist())
    rank = {name: place for place, name in enumerate(_WANTED_FIRST)}
    order = sorted(frame.columns, key=lambda c: rank.get(c.removeprefix("u ").split(" [")[0], len(rank)))
    lines, left_out = show.table(frame.assign(flags=marks), _DECIMALS, important=order, room=room)
    if notes:
        lines += ["", "flags:", *notes]
    lines += ["", f"{len(frame)} plug{'' if len(frame) == 1 else 's'}"]
    if left_out:
        lines.append(f"No room for: {', '.join(left_out)}.")
        lines.append("All columns: --format csv, json or parquet; or pass the table on to a pager or a file.")
    return "\n".join(lines)


@read_app.command("las")
def read_las(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="A log: LAS 1.2, 2.0 or 3.0.")],
    well: Annotated[str, typer.Option(metavar="WELL", help="The well it belongs to.")],
    check: Annotated[bool, typer.Option("--check", help="Only show what is in it.")] = False,
) -> None:
    """Take in a log."""
    with _lab() as lab:
        told = lab.read_las(file, well, check=check)
    known = [f"{m} [{u}]" + (f" {q}" if q else "") for m, u, q in told["curves"]]
    show.tell(
        f"{told['log']}: {told['samples']} samples, {told['top [m]']:.2f} to {told['base [m]']:.2f} m; "
        f"{', '.join(known)}"
    )
    for notice in told["notices"]:
        show.tell(f"  {notice}")
    if check:
        show.tell("Nothing was written.")
    elif not told["new"]:
        show.tell("Nothing changed: the record has this log already.")


@app.command()
def match(
    well: Well,
    log: Annotated[
        Path | None, typer.Option("--log", metavar="FILE.las", help="The log; else the newest read in.")
    ] = None,
    curve: Annotated[str, typer.Option(metavar="MNEMONIC", help="The curve to match with.")] = "",
    check: Annotated[bool, typer.Option("--check", help="Only show the shifts; keep none.")] = False,
    search: Annotated[
        float | None, typer.Option(metavar="METRES", help="Try shifts up to this either way; else 5.")
    ] = None,
    run: Annotated[str, typer.Option(metavar="RUN", help="The run to shift by hand.")] = "",
    shift: Annotated[
        float | None, typer.Option(metavar="LENGTH", help="Its shift: log depth less driller's depth.")
    ] = None,
    uncertainty: Annotated[
        float | None, typer.Option(metavar="LENGTH", help="Standard uncertainty of a shift by hand.")
    ] = None,
    unit: DepthUnit = "m",
    reason: Reason = "",
    form: TableOrJson = "table",
) -> None:
    """Match core depth to log depth and keep the shifts, or set one by hand."""
    _one_of("--format", form, "table", "json")
    _one_of("--unit", unit, "m", "ft")
    if (shift is None) != (not run):
        raise Usage("A shift by hand needs both: --run RUN and --shift LENGTH.")
    if shift is not None and (log is not None or check):
        raise Usage("A shift by hand is set without a log: leave --log and --check out.")
    metre = 1.0 if unit == "m" else 0.3048
    with _lab() as lab:
        if shift is not None:
            u = None if uncertainty is None else uncertainty * metre
            kind = lab.shift(well, run, shift * metre, reason, uncertainty_m=u)
            show.tell(f"The {kind} {run} of {well} is shifted by {shift:+g} {unit}.")
            return
        frame = lab.match(well, log, curve=curve, check=check, search=search)
    if form == "json":
        show.print_json(show.json_records(frame, ("matched by", "curve", "remark")))
    else:
        shown = frame.drop(columns=["probability"]).assign(
            certain=frame["certain"].map({True: "yes", False: "no"})
        )
        decimals = {
            "shift [m]": 2, "standard uncertainty [m]": 2, "correlation": 3, "second shift [m]": 2,
            "second correlation": 3,
        }  # fmt: skip
        show.print_table(shown, decimals, wrap="remark")
    unsure = int((~frame["certain"].astype(bool)).sum())
    if unsure:
        show.tell(
            f"{unsure} not certain: compare by eye, and set the shift by hand with "
            "'corelab match WELL --run RUN --shift LENGTH --reason TEXT' where another is right."
        )
    if check:
        show.tell("Nothing was kept.")


@app.command()
def summary(
    well: Well,
    top: Top = None,
    base: Base = None,
    depth: Basis = "",
    unit: DepthUnit = "",
    where: Where = "",
    stress: Stress = None,
    uniaxial: Uniaxial = None,
    by: Annotated[
        str, typer.Option(metavar="facies|run|lithology|orientation", help="Apart; else all together.")
    ] = "",
    weights: Annotated[
        str,
        typer.Option(metavar="count|length", help="Weigh every plug alike, or by the length it stands for."),
    ] = "count",
    leave_out: Annotated[
        list[str] | None,
        typer.Option(metavar="crushed|cracked|flagged", help="Leave suspect plugs out; may be repeated."),
    ] = None,
    porosity_cut: Annotated[
        float | None, typer.Option("--porosity-cut-off", metavar="V/V", help="Least porosity of net rock.")
    ] = None,
    permeability_cut: Annotated[
        float | None,
        typer.Option("--permeability-cut-off", metavar="MD", help="Least permeability of net rock."),
    ] = None,
    water_cut: Annotated[
        float | None,
        typer.Option("--water-saturation-cut-off", metavar="V/V", help="Most water saturation of pay."),
    ] = None,
    form: TableOrJson = "table",
) -> None:
    """Averages, spread, heterogeneity and net to gross of an interval."""
    _one_of("--format", form, "table", "json")
    cuts = {"porosity": porosity_cut, "permeability": permeability_cut, "water saturation": water_cut}
    with _lab() as lab:
        found = lab.summary(
            well,
            top,
            base,
            depth=depth,
            unit=unit,
            where=where,
            stress=stress,
            uniaxial=uniaxial,
            by=by,
            weights=weights,
            leave_out=leave_out or [],
            cuts=cuts,
        )
    if form == "json":
        show.print_json(found)
    else:
        from corelab.cli import summaries

        summaries.print_summary(found)


@app.command()
def trend(
    well: Well,
    top: Top = None,
    base: Base = None,
    depth: Basis = "",
    unit: DepthUnit = "",
    where: Where = "",
    stress: Stress = None,
    uniaxial: Uniaxial = None,
    by: Annotated[
        str,
        typer.Option(metavar="facies|run|lithology|orientation", help="Fit each apart; else all together."),
    ] = "",
    model: Annotated[str, typer.Option(metavar="NAME", help="Fit only this model.")] = "",
    rock_types: Annotated[
        bool, typer.Option("--rock-types", help="Show the rock types of each plug instead.")
    ] = False,
    percentile: Annotated[
        int, typer.Option(metavar="10…75", help="Mercury saturation of Pittman's radius, with --rock-types.")
    ] = 35,
    form: TableOrJson = "table",
) -> None:
    """Porosity-permeability fits with their prediction bands, ranked; rock types of the plugs."""
    _one_of("--format", form, "table", "json")
    if rock_types and (by or model):
        raise Usage("--rock-types shows each plug: leave --by and --model out.")
    filters: dict[str, Any] = {
        "depth": depth, "unit": unit, "where": where, "stress": stress, "uniaxial": uniaxial
    }  # fmt: skip
    with _lab() as lab:
        if rock_types:
            table = lab.rock_types(well, top, base, **filters, percentile=percentile)
            _show(table, form)
            from corelab.science.rock_types import CRITERION

            show.tell(f"Flow units: {table['flow unit'].max()}, {CRITERION}.")
            show.tell(
                "Throat radii are meant for gas permeability; Lucia's numbers for carbonates without vugs."
            )
            return
        found = lab.trend(well, top, base, **filters, by=by, model=model)
    if form == "json":
        show.print_json(found.records)
        fitted = {record["group"] for record in found.records}
        for group in found.groups:
            if group["group"] not in fitted:
                show.tell(f"No model for {group['group']}: {next(iter(group['not fitted'].values()))}.")
    else:
        from corelab.cli import trends

        trends.print_trends(found)


@app.command()
def history(
    well: Annotated[str, typer.Argument(metavar="[WELL]", help="Only this well.")] = "",
    plug: Annotated[str, typer.Argument(metavar="[PLUG]", help="Only this plug.")] = "",
    form: TableOrJson = "table",
) -> None:
    """Who entered or changed what, when and why."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.history(well, plug)
    if form == "json":
        show.print_json(show.json_records(frame))
        return
    for row in frame.to_dict("records"):
        what = row["what"] if "what" in row else show.event_words(row["detail"])
        reason = row.get("why") or row.get("reason")
        event = row.get("event", row.get("number"))
        when = str(row["at"])[:19].replace("T", " ")
        line = f"{event:>5}  {when} UTC  {row['person']}  {row['command']}: {what}."
        typer.echo(f"{line} Why: {reason}" if reason else line)


@app.command()
def recompute(
    check: Annotated[bool, typer.Option("--check", help="Only report; change nothing.")] = False,
) -> None:
    """Compute all results anew from the readings in force, and report any that differs."""
    with _lab() as lab:
        found = lab.recompute(check=check)
    if not len(found):
        show.tell("All results follow from the readings in force.")
        return
    show.print_table(found)
    show.tell(f"{len(found)} results differed" + ("." if check else " and were replaced."))
    if check:
        raise typer.Exit(1)


@app.command()
def methods(
    key: Annotated[
        str, typer.Argument(metavar="[KEY]", help="Key of one calculation, or 'safety' for all cautions.")
    ] = "",
    form: TableOrJson = "table",
) -> None:
    """The calculations: equation, symbols, units, range, source, cautions."""
    from corelab.lab import methods as described

    _one_of("--format", form, "table", "json")
    if key == "safety":
        from corelab.sheets import safety

        for hazard, text in safety.HAZARDS.items():
            typer.echo(f"{hazard}: {text}")
        typer.echo("Limits in air of the United States, as a measure of the danger:")
        for agent, limits, source in safety.LIMITS:
            typer.echo(f"  {agent}: {limits} ({source})")
        typer.echo(safety.DEFER)
        return
    found = described(key)
    if form == "json":
        show.print_json(found)
    elif key:
        for name, text in found[0].items():
            if text:
                typer.echo(f"{name}: {text}")
    else:
        for method in found:
            typer.echo(f"{method['key']:36}  {method['title']}")
        typer.echo(f"{'safety':36}  The usual cautions of the bench")


@read_app.command("spwla")
def read_spwla(
    file: Annotated[Path, typer.Argument(metavar="FILE", help="A file in the SPWLA core-data format.")],
    well: Annotated[str, typer.Option(metavar="WELL", help="The well it is of; made where it is new.")],
    laboratory: Annotated[
        str, typer.Option(metavar="NAME", help="Whose results they are; else as the file says.")
    ] = "",
    unit: Annotated[
        str, typer.Option(metavar="m|ft", help="Unit of the file's depths; else the well's own.")
    ] = "",
    check: Annotated[bool, typer.Option("--check", help="Only report what would be done.")] = False,
    reason: Reason = "",
) -> None:
    """Take in another laboratory's results; they are kept apart from the lab's own, with their origin."""
    with _lab() as lab:
        done = lab.read_spwla(file, well, laboratory=laboratory, unit=unit, reason=reason, check=check)
    if done.notices:
        show.tell(f"What to know of {done.file}:")
        show.print_lines([f"  {notice}" for notice in done.notices], 40)
    show.tell(
        f"{done.samples} samples, {done.plugs} plugs, {done.results} results of "
        f"{', '.join(done.laboratories)}."
    )
    if done.unchanged:
        show.tell("Nothing changed: the record has all of this already.")
    elif done.checked_only:
        show.tell("No problem found; nothing was written.")
    else:
        instead = f" in the place of {done.supersedes}" if done.supersedes else ""
        show.tell(f"Kept under well {done.well}{instead}. Seal {done.seal}")


@read_app.command("list")
def read_list(
    well: Annotated[str, typer.Argument(metavar="[WELL]", help="Only this well.")] = "",
    form: TableOrJson = "table",
) -> None:
    """The files of other laboratories' results that were read, and what became of them."""
    _one_of("--format", form, "table", "json")
    with _lab() as lab:
        frame = lab.read_list(well)
    _show(frame, form)


@read_app.command("withdraw")
def read_withdraw(
    number: Annotated[int, typer.Argument(metavar="NUMBER", help="Number of the file, from 'read list'.")],
    reason: Reason = "",
) -> None:
    """Take a file of another laboratory's results out of force, as when it was read into the wrong well."""
    with _lab() as lab:
        name = lab.read_withdraw(number, reason)
    show.tell(f"Withdrew {name}; it stays in the history.")


@write_app.command("workbook")
def write_workbook(
    well: Well,
    out: OutFile,
    partner: Partner = "",
    unit: DepthUnit = "",
    reason: Reason = "",
) -> None:
    """Write the workbook of a well that a partner receives."""
    with _lab() as lab:
        lab.write_workbook(well, out, recipient=partner, unit=unit, reason=reason)
    show.tell(f"Wrote {out}.")


@write_app.command("las")
def write_las(
    well: Well,
    out: OutFile,
    version: Annotated[
        str, typer.Option(metavar="2.0|3.0", help="3.0 holds texts, in sections for core.")
    ] = "2.0",
    partner: Partner = "",
    unit: DepthUnit = "",
    where: Where = "",
    reason: Reason = "",
) -> None:
    """Write the results of a well as LAS."""
    with _lab() as lab:
        lab.write_las(well, out, version=version, recipient=partner, unit=unit, where=where, reason=reason)
        show.tell(f"Wrote {out}. Seal {lab.seal()}")


@write_app.command("spwla")
def write_spwla(
    well: Well,
    out: OutFile,
    partner: Partner = "",
    unit: DepthUnit = "",
    where: Where = "",
    reason: Reason = "",
) -> None:
    """Write the results of a well in the SPWLA core-data format."""
    with _lab() as lab:
        lab.write_spwla(well, out, recipient=partner, unit=unit, where=where, reason=reason)
        show.tell(f"Wrote {out}. Seal {lab.seal()}")


@write_app.command("page")
def write_page(
    well: Well,
    out: OutFile,
    partner: Partner = "",
    unit: DepthUnit = "",
    reason: Reason = "",
) -> None:
    """Write the page of a well that a partner opens in a browser."""
    with _lab() as lab:
        lab.write_page(well, out, recipient=partner, unit=unit, reason=reason)
    show.tell(f"Wrote {out}.")


@write_app.command("csv")
def write_csv(
    well: Well,
    out: OutFile,
    partner: Partner = "",
    unit: DepthUnit = "",
    where: Where = "",
    reason: Reason = "",
) -> None:
    """Write the results of a well as CSV."""
    with _lab() as lab:
        lab.write_csv(well, out, recipient=partner, unit=unit, where=where, reason=reason)
        show.tell(f"Wrote {out}. Seal {lab.seal()}")


@write_app.command("parquet")
def write_parquet(
    well: Well,
    out: OutFile,
    partner: Partner = "",
    unit: DepthUnit = "",
    where: Where = "",
    reason: Reason = "",
) -> None:
    """Write the results of a well as Parquet."""
    with _lab() as lab:
        lab.write_parquet(well, out, recipient=partner, unit=unit, where=where, reason=reason)
        show.tell(f"Wrote {out}. Seal {lab.seal()}")


def run() -> None:
    """The program's entry: no traceback reaches a user."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(encoding="utf-8", errors="replace")
    try:
        app(prog_name="corelab")
    except Refused as refused:
        show.print_lines([refused.summary, *(f"  {problem}" for problem in refused.problems)], 200)
        sys.exit(1)
    except Usage as wrong:
        show.tell(str(wrong))
        sys.exit(2)
    except CorelabError as trouble:
        show.tell(str(trouble))
        sys.exit(1)
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(1)
    except Exception as fault:
        if isinstance(fault, OSError) and fault.errno == errno.ENOSPC:
            show.tell(f"The output cannot be written: {fault.strerror}. Make room and try again.")
            sys.exit(1)
        log = _log_fault()
        show.tell(
            f"This should not have happened ({type(fault).__name__}). Nothing was written to the record. "
            f"{f'Details are in {log}; please' if log else 'Please'} pass them on to who keeps corelab."
        )
        sys.exit(1)


def _log_fault() -> Path | None:
    """Keep the details of a fault of the program's own beside the lab, else in the folder at hand."""
    from datetime import UTC, datetime

    command = " ".join(sys.argv[1:])
    text = f"{datetime.now(UTC).isoformat()} corelab {__version__}: {command}\n{traceback.format_exc()}\n"
    text = _hidden(text)
    for folder in (Path(_State.database).parent, Path.cwd()):
        try:
            if "://" not in str(folder) and folder.is_dir():
                log = folder / "corelab.log"
                with log.open("a", encoding="utf-8") as file:
                    file.write(text)
                return log
        except OSError:
            continue
    return None


if __name__ == "__main__":
    run()
