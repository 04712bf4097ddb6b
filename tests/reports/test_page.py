"""The partner's page: one file that asks no network, holds what the interval holds, and stays whole."""

from __future__ import annotations

import base64
import hashlib
import json
import re
import time
from collections.abc import Callable, Iterator
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from corelab import open_lab
from corelab.errors import Refused, Usage
from corelab.lab import Lab
from corelab.reports.page import Page, page_html
from corelab.reports.workbook import WellReport


class Read(HTMLParser):
    """What there is in the page: tags with their attributes, texts, scripts."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.texts: list[str] = []
        self.scripts: list[tuple[dict[str, str | None], str]] = []
        self._script: dict[str, str | None] | None = None
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        self._script = dict(attrs) if tag == "script" else None

    def handle_data(self, data: str) -> None:
        if self._script is not None:
            self.scripts.append((self._script, data))
        else:
            self.texts.append(data)

    def handle_endtag(self, tag: str) -> None:
        self._script = None


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory, demo_folder: Path) -> Iterator[Lab]:
    with open_lab(str(tmp_path_factory.mktemp("page") / "lab.db"), by="Ada") as lab:
        lab.setup()
        lab.load([demo_folder / "bench"])
        lab.match("QB-1", demo_folder / "logs" / "QB-1.las")
        yield lab


@pytest.fixture(scope="module")
def page(demo: Lab, tmp_path_factory: pytest.TempPathFactory) -> str:
    out = tmp_path_factory.mktemp("out") / "QB-1.html"
    return demo.write_page("QB-1", out, recipient="Demo Partner North").read_text(encoding="utf-8")


def rows_of(page: str) -> pd.DataFrame:
    (text,) = (body for attrs, body in Read(page).scripts if attrs.get("id") == "data")
    held = json.loads(text)
    return pd.DataFrame(held["rows"], columns=held["columns"])


def test_nothing_is_asked_of_a_network(page: str) -> None:
    read = Read(page)
    for tag, attrs in read.tags:
        assert not {"src", "href", "srcset", "action", "data", "poster"} & set(attrs), (tag, attrs)
    assert not re.search(r"url\((?!#)", page)
    assert "@import" not in page
    (policy,) = (a["content"] for t, a in read.tags if t == "meta" and a.get("http-equiv"))
    assert policy is not None
    assert policy.startswith("default-src 'none'")
    (script,) = (body for attrs, body in read.scripts if not attrs)
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    assert f"script-src 'sha256-{digest}'" in policy  # the only script that may run is the one that is there


def test_it_holds_what_the_interval_holds(page: str, demo: Lab) -> None:
    frame = demo.interval("QB-1")
    held = rows_of(page)
    assert list(held.columns) == list(frame.columns)
    for column in ("porosity [v/v]", "klinkenberg permeability [mD]", "log depth [m]"):
        np.testing.assert_array_equal(held[column].astype(float), frame[column])
    assert held["flags"].tolist() == frame["flags"].tolist()


def test_every_plug_is_drawn_in_each_plot_where_it_has_a_value(page: str, demo: Lab) -> None:
    frame = demo.interval("QB-1")
    plots = re.findall(r'<svg class="plot" data-kind="(\w+)"(.*?)</svg>', page, re.DOTALL)
    assert [kind for kind, _ in plots] == ["depth", "cross"]
    drawn = len(re.findall('class="p"', plots[1][1]))
    both = frame["porosity [v/v]"].notna() & (frame["klinkenberg permeability [mD]"] > 0)
    assert drawn == both.sum()
    columns = ("porosity [v/v]", "klinkenberg permeability [mD]", "oil saturation [v/v]",
               "water saturation [v/v]", "grain density [g/cm3]")  # fmt: skip
    assert len(re.findall('class="p"', plots[0][1])) == sum(int(frame[c].notna().sum()) for c in columns)
    assert "GR log" in plots[0][1]


def test_likely_crushed_plugs_are_shown_as_such(page: str, demo: Lab) -> None:
    likely = int((demo.interval("QB-1")["crush verdict"] == "likely").sum())
    assert likely > 0
    assert f"{likely} percussion plugs are likely crushed" in page
    assert "likely crushed</span>" in page


def test_the_recipient_the_issue_and_the_seal_stand_on_it(page: str) -> None:
    assert "for Demo Partner North" in page
    assert re.search(r"export \d+, issue 1", page)
    assert re.search(r"\d+-[0-9a-f]{64}", page)


def test_a_partner_sees_no_more_than_they_are_entitled_to(demo: Lab, tmp_path: Path) -> None:
    demo.partner_set("Porosity only", wells=["QB-1"], columns=["porosity"], units="ft, %")
    text = demo.write_page("QB-1", tmp_path / "p.html", recipient="porosity only").read_text(encoding="utf-8")
    held = rows_of(text)
    assert "porosity [%]" in held
    assert "depth [ft]" in held
    assert not [c for c in held.columns if "permeability" in c or "saturation" in c or "density" in c]
    assert 'data-kind="cross"' not in text
    shown = " ".join(Read(text).texts)
    assert "k geometric mean" not in shown
    assert "Dykstra" not in shown
    with pytest.raises(Refused, match="not entitled to QB-2"):
        demo.write_page("QB-2", tmp_path / "q.html", recipient="Porosity only")


def test_another_ending_is_refused(demo: Lab, tmp_path: Path) -> None:
    with pytest.raises(Usage, match=r"named \.html"):
        demo.write_page("QB-1", tmp_path / "p.pdf")


HOSTILE = (
    "</script><script>alert(1)</script>",
    "<img src=x onerror=alert(1)>",
    '"><svg onload=alert(1)>',
    "\u2028",
)


def test_hostile_names_stay_text(lab: Lab, write_sheet: Callable[..., Path], tmp_path: Path) -> None:
    name = "".join(HOSTILE)
    quoted = name.replace('"', '""')
    lab.load(
        [
            write_sheet("wells", "well,depth unit", f'"{quoted}",m'),
            write_sheet(
                "plugs", "well,plug,from,depth [m],facies", f'"{quoted}","{quoted}",core,1000,"{quoted}"'
            ),
            write_sheet(
                "grain volume", "well,plug,instrument,grain volume [cm3]", f'"{quoted}","{quoted}",G,45'
            ),
            write_sheet(
                "dimensions", "well,plug,length 1 [mm],diameter 1 [mm]", f'"{quoted}","{quoted}",50,38'
            ),
        ]
    )
    text = lab.write_page(name, tmp_path / "p.html").read_text(encoding="utf-8")
    read = Read(text)
    assert [t for t, _ in read.tags].count("script") == 2
    assert not [t for t, a in read.tags if t == "img" or any(k.startswith("on") for k in a)]
    assert "\u2028" not in "".join(body for _, body in read.scripts)
    assert rows_of(text)["plug"].iloc[0] == lab.interval(name)["plug"].iloc[0]


def test_six_thousand_plugs_make_a_page_of_a_few_megabytes() -> None:
    rng = np.random.default_rng(1)
    n = 6000
    results = pd.DataFrame(
        {
            "well": "W-1",
            "plug": [f"{i}H" for i in range(n)],
            "source": "core",
            "depth [m]": 1000 + 0.3 * np.arange(n),
            "facies": rng.choice(["sand", "silt"], n),
            "porosity [v/v]": rng.uniform(0.05, 0.3, n),
            "klinkenberg permeability [mD]": 10 ** rng.uniform(-2, 3, n),
            "grain density [g/cm3]": rng.normal(2.66, 0.01, n),
            "crush verdict": "",
            "status": "computed",
            "flags": "",
        }
    )
    empty = pd.DataFrame()
    report = WellReport("W-1", {}, empty, empty, results, [], empty, [], [])
    start = time.perf_counter()
    text = page_html(Page(report))
    assert time.perf_counter() - start < 10
    assert len(text) < 8_000_000
    assert len(re.findall('class="p"', text)) == 4 * n
