"""What a plug's results depend on: the calibration in force, and the fingerprint of all entries."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab import open_lab
from corelab.bench.gather import CalibrationRows, Readings, gather, in_force
from corelab.lab import Lab
from corelab.records import engine as engines
from corelab.records import store

NOTHING = Readings(np.zeros(0, dtype=np.intp), {}, {})


def of_day(date: str, name: str = "") -> CalibrationRows:
    return CalibrationRows(1, "cup", name or date or "undated", date, NOTHING)


days = st.dates().map(str)


@settings(max_examples=60)
@given(st.lists(days, min_size=1, max_size=8, unique=True), days)
def test_law_newest_on_or_before(dates: list[str], reading: str) -> None:
    found = in_force([of_day(d) for d in dates], reading)
    before = [d for d in dates if d <= reading]
    if before:
        assert isinstance(found, CalibrationRows)
        assert found.date == max(before)
    else:
        assert isinstance(found, str)
        assert min(dates) in found


@settings(max_examples=30)
@given(st.lists(days, min_size=1, max_size=5, unique=True), days)
def test_law_an_undated_one_beside_one_that_could_serve_is_ambiguous(dates: list[str], reading: str) -> None:
    found = in_force([*(of_day(d) for d in dates), of_day("")], reading)
    if any(d <= reading for d in dates):
        assert isinstance(found, str)
        assert found.startswith("ambiguous: 2 calibrations")
    else:
        assert isinstance(found, CalibrationRows)
        assert found.date == ""


@pytest.mark.parametrize(
    ("dates", "reading", "serves"),
    [
        (["2026-01-01T09:00", "2026-01-01T15:00"], "2026-01-01T12:00", "2026-01-01T09:00"),
        (["2026-01-01T09:00", "2026-01-01T15:00"], "2026-01-01T15:00", "2026-01-01T15:00"),
        (["2026-01-01T09:00", "2026-01-01T15:00"], "2026-01-02", "2026-01-01T15:00"),
        (["2026-01-01T09:00", "2026-01-01T15:00"], "2026-01-01", None),  # before noon, or after?
        (["2025-12-31", "2026-01-01T15:00"], "2026-01-01T09:00", "2025-12-31"),
        (["2026-01-01"], "2026-01-01T00:10", "2026-01-01"),
        (["2026-01-01T15:00"], "2026-01-01T09:00", None),
    ],
)
def test_times_of_day_count_where_both_are_read(dates: list[str], reading: str, serves: str | None) -> None:
    found = in_force([of_day(d) for d in dates], reading)
    assert (found.date if isinstance(found, CalibrationRows) else None) == serves


def test_readings_hold_numbers_and_texts_apart() -> None:
    frame = pd.DataFrame(
        {
            "id": pd.Series([3, 4], dtype="int64"),
            "mass_g": pd.Series([1.5, np.nan]),
            "liquid": pd.Series(["brine", None], dtype=object),
        }
    )
    readings = Readings.of(frame, np.array([0, 1]))
    assert len(readings) == 2
    np.testing.assert_array_equal(readings.number("mass_g"), [1.5, np.nan])
    assert list(readings.text("liquid")) == ["brine", ""]
    readings.number("mass_g")[0] = 9.0  # a copy
    assert readings.number("mass_g")[0] == 1.5
    readings.numbers["mass_g"] = readings.numbers["mass_g"] + 1e-30j
    assert readings.number("mass_g").dtype == np.complex128


@pytest.fixture
def two_plugs(sqlite_database: str, tmp_path: Path) -> Iterator[tuple[Lab, Path]]:
    with open_lab(sqlite_database, by="tester") as lab:
        load(lab, tmp_path, "wells", "well,depth unit", "W,m")
        load(
            lab,
            tmp_path,
            "core runs",
            "well,run,top depth [m],base depth [m],recovered length [m],core diameter [mm]",
            "W,1,0,9,9,100",
        )
        load(lab, tmp_path, "plugs", "well,plug,from,run,depth [m]", "W,A,core,1,1", "W,B,core,1,2")
        load(lab, tmp_path, "grain volume", EXPANSION, "W,A,POR,800,380,100,2026-01-05")
        load(lab, tmp_path, "grain volume", "well,plug,instrument,grain volume [cm3]", "W,B,PYC,12")
        yield lab, tmp_path


EXPANSION = (
    "well,plug,instrument,reference pressure [kPa],expanded pressure [kPa],"
    "barometric pressure [kPa],measured on"
)


def load(lab: Lab, folder: Path, kind: str, *lines: str) -> None:
    path = folder / f"{kind}.csv"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    lab.load([path])


def fingerprints(lab: Lab) -> tuple[str, str]:
    with engines.reading(lab.engine) as connection:
        plugs = sorted(store.in_force(connection, "plugs")["plug_id"])
        tray = gather(connection, plugs, store.settings(connection))
        alone = [gather(connection, [plug], store.settings(connection)).fingerprints[0] for plug in plugs]
    assert alone == tray.fingerprints  # whatever else is on the tray
    return tray.fingerprints[0], tray.fingerprints[1]


def test_a_fingerprint_changes_with_what_the_plug_depends_on_and_nothing_else(
    two_plugs: tuple[Lab, Path],
) -> None:
    lab, folder = two_plugs
    first = fingerprints(lab)
    assert first[0] != first[1]
    load(
        lab,
        folder,
        "porosimeter calibration",
        "instrument,known volume [cm3],reference pressure [kPa],expanded pressure [kPa],measured on",
        "POR,0,800,275,2026-01-01",
        "POR,20,800,450,2026-01-01",
    )
    calibrated = fingerprints(lab)
    assert calibrated[0] != first[0]
    assert calibrated[1] == first[1]  # another instrument
    load(lab, folder, "masses", "well,plug,condition,mass [g]", "W,B,dry,30")
    weighed = fingerprints(lab)
    assert weighed[0] == calibrated[0]
    assert weighed[1] != calibrated[1]
    lab.setting("reporting mean pressure", "300")  # only chooses what is shown
    assert fingerprints(lab) == weighed
    lab.setting("barometric pressure", "99")
    moved = fingerprints(lab)
    assert moved[0] != weighed[0]
    assert moved[1] != weighed[1]


def test_calibrations_are_held_together_by_label_or_day(two_plugs: tuple[Lab, Path]) -> None:
    lab, folder = two_plugs
    load(
        lab,
        folder,
        "porosimeter calibration",
        "instrument,setup,calibration,known volume [cm3],reference pressure [kPa],expanded pressure [kPa],"
        "measured on",
        "POR,cup,Spring,0,800,275,2026-01-01",
        "POR,cup,spring,20,800,450,2026-01-02",  # one label over two days: as of the later
        "POR,cup,,0,800,275,2026-02-01T09:00",
        "POR,cup,,20,800,450,2026-02-01T10:00",  # one day
        "POR,holder,,0,800,683,2026-01-01",
    )
    with engines.reading(lab.engine) as connection:
        plugs = store.in_force(connection, "plugs")["plug_id"]
        tray = gather(connection, plugs, {})
    ((number, _),) = {key for key in tray.calibrations if key[1] == "cup"}
    found = {(c.name, c.date, len(c.readings)) for c in tray.calibrations[number, "cup"]}
    assert found == {("Spring", "2026-01-02", 2), ("2026-02-01T10:00", "2026-02-01T10:00", 2)}
    assert len(tray.calibrations[number, "holder"]) == 1
