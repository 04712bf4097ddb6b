"""The command `trend` as a user types it. No published values."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from corelab import open_lab
from corelab.cli import main


@pytest.fixture(scope="module")
def demo_file(tmp_path_factory: pytest.TempPathFactory, sqlite_template: Path, demo_folder: Path) -> Path:
    path = tmp_path_factory.mktemp("demo") / "lab.db"
    path.write_bytes(sqlite_template.read_bytes())
    with open_lab(str(path), by="Tomas Reyl") as lab:
        lab.load([demo_folder / "bench"])
    return path


@pytest.fixture
def run(demo_file: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]):
    def called(*words: str) -> tuple[int, str, str]:
        monkeypatch.setenv("CORELAB_DATABASE", str(demo_file))
        monkeypatch.setenv("CORELAB_BY", "Tomas Reyl")
        monkeypatch.setattr("sys.argv", ["corelab", "trend", *words])
        with pytest.raises(SystemExit) as ended:
            main.run()
        shown = capsys.readouterr()
        return int(ended.value.code or 0), shown.out, shown.err

    return called


def no_constant(name: str) -> float:
    raise AssertionError(f"{name} is no JSON")


def test_json_is_one_array_of_what_the_contract_names(run):
    status, out, err = run("QB-2", "--by", "facies", "--format", "json")
    assert status == 0
    rows = json.loads(out, parse_constant=no_constant)
    assert {r["group"] for r in rows} == {"channel sand", "shoreface sand", "heterolithic"}
    for row in rows:
        assert isinstance(row["parameters"], dict)
        assert isinstance(row["standard errors"], dict)
        assert isinstance(row["r squared"], float)
        assert isinstance(row["residual standard deviation"], float)
        assert isinstance(row["plugs"], int)
    assert "No model for cemented bed: fewer than three plugs." in err


def test_table_tells_equation_band_caveats_and_what_was_left_out(run):
    status, out, err = run("QB-1")
    assert status == 0
    assert out.startswith("all: 75 plugs, porosity ")
    for words in ("lg k = ", "band of ", "factors not applied", "flow units", "likely crushed"):
        assert words in out
    assert "By facies: slopes differ" in err
    assert "Left out: 3 plugs, duplicate of another plug." in err


def test_one_model_and_filters(run):
    status, out, _ = run(
        "QB-1", "--model", "york", "--where", "source = 'core'", "--top", "2450", "--format", "json"
    )
    assert status == 0
    assert [r["model"] for r in json.loads(out)] == ["york"]


def test_rock_types(run):
    status, out, _ = run("QB-1", "--rock-types", "--percentile", "50", "--format", "json")
    assert status == 0
    rows = json.loads(out, parse_constant=no_constant)
    assert len(rows) == 75
    assert rows[0]["pittman r50 [um]"] > 0
    status, out, _ = run("QB-1", "--rock-types")
    assert status == 0
    assert "flow zone indicator" in out


@pytest.mark.parametrize(
    ("words", "status", "told"),
    [
        (("QB-1", "--model", "yorc"), 2, "did you mean 'york'?"),
        (("QB-1", "--by", "colour"), 2, "--by is one of facies"),
        (("QB-1", "--format", "csv"), 2, "--format is one of table, json"),
        (("QB-1", "--rock-types", "--by", "facies"), 2, "leave --by and --model out"),
        (("QB-9",), 1, "There is no well 'QB-9'; did you mean"),
        (("QB-1", "--where", "plug = '2H'"), 1, "left out: 1 no permeability"),
    ],
)
def test_wrong_requests_end_with_a_sentence(run, words, status, told):
    ended, out, err = run(*words)
    assert ended == status
    assert told in err
    assert not out
    assert "Traceback" not in err
