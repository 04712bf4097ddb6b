"""The one door below the doors: a laboratory's record, with one method a command."""

from __future__ import annotations

import getpass
import json
import tempfile
from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pandas as pd

from corelab.bench import compute
from corelab.bench import load as loading
from corelab.bench import settings as lab_settings
from corelab.bench.parse import Row
from corelab.errors import NotFound, Problem, Refused, Unavailable, Usage, did_you_mean, quoted
from corelab.interval import board, controlled, explain, impact, life, other_labs, recovery, select
from corelab.records import engine as engines
from corelab.records import history, logs, migrate, schema, store
from corelab.review import approve, entitled, issued, roles
from corelab.review.issued import Issuing as _Issuing
from corelab.sheets import SHEETS, STANDARDS_WELL
from corelab.version import __version__

if TYPE_CHECKING:
    import sqlalchemy as sa

    from corelab.bench.other_labs import OtherLabReport
    from corelab.formats.well_heading import WellHeading
    from corelab.interval.trend import Trends
    from corelab.review.verify import Verified


@dataclass(frozen=True, slots=True)
class Setup:
    """What `setup` did."""

    before: str
    after: str
    backup: Path | None

    @property
    def made(self) -> bool:
        return not self.before


@dataclass(frozen=True, slots=True)
class Restored:
    """What `restore` did: the backup's seal, how many events of the lab it lacked, where those are kept."""

    seal: str
    lost: int
    kept: Path | None


