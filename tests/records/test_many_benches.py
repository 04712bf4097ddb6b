"""Many benches at once: no reading lost, none doubled, the chain unbroken.

With CORELAB_CAMPAIGN=full 8 processes on SQLite and 20 on PostgreSQL load 10,000 readings between them.
"""

from __future__ import annotations

import subprocess
import sys
import time
from collections import Counter
from collections.abc import Callable
from pathlib import Path

import pytest
import sqlalchemy as sa

from corelab.records import schema

ROOT = Path(__file__).resolve().parents[2]
Write = Callable[..., Path]
Campaign = Callable[[int, int], int]
SHEETS_EACH = 5

BENCH = """
import sys
from corelab import open_lab
sys.stdin.readline()
with open_lab(sys.argv[1], by=sys.argv[2]) as lab:
    for sheet in sys.argv[3:]:
        lab.load([sheet])
"""


@pytest.mark.parametrize("database", ["sqlite", "postgresql"])
def test_processes_that_load_at_once(
    database: str, request: pytest.FixtureRequest, write_sheet: Write, tmp_path: Path, campaign: Campaign
) -> None:
    from corelab import open_lab

    address = request.getfixturevalue(f"{database}_database")
    many = campaign(3, 8) if database == "sqlite" else campaign(4, 20)
    each = campaign(300, 10_000) // many // SHEETS_EACH
    with open_lab(address, by="tester") as lab:
        plugs = [f"W-1,P{n},core,{100 + n * 0.01:.2f}" for n in range(many * 4)]
        lab.load([
            write_sheet("wells", "well,depth unit", "W-1,m"),
            write_sheet("plugs", "well,plug,from,depth [m]", *plugs),
        ])  # fmt: skip
        wanted = Counter[tuple[str, float]]()
        benches = []
        for bench in range(many):
            paths = []
            for part in range(SHEETS_EACH):
                lines = []
                for n in range(each):
                    plug, mass = f"P{(bench * 7 + n) % (many * 4)}", 10 + bench + part / 10 + n / 100_000
                    wanted[plug, mass] += 1
                    repeat = 1 + bench * SHEETS_EACH * each + part * each + n
                    lines.append(f"W-1,{plug},dry,{mass!r},2026-03-01,{repeat}")
                heading = "well,plug,condition,mass [g],measured on,repeat"
                paths.append(write_sheet("masses", heading, *lines, folder=tmp_path / f"{bench}-{part}"))
            command = [sys.executable, "-c", BENCH, address, f"bench {bench}", *map(str, paths)]
            benches.append(
                subprocess.Popen(command, stdin=subprocess.PIPE, stderr=subprocess.PIPE, text=True, cwd=ROOT)
            )
        began = time.perf_counter()
        for process in benches:
            assert process.stdin is not None
            process.stdin.write("go\n")
            process.stdin.flush()
        said = [process.communicate(timeout=900)[1] for process in benches]
        seconds = time.perf_counter() - began
        assert [p.returncode for p in benches] == [0] * many, said
        with lab._reading() as connection:
            table = schema.SHEET_TABLES["masses"]
            found = Counter(
                tuple(row)
                for row in connection.execute(
                    sa.select(schema.plug.c.name, table.c.mass_g).join(
                        schema.plug, schema.plug.c.id == table.c.plug_id
                    )
                )
            )
        assert found == wanted
        assert found.total() == many * SHEETS_EACH * each
        events = lab.history()
        assert events["number"].tolist() == list(range(1, 3 + many * SHEETS_EACH))
        assert Counter(events["person"])["bench 0"] == SHEETS_EACH
        assert lab.verify().faults == []
        print(f"\n{database}: {found.total()} readings by {many} processes in {seconds:.0f} s")
