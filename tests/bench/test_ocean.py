"""Seven sediment samples of an ocean drilling hole, from weighings and pycnometer to published results.

ODP Leg 204, hole 1244C, moisture and density (method C: wet mass, dry mass, dry volume), as kept by NOAA NCEI
(Janus database, 2002): masses and volumes with their beaker, porosity and grain density as published. The sea
water dried in them: 35 g/kg, 1.024 g/cm3, its salt 2.22 g/cm3 (Blum, P. 1997, ODP Tech. Note 26).
"""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from corelab.errors import Refused
from corelab.lab import Lab

WRITE = Callable[..., Path]
MASSES = (
    "well,plug,condition,mass [g],container mass [g],saturant density [g/cm3],salinity [g/kg],salt,"
    "salt density [g/cm3]"
)
VOLUMES = "well,plug,instrument,grain volume [cm3],container volume [cm3]"


def load(
    lab: Lab, write: WRITE, samples: list[tuple[str, str, str, str, str, str]], wet: str = "saturated"
) -> None:
    """Samples: name, wet and dry mass with beaker, beaker [g], dry volume with beaker, beaker [cm3]."""
    lab.load(
        [
            write("wells", "well,depth unit,depth datum", "1244C,m,sea floor"),
            write(
                "core runs",
                "well,run,top depth [m],base depth [m],recovered length [m],core diameter [mm]",
                "1244C,1H,0,9,9,66",
            ),
            write(
                "plugs",
                "well,plug,from,run,depth [m]",
                *(f"1244C,{s[0]},core,1H,{0.5 + 0.001 * n}" for n, s in enumerate(samples)),
            ),
            write(
                "masses",
                MASSES,
                *(f"1244C,{s[0]},{wet},{s[1]},{s[3]},1.024,35,left,2.22" for s in samples if s[1]),
                *(f"1244C,{s[0]},dry,{s[2]},{s[3]},,,left,2.22" for s in samples if s[2]),
            ),
            write("grain volume", VOLUMES, *(f"1244C,{s[0]},PYC,{s[4]},{s[5]}" for s in samples if s[4])),
        ]
    )


