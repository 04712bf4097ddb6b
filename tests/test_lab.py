"""The lab as a door for notebooks: one call a question, tidy frames. No published values."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable, Iterator
from pathlib import Path

import pandas as pd
import pytest

import corelab
from corelab import open_lab
from corelab.errors import NotFound, Refused, Usage
from corelab.interval.select import TEXT_COLUMNS
from corelab.lab import Lab, methods


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory, demo_folder: Path) -> Iterator[Lab]:
    """The demo lab, loaded once; read only."""
    with corelab.open_lab(str(tmp_path_factory.mktemp("demo") / "lab.db"), by="Ada") as lab:
        assert lab.setup().made
        lab.load([demo_folder / "bench"])
        yield lab


def test_importing_the_package_is_light():
    code = "import corelab, sys; print(*sorted({m.split('.')[0] for m in sys.modules}))"
    root = Path(corelab.__file__).resolve().parent.parent
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, encoding="utf-8", check=True, cwd=root
    )
    assert not {"pandas", "numpy", "sqlalchemy", "scipy", "typer"} & set(done.stdout.split())


def test_an_interval_is_a_tidy_frame(demo: Lab):
    every = demo.interval("QB-1")
    top, base = every["depth [m]"].iloc[5], every["depth [m]"].iloc[15]
    frame = demo.interval("QB-1", top=top, base=base)
    pd.testing.assert_frame_equal(
        frame, every[every["depth [m]"].between(top, base)].reset_index(drop=True), check_exact=True
    )
    assert every.index.tolist() == list(range(len(every)))
    assert every["plug"].is_unique
    for heading in every:
        if heading in TEXT_COLUMNS:
            assert all(isinstance(v, str) for v in every[heading]), heading
        else:
            assert every[heading].dtype == "float64", heading
    porosity = every["porosity [v/v]"]
    computed = every["pore volume [cm3]"] / every["bulk volume [cm3]"]
    pd.testing.assert_series_equal(
        porosity[every["porosity route"] == "bulk-grain"],
        computed[every["porosity route"] == "bulk-grain"],
        check_names=False,
        rtol=1e-12,
    )


def test_no_frame_of_two_wells_mixes_them(demo: Lab):
    for well in demo.well_list()["well"]:
        assert set(demo.interval(well)["well"]) == {well}


def test_an_interval_is_the_same_every_time(demo: Lab):
    pd.testing.assert_frame_equal(demo.interval("QB-2"), demo.interval("qb-2"), check_exact=True)
    assert not len(demo.recompute(check=True))


def test_every_plug_without_a_result_says_why(demo: Lab):
    for well in demo.well_list()["well"]:
        for plug in demo.interval(well).to_dict("records"):
            for heading in ("bulk volume [cm3]", "porosity [v/v]", "klinkenberg permeability [mD]"):
                if plug[heading] != plug[heading]:
                    assert f"{heading.split(' [')[0]}" in plug["flags"], (well, plug["plug"], heading)


def test_methods_are_told_with_their_source():
    every = methods()
    assert len({m["key"] for m in every}) == len(every)
    assert methods(every[0]["key"]) == [every[0]]
    with pytest.raises(NotFound, match="There is no method"):
        methods("divination")


def test_files_come_out(demo: Lab, tmp_path: Path):
    book = demo.write_workbook("QB-1", tmp_path / "a.xlsx", recipient="Partner")
    sheet = demo.write_csv("QB-1", str(tmp_path / "a.csv"), where="porosity > 0.2")
    assert book.stat().st_size > 5000
    found = pd.read_csv(sheet, encoding="utf-8-sig")
    assert (found["porosity [v/v]"] > 0.2).all()
    assert len(found)


def test_a_change_is_seen_at_once_on_each_database(any_lab: Lab, write_sheet: Callable[..., Path]):
    files = [
        write_sheet("wells", "well,depth unit", "W 1,m"),
        write_sheet("plugs", "well,plug,from,depth [m]", "W 1,2H,core,1000", "W 1,10H,core,1000"),
        write_sheet("dimensions", "well,plug,length 1 [mm],diameter 1 [mm]", "W 1,2H,50,38"),
    ]
    first = any_lab.load(files)
    assert first.new == {"wells": 1, "plugs": 2, "dimensions": 1}
    assert first.seal == any_lab.seal()
    assert any_lab.interval("w 1")["plug"].tolist() == ["2H", "10H"]
    before = any_lab.interval("W 1")["bulk volume [cm3]"].iloc[0]
    files[2].write_text("well,plug,length 1 [mm],diameter 1 [mm]\nW 1,2H,25,38\n", encoding="utf-8")
    with pytest.raises(Refused):
        any_lab.load(files)
    again = any_lab.load(files, reason="typed twice as long")
    assert (again.new, again.corrected, again.unchanged) == ({}, {"dimensions": 1}, {"wells": 1, "plugs": 2})
    assert any_lab.interval("W 1")["bulk volume [cm3]"].iloc[0] == pytest.approx(before / 2, rel=1e-12)
    assert again.seal == any_lab.seal() != first.seal
    nothing = any_lab.load(files)
    assert not nothing.changes
    assert any_lab.seal() == again.seal
    assert not len(any_lab.recompute(check=True))


def test_a_barometer_set_later_moves_the_results_that_rest_on_it(
    demo: Lab, demo_folder: Path, tmp_path: Path
):
    with open_lab(str(tmp_path / "lab.db"), by="Ada") as lab:
        lab.setup()
        lab.load([demo_folder / "bench"])
        lab.setting("barometric pressure", "98 kPa")
        assert not len(lab.recompute(check=True))
        assert not lab.interval("QB-1")["flags"].str.contains("barometer assumed").any()


def test_who_acts(lab: Lab):
    assert lab.setting("depth unit", "ft")["value"].tolist() == ["ft"]
    lab.person_add("Ada Lovdal", "manager")
    with pytest.raises(NotFound, match="'tester' is not registered"):
        lab.setting("depth unit", "m")
    lab.by = " ada LOVDAL "
    lab.setting("depth unit", "m")
    lab.person_add("Bo", "technician")
    with pytest.raises(Usage, match="Bo is registered as technician already"):
        lab.person_add(" bo ", "technician")
    lab.person_add("bo", "reviewer")
    assert lab.history()["person"].tolist() == ["tester"] * 3 + ["Ada Lovdal"] * 3


def test_a_missing_file_is_not_made_by_asking(tmp_path: Path):
    with open_lab(str(tmp_path / "lab.db")) as lab, pytest.raises(NotFound, match="make one with"):
        lab.well_list()
    assert not list(tmp_path.iterdir())
