"""Other laboratories' results in the record, and files that other programs read.

Published: the statistics of the real plugs of well 7121/8-1 (Norwegian Offshore Directorate, NLOD 2.0),
computed outside the project, here through the summary as a user asks for it. Oracles: lasio, pandas,
openpyxl.
"""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path

import lasio
import numpy as np
import openpyxl
import pandas as pd
import pytest
import sqlalchemy as sa

from corelab import open_lab
from corelab.errors import NotFound, Refused, Usage
from corelab.interval.select import COLUMNS
from corelab.lab import Lab
from corelab.records import schema

REAL = "norway_7121_8-1/7121_8-1_CORE_CONV_RAW_1.SPWLA"
WELL = "W-1"
HEADING = """\
10     2
    W-1                                     Nowhere                                 18Feb09
    Elsewhere Ltd
15     4    4
          1512      1602  2031   0Elsewhere Ltd       Klinkenberg corrected gas perm, Hor.
          1515      1602  2031   0Elsewhere Ltd       Klinkenberg corrected gas perm, Vert.
          1402      1211  3084   0Elsewhere Ltd       Porosity, Horizontal PLUG
          2451      1201  1086   0Elsewhere Ltd       Grain Density, Hor.
"""
CONFORMING = HEADING + """\
30     1
     1000.25     0.00   1
36     1    1
    Sst.Lt-gry.
40     1    4
        10.50000     2.50000    18.50000     2.65100
30     1
     1001.25     0.00   2
40     1    4
         0.00000 -1002.00000    12.50000     2.66100
"""  # fmt: skip
NUMBERS = [c for c in COLUMNS if "[" in c]


@pytest.fixture
def theirs(tmp_path: Path) -> Path:
    """Another laboratory's file of two samples, three plugs."""
    path = tmp_path / "theirs.spwla"
    path.write_text(CONFORMING, encoding="utf-8")
    return path


def own_plug(lab: Lab, folder: Path) -> None:
    """One plug of the lab's own, of a name that the other laboratory uses too, with two results."""
    sheets = {
        "wells": ["well,depth unit", f"{WELL},m"],
        "plugs": ["well,plug,from,depth [m],orientation", f"{WELL},1H,core,1000.5,horizontal"],
        "reported permeability": [
            "well,plug,net confining stress [MPa],permeameter,klinkenberg permeability [mD]",
            f"{WELL},1H,20,PDK,8.25",
        ],
        "masses": ["well,plug,condition,mass [g]", f"{WELL},1H,dry,120.25"],
    }
    folder.mkdir()
    for kind, lines in sheets.items():
        (folder / f"{kind}.csv").write_text("\n".join(lines), encoding="utf-8")
    lab.load([folder])


def rows_of(lab: Lab) -> dict[str, int]:
    with lab._reading() as connection:
        return {
            t.name: connection.execute(sa.select(sa.func.count()).select_from(t)).scalar_one()
            for t in (schema.other_file, schema.other_plug, schema.other_result, schema.result, schema.plug)
        }


# -- reading in -------------------------------------------------------------------------------------------


def test_another_laboratorys_file_is_kept_apart(any_lab: Lab, theirs: Path) -> None:
    done = any_lab.read_spwla(theirs, WELL)
    assert (done.laboratories, done.samples, done.plugs, done.results) == (["Elsewhere Ltd"], 2, 3, 6)
    assert rows_of(any_lab) == {
        "other_file": 1, "other_plug": 3, "other_result": 7, "result": 0, "plug": 0,
    }  # fmt: skip
    (well,) = any_lab.well_list().to_dict("records")
    assert (well["well"], well["plugs"], well["plugs of others"]) == (WELL, 0, 3)
    frame = any_lab.interval(WELL)
    assert frame["plug"].tolist() == ["1H", "1V", "2"]
    assert set(frame["laboratory"]) == {"Elsewhere Ltd"}
    assert frame["klinkenberg permeability [mD]"].tolist()[:2] == [10.5, 2.5]
    assert np.isnan(frame["klinkenberg permeability [mD]"][2])
    assert frame["porosity [v/v]"].tolist()[::2] == [0.185, 0.125]
    assert frame["permeability basis"].tolist() == ["reported", "reported", ""]
    assert set(frame["status"]) == {"reported"}
    assert all(text.startswith("from another laboratory") for text in frame["flags"])
    assert "klinkenberg permeability: zero in the file, taken as not measured" in frame["flags"][2]
    assert any_lab.verify().faults == []
    assert any_lab.recompute(check=True).empty


