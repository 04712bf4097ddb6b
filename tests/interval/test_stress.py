"""Results between stresses.

Published: Jones 1988, SPE Formation Evaluation 3:235 (form and presets from memory): s* 3000 psi, C 3e-6
1/psi; 10.0 mD at 1500 psi and 8.5 mD at 5000 psi give 9.1266 mD at 3000 psi.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pandas as pd
import pytest

from corelab.interval.stress import equivalent_stress_mpa, with_interpolated
from corelab.lab import Lab

PSI = 0.006894757293168


def results(*rows: tuple[str, float, float, str, str | None]) -> pd.DataFrame:
    return pd.DataFrame(
        [
            {
                "place": 0,
                "quantity": q,
                "direction": "",
                "stress_mpa": s,
                "step": "",
                "value": v,
                "uncertainty": 0.01 * v,
                "value_limit": limit,
                "basis": "measured",
                "flags": flags,
                "reason": "",
            }
            for q, s, v, flags, limit in rows
        ]
    )


K = "klinkenberg permeability"


def at(frame: pd.DataFrame, quantity: str, stress: float) -> pd.DataFrame:
    return frame[(frame["quantity"] == quantity) & ((frame["stress_mpa"] - stress).abs() < 1e-9)]


def test_permeability_between_as_printed() -> None:
    two = results((K, 1500 * PSI, 10.0, "", None), (K, 5000 * PSI, 8.5, "", None))
    made = at(with_interpolated(two, 3000 * PSI), K, 3000 * PSI)
    assert made["value"].iloc[0] == pytest.approx(9.1266, abs=0.00005)
    assert "interpolated between 10.3421 and 34.4738 MPa" in made["flags"].iloc[0]


def test_never_beyond_and_what_is_measured_is_left_alone() -> None:
    two = results((K, 10.0, 10.0, "", None), (K, 30.0, 8.5, "", None))
    for beyond in (5.0, 31.0, 10.0, 30.02):
        assert len(with_interpolated(two, beyond)) == len(two)


def test_limits_and_unstated_stresses_are_no_ends() -> None:
    limited = results((K, 10.0, 0.01, "", "below"), (K, 30.0, 0.005, "", None))
    unstated = results((K, 0.0, 1.0, "net confining stress not stated", None), (K, 30.0, 0.5, "", None))
    assert len(with_interpolated(limited, 20.0)) == 2
    assert len(with_interpolated(unstated, 20.0)) == 2


def test_porosity_follows_from_pore_and_grain_volume() -> None:
    frame = results(
        ("pore volume", 10.0, 10.0, "", None),
        ("pore volume", 30.0, 9.5, "", None),
        ("grain volume", 0.0, 40.0, "", None),
    )
    made = with_interpolated(frame, 20.0)
    pore = at(made, "pore volume", 20.0)["value"].iloc[0]
    assert 9.5 < pore < 10.0
    assert at(made, "porosity", 20.0)["value"].iloc[0] == pytest.approx(pore / (pore + 40.0))
    assert at(made, "bulk volume", 20.0)["value"].iloc[0] == pytest.approx(pore + 40.0)


def test_equivalent_stress() -> None:
    """Teeuw 1971 (form from memory): (1 + nu)/(3 (1 - nu)); nu 0.30: 0.6190, 5000 psi gives 3095 psi."""
    assert equivalent_stress_mpa(5000.0, 0.30) == pytest.approx(3095.0, abs=0.5)


def test_through_the_lab(lab: Lab, write_sheet: Callable[..., Path]) -> None:
    lab.load(
        [
            write_sheet("wells", "well,depth unit", "W,m"),
            write_sheet("plugs", "well,plug,from,depth [m]", "W,1H,core,100"),
            write_sheet(
                "reported permeability",
                "well,plug,permeameter,klinkenberg permeability [mD],net confining stress [psi]",
                "W,1H,PD,10,1500",
                "W,1H,PD,8.5,5000",
                "W,1H,PD,8.0,8000",
            ),
        ]
    )
    found = lab.interval("W", stress=3000 * PSI).iloc[0]
    assert found[f"{K} [mD]"] == pytest.approx(9.1266, abs=0.00005)
    assert found["permeability stress [MPa]"] == pytest.approx(3000 * PSI)
    assert "interpolated between" in found["flags"]
    uniaxial = lab.interval("W", stress=3000 * PSI / 0.619047619, uniaxial=0.30).iloc[0]
    assert uniaxial[f"{K} [mD]"] == pytest.approx(9.1266, abs=0.00005)
    beyond = lab.interval("W", stress=60.0).iloc[0]
    assert beyond[f"{K} [mD]"] != beyond[f"{K} [mD]"]
    assert "not measured at 60 MPa" in beyond["flags"]
    exponents = lab.plug_show("W", "1H")["results"]
    assert (exponents["quantity"] == "permeability stress exponent").sum() == 1
