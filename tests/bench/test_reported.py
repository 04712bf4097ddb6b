"""What another laboratory's file says: columns by their words, nulls, zeros, two plugs of one sample point.

Published: the real plugs of well 7121/8-1 (Norwegian Offshore Directorate, NLOD 2.0). Their statistics were
computed outside the project from the table that others parsed: kKl_h > 0 of 264 plugs: 249, arithmetic mean
473.499, geometric 14.70235, harmonic 0.234817 mD, Cv 3.94663, mean porosity 16.0507 %; 246 pairs, geometric
mean ratio 0.410126, median 0.524049, kv above kh in 55.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from corelab.bench.reported import NOT_STATED, SUMMATION, ZERO, Plug, plugs_of
from corelab.formats.spwla_in import Meaning, Sample, SpwlaFile, read_spwla

REAL = "norway_7121_8-1/7121_8-1_CORE_CONV_RAW_1.SPWLA"


def made(
    meanings: list[str | tuple[tuple[int, ...], str]],
    *rows: list[str],
    words: tuple[str, ...] = (),
    names: tuple[str, ...] = (),
    unit: str = "m",
) -> tuple[list[Plug], list[str]]:
    """The plugs of a file with these columns and rows, and what was told of it."""
    known = [
        Meaning(i + 4, (), "Bench", m) if isinstance(m, str) else Meaning(i + 4, m[0], "Bench", m[1])
        for i, m in enumerate(meanings)
    ]
    samples = [
        Sample(
            10 + i, f"{1000 + i} 0.00 {i + 1}", 1000.0 + i, names[i] if names else str(i + 1),
            words=list(words), values=row,
        )
        for i, row in enumerate(rows)
    ]  # fmt: skip
    file = SpwlaFile("a.spwla", b"", meanings=known, samples=samples)
    told: list[str] = []
    return plugs_of(file, laboratory="", depth_unit=unit, told=told.append), told


def value(plug: Plug, quantity: str) -> float | None:
    (found,) = [v.value for v in plug.values if v.quantity == quantity]
    return found


# -- the real file ----------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def real(open_data: Path) -> tuple[list[Plug], list[str]]:
    told: list[str] = []
    file = read_spwla(open_data / REAL)
    return plugs_of(file, laboratory="", depth_unit="m", told=told.append), told


def test_published_horizontal_plugs(real: tuple[list[Plug], list[str]]) -> None:
    along = [p for p in real[0] if p.orientation == "horizontal"]
    assert len(along) == 264
    k = np.array([v for p in along if (v := value(p, "klinkenberg permeability")) is not None])
    assert len(k) == 249
    assert round(k.mean(), 3) == 473.499
    assert round(float(np.exp(np.log(k).mean())), 5) == 14.70235
    assert round(1.0 / (1.0 / k).mean(), 6) == 0.234817
    assert round(k.std(ddof=1) / k.mean(), 5) == 3.94663
    phi = [value(p, "porosity") for p in along if value(p, "klinkenberg permeability") is not None]
    assert round(100.0 * float(np.mean(np.array(phi, dtype=float))), 4) == 16.0507


def test_published_pairs(real: tuple[list[Plug], list[str]]) -> None:
    by_name = {p.name: p for p in real[0]}
    pairs = []
    for name, across in by_name.items():
        if name.endswith("V") and (along := by_name.get(f"{name[:-1]}H")):
            kv, kh = (value(p, "klinkenberg permeability") for p in (across, along))
            if kv is not None and kh is not None:
                pairs.append(kv / kh)
                assert across.sample == along.sample and across.depth_m == along.depth_m
    ratios = np.array(pairs)
    assert len(ratios) == 246
    assert round(float(np.exp(np.log(ratios).mean())), 6) == 0.410126
    assert round(float(np.median(ratios)), 6) == 0.524049
    assert int((ratios > 1).sum()) == 55


def test_the_quirks_of_the_real_file(real: tuple[list[Plug], list[str]]) -> None:
    """15 horizontal and 4 vertical zeros, of both permeabilities; rows of a second kind; a grain density cut
    off at the end of the file, and one of 3.268 in a mudstone."""
    plugs, told = real
    assert len(plugs) == 2 * 264 + 64
    zeros = [(p.orientation, v.quantity) for p in plugs for v in p.values if v.reason == ZERO]
    assert zeros.count(("horizontal", "klinkenberg permeability")) == 15
    assert zeros.count(("vertical", "klinkenberg permeability")) == 4
    assert len(zeros) == 38
    second = [p for p in plugs if "." in p.name]
    assert len(second) == 64
    assert {p.orientation for p in second} == {"vertical"}
    assert {v.quantity for p in second for v in p.values} == {"porosity", "oil saturation"}
    by_name = {p.name: p for p in plugs}
    assert value(by_name["1.11"], "porosity") == 0.1844722
    assert "grain density" not in {v.quantity for v in by_name["264H"].values}
    (dense,) = [v for v in by_name["92H"].values if v.quantity == "grain density"]
    assert dense.value == 3.2682
    assert dense.flags == ["grain density does not fit the described lithology"]
    assert by_name["88H"].description.startswith("Sst.Yelsh-gry.F/VC-gr.Gran.")
    assert by_name["88H"].lithology == "sandstone"
    assert any("-1002 stands 1567 times for nothing entered" in t for t in told)
    assert not [t for t in told if "not understood" in t]


# -- columns by their words -------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("words", "quantity", "orientation", "basis"),
    [
        ("Nitrogen Permeability, Hor.", "gas permeability", "horizontal", "nitrogen"),
        ("Klinkenberg corrected gas perm, Vert.", "klinkenberg permeability", "vertical", "reported"),
        ("Air perm horizontal (mD)", "gas permeability", "horizontal", "air"),
        ("Kair Max", "gas permeability", "horizontal", "air"),
        ("Helium permeability", "gas permeability", "", "helium"),
        ("PERM GAS (H)", "gas permeability", "horizontal", ""),
        ("KLH mD", "klinkenberg permeability", "horizontal", "reported"),
        ("KLV mD", "klinkenberg permeability", "vertical", "reported"),
        ("Equivalent liquid permeability, horizontal", "klinkenberg permeability", "horizontal", "reported"),
        ("Brine permeability", "liquid permeability", "", "reported"),
        ("HE POROSITY HOR %", "porosity", "horizontal", "reported"),
        ("Porosity, Summation", "porosity", "", SUMMATION),
        ("POR", "porosity", "", "reported"),
        ("Grain Den. g/cc", "grain density", "", "reported"),
        ("GD", "grain density", "", "reported"),
        ("Bulk density dry", "bulk density", "", "reported"),
        ("CORE Oil Saturation", "oil saturation", "", "reported"),
        ("So (% pore vol)", "oil saturation", "", "reported"),
        ("SW %", "water saturation", "", "reported"),
        ("Gas sat.", "gas saturation", "", "reported"),
        ("Pore volume (cc)", "pore volume", "", "reported"),
    ],
)
def test_a_column_is_known_by_its_words(words: str, quantity: str, orientation: str, basis: str) -> None:
    (plug,), told = made([words], ["0.5"])
    (found,) = plug.values
    assert (found.quantity, plug.orientation, found.basis) == (quantity, orientation, basis)
    assert not [t for t in told if "not understood" in t]


@pytest.mark.parametrize(
    "words",
    ["", "Formation factor", "Relative permeability to oil", "Kv/Kh ratio", "Calcite %", "Wet bulk density",
     "Pore volume compressibility", "Density"],
)  # fmt: skip
def test_what_is_not_understood_is_named_and_kept_as_entered(words: str) -> None:
    (plug,), told = made([words, "Porosity %"], ["1.5", "20.0"])
    assert [v.quantity for v in plug.values] == ["porosity"]
    assert plug.entered[words or "value 1"] == "1.5"
    assert any("not understood; its 1 values are kept as entered" in t for t in told)


def test_a_second_column_of_the_same_is_kept_as_entered() -> None:
    (plug,), told = made(["Porosity %", "Porosity (repeat) %"], ["20.0", "21.0"])
    assert value(plug, "porosity") == 0.2
    assert plug.entered["Porosity (repeat) %"] == "21.0"
    assert any("a second column of the same" in t for t in told)


# -- units ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("column", "text", "stored", "assumed"),
    [
        (((1402, 1211, 3084, 0), "Porosity"), "18.44722", 0.1844722, False),
        ("Porosity (%)", "18.44722", 0.1844722, False),
        ("Porosity, fraction", "0.25", 0.25, False),
        ("Porosity", "18.44722", 0.1844722, True),
        ("Porosity", "0.25", 0.25, True),
        ("Grain density kg/m3", "2650", 2.65, False),
        ("Grain density", "2650", 2.65, True),
        ("Grain density", "2.65", 2.65, True),
        ("Klinkenberg permeability, darcy", "1.5", 1500.0, False),
        ("Klinkenberg permeability", "1.5", 1.5, True),
        (((1512, 1602, 2031, 0), "Klinkenberg permeability"), "1.5", 1.5, False),
    ],
)
def test_units(column: str | tuple[tuple[int, ...], str], text: str, stored: float, assumed: bool) -> None:
    (plug,), told = made([column], [text])
    (found,) = plug.values
    assert found.value == pytest.approx(stored, rel=1e-15)
    assert (f"{found.quantity}: unit assumed" in found.flags) == assumed
    assert any("unit is not known" in t for t in told) == assumed


def test_percentages_below_one_are_asked_about() -> None:
    _, told = made(["Porosity (%)"], ["0.21"], ["0.19"], ["0.25"])
    assert any("ask whether they are fractions" in t for t in told)


@given(st.decimals("0.001", "99.999", places=5))
def test_a_percentage_is_shifted_without_rounding(percent: object) -> None:
    (plug,), _ = made(["Porosity (%)"], [str(percent)])
    assert value(plug, "porosity") == float(str(percent) + "e-2")


def test_depths_in_feet() -> None:
    (plug,), _ = made(["Porosity (%)"], ["20"], unit="ft")
    assert plug.depth_m == pytest.approx(304.8)


def test_stresses_in_words_and_in_columns() -> None:
    (plug,), _ = made(
        ["Klinkenberg perm. @ 400 psi", "Klinkenberg perm. at 20 MPa", "Porosity %",
         "Net confining stress of porosity (bar)"],
        ["12.0", "10.0", "20.0", "50"],
    )  # fmt: skip
    stresses = {(v.quantity, v.value): v.stress_mpa for v in plug.values}
    assert stresses["klinkenberg permeability", 12.0] == pytest.approx(2.757903)
    assert stresses["klinkenberg permeability", 10.0] == 20.0
    assert stresses["porosity", 0.2] == 5.0


# -- nothing, zero, limits --------------------------------------------------------------------------------


@pytest.mark.parametrize("text", ["-1002.00000", "-999.25", "-9999", "", "-", "n/a", "-123.0"])
def test_what_stands_for_nothing(text: str) -> None:
    (plug,), _ = made(["Porosity (%)", "Klinkenberg permeability mD"], [text, "5.0"])
    assert [v.quantity for v in plug.values] == ["klinkenberg permeability"]


def test_a_negative_number_once_is_no_null_and_not_possible() -> None:
    (first, second), told = made(["Porosity (%)"], ["-0.3"], ["20"])
    assert value(first, "porosity") is None
    assert first.values[0].reason == "-0.3 in the file is not possible"
    assert value(second, "porosity") == 0.2
    assert any("not possible" in t for t in told)


def test_a_permeability_or_density_of_zero_was_not_measured() -> None:
    (plug,), told = made(
        ["Klinkenberg permeability mD", "Porosity (%)", "Grain density g/cc"], ["0.000", "0.0", "2.71"]
    )
    by = {v.quantity: v for v in plug.values}
    assert by["klinkenberg permeability"].value is None
    assert by["klinkenberg permeability"].reason == ZERO
    assert by["porosity"].value == 0.0
    assert any("1 values of zero are taken as not measured" in t for t in told)


def test_zeros_all_along_a_row_were_not_measured() -> None:
    columns = ["Porosity (%)", "Grain density g/cc", "Oil saturation %", "Water saturation %"]
    (plug,), _ = made(columns, ["0.0", "0.0", "0.0", "0.0"])
    assert {v.reason for v in plug.values} == {ZERO}
    (dry,), _ = made(columns, ["20", "2.65", "0.0", "35.0"])
    assert value(dry, "oil saturation") == 0.0


@pytest.mark.parametrize(("text", "limit"), [("<0.01", "below"), (">5000", "above"), ("< 0.01", "below")])
def test_limits(text: str, limit: str) -> None:
    (plug,), _ = made(["Klinkenberg permeability mD"], [text])
    (found,) = plug.values
    assert found.value_limit == limit
    assert found.value == float(text.strip("<> "))
    assert f"klinkenberg permeability {limit} limit" in found.flags


@pytest.mark.parametrize("text", ["****", "NMP", "1,5", "12..3", "1e999", "0x10"])
def test_what_is_no_number_is_named(text: str) -> None:
    (plug,), _ = made(["Klinkenberg permeability mD"], [text])
    assert plug.values[0].value is None
    assert text in plug.values[0].reason
    assert plug.entered["Klinkenberg permeability mD"] == text


def test_doubts() -> None:
    (plug,), _ = made(
        ["Air permeability mD", "Klinkenberg permeability mD", "Porosity %", "Grain density g/cc"],
        ["5.0", "6.0", "60.0", "3.27"],
        words=("Sst.Lt-gry.",),
    )
    by = {v.quantity: v.flags for v in plug.values}
    assert by["klinkenberg permeability"] == ["klinkenberg permeability above gas permeability"]
    assert by["porosity"] == ["porosity outside the usual range"]
    assert by["grain density"] == ["grain density does not fit the described lithology"]


# -- plugs of a sample ------------------------------------------------------------------------------------

BOTH = ["Klinkenberg perm, Hor. mD", "Klinkenberg perm, Vert. mD", "Porosity %"]


def test_a_sample_with_values_of_both_orientations_becomes_two_plugs() -> None:
    plugs, _ = made(BOTH, ["10", "5", "20"])
    assert [(p.name, p.orientation, p.sample, p.depth_m) for p in plugs] == [
        ("1H", "horizontal", "1", 1000.0), ("1V", "vertical", "1", 1000.0),
    ]  # fmt: skip
    assert value(plugs[0], "porosity") == 0.2
    assert [v.quantity for v in plugs[1].values] == ["klinkenberg permeability"]


def test_a_zero_of_the_other_orientation_still_tells_of_its_plug() -> None:
    plugs, _ = made(BOTH, ["10", "0.000", "20"])
    assert [p.name for p in plugs] == ["1H", "1V"]
    assert plugs[1].values[0].reason == ZERO


@pytest.mark.parametrize(
    ("row", "orientation"),
    [(["10", "-1002", "20"], "horizontal"), (["-1002", "5", "20"], "vertical"), (["-1002", "", "20"], "")],
)
def test_a_sample_of_one_orientation_keeps_its_name(row: list[str], orientation: str) -> None:
    (plug,), _ = made(BOTH, row)
    assert (plug.name, plug.orientation) == ("1", orientation)
    assert value(plug, "porosity") == 0.2


def test_names_that_come_back_are_told_apart() -> None:
    plugs, told = made(["Porosity %"], ["20"], ["21"], ["22"], names=("7", "7", ""))
    assert [p.name for p in plugs] == ["7", "7 (2)", "1002"]
    assert any("1 names stand more than once" in t for t in told)
    mixed, _ = made(BOTH, ["10", "5", "20"], ["10", "", "20"], names=("1", "1h"))
    assert [p.name for p in mixed] == ["1H", "1V", "1h (2)"]


def test_an_origin_not_stated() -> None:
    file = SpwlaFile("a.spwla", b"", meanings=[Meaning(4, (), "", "Porosity %")])
    file.samples.append(Sample(10, "1 A", 1.0, "A", values=["20"]))
    (plug,) = plugs_of(file, laboratory="", depth_unit="m", told=lambda _: None)
    assert plug.laboratory == NOT_STATED
    (named,) = plugs_of(file, laboratory="Elsewhere", depth_unit="m", told=lambda _: None)
    assert named.laboratory == "Elsewhere"


@given(st.lists(st.text("0123456789.-<>eE* ", max_size=12), min_size=3, max_size=3))
def test_any_cells_give_plugs(row: list[str]) -> None:
    plugs, _ = made(BOTH, [cell.strip() for cell in row])
    for plug in plugs:
        for found in plug.values:
            assert (found.value is None) == bool(found.reason)
            assert found.value is None or 0.0 <= found.value < 1e300
