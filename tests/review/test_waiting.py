"""The order of review: each kind of oddity is provoked on a plug of an even well, and that plug comes first.

The well is simulated: forty plugs of one sand whose porosity and permeability follow one trend with a little
scatter from a fixed seed.
"""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from corelab import open_lab
from corelab.lab import Lab
from corelab.review.waiting import modified_z

ODD = "P20"
N = 40


def sheet(folder: Path, kind: str, heading: str, *rows: str) -> Path:
    path = folder / f"{kind}.csv"
    path.write_text("\n".join([heading, *rows]) + "\n", encoding="utf-8")
    return path


DIMENSIONS = "well,plug,length 1 [mm],diameter 1 [mm],measured on,measured by,caliper"
VOLUMES = "well,plug,instrument,grain volume [cm3],measured on,measured by"
FLOW = (
    "well,plug,net confining stress [MPa],permeameter,klinkenberg permeability [mD],measured on,measured by"
)
MASSES = "well,plug,condition,mass [g],balance,measured on,measured by"
BULK_CM3 = np.pi / 4 * 3.8**2 * 5.0


@pytest.fixture(scope="module")
def even_file(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path) -> Path:
    folder = tmp_path_factory.mktemp("even")
    luck = np.random.default_rng(5)
    phi = 0.20 + 0.03 * np.sin(np.arange(N) / 6) + luck.normal(0, 0.002, N)
    k_md = 10 ** (20 * phi - 2 + luck.normal(0, 0.05, N))
    grain = BULK_CM3 * (1 - phi)
    names = [f"P{n}" for n in range(N)]
    instruments = "instrument,measures,repeatability,scale uncertainty,uncertainty unit"
    sheet(folder, "instruments", instruments, "BAL,mass,0.005,0.002,g", "CAL,length,0.02,0.01,mm",
          "POR,volume,0.02,0.01,cm3")  # fmt: skip
    sheet(folder, "wells", "well,depth unit", "W-1,m")
    sheet(folder, "plugs", "well,plug,from,depth [m],facies", *(
        f"W-1,{p},core,{1000 + n * 0.25},sand" for n, p in enumerate(names)
    ))  # fmt: skip
    sheet(folder, "dimensions", DIMENSIONS, *(f"W-1,{p},50,38,2026-03-01,Odd Pell,CAL" for p in names))
    sheet(folder, "grain volume", VOLUMES, *(
        f"W-1,{p},POR,{g:.4f},2026-03-01,Odd Pell" for p, g in zip(names, grain, strict=True)
    ))  # fmt: skip
    sheet(folder, "masses", MASSES, *(
        f"W-1,{p},dry,{2.65 * g:.3f},BAL,2026-03-01,Odd Pell" for p, g in zip(names, grain, strict=True)
    ))  # fmt: skip
    sheet(folder, "reported permeability", FLOW, *(
        f"W-1,{p},5,PD,{k:.4g},2026-03-01,Odd Pell" for p, k in zip(names, k_md, strict=True)
    ))  # fmt: skip
    path = folder / "lab.db"
    shutil.copyfile(sqlite_template, path)
    with open_lab(str(path), by="Tor Vale") as lab:
        lab.load([folder])
        lab.person_add("Mara Quist", "manager")
        lab.by = "Mara Quist"
        lab.person_add("Tor Vale", "technician")
        lab.engine.dispose()
    return path


@pytest.fixture
def even(even_file: Path, tmp_path: Path) -> Iterator[Lab]:
    path = shutil.copyfile(even_file, tmp_path / "lab.db")
    with open_lab(str(path), by="Mara Quist") as lab:
        yield lab


def first(lab: Lab) -> dict[str, object]:
    """The first plug of the review, which has to be odd in more than the others are."""
    frame = lab.review("W-1")
    top = frame.iloc[0].to_dict()
    assert top["plug"] == ODD, frame.head(3).to_string()
    assert frame["oddities"].iloc[1] < top["oddities"]
    return top


def loaded(lab: Lab, folder: Path, kind: str, heading: str, *rows: str) -> None:
    lab.load([sheet(folder, kind, heading, *rows)], reason="simulated")


def test_in_an_even_well_no_plug_stands_apart(even: Lab) -> None:
    frame = even.review("W-1")
    assert len(frame) == N
    assert not frame["odd"].str.contains("stands apart|the trend|repeats|duplicate|approved as").any()
    assert frame["depth [m]"].is_monotonic_increasing  # as odd as each other: by depth
    assert set(frame["measured by"]) == {"Odd Pell, Tor Vale"}


def test_a_porosity_that_stands_apart_from_its_neighbours(even: Lab, tmp_path: Path) -> None:
    g = BULK_CM3 * (1 - 0.27)
    loaded(even, tmp_path, "grain volume", VOLUMES, f"W-1,{ODD},POR,{g:.4f},2026-03-01,Odd Pell")
    words = str(first(even)["odd"])
    assert "porosity 0.270 stands apart from its neighbours' 0.1" in words


def test_a_permeability_that_stands_apart_from_the_trend(even: Lab, tmp_path: Path) -> None:
    before = even.interval("W-1").set_index("plug").loc[ODD, "klinkenberg permeability [mD]"]
    loaded(
        even, tmp_path, "reported permeability", FLOW, f"W-1,{ODD},5,PD,{before * 20:.4g},2026-03-01,Odd Pell"
    )
    words = str(first(even)["odd"])
    assert "times above the trend of sand" in words
    times = float(words.split("permeability ")[-1].split(" times")[0])
    assert 12 < times < 30  # twenty times, and the scatter it had