@pytest.mark.parametrize("wet", ["saturated", "as received"])
def test_published_porosity_and_grain_density(
    lab: Lab, write_sheet: WRITE, open_data: Path, wet: str
) -> None:
    """Published: porosity [%] as printed to 0.1, grain density [g/cm3] as printed to 0.001."""
    with (open_data / "ocean_1244C" / "odp_leg204_1244C_mad_raw.tsv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file, delimiter="\t"))
    assert len(rows) == 7
    columns = (
        "Mass(bulk+beaker)(g)",
        "Mass(dry+beaker)(g)",
        "Mass beaker (g)",
        "Vol.(dry+beaker)(cc)",
        "Vol beaker (cc)",
    )
    load(lab, write_sheet, [(str(n), *(r[c] for c in columns)) for n, r in enumerate(rows)], wet)  # type: ignore[misc]
    found = lab.interval("1244C")
    assert list(found["plug"]) == [str(n) for n in range(7)]
    assert set(found["porosity route"]) == {"pore-grain"}
    for row, published in zip(found.to_dict("records"), rows, strict=True):
        printed = published["Porosity (%)"], published["Grain Density (g/cc)"]
        for value, text in zip(
            (100 * row["porosity [v/v]"], row["grain density [g/cm3]"]), printed, strict=True
        ):
            half = 0.5 * 10.0 ** -len(text.partition(".")[2])
            # its own printing keeps the porosity to one decimal, the densities to three
            half = max(half, 0.05 if text == printed[0] else 0.0005)
            assert abs(value - float(text)) <= half * (1 + 1e-9)
        for heading, column in (
            ("pore volume [cm3]", "Vol of Porewater (cc)"),
            ("grain volume [cm3]", "Vol. Solids (cc)"),
        ):
            digits = len(published[column].partition(".")[2])
            assert abs(row[heading] - float(published[column])) <= 0.5 * 10.0**-digits + 1e-9


def test_samples_of_known_truth_come_back(lab: Lab, write_sheet: WRITE) -> None:
    """Law: whatever pores, grains and beaker, porosity and grain density are those put in."""
    rng = np.random.default_rng(5)
    pore, grain = rng.uniform(0.5, 15.0, (2, 40))
    density, beaker = rng.uniform(2.2, 3.3, 40), rng.uniform(5.0, 12.0, 40)
    water, salt = pore * 1.024 * 0.965, pore * 1.024 * 0.035
    dry = density * grain + salt + beaker
    columns = (dry + water, dry, beaker, grain + salt / 2.22 + beaker / 2.2, beaker / 2.2)
    names = [f"{n}X" for n in range(40)]
    load(lab, write_sheet, list(zip(names, *(map(repr, c.tolist()) for c in columns), strict=True)))  # type: ignore[arg-type]
    found = lab.interval("1244C").set_index("plug").loc[names]
    np.testing.assert_allclose(found["porosity [v/v]"], pore / (pore + grain), rtol=1e-9)
    np.testing.assert_allclose(found["grain density [g/cm3]"], density, rtol=1e-9)
    assert found["flags"].str.contains("corrected for salt left").all()


def test_what_real_files_hold(lab: Lab, write_sheet: WRITE) -> None:
    """Incomplete and contradictory samples load; each result that is missing says why, the rest come."""
    load(
        lab,
        write_sheet,
        [
            ("good", "20.925", "15.028", "8.117", "6.253", "3.69"),
            ("no wet mass", "", "15.028", "8.117", "6.253", "3.69"),
            ("no dry mass", "20.925", "", "8.117", "6.253", "3.69"),
            ("no volume", "20.925", "15.028", "8.117", "", ""),
            ("no beaker", "12.8", "6.9", "", "2.56", ""),
            ("dry above wet", "14.9", "15.028", "8.117", "6.253", "3.69"),
            ("dry as wet", "15.028", "15.028", "8.117", "6.253", "3.69"),
            ("beaker above volume", "20.925", "15.028", "8.117", "3.5", "3.69"),
        ],
    )
    found = lab.interval("1244C").set_index("plug")
    porosity, flags = found["porosity [v/v]"], found["flags"]
    assert porosity["good"] == pytest.approx(0.708, abs=0.0005)
    assert porosity["no beaker"] == pytest.approx(0.71, abs=0.01)
    assert found["grain density [g/cm3]"]["no wet mass"] > 2.0
    assert "salt left not corrected: amount unknown" in flags["no wet mass"]
    for plug, words in {
        "no wet mass": "porosity",
        "no dry mass": "a saturated mass without a dry one",
        "no volume": "grain volume",
        "dry above wet": "dry mass: not more than the wet mass expected",
        "beaker above volume": "the container is not smaller than the volume measured",
    }.items():
        assert pd.isna(porosity[plug])
        assert words in flags[plug]
    assert porosity["dry as wet"] == 0.0
    assert lab.recompute(check=True).empty


@pytest.mark.parametrize(
    ("sample", "words"),
    [
        (("x", "7.9", "7.5", "8.117", "6.253", "3.69"), "container mass"),
        (("x", "-20.925", "15.028", "8.117", "6.253", "3.69"), "mass"),
        (("x", "20.925", "15.028", "8.117", "-6.253", "3.69"), "grain volume"),
        (("x", "20.925", "0", "8.117", "6.253", "3.69"), "mass"),
        (("x", "20.925", "-999.25", "8.117", "6.253", "3.69"), "mass"),
    ],
)
def test_impossible_readings_are_named(
    lab: Lab, write_sheet: WRITE, sample: tuple[str, ...], words: str
) -> None:
    with pytest.raises(Refused) as refusal:
        load(lab, write_sheet, [sample])  # type: ignore[list-item]
    assert words in str(refusal.value)
    assert "row" in str(refusal.value)