def test_the_file_itself_is_kept_byte_for_byte(lab: Lab, theirs: Path) -> None:
    lab.read_spwla(theirs, WELL)
    with lab._reading() as connection:
        assert connection.execute(sa.select(schema.other_file.c.content)).scalar_one() == theirs.read_bytes()


def test_the_same_again_is_unchanged(any_lab: Lab, theirs: Path) -> None:
    any_lab.read_spwla(theirs, WELL)
    seal = any_lab.seal()
    again = any_lab.read_spwla(theirs, WELL)
    copy = shutil.copyfile(theirs, theirs.with_name("copy.spwla"))
    assert again.unchanged and any_lab.read_spwla(copy, WELL.lower()).unchanged
    assert any_lab.seal() == seal


def test_other_content_needs_a_reason_and_takes_its_place(any_lab: Lab, theirs: Path) -> None:
    any_lab.read_spwla(theirs, WELL)
    theirs.write_text(CONFORMING.replace("18.50000", "19.50000"), encoding="utf-8")
    with pytest.raises(Refused, match="--reason"):
        any_lab.read_spwla(theirs, WELL)
    renamed = shutil.copyfile(theirs, theirs.with_name("second edition.spwla"))
    with pytest.raises(Refused, match="the same plugs"):
        any_lab.read_spwla(renamed, WELL)
    done = any_lab.read_spwla(renamed, WELL, reason="they corrected it")
    assert done.supersedes == "file 1"
    frame = any_lab.interval(WELL)
    assert len(frame) == 3
    assert frame["porosity [v/v]"][0] == 0.195
    assert any_lab.read_list()["state"].tolist() == ["superseded by 2", "in force"]
    assert rows_of(any_lab)["other_plug"] == 6
    assert "in the place of file 1" in any_lab.history(WELL)["what"].iloc[-1]
    assert any_lab.verify().faults == []


def test_the_same_file_in_feet_takes_the_place_of_itself_in_metres(lab: Lab, theirs: Path) -> None:
    lab.read_spwla(theirs, WELL)
    with pytest.raises(Refused):
        lab.read_spwla(theirs, WELL, unit="ft")
    lab.read_spwla(theirs, WELL, unit="ft", reason="depths are feet")
    assert lab.interval(WELL, unit="ft")["depth [ft]"].tolist() == [1000.25, 1000.25, 1001.25]


def test_a_withdrawn_file_is_out_of_force_and_stays_in_the_history(any_lab: Lab, theirs: Path) -> None:
    any_lab.read_spwla(theirs, WELL)
    with pytest.raises(Usage, match="reason"):
        any_lab.read_withdraw(1, " ")
    assert any_lab.read_withdraw(1, "wrong well") == "theirs.spwla"
    assert any_lab.interval(WELL).empty
    assert any_lab.read_list()["state"].tolist() == ["withdrawn"]
    with pytest.raises(Usage, match="not in force"):
        any_lab.read_withdraw(1, "again")
    with pytest.raises(NotFound, match="read list"):
        any_lab.read_withdraw(7, "none")
    assert not any_lab.read_spwla(theirs, WELL).unchanged
    assert len(any_lab.interval(WELL)) == 3
    assert any_lab.verify().faults == []


def test_a_check_writes_nothing(any_lab: Lab, theirs: Path) -> None:
    seal = any_lab.seal()
    done = any_lab.read_spwla(theirs, WELL, check=True)
    assert (done.plugs, done.seal, done.checked_only) == (3, "", True)
    assert any_lab.seal() == seal
    assert any_lab.well_list().empty


