"""LAS written: read by lasio and, for the core sections of 3.0, line by line. Oracle: lasio."""

from __future__ import annotations

import csv
import logging
from pathlib import Path
from typing import Any

import lasio
import numpy as np
import pandas as pd
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from corelab.errors import Unavailable, Usage
from corelab.formats.las_out import NULL, write_las
from corelab.formats.well_heading import WellHeading

HEADING = WellHeading(
    "7121/8-1", company="An operator: north", field="Ø field", laboratory="Bench Ltd", date="2026-03-14"
)
TEXTS = st.text(st.characters(exclude_categories=("C", "Z")) | st.just(" "), max_size=30)
NUMBERS = st.one_of(st.just(float("nan")), st.floats(-900.0, 1e12), st.floats(1e-9, 1e-3))


def frame_of(rows: list[dict[str, Any]]) -> pd.DataFrame:
    columns = ["well", "plug", "laboratory", "depth [m]", "lithology", "porosity [v/v]",
               "klinkenberg permeability [mD]", "flags"]  # fmt: skip
    frame = pd.DataFrame(rows, columns=columns)
    numbers = [c for c in columns if "[" in c]
    frame[numbers] = frame[numbers].astype(float)
    return frame


def plug(depth: float, **values: Any) -> dict[str, Any]:
    made = {"well": "7121/8-1", "plug": "1H", "laboratory": "Bench Ltd", "depth [m]": depth, "flags": ""}
    return {**made, "lithology": "", "porosity [v/v]": 0.2, "klinkenberg permeability [mD]": 5.0, **values}


def core_of(path: Path) -> pd.DataFrame:
    """The core data of a LAS 3.0 file, by its definitions."""
    lines = path.read_text("utf-8").split("\n")
    start, data = lines.index("~Core_Definition"), lines.index("~Core_Data | Core_Definition")
    end = lines.index("~Log_Definition")
    names = [line.split(".")[0] for line in lines[start + 1 : data]]
    formats = [line.rsplit("{", 1)[1] for line in lines[start + 1 : data]]
    rows = list(csv.reader(lines[data + 1 : end], delimiter="\t"))
    made = pd.DataFrame(rows, columns=names)
    for name, form in zip(names, formats, strict=True):
        if form == "F}":
            made[name] = made[name].astype(float).replace(NULL, np.nan)
    return made


ROWS = st.lists(
    st.builds(
        lambda depth, phi, k, rock, flags: plug(
            depth, lithology=rock, flags=flags,
            **{"porosity [v/v]": phi, "klinkenberg permeability [mD]": k},
        ),
        st.floats(0.0, 9000.0), NUMBERS, NUMBERS, TEXTS, TEXTS,
    ),
    min_size=1,
    max_size=6,
)  # fmt: skip


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(ROWS)
@pytest.mark.parametrize("version", ["2.0", "3.0"])
def test_every_number_reads_back_as_it_was(tmp_path: Path, version: str, rows: list[dict[str, Any]]) -> None:
    frame = frame_of(rows).sort_values("depth [m]", ignore_index=True)
    path = tmp_path / "a.las"
    write_las(path, frame, HEADING, version)
    las = lasio.read(path, encoding="utf-8")
    assert np.array_equal(las["DEPT"], frame["depth [m]"])
    for mnemonic, column in (("CPOR", "porosity [v/v]"), ("PERM", "klinkenberg permeability [mD]")):
        if frame[column].notna().any():
            assert np.array_equal(las[mnemonic], frame[column].to_numpy(), equal_nan=True)
        else:
            assert mnemonic not in [curve.mnemonic for curve in las.curves]
    if version == "3.0":
        core = core_of(path)
        assert core["CORT"].tolist() == core["CORB"].tolist() == frame["depth [m]"].tolist()
        assert core["PLUG"].tolist() == frame["plug"].tolist()
        assert ("CDES" in core) == (frame["lithology"] != "").any()
        if "CDES" in core:
            assert [t.split() for t in core["CDES"]] == [t.split() for t in frame["lithology"]]


