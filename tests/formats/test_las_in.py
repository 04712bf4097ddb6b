"""Logs in: each version of the standard, the ways files are odd, and what is no log.

Sources: Canadian Well Logging Society, LAS 2.0 (update of January 2014) and LAS 3.0 (structure of sections).
"""

from __future__ import annotations

from pathlib import Path

import lasio
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import CorelabError, Refused, Unavailable
from corelab.formats import las_in
from corelab.formats.las_in import quantity, read_las

LAS2 = """~Version
VERS. 2.0 : version
WRAP. NO : one line
~Well
STRT.{u} 100.0 : start
STOP.{u} 101.0 : stop
STEP.{u} 0.5 : step
NULL. -999.25 : absent
WELL. Qubrel 7 : well
~Curve
DEPT.{u} : depth
GR.GAPI : gamma ray
RHOB.K/M3 : bulk density
~ASCII
100.0 60.5 2450
100.5 -999.25 2410
101.0 75.0 2390
"""


@pytest.fixture
def file(tmp_path: Path):
    def write(text: str | bytes, name: str = "log.las") -> Path:
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return write


@pytest.mark.parametrize(("unit", "metre"), [("M", 1.0), ("FT", 0.3048), ("F", 0.3048), ("m", 1.0)])
def test_version_2(file, unit: str, metre: float):
    las = read_las(file(LAS2.replace("{u}", unit)))
    assert (las.version, las.well) == ("2.0", "Qubrel 7")
    assert las.depth_m == pytest.approx(np.array([100, 100.5, 101]) * metre)
    gamma, density = las.curves
    assert (gamma.mnemonic, gamma.unit, gamma.quantity) == ("GR", "GAPI", "gamma")
    assert density.quantity == "density"
    assert np.isnan(gamma.values[1])
    assert gamma.values[[0, 2]].tolist() == [60.5, 75.0]


def test_version_1_2_and_wrapped(file):
    text = LAS2.replace("{u}", "M").replace("VERS. 2.0", "VERS. 1.2").replace("WRAP. NO", "WRAP. YES")
    head, rows = text.split("~ASCII\n")
    wrapped = "".join("\n".join(line.split(" ", 1)) + "\n" for line in rows.splitlines())
    las = read_las(file(f"{head}~ASCII\n{wrapped}"))
    assert las.version == "1.2"
    assert las.curves[1].values.tolist() == [2450, 2410, 2390]


@pytest.mark.parametrize(("mark", "sign"), [("COMMA", ","), ("TAB", "\t"), ("SPACE", " ")])
def test_version_3_with_core_data_beside(file, mark: str, sign: str):
    text = f"""~Version
VERS. 3.0 : version
WRAP. NO : one line
DLM. {mark} : delimiter
~Well
STRT.M 100.0 : start
STOP.M 101.0 : stop
STEP.M 0.5 : step
NULL. -999.25 : absent
WELL. Qubrel 7 : well
~Core_Definition
CORT.M : top {{F}}
~Core_Data | Core_Definition
100.0
~Log_Definition
DEPT.M : depth {{F}}
GR.GAPI : gamma ray {{F}}
~Log_Data | Log_Definition
100.0{sign}60.5
100.5{sign}-999.25
101.0{sign}75.0
"""
    las = read_las(file(text))
    assert las.depth_m.tolist() == [100, 100.5, 101]
    assert las.curves[0].values[[0, 2]].tolist() == [60.5, 75.0]
    assert np.isnan(las.curves[0].values[1])
    assert any("core_data" in notice for notice in las.notices)


def test_what_lasio_writes_reads_back(tmp_path: Path):
    made = lasio.LASFile()
    depth = np.arange(2000, 2010, 0.1524)
    made.append_curve("DEPT", depth, unit="m")
    made.append_curve("GR", np.linspace(20, 120, len(depth)), unit="gAPI")
    made.append_curve("GR", np.linspace(30, 130, len(depth)), unit="gAPI")
    with (tmp_path / "out.las").open("w") as stream:
        made.write(stream, version=2.0, fmt="%.8f")
    las = read_las(tmp_path / "out.las")
    assert las.depth_m == pytest.approx(depth, abs=1e-8)
    assert [c.mnemonic for c in las.curves] == ["GR", "GR:2"]
    assert any("several curves GR" in n for n in las.notices)


