"""The one door below the doors: a laboratory's record, with one method a command."""

from __future__ import annotations

import getpass
from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pandas as pd

from corelab.bench import compute
from corelab.bench import load as loading
from corelab.bench import settings as lab_settings
from corelab.bench.parse import Row
from corelab.errors import NotFound, Problem, Refused, Unavailable, Usage, did_you_mean, quoted
from corelab.interval import board, explain, life, recovery, select
from corelab.records import engine as engines
from corelab.records import history, migrate, schema, store
from corelab.sheets import SHEETS, STANDARDS_WELL
from corelab.version import __version__

if TYPE_CHECKING:
    import sqlalchemy as sa


@dataclass(frozen=True, slots=True)
class Setup:
    """What `setup` did."""

    before: str
    after: str
    backup: Path | None

    @property
    def made(self) -> bool:
        return not self.before


class Lab:
    """A laboratory's record. Made by `corelab.open_lab`."""

    def __init__(self, database: str = "corelab.db", by: str = "") -> None:
        self.database = database
        self.by = by
        self.engine = engines.make_engine(database)

    def close(self) -> None:
        """Let go of the database."""
        self.engine.dispose()

    def __enter__(self) -> Lab:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    # -- transactions -------------------------------------------------------------------------------------

    def _require_file(self) -> None:
        file = self._file()
        if file is not None and not file.exists():
            raise NotFound(
                f"There is no lab at {file}; make one with 'corelab setup', or name another database."
            )

    def _file(self) -> Path | None:
        file = engines.sqlite_file(self.engine.url)
        if file is not None and file.is_dir():
            raise Unavailable(f"'{file}' cannot be used as a lab: it is a folder; name a file in it.")
        return file

    @contextmanager
    def _reading(self) -> Iterator[sa.Connection]:
        self._require_file()
        with engines.reading(self.engine) as connection:
            migrate.require_current(connection)
            yield connection

    @contextmanager
    def _writing(self, *, keep: bool = True) -> Iterator[tuple[sa.Connection, str]]:
        """A connection that changes the record, and the acting person; the changes may only be tried."""
        self._require_file()
        with engines.writing(self.engine, keep=keep) as connection:
            migrate.require_current(connection)
            yield connection, self._acting(connection)

    def _acting(self, connection: sa.Connection) -> str:
        """The acting person: registered, once anybody is."""
        name = self.by or _login()
        known = store.persons(connection)
        if known and store.name_key(name) not in known:
            names = [shown for _, shown, _ in known.values()]
            raise NotFound(
                f"{quoted(name)} is not registered in this lab; {did_you_mean(name, names)} "
                "Say who you are with --by or CORELAB_BY."
            )
        return known[store.name_key(name)][1] if known else name

    def _close(
        self,
        change: store.Change,
        person: str,
        command: str,
        detail: Mapping[str, object],
        reason: str = "",
    ) -> str:
        return change.close(
            person=person, command=command, program_version=__version__, reason=reason, detail=detail
        )

    # -- the lab itself -----------------------------------------------------------------------------------

    def setup(self) -> Setup:
        """Make the database, or bring it to the newest schema."""
        file = self._file()
        if file is not None and not file.absolute().parent.is_dir():
            raise NotFound(f"There is no folder {file.absolute().parent}: make it first.")
        before, after, backup = migrate.upgrade(self.engine)
        with engines.writing(self.engine) as connection:
            identities = store.Identities.read(connection)
            if identities.find("well", STANDARDS_WELL) is None:
                change = store.Change.begin(connection)
                identities.add("well", STANDARDS_WELL)
                change.identities(identities)
                self._close(change, self.by or _login(), "setup", {"schema": after})
        return Setup(before, after, backup)

    def seal(self) -> str:
        """The head of the chain of events."""
        with self._reading() as connection:
            return history.last_seal(connection)

    def setting(self, name: str = "", value: str | None = None) -> pd.DataFrame:
        """The settings, or one of them; with a value, set it and recompute what depends on it."""
        if value is not None:
            self._set(name, value)
        names = [lab_settings.setting_named(name).name] if name else list(lab_settings.SETTINGS)
        with self._reading() as connection:
            stored = store.settings(connection)
        rows = [
            {
                "setting": n,
                "value": lab_settings.shown(stored, n),
                "unit": lab_settings.SETTINGS[n].unit,
                "set": "set" if n in stored else "default" if lab_settings.SETTINGS[n].default else "not set",
                "meaning": lab_settings.SETTINGS[n].note,
            }
            for n in names
        ]
        return pd.DataFrame(rows)

    def _set(self, name: str, value: str) -> None:
        setting = lab_settings.setting_named(name)
        text = lab_settings.checked(name, value)
        with self._writing() as (connection, person):
            stored = store.settings(connection)
            if stored.get(setting.name) == text:
                return
            change = store.Change.begin(connection)
            number = store.next_id(connection, schema.setting)
            change.rows(schema.setting, [{"id": number, "name": setting.name, "value": text}])
            if setting.moves_results:
                identities = store.Identities.read(connection)
                stored[setting.name] = text
                compute.keep(connection, list(identities.names["plug"]), stored)
            self._close(change, person, "setting", {"name": setting.name, "value": text})

    def person_add(self, name: str, role: str) -> None:
        """Register a person, or give a registered one another role."""
        if role not in schema.ROLES:
            raise Usage(f"A role is one of: {', '.join(schema.ROLES)}; found {quoted(role)}.")
        shown = " ".join(name.split())
        if not shown:
            raise Usage("A person needs a name.")
        with self._writing() as (connection, acting):
            known = store.persons(connection)
            if not known and role != "manager":
                raise Usage("The first person registered must be a manager, who registers the others.")
            if known and known[store.name_key(acting)][2] != "manager":
                raise Refused(
                    [Problem(f"the role of {acting}", "a manager", "ask a manager to register people")],
                    "Nothing was written: only a manager registers people.",
                )
            change = store.Change.begin(connection)
            key = store.name_key(shown)
            if key in known:
                number = known[key][0]
                if known[key][2] == role:
                    raise Usage(f"{known[key][1]} is registered as {role} already.")
            else:
                number = store.next_id(connection, schema.person)
                change.rows(schema.person, [{"id": number, "name": shown, "name_key": key}])
            fact = {"id": store.next_id(connection, schema.person_role), "person_id": number, "role": role}
            change.rows(schema.person_role, [fact])
            self._close(change, acting, "person add", {"name": shown, "role": role})

    # -- bench sheets -------------------------------------------------------------------------------------

    def sheet_blank(self, kinds: Sequence[str], out: Path, well: str = "") -> None:
        """Write empty bench sheets, with the well's plugs filled in where a well is named."""
        from corelab.formats.blank_sheets import write_blank

        sheets = [SHEETS[kind] for kind in kinds]
        prefilled: dict[str, list[dict[str, str]]] = {}
        if well:
            with self._reading() as connection:
                identities = store.Identities.read(connection)
                number = select.well_id(identities, well)
            shown = identities.name("well", number)
            plugs = sorted(identities.known("plug", number), key=select.natural_key)
            for sheet in sheets:
                names = {c.name for c in sheet.own_columns}
                if {"well", "plug"} <= names and sheet.kind != "plugs":
                    prefilled[sheet.kind] = [{"well": shown, "plug": plug} for plug in plugs]
                elif "well" in names:
                    prefilled[sheet.kind] = [{"well": shown}]
        write_blank(out, sheets, prefilled=prefilled)

    def load(
        self,
        paths: Sequence[str | Path],
        *,
        check: bool = False,
        reason: str = "",
        decimal_comma: bool = False,
        told: Callable[[str], None] | None = None,
    ) -> loading.LoadReport:
        """Load bench sheets: all or nothing.

        Raises
        ------
        Refused
            With every problem of every file; nothing is written.
        """
        say = told or (lambda _: None)
        self._require_file()
        files, ignored, problems = loading.find_files([Path(p) for p in paths])
        report = loading.LoadReport([shown for _, shown in files], ignored, checked_only=check)
        say(f"reading {len(files)} file{'' if len(files) == 1 else 's'}")
        rows, wrong, report.notices = loading.read_rows(files, decimal_comma=decimal_comma)
        problems += wrong
        say(f"checking {len(rows)} rows")
        with self._writing(keep=not check) as (connection, person):
            planned, identities, stored = self._planned(connection, rows, problems, report, reason)
            if not planned.new and not identities.added:
                return report
            change = store.Change.begin(connection)
            change.identities(identities)
            change.entries(planned.new)
            plugs = loading.affected_plugs(connection, planned.touched, identities)
            say(f"computing the results of {len(plugs)} plugs")
            computed = compute.keep(connection, plugs, stored)
            report.plugs = len(plugs)
            report.not_computed = compute.not_computed(computed)
            for n, flag in compute.doubtful(computed):
                well = identities.name("well", identities.owner("plug", n))
                report.doubtful.append(f"{identities.name('plug', n)} of {well}: {flag}")
            detail = {"files": loading.file_digests(files), "new": report.new, "corrected": report.corrected}
            seal = self._close(change, person, "sheet load", detail, reason)
            report.seal = "" if check else seal
        return report

    def _planned(
        self,
        connection: sa.Connection,
        rows: list[Row],
        problems: list[Problem],
        report: loading.LoadReport,
        reason: str,
    ) -> tuple[loading.Planned, store.Identities, dict[str, str]]:
        identities = store.Identities.read(connection)
        stored = store.settings(connection)
        barometer = lab_settings.number(stored, "barometric pressure")
        planned = loading.plan(
            connection,
            rows,
            problems,
            report,
            identities,
            barometer_kpa=None if barometer != barometer else barometer,
            reason=reason.strip(),
        )
        return planned, identities, stored

    def withdraw(self, number: int, reason: str) -> dict[str, Any]:
        """Take an entry out of force; its results are computed anew without it."""
        if not reason.strip():
            raise Usage("A withdrawal needs a reason: --reason TEXT.")
        with self._writing() as (connection, person):
            row = store.entry_row(connection, number)
            if row is None or row["kind"] == schema.WITHDRAWAL:
                raise NotFound(
                    f"There is no reading {number}; 'corelab plug show' lists them with their numbers."
                )
            if not row["in_force"]:
                raise NotFound(f"Reading {number} is not in force: it was corrected or withdrawn before.")
            self._refuse_orphans(connection, row)
            stored = store.settings(connection)
            change = store.Change.begin(connection)
            change.entries([store.NewEntry(schema.WITHDRAWAL, {}, {}, supersedes=number)])
            identities = store.Identities.read(connection)
            plugs = loading.affected_plugs(connection, [(row["kind"], row["values"])], identities)
            compute.keep(connection, plugs, stored)
            self._close(
                change, person, "withdraw", {"withdrawn": number, "kind": row["kind"]}, reason.strip()
            )
        return row

    def _refuse_orphans(self, connection: sa.Connection, row: Mapping[str, Any]) -> None:
        """A run or shot on which plugs in force rest cannot be taken out of force from under them."""
        values = row["values"]
        if row["kind"] == "plugs":
            number = values["plug_id"]
            entries = life.entries_of_plugs(connection, [number], in_force_only=True)
            resting = entries[~entries["kind"].isin(["plugs", "descriptions"])] if len(entries) else entries
            if len(resting):
                identities = store.Identities.read(connection)
                raise Refused(
                    [
                        Problem(
                            f"{len(resting)} entries in force about plug {identities.name('plug', number)}",
                            "a plug about which nothing is in force",
                            "withdraw those first ('corelab plug show' lists their numbers)",
                        )
                    ]
                )
            return
        if row["kind"] == "core runs":
            plugs = store.in_force(connection, "plugs", [values["run_id"]], by="run_id")
            what = "run"
        elif row["kind"] == "sidewall shots":
            plugs = store.in_force(connection, "plugs", [values["gun_run_id"]], by="gun_run_id")
            plugs = plugs[[str(s).casefold() == values["shot"].casefold() for s in plugs["shot"]]]
            what = "shot"
        else:
            return
        if len(plugs):
            identities = store.Identities.read(connection)
            names = ", ".join(identities.name("plug", int(p)) for p in plugs["plug_id"][:5])
            raise Refused(
                [
                    Problem(
                        f"{len(plugs)} plugs that rest on this {what} ({names})",
                        f"no plug in force from a {what} that is withdrawn",
                        "correct the plugs first, or withdraw them",
                    )
                ]
            )

    # -- what the lab holds -------------------------------------------------------------------------------

    def well_list(self) -> pd.DataFrame:
        """The wells, with their jobs and how much of them is here."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            facts = {int(r["well_id"]): r for r in store.rows_of(store.in_force(connection, "wells"))}
        rows = []
        for number, name in identities.names["well"].items():
            if store.name_key(name) == STANDARDS_WELL:
                continue
            fact: Mapping[str, Any] = facts.get(number, {})
            job = fact.get("job_id")
            rows.append(
                {
                    "well": name,
                    "field": fact.get("field") or "",
                    "job": "" if job is None or job != job else identities.name("job", int(job)),
                    "depth unit": fact.get("depth_unit") or "",
                    "core runs": sum(o == number for o in identities.owners["run"].values()),
                    "plugs": sum(o == number for o in identities.owners["plug"].values()),
                }
            )
        rows.sort(key=lambda r: select.natural_key(str(r["well"])))
        return pd.DataFrame(rows, columns=["well", "field", "job", "depth unit", "core runs", "plugs"])

    def plug_list(self, well: str) -> pd.DataFrame:
        """The plugs of a well; `standards` lists the check plugs."""
        frame = self.interval(well)
        headings = ["plug", "source", "run", "orientation", "facies", "lithology"]
        depth = next(c for c in frame.columns if c.startswith("depth ["))
        if store.name_key(well) == STANDARDS_WELL:
            with self._reading() as connection:
                identities = store.Identities.read(connection)
                kinds = store.in_force(connection, "standards")
            return pd.DataFrame(
                {
                    "standard": [identities.name("standard", int(s)) for s in kinds["standard_id"]],
                    "kind": kinds["kind"],
                    "certificate": kinds["certificate"].fillna(""),
                    "valid until": kinds["valid_until"].fillna(""),
                }
            )
        return frame[["plug", "source", depth, *headings[2:]]]

    def plug_show(self, well: str, plug: str) -> dict[str, pd.DataFrame]:
        """All that is recorded of one plug: its entries with their numbers, and its results."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            number = select.plug_id(identities, well, plug)
            entries = life.entries_of_plugs(connection, [number])
            results = store.results(connection, [number])
        shown = []
        for entry in entries.to_dict("records"):
            state = "in force"
            if entry["superseded_by"] == entry["superseded_by"] and entry["superseded_by"] is not None:
                withdrawn = entry["superseded_kind"] == schema.WITHDRAWAL
                state = "withdrawn" if withdrawn else f"corrected by {int(entry['superseded_by'])}"
            shown.append(
                {
                    "number": int(entry["number"]),
                    "kind": entry["kind"],
                    "measured on": entry["measured_on"] or "",
                    "measured by": entry["measured_by"] or "",
                    "entry": life.entered_words(entry["entered"]),
                    "state": state,
                    "entered by": entry["person"],
                }
            )
        columns = ["number", "kind", "measured on", "measured by", "entry", "state", "entered by"]
        there = results[
            [
                "quantity",
                "direction",
                "stress_mpa",
                "step",
                "value",
                "value_limit",
                "basis",
                "flags",
                "reason",
            ]
        ]
        return {
            "entries": pd.DataFrame(shown, columns=columns),
            "results": there.rename(columns={"stress_mpa": "stress [MPa]", "value_limit": "limit"}),
        }

    def explain(
        self, well: str, plug: str, result: str, *, stress: float | None = None, direction: str = ""
    ) -> dict[str, Any]:
        """How a result came about: formulas with numbers, readings as typed, instruments, budget.

        Parameters
        ----------
        result
            Its name, such as `porosity` or `klinkenberg permeability`.
        stress, direction
            Which one, where there are several; the lowest stress measured where not said.
        """
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            return explain.explain(
                connection, identities, well, plug, result, stress_mpa=stress, direction=direction
            )

    def recovery(self, well: str, unit: str = "") -> dict[str, pd.DataFrame]:
        """Core runs and sidewall shots: cut, recovered, lost."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well)
            facts = store.in_force(connection, "wells", [number], by="well_id")
            shown = select.depth_unit(facts, store.settings(connection), unit)
            return {
                "core runs": recovery.core_runs(connection, identities, number, shown),
                "sidewall shots": recovery.shots(connection, identities, number),
            }

    def board(self, well: str = "") -> pd.DataFrame:
        """Where every plug is and what it waits for."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            standards = identities.find("well", STANDARDS_WELL)
            wells = [select.well_id(identities, well)] if well else list(identities.names["well"])
            return board.board(connection, identities, [w for w in wells if w != standards])

    def interval(
        self,
        well: str,
        top: float | None = None,
        base: float | None = None,
        *,
        depth: str = "",
        unit: str = "",
        where: str = "",
        stress: float | None = None,
        with_uncertainty: bool = False,
        uniaxial: float | None = None,
    ) -> pd.DataFrame:
        """The plugs of an interval and their results, one row a plug, units in the headings.

        Parameters
        ----------
        well
            Name of the well.
        top, base
            Inclusive, in `unit`.
        depth
            'driller' or 'log'; each plug's own where empty.
        unit
            'm' or 'ft'; the well's own where empty.
        where
            A condition such as ``porosity > 0.12 and facies = 'channel sand'``.
        stress
            Net confining stress [MPa]; the lowest measured where None.
        uniaxial
            Poisson's ratio, where `stress` is a uniaxial stress of the reservoir: the hydrostatic stress of
            the laboratory that compacts alike is taken (Teeuw 1971).
        with_uncertainty
            Add a column `u …` after each computed one.
        """
        filters = select.Filters(top, base, depth, unit, where, stress, with_uncertainty, uniaxial)
        with self._reading() as connection:
            return select.interval(connection, store.Identities.read(connection), well, filters)

    def history(self, well: str = "", plug: str = "") -> pd.DataFrame:
        """Who entered or changed what, when and why."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            if plug:
                return life.of_plug(connection, select.plug_id(identities, well, plug))
            if well:
                return life.of_well(connection, identities, select.well_id(identities, well))
            return store.events(connection)[["number", "at", "person", "command", "reason", "detail"]]

    def recompute(self, *, check: bool = False) -> pd.DataFrame:
        """Compute all results anew; returns those that differ from what is stored (none, it is hoped)."""
        columns = ["well", "plug", "quantity", "direction", "stress [MPa]", "step", "difference"]
        context = self._reading() if check else self._writing()
        with context as opened:
            connection = opened if check else opened[0]  # type: ignore[index]
            identities = store.Identities.read(connection)  # type: ignore[arg-type]
            plugs = list(identities.names["plug"])
            stored = store.settings(connection)  # type: ignore[arg-type]
            rows = compute.compute(connection, plugs, stored)  # type: ignore[arg-type]
            recorded = store.rows_of(store.results(connection))  # type: ignore[arg-type]
            found = compute.differences(rows, recorded)
            if found and not check:
                store.replace_results(connection, plugs, rows)  # type: ignore[arg-type]
                change = store.Change.begin(connection)  # type: ignore[arg-type]
                self._close(change, opened[1], "recompute", {"results that differed": len(found)})  # type: ignore[index]
        shown = [
            {
                "well": identities.name("well", identities.owner("plug", key[0])),
                "plug": identities.name("plug", key[0]),
                **dict(zip(columns[2:6], key[1:], strict=True)),
                "difference": text,
            }
            for key, text in found
        ]
        return pd.DataFrame(shown, columns=columns)

    # -- what leaves the lab ------------------------------------------------------------------------------

    def write_workbook(self, well: str, out: str | Path, *, recipient: str = "", unit: str = "") -> Path:
        """Write the workbook of a well that a partner receives."""
        from corelab.reports.well import report
        from corelab.reports.workbook import write_workbook

        _refuse_standards(well)
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            person = self._acting(connection)
            filters = select.Filters(unit=unit)
            made = report(connection, identities, well, person=person, recipient=recipient, filters=filters)
        write_workbook(Path(out), made)
        return Path(out)

    def write_csv(self, well: str, out: str | Path, **filters: Any) -> Path:
        """Write the interval of a well as CSV, UTF-8 with a mark."""
        from corelab.formats.tables_out import write_csv

        _refuse_standards(well)
        write_csv(Path(out), self.interval(well, **filters))
        return Path(out)

    def write_parquet(self, well: str, out: str | Path, **filters: Any) -> Path:
        """Write the interval of a well as Parquet."""
        from corelab.formats.tables_out import write_parquet

        _refuse_standards(well)
        write_parquet(Path(out), self.interval(well, **filters))
        return Path(out)


def methods(key: str = "") -> list[dict[str, str]]:
    """The calculations in the words of the code: all of them, or the one named."""
    from corelab.reports.well import described
    from corelab.science.catalogue import formulas

    known: Mapping[str, Any] = formulas()
    if key and key not in known:
        raise NotFound(f"There is no method {quoted(key)}; {did_you_mean(key, list(known))}")
    chosen: Collection[str] = [key] if key else known
    return [described(known[k]) for k in chosen]


def _refuse_standards(well: str) -> None:
    if store.name_key(well) == STANDARDS_WELL:
        raise Usage(f"'{STANDARDS_WELL}' are check plugs, not a well: name a well to write its results.")


def _login() -> str:
    try:
        return getpass.getuser()
    except (OSError, KeyError, ImportError):
        return "unknown"