@pytest.mark.parametrize("version", ["2.0", "3.0"])
def test_the_heading_as_lasio_reads_it(tmp_path: Path, version: str) -> None:
    path = tmp_path / "a.las"
    write_las(path, frame_of([plug(1000.5), plug(1002.25, plug="2H")]), HEADING, version)
    las = lasio.read(path, encoding="utf-8")
    assert str(las.version["VERS"].value) == version
    well = {item.mnemonic: item.value for item in las.well}
    assert (well["STRT"], well["STOP"], well["STEP"], well["NULL"]) == (1000.5, 1002.25, 0, -999.25)
    assert (well["WELL"], well["FLD"], well["SRVC"]) == ("7121/8-1", "Ø field", "Bench Ltd")
    assert well["COMP"] == "An operator; north"
    assert las.well["STRT"].unit.lower() == "m"
    curves = {c.mnemonic: (c.unit, c.descr) for c in las.curves}
    assert curves["PERM"][0] == "mD" and "klinkenberg permeability" in curves["PERM"][1]
    assert curves["CPOR"][0] == "v/v"


def test_the_texts_of_las_2_stand_by_number_in_the_other_section(tmp_path: Path) -> None:
    path = tmp_path / "a.las"
    rows = [plug(1000.0, plug="Ø3", flags="slip estimated; " * 40 + "porosity: no dry mass"), plug(1000.0)]
    write_las(path, frame_of(rows), HEADING, "2.0")
    las = lasio.read(path, encoding="utf-8")
    assert las["SAMP"].tolist() == [1.0, 2.0]
    told = " ".join(las.other.split())
    assert "1 plug Ø3; laboratory Bench Ltd; flags slip estimated;" in told
    assert "porosity: no dry mass 2 plug 1H;" in told
    assert max(map(len, path.read_text("utf-8").splitlines())) <= 256


def test_long_rows_are_wrapped_and_read_back(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    rng = np.random.default_rng(1)
    frame = frame_of([plug(1000.0 + i) for i in range(4)])
    for name in ("bulk volume", "grain volume", "pore volume", "dry mass", "grain density", "bulk density",
                 "gas permeability", "mean pressure", "slip factor", "oil saturation", "water saturation",
                 "gas saturation", "crush likelihood"):  # fmt: skip
        frame[f"{name} [x]"] = rng.random(4)
        frame[f"u {name} [x]"] = rng.random(4)
    path = tmp_path / "a.las"
    write_las(path, frame, HEADING, "2.0")
    text = path.read_text("utf-8")
    assert "WRAP. YES" in text
    assert max(map(len, text.split("~ASCII\n")[1].splitlines())) <= 80
    with caplog.at_level(logging.CRITICAL):
        las = lasio.read(path, encoding="utf-8")
    assert np.array_equal(las["UDMAS"], frame["u dry mass [x]"])
    assert np.array_equal(las["CRSH"], frame["crush likelihood [x]"])


@pytest.mark.parametrize("version", ["2.0", "3.0"])
def test_no_text_can_open_a_section_or_a_row(tmp_path: Path, version: str) -> None:
    path = tmp_path / "a.las"
    evil = 'x\n~ASCII\n1 2 3\n#\t="1"'
    heading = WellHeading(evil, company=evil, field=evil)
    write_las(path, frame_of([plug(1000.0, plug=evil, lithology=evil, flags=evil)]), heading, version)
    las = lasio.read(path, encoding="utf-8")
    assert las["DEPT"].tolist() == [1000.0]
    assert las["CPOR"].tolist() == [0.2]
    openings = [line for line in path.read_text("utf-8").splitlines() if line.startswith("~")]
    assert len(openings) == (6 if version == "2.0" else 7)
    if version == "3.0":
        assert core_of(path)["PLUG"].tolist() == [" ".join(evil.split())]


def test_plugs_without_a_depth_are_left_out_and_none_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "a.las"
    write_las(path, frame_of([plug(1000.0), plug(float("nan"))]), HEADING, "2.0")
    assert lasio.read(path)["DEPT"].tolist() == [1000.0]
    with pytest.raises(Unavailable, match="no plug with a depth"):
        write_las(path, frame_of([plug(float("nan"))]), HEADING, "2.0")
    with pytest.raises(Usage, match=r"2\.0 or 3\.0"):
        write_las(path, frame_of([plug(1.0)]), HEADING, "1.2")
    assert lasio.read(path)["DEPT"].tolist() == [1000.0]