def test_depths_that_fall_are_turned_and_texts_passed_over(file):
    text = LAS2.replace("{u}", "M").replace("RHOB.K/M3 : bulk density", "LITH. : lithology")
    head, _ = text.split("~ASCII\n")
    las = read_las(file(f"{head}~ASCII\n101.0 75 sand\n100.5 70 shale\n100.0 60 sand\n"))
    assert las.depth_m.tolist() == [100, 100.5, 101]
    assert las.curves[0].values.tolist() == [60, 70, 75]
    assert [c.mnemonic for c in las.curves] == ["GR"]
    assert any("LITH holds texts" in n for n in las.notices)


@pytest.mark.parametrize(
    ("mnemonic", "unit", "description", "what"),
    [
        ("GR", "gAPI", "", "gamma"),
        ("SGR", "API", "", "gamma"),
        ("X12", "GAPI", "Gamma Ray", "gamma"),
        ("RHOB", "G/C3", "", "density"),
        ("DRHO", "G/C3", "Bulk Density Correction", "density correction"),
        ("NPHI", "V/V", "", "neutron porosity"),
        ("PHIT", "%", "", "porosity"),
        ("CALI", "IN", "", "caliper"),
        ("DEPTH2", "M", "", ""),
        ("GR", "OHMM", "", ""),
    ],
)
def test_curves_are_known_by_name_unit_and_words(mnemonic: str, unit: str, description: str, what: str):
    assert quantity(mnemonic, unit, description) == what


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("Dear partner, here is the log.", "no section ~Version"),
        (b"\x00\x01\x02" * 100, "binary"),
        (LAS2.replace("{u}", "FURLONG"), "depths in"),
        (LAS2.replace(".{u}", "."), "depths without a unit"),
        (LAS2.replace("{u}", "M").split("~ASCII")[0], "log data"),
        ("~Version\nVERS. 3.0 :\nWRAP. NO :\n~Well\nSTRT.M 1 :\n", "Log_Definition"),
    ],
)
def test_what_is_no_log_is_refused_in_words(file, text: str | bytes, said: str):
    with pytest.raises(Refused) as refusal:
        read_las(file(text))
    assert said in str(refusal.value)
    assert "log.las" in str(refusal.value)


def test_a_missing_or_huge_file_is_named(tmp_path: Path, file, monkeypatch: pytest.MonkeyPatch):
    with pytest.raises(Unavailable, match="cannot be read"):
        read_las(tmp_path / "none.las")
    monkeypatch.setattr(las_in, "LARGEST_BYTES", 10)
    with pytest.raises(Unavailable, match="more than a log"):
        read_las(file(LAS2.replace("{u}", "M")))


def test_a_path_in_the_text_is_not_followed(file, tmp_path: Path):
    """The library would open what looks like a file or an address: it is given text only."""
    secret = tmp_path / "secret.las"
    secret.write_text(LAS2.replace("{u}", "M"))
    for text in (str(secret), "http://127.0.0.1:1/log.las"):
        with pytest.raises(Refused):
            read_las(file(text))


@settings(max_examples=150, deadline=5000)
@given(st.data())
def test_a_spoilt_file_is_read_or_refused_and_nothing_else(tmp_path_factory, data):
    content = bytearray(LAS2.replace("{u}", "M").encode())
    for _ in range(data.draw(st.integers(1, 6))):
        place = data.draw(st.integers(0, len(content) - 1))
        how = data.draw(st.sampled_from(["put", "cut", "set"]))
        if how == "put":
            content[place:place] = data.draw(st.binary(min_size=1, max_size=8))
        elif how == "cut":
            del content[place : place + data.draw(st.integers(1, 30))]
        else:
            content[place] = data.draw(st.integers(0, 255))
        if not content:
            break
    path = tmp_path_factory.mktemp("spoilt") / "log.las"
    path.write_bytes(bytes(content))
    try:
        las = read_las(path)
    except CorelabError:
        return
    assert len(las.depth_m) == len(las.curves[0].values)
