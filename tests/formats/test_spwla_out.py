"""The SPWLA core-data format written: what is written reads back, to the digits that twelve columns hold."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from corelab.bench.reported import Plug, plugs_of
from corelab.errors import Unavailable
from corelab.formats.spwla_in import parsed, read_spwla
from corelab.formats.spwla_out import _fitted, write_spwla
from corelab.formats.well_heading import WellHeading

HEADING = WellHeading(
    "W-1", country="Nowhere", laboratory="Bench Ltd", date="2026-03-14", runs_m=((1000.0, 1010.0),)
)
#: Eleven characters hold at least seven digits of 1e-3 to 1e10.
CLOSE = 1e-6


def frame_of(rows: list[dict[str, Any]]) -> pd.DataFrame:
    columns = [
        "well", "plug", "source", "laboratory", "depth [m]", "depth basis", "orientation", "facies",
        "lithology",
        "dry mass [g]", "porosity [v/v]", "porosity route", "porosity stress [MPa]", "grain density [g/cm3]",
        "gas permeability [mD]", "gas", "mean pressure [kPa]", "klinkenberg permeability [mD]",
        "permeability stress [MPa]", "oil saturation [v/v]", "status", "flags",
    ]  # fmt: skip
    frame = pd.DataFrame(rows, columns=columns)
    numbers = [c for c in columns if "[" in c]
    frame[numbers] = frame[numbers].astype(float)
    for column in (c for c in columns if "[" not in c):
        frame[column] = ["" if pd.isna(text) else text for text in frame[column]]
    return frame


def back(path: Path) -> tuple[list[Plug], list[str]]:
    file = read_spwla(path)
    told: list[str] = list(file.notices)
    return plugs_of(file, laboratory="", depth_unit=file.depth_unit, told=told.append), told


def values(plug: Plug) -> dict[str, float | None]:
    return {v.quantity: v.value for v in plug.values}


POSITIVE = st.one_of(st.just(math.nan), st.floats(1e-3, 5e4))
SHARE = st.one_of(st.just(math.nan), st.floats(0.001, 1.0))
ROWS = st.lists(
    st.fixed_dictionaries(
        {
            "orientation": st.sampled_from(["horizontal", "vertical", "oblique", ""]),
            "laboratory": st.sampled_from(
                ["Bench Ltd", "A laboratory of twenty", "Exactly twenty chars", "Far & Away"]
            ),
            "source": st.sampled_from(["core", "percussion sidewall"]),
            "depth basis": st.sampled_from(["driller", "log"]),
            "facies": st.sampled_from(["", "channel sand"]),
            "lithology": st.sampled_from(["", "sandstone", "shale, sandy"]),
            "depth [m]": st.floats(1.0, 9000.0),
            "dry mass [g]": POSITIVE,
            "porosity [v/v]": SHARE,
            "porosity route": st.sampled_from(["bulk-grain", "summation of fluids"]),
            "grain density [g/cm3]": st.floats(2.0, 4.0),
            "gas permeability [mD]": POSITIVE,
            "gas": st.sampled_from(["nitrogen", "helium", "air", ""]),
            "mean pressure [kPa]": st.floats(100.0, 900.0),
            "klinkenberg permeability [mD]": POSITIVE,
            "oil saturation [v/v]": SHARE,
        }
    ),
    min_size=1,
    max_size=5,
)


@settings(max_examples=80, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(ROWS)
def test_what_is_written_reads_back(tmp_path: Path, rows: list[dict[str, Any]]) -> None:
    frame = frame_of([{"well": "W-1", "plug": f"{i}H 2", **row} for i, row in enumerate(rows)])
    path = tmp_path / "a.spwla"
    write_spwla(path, frame, HEADING)
    plugs, told = back(path)
    assert not [t for t in told if "not understood" in t or "unit" in t]
    assert [p.name for p in plugs] == frame["plug"].tolist()
    for plug, row in zip(plugs, frame.to_dict("records"), strict=True):
        assert plug.laboratory == row["laboratory"]
        assert (plug.orientation, plug.source, plug.depth_basis, plug.facies, plug.lithology) == (
            row["orientation"], row["source"], row["depth basis"], row["facies"],
            row["lithology"].split(",")[0],
        )  # fmt: skip
        assert plug.depth_m == pytest.approx(row["depth [m]"], rel=CLOSE)
        found = values(plug)
        for name, unit in (
            ("dry mass", "g"), ("porosity", "v/v"), ("grain density", "g/cm3"), ("gas permeability", "mD"),
            ("mean pressure", "kPa"), ("klinkenberg permeability", "mD"), ("oil saturation", "v/v"),
        ):  # fmt: skip
            there = row[f"{name} [{unit}]"]
            if math.isnan(there):
                assert name not in found
            else:
                assert found[name] == pytest.approx(there, rel=CLOSE)
        basis = {v.quantity: v.basis for v in plug.values}
        assert basis.get("porosity", row["porosity route"]) == row["porosity route"]
        assert basis.get("gas permeability", row["gas"]) == row["gas"]


@given(st.floats(1e-9, 1e15))
def test_a_number_fits_eleven_characters(value: float) -> None:
    text = _fitted(value)
    assert len(text) <= 11
    assert float(text) == pytest.approx(value, rel=5e-6)


@pytest.mark.parametrize("value", [18.44722, 0.045, 22285.75, 1918.95, 2.65, 0.0])
def test_short_numbers_are_exact(value: float) -> None:
    assert float(_fitted(value)) == value


def test_flags_stresses_and_limits_travel(tmp_path: Path) -> None:
    flags = "; ".join(["klinkenberg permeability below limit", *(f"doubt number {i}" for i in range(40))])
    row = {
        "well": "W-1", "plug": "1H", "laboratory": "Bench Ltd", "depth [m]": 1000.0, "flags": flags,
        "orientation": "horizontal", "klinkenberg permeability [mD]": 0.01, "permeability stress [MPa]": 20.0,
        "porosity [v/v]": 0.2, "porosity stress [MPa]": 5.0, "porosity route": "bulk-grain",
        "source": "core", "depth basis": "driller",
    }  # fmt: skip
    path = tmp_path / "a.spwla"
    write_spwla(path, frame_of([row]), HEADING)
    (plug,), _ = back(path)
    assert plug.flags == flags.split("; ")
    by = {v.quantity: v for v in plug.values}
    assert by["klinkenberg permeability"].value_limit == "below"
    assert (by["klinkenberg permeability"].stress_mpa, by["porosity"].stress_mpa) == (20.0, 5.0)


def test_the_shape_of_the_records(tmp_path: Path) -> None:
    """As in files of the Norwegian Offshore Directorate: openings, columns, the null."""
    path = tmp_path / "a.spwla"
    row = {"well": "W-1", "laboratory": "Bench Ltd", "depth [m]": 1000.25, "orientation": "horizontal",
           "source": "core", "depth basis": "driller", "lithology": "sandstone"}  # fmt: skip
    rows = [{**row, "plug": "1H", "porosity [v/v]": 0.205, "porosity route": "bulk-grain"},
            {**row, "plug": "2H", "klinkenberg permeability [mD]": 5.5}]  # fmt: skip
    write_spwla(path, frame_of(rows), HEADING)
    lines = path.read_text("utf-8").splitlines()
    assert lines[0] == f"{'10     2':<127}"
    assert lines[3] == f"{'15    2    2'.replace('15    2', '15     2'):<127}"
    assert lines[4] == "          1402         0  3084   0Bench Ltd           Porosity, bulk-grain, Hor."
    assert lines[5] == "          1512         0  2031   0Bench Ltd           Klinkenberg permeability, Hor."
    assert lines[6:8] == [f"{'20     1':<127}", "        0.00     0.00  1000.00  1010.00  0.0  1"]
    assert lines[9] == "     1000.25     0.00   1H"
    assert "            20.5 -1002.00000" in lines
    assert "     -1002.00000         5.5" in lines


def test_no_text_can_open_a_record(tmp_path: Path) -> None:
    evil = "x\n40     1    1\n    1.0"
    row = {"well": evil, "plug": evil, "laboratory": evil, "depth [m]": 1.0, "porosity [v/v]": 0.2,
           "lithology": evil, "flags": evil, "facies": evil}  # fmt: skip
    path = tmp_path / "a.spwla"
    write_spwla(path, frame_of([row]), WellHeading(evil, country=evil, laboratory=evil))
    (plug,), _ = back(path)
    assert values(plug) == {"porosity": 0.2}
    assert plug.name == " ".join(evil.split())


def test_without_a_plug_at_a_depth_nothing_is_written(tmp_path: Path) -> None:
    with pytest.raises(Unavailable, match="no plug with a depth"):
        write_spwla(tmp_path / "a.spwla", frame_of([]), HEADING)
    assert not list(tmp_path.iterdir())


def test_depths_in_feet_say_so(tmp_path: Path) -> None:
    row = {"plug": "1", "depth [m]": 8000.5, "porosity [v/v]": 0.2}
    path = tmp_path / "a.spwla"
    write_spwla(path, frame_of([row]).rename(columns={"depth [m]": "depth [ft]"}), HEADING)
    file = parsed("a.spwla", path.read_bytes())
    assert file.depth_unit == "ft"
    assert file.intervals == ["0.00     0.00  3280.84  3313.65  0.0  1"]
    assert back(path)[0][0].depth_m == pytest.approx(8000.5 * 0.3048)