def test_what_is_refused_leaves_nothing(lab: Lab, tmp_path: Path, theirs: Path) -> None:
    bad = tmp_path / "bad.spwla"
    bad.write_text("well,plug\n", encoding="utf-8")
    seal = lab.seal()
    with pytest.raises(Refused, match="SPWLA"):
        lab.read_spwla(bad, WELL)
    with pytest.raises(Usage):
        lab.read_spwla(theirs, "standards")
    with pytest.raises(Usage):
        lab.read_spwla(theirs, " ")
    with pytest.raises(Usage):
        lab.read_spwla(theirs, WELL, unit="furlong")
    assert lab.seal() == seal
    lab.setting("laboratory name", "elsewhere ltd")
    with pytest.raises(Refused, match="which is this laboratory"):
        lab.read_spwla(theirs, WELL)
    assert lab.read_spwla(theirs, WELL, laboratory="Third Ltd").laboratories == ["Third Ltd"]


# -- beside the lab's own ---------------------------------------------------------------------------------


@pytest.fixture
def both(any_lab: Lab, theirs: Path, tmp_path: Path) -> Lab:
    any_lab.setting("laboratory name", "Our bench")
    own_plug(any_lab, tmp_path / "sheets")
    any_lab.read_spwla(theirs, WELL)
    return any_lab


def test_both_stand_in_the_interval_and_are_told_apart(both: Lab) -> None:
    frame = both.interval(WELL)
    assert list(zip(frame["plug"], frame["laboratory"], strict=True)) == [
        ("1H", "Elsewhere Ltd"), ("1V", "Elsewhere Ltd"), ("1H", "Our bench"), ("2", "Elsewhere Ltd"),
    ]  # fmt: skip
    ours = both.interval(WELL, where="laboratory = 'our bench'")
    assert ours["klinkenberg permeability [mD]"].tolist() == [8.25]
    others = both.interval(WELL, where="laboratory != 'Our bench' and porosity > 0.15")
    assert others["plug"].tolist() == ["1H"]
    assert both.interval(WELL, 1001.0)["plug"].tolist() == ["2"]
    assert both.interval(WELL, unit="ft")["depth [ft]"][0] == pytest.approx(1000.25 / 0.3048)


def test_at_a_stress_only_what_was_measured_there(both: Lab) -> None:
    frame = both.interval(WELL, stress=20.0)
    assert frame["klinkenberg permeability [mD]"].dropna().tolist() == [8.25]
    assert frame["porosity [v/v]"].isna().all()
    assert frame["grain density [g/cm3]"].dropna().tolist() == [2.651, 2.661]
    assert "klinkenberg permeability: not measured at 20 MPa" in frame["flags"][0]


def test_approvals_and_reviews_do_not_concern_them(both: Lab) -> None:
    assert both.review(WELL)["plug"].tolist() == ["1H"]
    both.person_add("Ada", "manager")
    both.by = "Ada"
    both.person_add("Bo", "reviewer")
    both.by = "Bo"
    both.approve(WELL, [], "fine", everything=True)
    status = both.interval(WELL)
    assert status.groupby("laboratory")["status"].unique().map(list).to_dict() == {
        "Elsewhere Ltd": ["reported"], "Our bench": ["approved"],
    }  # fmt: skip


def test_their_plugs_show_and_explain_their_origin(both: Lab) -> None:
    parts = both.plug_show(WELL, "1H")
    assert set(parts) == {"entries", "results", "of another laboratory"}
    shown = both.plug_show(WELL, "1v")["of another laboratory"]
    assert shown["quantity"].tolist() == ["klinkenberg permeability"]
    assert shown["file"][0] == "theirs.spwla, row 10"
    assert "Klinkenberg corrected gas perm, Vert. 2.50000" in shown["as entered"][0]
    told = both.explain(WELL, "1V", "klinkenberg permeability")
    assert told["value"] == 2.5
    assert told["source"].startswith("reported by Elsewhere Ltd")
    assert told["readings"][0]["as typed"]["description"] == "Sst.Lt-gry."
    with pytest.raises(NotFound, match="no water saturation"):
        both.explain(WELL, "1V", "water saturation")
    assert both.explain(WELL, "1H", "klinkenberg permeability")["value"] == 8.25
    with pytest.raises(NotFound, match="no plug"):
        both.plug_show(WELL, "9")


