"""How results explain themselves, on the demo lab: every calculation shown is done again, budgets add up."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from corelab import open_lab
from corelab.cli.explained import print_explanation
from corelab.errors import NotFound
from corelab.lab import Lab
from corelab.quantities import RESULTS
from corelab.science.catalogue import formulas

MANY = [
    "bulk volume",
    "grain volume",
    "pore volume",
    "dry mass",
    "porosity",
    "grain density",
    "bulk density",
    "gas permeability",
    "klinkenberg permeability",
    "slip factor",
    "oil saturation",
    "water saturation",
    "gas saturation",
]


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory, demo_folder: Path) -> Iterator[Lab]:
    path = tmp_path_factory.mktemp("explain") / "lab.db"
    with open_lab(str(path), by="tester") as lab:
        lab.setup()
        lab.load([demo_folder / "bench"])
        yield lab


@pytest.fixture(scope="module")
def full(demo: Lab) -> str:
    """A core plug with volumes, a regressed permeability and distilled fluids."""
    frame = demo.interval(
        "QB-1",
        where="slip basis = measured and oil saturation > 0.1 and source = core and orientation = horizontal",
    )
    return str(frame["plug"].iloc[0])


@pytest.mark.parametrize("result", MANY)
def test_value_budget_and_calculations_hang_together(demo: Lab, full: str, result: str) -> None:
    found = demo.explain("QB-1", full, result)
    row = demo.interval("QB-1", with_uncertainty=True).set_index("plug").loc[full]
    heading = RESULTS[result].stored_heading
    if result != "gas permeability":  # interval shows the step at the reporting pressure
        assert found["value"] == pytest.approx(row[heading], rel=1e-12)
        assert found["uncertainty"] == pytest.approx(row[f"u {heading}"], rel=1e-9)
    parts = [b["contribution"] ** 2 for b in found["budget"]]
    assert sum(parts) == pytest.approx(found["uncertainty"] ** 2, rel=1e-9)
    assert sum(b["share"] for b in found["budget"]) == pytest.approx(1.0)
    assert parts == sorted(parts, reverse=True)
    for step in found["calculations"]:
        _done_again(step)
    assert found["readings"]
    assert all(r["as typed"] and r["number"] > 0 for r in found["readings"])
    assert found["version"] >= 1
    assert found["fingerprint"]


def _done_again(step: dict[str, Any]) -> None:
    """The catalogue's own formula, with the inputs that were shown, gives what was shown."""
    formula = formulas()[step["key"]]
    shown = {i["symbol"]: i["value"] for i in step["inputs"]}
    given = {s.name: shown[s.symbol or s.name] for s in formula.inputs if (s.symbol or s.name) in shown}
    size = max(len(v) if isinstance(v, list) else 1 for v in given.values())
    spread = {
        n: np.broadcast_to(
            np.array([np.nan if i is None else i for i in v] if isinstance(v, list) else v), (size,)
        )
        for n, v in given.items()
        if v is not None
    }
    result = formula.compute(**spread)
    names = {f.name for f in fields(result)} if is_dataclass(result) else set()
    for output, symbol in zip(step["outputs"], formula.outputs, strict=False):
        value = getattr(result, symbol.name) if symbol.name in names else result
        expected = np.atleast_1d(np.asarray(value)).ravel()
        if expected.dtype.kind == "f" and output["value"] is not None:
            got = output["value"] if isinstance(output["value"], list) else [output["value"]]
            got = np.array([np.nan if v is None else v for v in got], dtype=float)
            np.testing.assert_allclose(
                np.broadcast_to(got, expected.shape), expected, rtol=1e-9, equal_nan=True
            )


def test_the_last_calculation_gives_the_value(demo: Lab, full: str) -> None:
    for result in ("porosity", "grain density", "bulk density"):
        found = demo.explain("QB-1", full, result)
        last = found["calculations"][-1]
        assert last["key"] == found["method"]
        assert last["outputs"][0]["value"] == pytest.approx(found["value"], rel=1e-12)


def test_the_calibration_in_force_and_the_instruments_are_named(demo: Lab, full: str) -> None:
    found = demo.explain("QB-1", full, "grain volume")
    (calibration,) = found["calibrations"]
    assert calibration["setup"] == "cup"
    assert len(calibration["readings"]) >= 4
    assert {i["measures"] for i in found["instruments"]} >= {"pressure"}
    assert all(i["from"] for i in found["instruments"])


def test_every_result_of_every_plug_can_be_printed(demo: Lab, capsys: pytest.CaptureFixture[str]) -> None:
    frame = demo.interval("QB-1")
    odd = frame[
        frame["flags"].str.contains("limit|salt left|not measured|percussion|texture")
        | (frame.index % 12 == 0)
    ]
    for plug in odd["plug"].head(10):
        for result in ("porosity", "klinkenberg permeability", "oil saturation"):
            found = demo.explain("QB-1", plug, result)
            json.dumps(found, allow_nan=False)
            print_explanation(found)
            assert (found["value"] is None) == bool(found["reason"])
    assert "porosity of" in capsys.readouterr().out


def test_what_is_not_there_is_named(demo: Lab, full: str) -> None:
    with pytest.raises(NotFound, match="did you mean 'porosity'"):
        demo.explain("QB-1", full, "porosty")
    with pytest.raises(NotFound, match="was not measured"):
        demo.explain("QB-1", full, "klinkenberg permeability", stress=77.0)


def test_stored_methods_are_in_the_catalogue(demo: Lab) -> None:
    with demo.engine.connect() as connection:
        stored = {row[0] for row in connection.exec_driver_sql("SELECT DISTINCT method FROM result")}
    keys = {part for text in stored for part in text.split(" + ")} - {"", "reported"}
    assert keys <= set(formulas())
    assert len(keys) > 12


def test_what_methods_shows_is_the_code(demo: Lab) -> None:
    """Each text names every symbol of its formula, with its unit; an argument without one would show."""
    import inspect

    for formula in formulas().values():
        assert [s.name for s in formula.inputs] == list(inspect.signature(formula.compute).parameters)[
            : len(formula.inputs)
        ]
        assert formula.equation
        assert formula.source
        assert formula.tested
