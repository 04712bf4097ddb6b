"""The README's notebook lines run as they stand, each giving what it says."""

from __future__ import annotations

import ast
import re
import shutil
from pathlib import Path
from typing import Any

import pytest

from corelab.demo import build

ROOT = Path(__file__).resolve().parent.parent


def test_the_notebook_lines_run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (block,) = re.findall(r"```python\n(.*?)```", (ROOT / "README.md").read_text(encoding="utf-8"), re.DOTALL)
    monkeypatch.chdir(tmp_path)
    build(Path("demo-lab"), lambda _: None, lambda _: None)
    shutil.copytree(ROOT / "demo_lab" / "logs", tmp_path / "demo_lab" / "logs")
    names: dict[str, Any] = {}
    given = {}
    for statement in ast.parse(block).body:
        if isinstance(statement, ast.Expr):
            text = ast.unparse(statement)
            given[text.split("(")[0]] = eval(compile(ast.Expression(statement.value), text, "eval"), names)
        else:
            exec(compile(ast.Module([statement], []), "README", "exec"), names)
    assert 0 < len(given["lab.interval"]) < 60
    assert {"porosity [v/v]", "depth [m]"} <= set(given["lab.interval"].columns)
    assert "shoreface sand" in {r["group"] for r in given["lab.summary"]}
    assert {r["model"] for r in given["lab.trend"]} >= {"semilog", "power"}
    assert given["lab.match"].loc[given["lab.match"]["kind"] == "core", "certain"].all()
    assert all(0 < r["crush likelihood [v/v]"] < 1 for r in given["lab.impact"])
    assert "vconcat" in given["lab.charts"].to_dict() or "hconcat" in given["lab.charts"].to_dict()
