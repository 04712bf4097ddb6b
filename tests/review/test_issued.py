"""Files that left the laboratory: kept byte for byte, numbered, told apart from altered ones."""

from __future__ import annotations

import hashlib
from collections.abc import Callable
from pathlib import Path

import pandas as pd
import pytest
import sqlalchemy as sa

from corelab.errors import NotFound, Unavailable
from corelab.lab import Lab
from corelab.records import schema
from corelab.review.issued import frame_of

Correct = Callable[..., Path]


def test_what_was_issued_is_written_again_the_same_whatever_came_after(
    any_staffed: Lab, tmp_path: Path, correct: Correct
) -> None:
    lab = any_staffed
    lab.approve("QB-2", ["1H"], "good")
    made = {
        1: lab.write_csv("QB-2", tmp_path / "a.csv", recipient="A partner", where="porosity > 0.1", unit="m"),
        2: lab.write_workbook("QB-2", tmp_path / "a.xlsx", recipient="A partner"),
        3: lab.write_parquet("QB-2", tmp_path / "a.parquet", recipient="A partner"),
    }
    before = {number: path.read_bytes() for number, path in made.items()}
    shown = lab.interval("QB-2", where="porosity > 0.1", unit="m")
    lab.by = "Tor Vale"
    lab.load([correct(tmp_path)], reason="misread")
    lab.by = "Mara Quist"
    lab.revoke("QB-2", ["1H"], "doubt")
    lab.setting("laboratory name", "Another name")
    lab.setting("depth unit", "m")
    for number, content in before.items():
        again = lab.export_again(number, tmp_path / f"again {number}")
        assert again.read_bytes() == content
        assert lab.export_check(again)["export"].tolist() == [number]
    with lab._reading() as connection:
        kept = connection.execute(sa.select(schema.export).where(schema.export.c.id == 1)).mappings().one()
    assert kept["content_digest"] == hashlib.sha256(before[1]).hexdigest()
    pd.testing.assert_frame_equal(frame_of(kept["shown"]).astype(shown.dtypes), shown, check_exact=True)
    assert lab.verify().faults == []


def test_each_issue_is_counted_by_well_kind_and_recipient(staffed: Lab, tmp_path: Path) -> None:
    staffed.write_csv("QB-2", tmp_path / "a.csv", recipient="A partner", reason="asked for")
    staffed.write_csv("qb-2", tmp_path / "b.csv", recipient=" a PARTNER")
    staffed.write_csv("QB-2", tmp_path / "c.csv", recipient="Another")
    staffed.write_workbook("QB-2", tmp_path / "d.xlsx", recipient="A partner")
    staffed.write_csv("QB-2", tmp_path / "e.csv")
    staffed.write_csv("QB-2", tmp_path / "f.csv")
    listed = staffed.export_list("QB-2")
    assert listed["export"].tolist() == [1, 2, 3, 4, 5, 6]
    assert listed["issue"].tolist() == [1, 2, 1, 1, 1, 2]
    assert listed["file"].tolist() == ["a.csv", "b.csv", "c.csv", "d.xlsx", "e.csv", "f.csv"]
    assert listed["reason"].tolist()[0] == "asked for"
    assert set(listed["person"]) == {"Runa Holt"}
    assert staffed.export_list().equals(listed)
    told = staffed.history("QB-2")["what"].tolist()
    assert "issued b.csv (export 2, issue 2) to  a PARTNER" in told


def test_a_second_issue_says_what_it_replaces(staffed: Lab, tmp_path: Path) -> None:
    import openpyxl

    words = []
    for name in ("a.xlsx", "b.xlsx"):
        path = staffed.write_workbook("QB-2", tmp_path / name, recipient="A partner")
        tabs = openpyxl.load_workbook(path).worksheets
        words.append(
            " ".join(str(c.value) for tab in tabs for row in tab.iter_rows() for c in row if c.value)
        )
    assert "export 1, issue 1" in words[0]
    assert "replaces" not in words[0]
    assert "export 2, issue 2; replaces export 1 of 20" in words[1]


def test_an_altered_file_is_told_from_the_one_issued(staffed: Lab, tmp_path: Path) -> None:
    path = staffed.write_csv("QB-2", tmp_path / "a.csv", recipient="A partner")
    content = path.read_bytes()
    for altered in (content + b"\n", content[:-1], content.replace(b"0.1", b"0.2", 1), b""):
        (tmp_path / "other.csv").write_bytes(altered)
        assert staffed.export_check(tmp_path / "other.csv").empty
    (tmp_path / "renamed.txt").write_bytes(content)
    assert staffed.export_check(tmp_path / "renamed.txt")["file"].tolist() == ["a.csv"]


def test_what_is_not_there_is_said(staffed: Lab, tmp_path: Path) -> None:
    with pytest.raises(NotFound, match="There is no export 7"):
        staffed.export_again(7, tmp_path / "a.csv")
    with pytest.raises(NotFound, match="cannot be read"):
        staffed.export_check(tmp_path / "nothing.csv")
    with pytest.raises(NotFound):
        staffed.export_list("QB-9")
    seal = staffed.seal()
    with pytest.raises(Unavailable, match="There is no folder"):
        staffed.write_csv("QB-2", tmp_path / "nowhere" / "a.csv")
    (tmp_path / "taken").mkdir()
    with pytest.raises(Unavailable, match="cannot be written"):
        staffed.write_csv("QB-2", tmp_path / "taken")
    assert list(tmp_path.glob(".*")) == []
    assert staffed.verify(seal).faults == []


def test_a_refused_issue_leaves_no_file(staffed: Lab, tmp_path: Path) -> None:
    seal = staffed.seal()
    with pytest.raises(NotFound):
        staffed.write_csv("QB-9", tmp_path / "a.csv")
    assert staffed.seal() == seal
    assert not list(tmp_path.glob("*a.csv*"))