class Lab:
    """A laboratory's record. Made by `corelab.open_lab`."""

    def __init__(
        self, database: str = "corelab.db", by: str = "", password: str | Callable[[str], str] = ""
    ) -> None:
        self.database = database
        self.by = by
        self.engine = engines.make_engine(database)
        self._password = password
        self._signed_in: set[str] = set()

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
    def _writing(self, act: str, *, keep: bool = True) -> Iterator[tuple[sa.Connection, str]]:
        """A connection that changes the record, and the acting person, who must be allowed to do so.

        Parameters
        ----------
        act
            What is done, by its name in `corelab.review.roles.MAY`.
        keep
            Whether the changes stay; else they are only tried.
        """
        self._require_file()
        self._sign_in()
        with engines.writing(self.engine, keep=keep) as connection:
            migrate.require_current(connection)
            yield connection, self._acting(connection, act)

    def _acting(self, connection: sa.Connection, act: str = "") -> str:
        """The acting person: registered, once anybody is, and allowed to do what is asked."""
        known = store.persons(connection)
        if not known:
            return self.by or _login()
        number, name, role = self._registered(known)
        if act:
            secret = store.secrets(connection).get(number)
            if secret is not None and secret not in self._signed_in:
                raise Unavailable(f"The password of {name} was set a moment ago: try again.")
            roles.require(act, name, role)
        return name

    def _registered(self, known: Mapping[str, tuple[int, str, str]]) -> tuple[int, str, str]:
        name = self.by or _login()
        found = known.get(store.name_key(name))
        if found is None or found[2] == schema.LEFT:
            names = [shown for _, shown, role in known.values() if role != schema.LEFT]
            state = "has left this lab" if found else "is not registered in this lab"
            raise NotFound(
                f"{quoted(name)} {state}; {did_you_mean(name, names)} "
                "Say who you are with --by or CORELAB_BY."
            )
        return found

    def _sign_in(self) -> None:
        """Check the acting person's password, if there is one, before the record is locked for writing."""
        with self._reading() as connection:
            known, secrets = store.persons(connection), store.secrets(connection)
        if not known:
            return
        number, name, _ = self._registered(known)
        secret = secrets.get(number)
        if secret is None or secret in self._signed_in:
            return
        given = self._password(name) if callable(self._password) else self._password
        roles.check_password(name, secret, given)
        self._signed_in.add(secret)

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

    def setup(self, manager: str = "") -> Setup:
        """Make the database, or bring it to the newest schema.

        Parameters
        ----------
        manager
            Registered as the first person, in a lab that has nobody registered.
        """
        file = self._file()
        if file is not None and not file.absolute().parent.is_dir():
            raise NotFound(f"There is no folder {file.absolute().parent}: make it first.")
        before, after, backup = migrate.upgrade(self.engine)
        shown = " ".join(manager.split())
        with engines.writing(self.engine) as connection:
            identities = store.Identities.read(connection)
            known = store.persons(connection)
            if known.get(store.name_key(shown), (0, "", ""))[2] == "manager":
                shown = ""  # said again
            change = store.Change.begin(connection)
            detail: dict[str, object] = {"schema": after}
            if identities.find("well", STANDARDS_WELL) is None:
                identities.add("well", STANDARDS_WELL)
                change.identities(identities)
            elif before != after:
                detail["schema before"] = before
            elif not shown:
                return Setup(before, after, backup)
            if shown:
                if known:
                    raise Usage("People are registered already: 'corelab person add' registers others.")
                self._add_person(change, shown, "manager", {})
                detail["manager"] = shown
            self._close(change, shown or self.by or _login(), "setup", detail)
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

    def _set(
        self,
        name: str,
        value: str,
        act: str = "change settings",
        detail: Mapping[str, object] | None = None,
    ) -> None:
        setting = lab_settings.setting_named(name)
        text = lab_settings.checked(name, value)
        if setting.name == "report units":
            text = ", ".join(entitled.checked_units(text))
        with self._writing(act) as (connection, person):
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
            kept = {"name": setting.name, "value": text, **(detail or {})}
            self._close(change, person, "setting" if detail is None else "recalibrate", kept)

    def person_add(self, name: str, role: str) -> None:
        """Register a person, or give a registered one another role."""
        if role not in schema.ROLES:
            raise Usage(f"A role is one of: {', '.join(schema.ROLES)}; found {quoted(role)}.")
        self._set_role(name, role, "person add")

    def person_leave(self, name: str) -> None:
        """Note that a person has left: what they did stays, and they may do nothing more."""
        self._set_role(name, schema.LEFT, "person leave")

    def _set_role(self, name: str, role: str, command: str) -> None:
        shown = " ".join(name.split())
        if not shown:
            raise Usage("A person needs a name.")
        with self._writing("register people") as (connection, acting):
            known = store.persons(connection)
            if not known and role != "manager":
                raise Usage("The first person registered must be a manager, who registers the others.")
            key = store.name_key(shown)
            if role == schema.LEFT and key not in known:
                names = [n for _, n, r in known.values() if r != schema.LEFT]
                raise NotFound(f"{quoted(shown)} is not registered; {did_you_mean(shown, names)}")
            if key in known and known[key][2] == role:
                state = "has left already" if role == schema.LEFT else f"is registered as {role} already"
                raise Usage(f"{known[key][1]} {state}.")
            managers = [k for k, (_, _, r) in known.items() if r == "manager"]
            if managers == [key]:
                raise Usage(f"{known[key][1]} is the only manager: make somebody else a manager first.")
            change = store.Change.begin(connection)
            self._add_person(change, shown, role, known)
            self._close(change, acting, command, {"name": shown, "role": role})

    def _add_person(
        self, change: store.Change, shown: str, role: str, known: Mapping[str, tuple[int, str, str]]
    ) -> None:
        key = store.name_key(shown)
        if key in known:
            number = known[key][0]
        else:
            number = store.next_id(change.connection, schema.person)
            change.rows(schema.person, [{"id": number, "name": shown, "name_key": key}])
        fact = {
            "id": store.next_id(change.connection, schema.person_role),
            "person_id": number,
            "role": role,
        }
        change.rows(schema.person_role, [fact])

    def person_password(self, name: str, password: str) -> None:
        """Set a person's password; whoever has one gives it at every change of the record."""
        with self._reading() as connection:
            own = store.name_key(name) == store.name_key(self._acting(connection))
        secret = roles.secret_of(password)
        act = "set one's own password" if own else "set another's password"
        with self._writing(act) as (connection, acting):
            known = store.persons(connection)
            found = known.get(store.name_key(name))
            if found is None:
                names = [n for _, n, _ in known.values()]
                raise NotFound(f"{quoted(name)} is not registered; {did_you_mean(name, names)}")
            change = store.Change.begin(connection)
            number = store.next_id(connection, schema.credential)
            change.rows(schema.credential, [{"id": number, "person_id": found[0], "secret": secret}])
            self._close(change, acting, "person password", {"name": found[1]})
        if own:
            self._signed_in.add(secret)

    def partner_set(
        self, name: str, *, wells: Sequence[str] = (), columns: Sequence[str] = (), units: str = ""
    ) -> None:
        """Say what a partner is entitled to, in the place of what was said before.

        Parameters
        ----------
        wells, columns
            The wells and result columns; all where empty.
        units
            Units in which results are written for this partner, such as `ft, psi, %`.
        """
        shown = " ".join(name.split())
        if not shown:
            raise Usage("A partner needs a name.")
        with self._writing("say what partners are entitled to") as (connection, person):
            identities = store.Identities.read(connection)
            names = [identities.name("well", select.well_id(identities, w)) for w in wells]
            facts = {
                "wells": names,
                "columns": list(entitled.checked_columns(columns)),
                "units": list(entitled.checked_units(units)),
            }
            change = store.Change.begin(connection)
            row = {"id": store.next_id(connection, schema.partner), "name": shown}
            change.rows(schema.partner, [row | {k: json.dumps(v) for k, v in facts.items()}])
            self._close(change, person, "partner set", {"name": shown, **facts})

    def partner_list(self) -> pd.DataFrame:
        """The registered partners and what they are entitled to."""
        with self._reading() as connection:
            known = entitled.partners(connection)
        rows = [
            {
                "partner": p.name,
                "wells": ", ".join(p.wells) or "all",
                "columns": ", ".join(p.columns) or "all",
                "units": ", ".join(p.units),
            }
            for p in known.values()
        ]
        return pd.DataFrame(rows, columns=["partner", "wells", "columns", "units"])

    def person_list(self) -> pd.DataFrame:
        """Who is registered, in which role, and whether they sign in with a password."""
        with self._reading() as connection:
            known, secrets = store.persons(connection), store.secrets(connection)
        rows = [
            {"person": name, "role": role, "password": "set" if number in secrets else "not set"}
            for number, name, role in known.values()
        ]
        return pd.DataFrame(rows, columns=["person", "role", "password"])

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
        described = bool(rows) and {row.sheet.kind for row in rows} <= roles.DESCRIBED
        act = "load descriptions and crush verdicts" if described else "load bench sheets"
        with self._writing(act, keep=not check) as (connection, person):
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
        with self._writing("withdraw readings") as (connection, person):
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
            others = store.other_plugs(connection)["well_id"].value_counts()
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
                    "plugs of others": int(others.get(number, 0)),
                }
            )
        rows.sort(key=lambda r: select.natural_key(str(r["well"])))
        columns = ["well", "field", "job", "depth unit", "core runs", "plugs", "plugs of others"]
        return pd.DataFrame(rows, columns=columns)

    def plug_list(self, well: str) -> pd.DataFrame:
        """The plugs of a well; `standards` lists the check plugs."""
        frame = self.interval(well)
        headings = ["plug", "source", "laboratory", "run", "orientation", "facies", "lithology"]
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
        """All that is recorded of one plug: its entries with their numbers, and its results.

        Where another laboratory reports on a plug of this name, a part `of another laboratory` says what.
        """
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            theirs = other_labs.shown(connection, select.well_id(identities, well), plug)
            if len(theirs) and identities.find("plug", plug, select.well_id(identities, well)) is None:
                return {"of another laboratory": theirs}
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
        } | ({"of another laboratory": theirs} if len(theirs) else {})

    def explain(
        self,
        well: str,
        plug: str,
        result: str,
        *,
        stress: float | None = None,
        direction: str = "",
        approved: bool = False,
    ) -> dict[str, Any]:
        """How a result came about: formulas with numbers, readings as typed, instruments, budget.

        Parameters
        ----------
        result
            Its name, such as `porosity` or `klinkenberg permeability`.
        stress, direction
            Which one, where there are several; the lowest stress measured where not said.
        approved
            As it was approved, from the readings that were in force then.
        """
        if store.name_key(result) in {"crush likelihood", "crush verdict"}:
            raise Usage(f"The crush likelihood is explained by its evidence: 'corelab impact {well}'.")
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            if approved:
                number = select.plug_id(identities, well, plug)
                newest = store.approvals(connection, [number])
                if not len(newest) or newest["verdict"].iloc[0] != "approved":
                    raise NotFound(f"Plug {quoted(plug)} of {well} is not approved.")
                with store.as_of(connection, int(newest["event"].iloc[0])):
                    return explain.explain(
                        connection, identities, well, plug, result, stress_mpa=stress, direction=direction
                    )
            owner = select.well_id(identities, well)
            theirs = identities.find("plug", plug, owner) is None
            if theirs and len(other_labs.found_plugs(connection, owner, plug)):
                shown = identities.name("well", owner)
                return other_labs.explained(connection, owner, shown, plug, explain.quantity_named(result))
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
        filters = _filters(
            top, base, depth=depth, unit=unit, where=where, stress=stress,
            with_uncertainty=with_uncertainty, uniaxial=uniaxial,
        )  # fmt: skip
        with self._reading() as connection:
            return select.interval(connection, store.Identities.read(connection), well, filters)

    def summary(
        self,
        well: str,
        top: float | None = None,
        base: float | None = None,
        *,
        depth: str = "",
        unit: str = "",
        where: str = "",
        stress: float | None = None,
        uniaxial: float | None = None,
        by: str = "",
        weights: str = "count",
        leave_out: Sequence[str] = (),
        cuts: Mapping[str, float | None] | None = None,
    ) -> list[dict[str, Any]]:
        """Averages, spread, heterogeneity, net to gross: one record a group.

        The filters are those of `interval`. Horizontal and unoriented plugs, unless `where` names the
        orientation.

        Parameters
        ----------
        by
            'facies', 'run', 'lithology' or 'orientation'; all plugs together where empty.
        weights
            'count', or 'length' for the length that each plug stands for.
        leave_out
            Suspect plugs to leave out: 'crushed', 'cracked', 'flagged'.
        cuts
            Cut-offs by name (porosity, permeability, water saturation) in the place of the settings.
        """
        from corelab.interval.summary import summary

        _refuse_standards(well)
        filters = select.Filters(top, base, depth, unit, where, stress, False, uniaxial)
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            return summary(
                connection, identities, well, filters, by=by, weights=weights, leave_out=leave_out, cuts=cuts
            )

    def read_las(self, file: str | Path, well: str, *, check: bool = False) -> dict[str, Any]:
        """Take in a log: its curves are kept with the well, each as it stands in the file.

        The same file again changes nothing; another file of the same name is a newer reading of that log.
        """
        from corelab.formats.las_in import read_las

        path = Path(file)
        las = read_las(path)
        digest = loading.file_digests([(path, path.name)])[path.name]
        with self._writing("read in logs and other laboratories' results", keep=not check) as (
            connection,
            person,
        ):
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well)
            _refuse_standards(well)
            known = logs.known_log(connection, number, path.stem)
            told: dict[str, Any] = {
                "log": path.stem,
                "well in file": las.well,
                "curves": [(c.mnemonic, c.unit, c.quantity) for c in las.curves],
                "samples": len(las.depth_m),
                "top [m]": float(las.depth_m.min()),
                "base [m]": float(las.depth_m.max()),
                "notices": list(las.notices),
                "new": known != digest,
            }
            named = identities.name("well", number)
            if las.well and store.name_key(las.well) != store.name_key(named):
                told["notices"].append(f"the file names the well {las.well}; it was taken for {named}")
            if told["new"]:
                change = store.Change.begin(connection)
                new = [
                    logs.NewCurve(c.mnemonic, c.unit, c.quantity, c.description, las.depth_m, c.values)
                    for c in las.curves
                ]
                logs.add_curves(change, number, path.stem, path.name, digest, new)
                detail = {"file": path.name, "well": named, "curves": [c.mnemonic for c in las.curves]}
                self._close(change, person, "read las", detail)
        return told

    def match(
        self,
        well: str,
        log: str | Path | None = None,
        *,
        curve: str = "",
        check: bool = False,
        search: float | None = None,
    ) -> pd.DataFrame:
        """Match core runs and gun runs to a log and keep the shifts; `check` only shows them.

        Parameters
        ----------
        log
            A LAS file, read in as by `read_las`; the newest log of the record where None.
        curve
            The curve to match with; the first gamma curve, else density or porosity, where empty.
        search
            Shifts up to this either way are tried [m].
        """
        from corelab.interval import depths

        if log is not None:
            with self._writing("match depths", keep=False):
                pass  # who may not match reads no log in either
            self.read_las(log, well, check=check)
        with self._writing("match depths", keep=not check) as (connection, person):
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well)
            curves = logs.curves(connection, number)
            if log is not None and check:
                curves = _unkept(Path(log)) or curves
            elif log is not None:
                curves = [c for c in curves if store.name_key(c.log) == store.name_key(Path(log).stem)]
            found = depths.matched(
                connection, identities, well, curves, curve=curve, search_m=search or depths.SEARCH_M
            )
            if not check:
                change = store.Change.begin(connection)
                if depths.keep(change, number, found):
                    told = {s.run: round(s.match.shift_m, 3) for s in found if s.match is not None}
                    self._close(change, person, "match", {"well": well, "shifts": told})
        return depths.shown(found)

    def shift(
        self, well: str, run: str, shift_m: float, reason: str, *, uncertainty_m: float | None = None
    ) -> str:
        """Set a person's own shift of a run: log depth less driller's depth [m]."""
        from corelab.interval import depths

        _require_reason(reason, "A shift set by hand")
        with self._writing("match depths") as (connection, person):
            identities = store.Identities.read(connection)
            change = store.Change.begin(connection)
            kind = depths.own_shift(change, identities, well, run, shift_m, uncertainty_m)
            detail = {"well": well, "run": run, "shift [m]": shift_m}
            self._close(change, person, "match", detail, reason.strip())
        return kind

    def trend(
        self,
        well: str,
        top: float | None = None,
        base: float | None = None,
        *,
        depth: str = "",
        unit: str = "",
        where: str = "",
        stress: float | None = None,
        uniaxial: float | None = None,
        by: str = "",
        model: str = "",
    ) -> Trends:
        """Fits of log10 permeability on porosity with their prediction bands, ranked.

        The filters are those of `interval`. Horizontal and unoriented plugs, unless `where` names the
        orientation.

        Parameters
        ----------
        by
            'facies', 'run', 'lithology' or 'orientation'; all plugs together where empty.
        model
            One model; all where empty.
        """
        from corelab.interval.trend import trend

        _refuse_standards(well)
        filters = select.Filters(top, base, depth, unit, where, stress, True, uniaxial)
        with self._reading() as connection:
            return trend(connection, store.Identities.read(connection), well, filters, by, model)

    def rock_types(
        self,
        well: str,
        top: float | None = None,
        base: float | None = None,
        *,
        depth: str = "",
        unit: str = "",
        where: str = "",
        stress: float | None = None,
        uniaxial: float | None = None,
        percentile: int = 35,
    ) -> pd.DataFrame:
        """Flow zones, throat radii and rock fabric of each plug; `percentile` is that of Pittman's radius."""
        from corelab.interval.trend import rock_type_table

        _refuse_standards(well)
        filters = select.Filters(top, base, depth, unit, where, stress, True, uniaxial)
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            return rock_type_table(connection, identities, well, filters, percentile)

    def impact(self, well: str, prior: float | None = None, *, blind: bool = False) -> list[dict[str, Any]]:
        """Percussion plugs: the likelihood that impact changed them enough to matter, and the evidence.

        Parameters
        ----------
        prior
            Likelihood before any evidence; the lab's setting where None.
        blind
            Judge core and rotary plugs instead, as if shot: what is called likely is a false alarm.
        """
        if prior is not None and not 0.0 < prior < 1.0:
            raise Usage(f"--prior lies between 0 and 1; found {prior:g}.")
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well)
            stored = store.settings(connection)
            frame = select.of_well(connection, identities, number, stored)
            found = impact.of_well(connection, number, frame, stored, prior, blind=blind)
            judged: dict[int, list[str]] = {}
            for plug, words in store.crush_verdicts(connection, set(frame["plug_id"].tolist())):
                judged.setdefault(plug, []).append(words)
            facts = store.in_force(connection, "wells", [number], by="well_id")
            unit = select.depth_unit(facts, stored)
        rows = impact.table(found, frame, unit)
        for row, place in zip(rows, found.place, strict=True):
            row["judged"] = judged.get(int(frame["plug_id"].iloc[place]), [])
        return sorted(rows, key=lambda r: (r["depth [m]"], select.natural_key(r["plug"])))

    def impact_recalibrate(self, *, adopt: bool = False) -> dict[str, Any]:
        """Two parameters learnt from persons' verdicts, with their skill; `adopt` keeps them."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            stored = store.settings(connection)
            standards = identities.find("well", STANDARDS_WELL)
            frames = {
                number: select.of_well(connection, identities, number, stored)
                for number in identities.names["well"]
                if number != standards
            }
            found = impact.recalibrated(impact.labelled(connection, frames, stored), stored)
        if adopt:
            shown = {
                "verdicts": found["verdicts"],
                "skill as it was": round(found["as it is"]["skill"], 4),
                "cross-validated skill": round(found["recalibrated"]["skill"], 4),
            }
            self._set("crush recalibration", found["setting"], "recalibrate the crush likelihood", shown)
        return found

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
        context = self._reading() if check else self._writing("recompute results")
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

    # -- other laboratories' results ----------------------------------------------------------------------

    def read_spwla(
        self,
        file: str | Path,
        well: str,
        *,
        laboratory: str = "",
        unit: str = "",
        reason: str = "",
        check: bool = False,
    ) -> OtherLabReport:
        """Take in another laboratory's results from a file in the SPWLA core-data format.

        Parameters
        ----------
        well
            Name of the well, which is made where it is new.
        laboratory
            Whose results they are; as the file says where empty.
        unit
            Of the file's depths, which it does not state: 'm' or 'ft'; the well's own where empty.
        reason
            Why it takes the place of a file that was read before.
        check
            Only report what would be done.

        Raises
        ------
        Refused
            If the file cannot be read, or holds other content than the one read before, without a reason.
        """
        from corelab.bench import other_labs as taking
        from corelab.bench.reported import plugs_of
        from corelab.formats.spwla_in import read_spwla

        _refuse_standards(well)
        if not store.name_key(well):
            raise Usage("Name the well: --well W.")
        self._require_file()
        found = read_spwla(Path(file))
        report = taking.OtherLabReport(found.file, well.strip(), checked_only=check)
        report.notices += found.notices
        act = "read in logs and other laboratories' results"
        with self._writing(act, keep=not check) as (connection, person):
            identities = store.Identities.read(connection)
            number = identities.add("well", well)
            report.well = identities.name("well", number)
            if identities.added:
                report.notices.append(f"{quoted(report.well)} is a new well")
            if found.well and _same_letters(found.well) != _same_letters(well):
                report.notices.append(f"the file names the well {quoted(found.well)}")
            stored = store.settings(connection)
            facts = store.in_force(connection, "wells", [number], by="well_id")
            depths = select.depth_unit(facts, stored, unit or found.depth_unit)
            if not (unit or found.depth_unit):
                report.notices.append(f"depths are taken as {depths}; say --unit if they are in another")
            plugs = plugs_of(
                found, laboratory=laboratory.strip(), depth_unit=depths, told=report.notices.append
            )
            report.laboratories = sorted({p.laboratory for p in plugs})
            report.samples, report.plugs = len(found.samples), len(plugs)
            report.results = sum(v.value is not None for p in plugs for v in p.values)
            own = select.laboratory_of(connection, facts, stored)
            report.unchanged, before = taking.superseded(
                connection, number, found, plugs, own, reason.strip()
            )
            if report.unchanged:
                return report
            if before is not None:
                report.supersedes = f"file {before}"
            change = store.Change.begin(connection)
            change.identities(identities)
            kept = taking.keep(change, number, found, plugs, before, report.notices)
            detail = {"file": found.file, "well": report.well, "number": kept, "plugs": len(plugs)}
            detail |= {"laboratories": report.laboratories}
            seal = self._close(change, person, "read spwla", detail, reason.strip())
            report.seal = "" if check else seal
        return report

    def read_list(self, well: str = "") -> pd.DataFrame:
        """The files of other laboratories' results, of all wells or of one, with what became of them."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well) if well else None
            files = store.other_files(connection, number)
            plugs = store.other_plugs(connection, number)
        of_file = plugs.groupby("other_file_id")
        rows = []
        for row in store.rows_of(files[files["state"] == "read"]):
            there = of_file.get_group(row["id"]) if row["id"] in of_file.groups else plugs.iloc[:0]
            state = "in force"
            if row["superseded_state"]:
                gone = row["superseded_state"] == "withdrawn"
                state = "withdrawn" if gone else f"superseded by {int(row['superseded_by'])}"
            rows.append(
                {
                    "number": row["id"],
                    "well": identities.name("well", int(row["well_id"])),
                    "file": row["file"],
                    "laboratory": ", ".join(sorted(set(there["laboratory"]))),
                    "plugs": len(there),
                    "state": state,
                    "read on": str(row["at"])[:16].replace("T", " "),
                    "read by": row["person"],
                }
            )
        columns = ["number", "well", "file", "laboratory", "plugs", "state", "read on", "read by"]
        return pd.DataFrame(rows, columns=columns)

    def read_withdraw(self, number: int, reason: str) -> str:
        """Take a file of another laboratory's results out of force; returns its name."""
        from corelab.bench import other_labs as taking

        _require_reason(reason, "A withdrawal")
        with self._writing("withdraw readings") as (connection, person):
            change = store.Change.begin(connection)
            row = taking.withdraw(change, number)
            self._close(
                change, person, "read withdraw", {"file": row["file"], "withdrawn": number}, reason.strip()
            )
        return str(row["file"])

    # -- what leaves the lab ------------------------------------------------------------------------------

    def write_workbook(
        self, well: str, out: str | Path, *, recipient: str = "", unit: str = "", reason: str = ""
    ) -> Path:
        """Write the workbook of a well that a partner receives."""
        from corelab.reports.well import report
        from corelab.reports.workbook import write_workbook

        def make(at: _Issuing, part: Path) -> pd.DataFrame:
            filters = select.Filters(unit=unit)
            made = report(
                at.connection, at.identities, well, person=at.person, recipient=recipient,
                filters=filters, issue=at,
            )  # fmt: skip
            write_workbook(part, made)
            return made.results

        return self._issue("workbook", well, Path(out), make, {"unit": unit}, recipient, reason)

    def write_page(
        self, well: str, out: str | Path, *, recipient: str = "", unit: str = "", reason: str = ""
    ) -> Path:
        """Write the page of a well that a partner opens in a browser: one file, no network."""
        from corelab.reports.page import page_html
        from corelab.reports.well import page, report

        if Path(out).suffix.lower() not in {".html", ".htm"}:
            raise Usage(f"A page is named .html, not {quoted(Path(out).name)}.")

        def make(at: _Issuing, part: Path) -> pd.DataFrame:
            made = report(
                at.connection,
                at.identities,
                well,
                person=at.person,
                recipient=recipient,
                filters=select.Filters(unit=unit),
                issue=at,
            )
            shown = page(at.connection, at.identities, made, at.partner)
            part.write_text(page_html(shown), encoding="utf-8")
            return made.results

        return self._issue("page", well, Path(out), make, {"unit": unit}, recipient, reason)

    def charts(self, well: str) -> Any:
        """Permeability against porosity and both against depth, as one Altair chart for a notebook."""
        from corelab.reports.charts import well_charts

        return well_charts(self.interval(well))

    def write_csv(
        self, well: str, out: str | Path, *, recipient: str = "", reason: str = "", **filters: Any
    ) -> Path:
        """Write the interval of a well as CSV, UTF-8 with a mark."""
        from corelab.formats.tables_out import write_csv

        return self._issue_table("csv", write_csv, well, Path(out), filters, recipient, reason)

    def write_parquet(
        self, well: str, out: str | Path, *, recipient: str = "", reason: str = "", **filters: Any
    ) -> Path:
        """Write the interval of a well as Parquet."""
        from corelab.formats.tables_out import write_parquet

        return self._issue_table("parquet", write_parquet, well, Path(out), filters, recipient, reason)

    def write_las(
        self,
        well: str,
        out: str | Path,
        *,
        version: str = "2.0",
        recipient: str = "",
        reason: str = "",
        **filters: Any,
    ) -> Path:
        """Write the interval of a well as LAS: 2.0 on irregular depths, or 3.0 with its core sections."""
        from corelab.formats import las_out

        if version not in las_out.VERSIONS:
            raise Usage(f"--version is {' or '.join(las_out.VERSIONS)}, not {quoted(version)}.")

        heading = self._well_heading(well)

        def write(part: Path, frame: pd.DataFrame) -> None:
            las_out.write_las(part, frame, heading, version)

        return self._issue_table("las", write, well, Path(out), filters, recipient, reason)

    def write_spwla(
        self, well: str, out: str | Path, *, recipient: str = "", reason: str = "", **filters: Any
    ) -> Path:
        """Write the interval of a well in the SPWLA core-data format."""
        from corelab.formats.spwla_out import write_spwla

        heading = self._well_heading(well)

        def write(part: Path, frame: pd.DataFrame) -> None:
            write_spwla(part, frame, heading)

        return self._issue_table("spwla", write, well, Path(out), filters, recipient, reason)

    def _well_heading(self, well: str) -> WellHeading:
        """The facts of a well that a file for other programs opens with."""
        from corelab.reports.well import heading

        with self._reading() as connection:
            return heading(connection, store.Identities.read(connection), well)

    def _issue_table(
        self,
        kind: str,
        write: Callable[[Path, pd.DataFrame], None],
        well: str,
        out: Path,
        filters: dict[str, Any],
        recipient: str,
        reason: str,
    ) -> Path:
        def make(at: _Issuing, part: Path) -> pd.DataFrame:
            chosen = {"unit": at.partner.depth_unit} | {k: v for k, v in filters.items() if v}
            frame = select.interval(at.connection, at.identities, well, _filters(**chosen))
            frame = entitled.in_units(entitled.of_partner(frame, at.partner), at.partner.units)
            write(part, frame)
            return frame

        return self._issue(kind, well, out, make, filters, recipient, reason)

    def _issue(
        self,
        kind: str,
        well: str,
        out: Path,
        make: Callable[[_Issuing, Path], pd.DataFrame],
        request: Mapping[str, Any],
        recipient: str,
        reason: str,
    ) -> Path:
        """Write a file and keep it, byte for byte, with what it showed.

        It gets its name once the record is closed: nothing is issued unrecorded.
        """
        from corelab.formats.tables_out import replacing

        _refuse_standards(well)
        act = "issue files to a partner" if recipient else "write files"
        with replacing(out) as beside, self._writing(act) as (connection, person):
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well)
            at = issued.begin(connection, identities, number, kind, recipient, person)
            with tempfile.TemporaryDirectory(prefix="corelab-") as folder:
                part = Path(folder) / f"part{out.suffix}"
                shown = make(at, part)
                content = part.read_bytes()
            change = store.Change.begin(connection)
            issued.keep(change, at, out.name, content, shown, request)
            detail: dict[str, object] = {
                "file": out.name,
                "kind": kind,
                "well": identities.name("well", number),
            }
            detail |= {"export": at.number, "issue": at.issue} | ({"for": recipient} if recipient else {})
            self._close(change, person, f"write {kind}", detail, reason.strip())
            beside.write_bytes(content)
        return out

    def export_list(self, well: str = "") -> pd.DataFrame:
        """The files that were issued, of all wells or of one."""
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well) if well else None
            return issued.listed(connection, identities, number)

    def export_again(self, number: int, out: str | Path) -> Path:
        """Write a file that was issued again, byte for byte."""
        from corelab.formats.tables_out import write_bytes

        with self._reading() as connection:
            row = store.export_row(connection, number)
        if row is None:
            raise NotFound(f"There is no export {number}; 'corelab export list' shows those there are.")
        write_bytes(Path(out), row["content"])
        return Path(out)

    def export_check(self, file: str | Path) -> pd.DataFrame:
        """The exports to which a file is equal, byte for byte; none where it was altered or is not ours."""
        path = Path(file)
        try:
            content = path.read_bytes()
        except OSError as trouble:
            raise NotFound(f"{path} cannot be read ({trouble.strerror}).") from trouble
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            return issued.listed(connection, identities, None, content)

    # -- review -------------------------------------------------------------------------------------------

    def review(self, well: str, *, unit: str = "") -> pd.DataFrame:
        """What waits for review in a well, with what is odd about it first."""
        from corelab.review.waiting import waiting

        _refuse_standards(well)
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            number = select.well_id(identities, well)
            blocked = self._blocked(connection, identities, select.plugs_of_well(identities, number))
            return waiting(connection, identities, well, blocked, unit)

    def approve(self, well: str, plugs: Sequence[str], reason: str, *, everything: bool = False) -> int:
        """Approve the results of plugs: they are frozen as they are; returns how many results.

        Parameters
        ----------
        everything
            All that waits in the well, in the place of named plugs.
        """
        _require_reason(reason, "An approval")
        with self._writing("approve results") as (connection, person):
            if not store.persons(connection):
                raise Usage(
                    "Nobody is registered in this lab, and an approval is a person's: register a manager and "
                    "a reviewer first ('corelab person add NAME --role manager')."
                )
            identities, ids = self._named_plugs(connection, well, plugs, everything)
            change = store.Change.begin(connection)
            count = approve.approve(
                change, identities, ids, person, self._blocked(connection, identities, ids)
            )
            detail = {"well": well, "plugs": [identities.name("plug", p) for p in ids], "results": count}
            self._close(change, person, "approve", detail, reason.strip())
        return count

    def revoke(self, well: str, plugs: Sequence[str], reason: str) -> None:
        """Take back the approval of plugs."""
        _require_reason(reason, "Revoking an approval")
        with self._writing("revoke approvals") as (connection, person):
            identities, ids = self._named_plugs(connection, well, plugs, False)
            change = store.Change.begin(connection)
            approve.revoke(change, identities, ids)
            detail = {"well": well, "plugs": [identities.name("plug", p) for p in ids]}
            self._close(change, person, "revoke", detail, reason.strip())

    def release(self, well: str, plugs: Sequence[str], reason: str) -> None:
        """Let results stand that control blocks; the reason travels with them."""
        _require_reason(reason, "A release")
        with self._writing("release what control blocks") as (connection, person):
            identities, ids = self._named_plugs(connection, well, plugs, False)
            change = store.Change.begin(connection)
            approve.release(change, identities, ids, self._blocked(connection, identities, ids))
            detail = {"well": well, "plugs": [identities.name("plug", p) for p in ids]}
            self._close(change, person, "release", detail, reason.strip())

    def _named_plugs(
        self, connection: sa.Connection, well: str, plugs: Sequence[str], everything: bool
    ) -> tuple[store.Identities, list[int]]:
        _refuse_standards(well)
        identities = store.Identities.read(connection)
        if everything:
            frame = select.interval(connection, identities, well, select.Filters(own_only=True))
            plugs = frame.loc[frame["status"] != "approved", "plug"].tolist()
            number = select.well_id(identities, well)
            ids = [identities.ids["plug"][number, store.name_key(p)] for p in plugs]
            results = store.results(connection, ids)
            there = set(results.loc[results["value"].notna(), "plug_id"])
            ids = [p for p in ids if p in there]
            if not ids:
                raise NotFound(f"Nothing waits for review in {well}.")
            return identities, ids
        if not plugs:
            raise Usage("Name the plugs.")
        return identities, list(dict.fromkeys(select.plug_id(identities, well, plug) for plug in plugs))

    def _blocked(
        self, connection: sa.Connection, identities: store.Identities, plug_ids: Sequence[int]
    ) -> dict[int, str]:
        """By plug, what control says against its results."""
        found = controlled.doubts_of(connection, identities, store.settings(connection), plug_ids)
        return {plug: "; ".join(words) for plug, words in found.items()}

    def control(self, instrument: str = "", on: str = "") -> dict[str, pd.DataFrame]:
        """The state of each instrument, the charts of its check standards, its precision.

        Parameters
        ----------
        instrument
            Only this one; all where empty.
        on
            The state on this day, from the checks made until then; today, or on the day of the newest
            check if that is later, where empty.

        Returns
        -------
        dict
            `instruments`, `charts`, `checks` (one row an occasion), `precision`, `between instruments`, and
            of all instruments also `standards` and `duplicates`.
        """
        if on and not _is_day(on):
            raise Usage(f"A day is written as 2026-03-14; found {quoted(on)}.")
        with self._reading() as connection:
            identities = store.Identities.read(connection)
            if instrument and identities.find("instrument", instrument) is None:
                names = sorted(identities.known("instrument"), key=select.natural_key)
                raise NotFound(
                    f"There is no instrument {quoted(instrument)}; {did_you_mean(instrument, names)}"
                )
            only = identities.find("instrument", instrument) if instrument else None
            return controlled.shown(connection, identities, store.settings(connection), only, on)

    def write_control_charts(self, out: str | Path, instrument: str = "", on: str = "") -> Path:
        """Draw the control charts into a page (.html) or a picture (.svg, .png)."""
        from corelab.reports.charts import control_charts, save

        found = self.control(instrument, on)
        save(control_charts(found["checks"]), Path(out))
        return Path(out)

    # -- trust --------------------------------------------------------------------------------------------

    def verify(self, seal: str = "") -> Verified:
        """Prove that nothing was altered behind the program's back; with a seal, since it was taken."""
        from corelab.review.verify import verify

        with self._reading() as connection:
            return verify(connection, seal)

    def backup(self, file: str | Path) -> str:
        """Copy the lab into a file while it is in use; returns the seal of the copy."""
        from corelab.records.backup import write_backup

        target = Path(file)
        if target.exists():
            raise Usage(f"{target} is there already: name another file, or remove it first.")
        if not target.absolute().parent.is_dir():
            raise Unavailable(f"There is no folder {target.absolute().parent}: make it first.")
        with self._writing("back up", keep=False):
            pass  # who may not back up is refused before anything is copied
        seal = write_backup(self.engine, target)
        with self._writing("back up") as (connection, person):
            change = store.Change.begin(connection)
            self._close(change, person, "backup", {"file": target.name, "seal": seal})
        return seal

    def restore(self, file: str | Path, *, over_newer: bool = False) -> Restored:
        """Bring back a lab from a backup.

        Raises
        ------
        Refused
            If the lab here holds what the backup does not, unless that is said to be meant.
        """
        from corelab.records import backup

        path = Path(file)
        target = self._file()
        if target is not None and target.exists() and target.resolve() == path.resolve():
            raise Usage("The backup and the lab are the same file.")
        with backup.readable_copy(path) as copy:
            lost = self._lost_by_restoring(copy, target, over_newer)
            with Lab(str(copy), self.by, self._password) as from_backup:
                seal = from_backup.seal()
                if lost is None:
                    with from_backup._writing("restore", keep=False):
                        pass
            kept = None
            if target is not None:
                kept = backup.replace_file(copy, target)
                migrate.upgrade(self.engine)
            else:
                backup.fill_server(copy, self.engine)
        with engines.writing(self.engine) as connection:
            found = history.last_seal(connection)
            if found != seal:
                raise Unavailable(f"what was restored has the seal {found}, the backup {seal}: try again.")
            known = store.persons(connection)
            person = known.get(store.name_key(self.by or _login()), (0, self.by or _login(), ""))[1]
            change = store.Change.begin(connection)
            detail = {"file": path.name, "seal": seal, "events not in it": lost or 0}
            self._close(change, person, "restore", detail)
        return Restored(seal, lost or 0, kept)

    def _lost_by_restoring(self, copy: Path, target: Path | None, over_newer: bool) -> int | None:
        """How much of the lab here a backup lacks; None where there is no lab here."""
        from corelab.records import backup

        if target is None or not target.exists() or not target.stat().st_size:
            return None
        try:
            with engines.reading(self.engine) as connection:
                if not migrate.schema_version(connection):
                    return None
                lost = backup.lost_by_restoring(connection, copy)
        except Unavailable:
            if not over_newer:
                raise
            return None
        with self._writing("restore", keep=False):
            pass
        if lost and not over_newer:
            raise Refused(
                [
                    Problem(
                        f"{lost} events in {target} that the backup does not hold",
                        "a lab that is no newer than the backup",
                        "look at 'corelab history'; restore with --over-newer if they may go: the lab as it "
                        "is now is kept beside it",
                    )
                ],
                "Nothing was restored: the lab is newer than the backup.",
            )
        return lost