def test_their_plugs_have_pairs_and_no_facts_of_ours(both: Lab) -> None:
    group = both.summary(WELL, where="laboratory = 'Elsewhere Ltd'")[0]
    assert group["vertical to horizontal ratio"] == pytest.approx(2.5 / 10.5)
    assert both.summary(WELL)[0]["klinkenberg permeability"]["count"] == 2


# -- the real file ----------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def real(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, open_data: Path) -> Iterator[Lab]:
    path = shutil.copyfile(sqlite_template, tmp_path_factory.mktemp("real") / "lab.db")
    with open_lab(str(path), by="tester") as lab:
        lab.read_spwla(open_data / REAL, "7121/8-1")
        yield lab


def test_published_statistics_through_the_summary(real: Lab) -> None:
    """249 plugs with kKl > 0: arithmetic 473.499, geometric 14.70235, harmonic 0.234817 mD, Cv 3.94663,
    N0 1557.6, V 0.963967 (1-e^-s) and 0.964636 (regression), Lorenz 0.858919 and 0.859473; 15 zero."""
    (group,) = real.summary("7121/8-1")
    k = group["klinkenberg permeability"]
    assert (k["count"], k["not measured"]) == (249, 15)
    assert round(k["arithmetic mean"], 3) == 473.499
    assert round(k["geometric mean"], 5) == 14.70235
    assert round(k["harmonic mean"], 6) == 0.234817
    assert round(k["coefficient of variation"], 5) == 3.94663
    assert round(k["samples for 20 %"], 1) == 1557.6
    assert round(group["dykstra-parsons coefficient"], 6) == 0.964636
    others = group["dykstra-parsons by other conventions"].items()
    assert [round(v, 6) for name, v in others if "1 - exp(-s)" in name] == [0.963967]
    assert round(group["lorenz by permeability"], 6) == 0.858919
    assert round(group["lorenz coefficient"], 6) == 0.859473
    (known,) = real.summary("7121/8-1", where="klinkenberg permeability > 0")
    assert round(100.0 * known["porosity"]["arithmetic mean"], 4) == 16.0507


def test_published_pairs_through_the_summary(real: Lab) -> None:
    """kv/kh on 246 pairs: geometric mean ratio 0.410126, median 0.524049, kv>kh in 55; layers 1.0e-4."""
    (group,) = real.summary("7121/8-1")
    assert group["vertical to horizontal pairs"] == 246
    assert round(group["vertical to horizontal ratio"], 6) == 0.410126
    assert round(group["vertical to horizontal median"], 6) == 0.524049
    assert group["vertical above horizontal"] == 55
    assert f"{group['vertical to horizontal of layers']:.1e}" == "1.0e-04"


def test_trends_rest_on_the_same_plugs(real: Lab) -> None:
    found = real.trend("7121/8-1")
    assert {r["plugs"] for r in found.records if r["model"] == "semilog"} == {249}


def test_the_real_plugs_travel_on(real: Lab, tmp_path: Path, sqlite_template: Path) -> None:
    """Written in the same format and read by another lab: the same values, all of them short enough."""
    path = tmp_path / "on.spwla"
    real.write_spwla("7121/8-1", path)
    file = shutil.copyfile(sqlite_template, tmp_path / "other.db")
    with open_lab(str(file), by="tester") as other:
        other.read_spwla(path, "7121/8-1")
        there = other.interval("7121/8-1")
    here = real.interval("7121/8-1")
    pd.testing.assert_frame_equal(there.drop(columns="flags"), here.drop(columns="flags"), check_exact=True)


# -- files of ours ----------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, demo_folder: Path) -> Iterator[Lab]:
    path = shutil.copyfile(sqlite_template, tmp_path_factory.mktemp("demo") / "lab.db")
    with open_lab(str(path), by="Tomas Reyl") as lab:
        lab.load([demo_folder / "bench"])
        yield lab


WELLS = pytest.mark.parametrize("well", ["QB-1", "QB-2"])