def test_a_grain_density_beyond_the_usual(even: Lab, tmp_path: Path) -> None:
    loaded(
        even, tmp_path, "masses", MASSES, f"W-1,{ODD},dry,{BULK_CM3 * 0.8 * 3.4:.3f},BAL,2026-03-01,Odd Pell"
    )
    assert "outside the usual range" in str(first(even)["odd"])


def test_repeats_that_differ_more_than_repeatability_lets_them(even: Lab, tmp_path: Path) -> None:
    mass = even.interval("W-1").set_index("plug").loc[ODD, "dry mass [g]"]
    other = f"W-1,P3,dry,{even.interval('W-1').set_index('plug').loc['P3', 'dry mass [g]'] + 0.012:.3f}"
    repeats = f"{MASSES},repeat"
    tail = "BAL,2026-03-01,Odd Pell,2"
    # the critical difference of two is 2.8 times the repeatability standard deviation (ISO 5725-6): 0.014 g
    loaded(even, tmp_path, "masses", repeats, f"W-1,{ODD},dry,{mass + 0.017:.3f},{tail}", f"{other},{tail}")
    words = str(first(even)["odd"])
    assert (
        "2 repeats of masses, mass, differ by 0.017 g, more than the 0.014 that repeatability allows" in words
    )
    frame = even.review("W-1").set_index("plug")
    assert "repeats" not in frame.loc["P3", "odd"]


def test_a_duplicate_that_parts_from_its_first(even: Lab, tmp_path: Path) -> None:
    plugs = "well,plug,from,depth [m],facies,duplicate of"
    loaded(even, tmp_path, "plugs", plugs, f"W-1,{ODD},core,1005,sand,P19")
    words = str(first(even)["odd"])
    assert "where its duplicate P19 has" in words


def test_what_control_blocks(even: Lab, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(
        Lab,
        "_blocked",
        lambda _lab, _connection, identities, ids: {
            i: "POR is out of control" for i in ids if identities.name("plug", i) == ODD
        },
    )
    top = first(even)
    assert top["blocked"] == "POR is out of control"
    assert "POR is out of control" in str(top["odd"])


def test_a_correction_of_what_was_approved(even: Lab, tmp_path: Path) -> None:
    even.approve("W-1", [], "all good", everything=True)
    assert even.review("W-1").empty
    even.by = "Tor Vale"
    before = even.interval("W-1").set_index("plug").loc[ODD]
    mass = before["dry mass [g]"] + 0.5
    loaded(even, tmp_path, "masses", MASSES, f"W-1,{ODD},dry,{mass:.3f},BAL,2026-03-01,Odd Pell")
    frame = even.review("W-1")
    assert frame["plug"].tolist() == [ODD]
    assert frame["status"].tolist() == ["newer waits"]
    now = even.plug_show("W-1", ODD)["results"].set_index("quantity").loc["grain density", "value"]
    then = before["grain density [g/cm3]"]
    assert f"grain density approved as {then:.5g}, now {now:.5g}" in frame["odd"].iloc[0]
    assert frame["grain density [g/cm3]"].iloc[0] == now  # the review shows what waits


def test_more_oddities_come_before_fewer(even: Lab, tmp_path: Path) -> None:
    before = even.interval("W-1").set_index("plug")["klinkenberg permeability [mD]"]
    g = BULK_CM3 * (1 - 0.30)
    loaded(even, tmp_path, "grain volume", VOLUMES, f"W-1,{ODD},POR,{g:.4f},2026-03-01,Odd Pell")
    loaded(even, tmp_path, "masses", MASSES, f"W-1,{ODD},dry,{g * 3.4:.3f},BAL,2026-03-01,Odd Pell")
    rows = [f"W-1,P5,5,PD,{before['P5'] * 20:.4g},2026-03-01,Odd Pell"]
    loaded(even, tmp_path, "reported permeability", FLOW, *rows)
    frame = even.review("W-1")
    assert frame["plug"].tolist()[:2] == [ODD, "P5"]
    assert frame["oddities"].tolist()[:2] == sorted(frame["oddities"], reverse=True)[:2]


def test_depths_in_feet_make_the_same_order(even: Lab, tmp_path: Path) -> None:
    g = BULK_CM3 * (1 - 0.27)
    loaded(even, tmp_path, "grain volume", VOLUMES, f"W-1,{ODD},POR,{g:.4f},2026-03-01,Odd Pell")
    metres, feet = even.review("W-1"), even.review("W-1", unit="ft")
    same = [c for c in metres.columns if not c.startswith("depth")]
    pd.testing.assert_frame_equal(metres[same], feet[same])
    np.testing.assert_allclose(feet["depth [ft]"] * 0.3048, metres["depth [m]"])


def test_the_modified_z_score_is_that_of_statsmodels() -> None:
    """Oracle: statsmodels' `mad`, whose scale is that of the normal distribution."""
    from statsmodels.robust.scale import mad

    values = np.random.default_rng(1).normal(size=101)
    expected = (values - np.median(values)) / mad(values)
    np.testing.assert_allclose(modified_z(values), expected, rtol=1e-4)
    assert np.array_equal(modified_z(np.full(9, 3.0)), np.zeros(9))
    assert np.isnan(modified_z(np.array([np.nan, 1.0, 2.0, 3.0]))[0])