def methods(key: str = "") -> list[dict[str, str]]:
    """The calculations in the words of the code: all of them, or the one named."""
    from corelab.reports.well import described
    from corelab.science.catalogue import formulas

    known: Mapping[str, Any] = formulas()
    if key and key not in known:
        raise NotFound(f"There is no method {quoted(key)}; {did_you_mean(key, list(known))}")
    chosen: Collection[str] = [key] if key else known
    return [described(known[k]) for k in chosen]


def _unkept(file: Path) -> list[logs.LogCurve]:
    """The curves of a file that is only looked at."""
    from corelab.formats.las_in import read_las

    las = read_las(file)
    return [
        logs.LogCurve(0, file.stem, c.mnemonic, c.unit, c.quantity, las.depth_m, c.values) for c in las.curves
    ]


def role_table() -> pd.DataFrame:
    """What each role may do."""
    return pd.DataFrame(
        [
            {"act": act, **{role: "may" if role in allowed else "" for role in schema.ROLES}}
            for act, allowed in roles.MAY.items()
        ]
    )


def _filters(
    top: float | None = None,
    base: float | None = None,
    *,
    depth: str = "",
    unit: str = "",
    where: str = "",
    stress: float | None = None,
    with_uncertainty: bool = False,
    uniaxial: float | None = None,
) -> select.Filters:
    return select.Filters(top, base, depth, unit, where, stress, with_uncertainty, uniaxial)


def _is_day(text: str) -> bool:
    try:
        return date.fromisoformat(text).isoformat() == text
    except ValueError:
        return False


def _same_letters(name: str) -> str:
    """A name without case, blanks and marks, for comparing how two files write it."""
    return "".join(c for c in name.casefold() if c.isalnum())


def _require_reason(reason: str, what: str) -> None:
    if not reason.strip():
        raise Usage(f"{what} needs a reason: --reason TEXT.")


def _refuse_standards(well: str) -> None:
    if store.name_key(well) == STANDARDS_WELL:
        raise Usage(f"'{STANDARDS_WELL}' are check plugs, not a well: name a well to write its results.")


def _login() -> str:
    try:
        return getpass.getuser()
    except (OSError, KeyError, ImportError):
        return "unknown"