@WELLS
def test_csv_and_parquet_read_back_the_same(demo: Lab, tmp_path: Path, well: str) -> None:
    frame = demo.interval(well)
    demo.write_csv(well, tmp_path / "a.csv")
    texts = {c: str for c in frame.columns if "[" not in c}
    back = pd.read_csv(tmp_path / "a.csv", encoding="utf-8-sig", dtype=texts, keep_default_na=False,
                       na_values={c: [""] for c in frame.columns if "[" in c},
                       float_precision="round_trip")  # fmt: skip
    pd.testing.assert_frame_equal(back, frame, check_exact=True, check_dtype=False)
    demo.write_parquet(well, tmp_path / "a.parquet")
    pd.testing.assert_frame_equal(pd.read_parquet(tmp_path / "a.parquet"), frame, check_exact=True)


@WELLS
def test_the_workbook_holds_the_same_values(demo: Lab, tmp_path: Path, well: str) -> None:
    """To the sixteen digits with which openpyxl writes a number."""
    frame = demo.interval(well)
    demo.write_workbook(well, tmp_path / "a.xlsx")
    sheet = openpyxl.load_workbook(tmp_path / "a.xlsx")["all results"]
    rows = [list(row) for row in sheet.iter_rows(values_only=True)]
    at = next(i for i, row in enumerate(rows) if "plug" in row)
    back = pd.DataFrame(rows[at + 1 :], columns=rows[at])
    back = back[back["plug"].notna()].reset_index(drop=True)
    for column in (c for c in frame.columns if "[" in c and c in back):
        there = back[column].astype(float)
        assert np.allclose(there, frame[column], rtol=1e-15, atol=0.0, equal_nan=True), column
    assert back["plug"].tolist() == frame["plug"].tolist()


@WELLS
@pytest.mark.parametrize("version", ["2.0", "3.0"])
def test_las_reads_back_the_same(demo: Lab, tmp_path: Path, well: str, version: str) -> None:
    frame = demo.interval(well)
    demo.write_las(well, tmp_path / "a.las", version=version)
    las = lasio.read(tmp_path / "a.las")
    depth = next(c for c in frame.columns if c.startswith("depth ["))
    assert np.array_equal(las["DEPT"], frame[depth])
    by_words = {c.descr.split(" {")[0]: c.data for c in las.curves}
    filled = [c for c in NUMBERS if c in frame and frame[c].notna().any() and c != depth]
    assert len(filled) > 10
    for column in filled:
        name = column.split(" [")[0]
        assert np.array_equal(by_words[name], frame[column], equal_nan=True), column


@WELLS
def test_the_spwla_format_reads_back_to_its_digits(
    demo: Lab, tmp_path: Path, well: str, sqlite_template: Path
) -> None:
    demo.write_spwla(well, tmp_path / "a.spwla")
    here = demo.interval(well)
    unit = "ft" if "depth [ft]" in here else "m"
    file = shutil.copyfile(sqlite_template, tmp_path / "other.db")
    with open_lab(str(file), by="tester") as other:
        done = other.read_spwla(tmp_path / "a.spwla", well)
        there = other.interval(well, unit=unit)
    assert done.laboratories == here["laboratory"].unique().tolist()
    assert not [n for n in done.notices if "not understood" in n]
    numbers = [c for c in here.columns if "[" in c and c != "crush likelihood [v/v]"]
    same = ["plug", "source", "laboratory", "depth basis", "orientation", "facies", "porosity route", "gas"]
    pd.testing.assert_frame_equal(there[same], here[same])
    pd.testing.assert_frame_equal(there[numbers], here[numbers], rtol=1e-7)
    for ours, theirs in zip(here["flags"], there["flags"], strict=True):
        doubts = [f for f in ours.split("; ") if f and ": " not in f]
        assert not [f for f in doubts if f not in theirs]


def test_files_are_issued_like_others(demo: Lab, tmp_path: Path) -> None:
    demo.write_las("QB-1", tmp_path / "a.las", recipient="", reason="asked for")
    demo.write_spwla("QB-1", tmp_path / "a.spwla", where="porosity > 0.2")
    kinds = demo.export_list("QB-1")["kind"].tolist()
    assert {"las", "spwla"} <= set(kinds)
    assert set(demo.export_check(tmp_path / "a.las")["kind"]) == {"las"}
    with pytest.raises(Usage, match=r"--version"):
        demo.write_las("QB-1", tmp_path / "b.las", version="4")
    assert not (tmp_path / "b.las").exists()
