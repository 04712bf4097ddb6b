"""The page in a real browser: no complaint, brushing, sorting, filtering, paper."""

from __future__ import annotations

import base64
import json
import re
import shutil
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from corelab import open_lab

CHROMIUM, DRIVER = shutil.which("chromium"), shutil.which("chromedriver")
pytestmark = pytest.mark.skipif(
    not (CHROMIUM and DRIVER), reason="chromium and chromedriver are not installed"
)
OPTIONS = (
    "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
    "--disable-background-networking", "--disable-component-update", "--disable-sync",
    "--window-size=1280,900",
)  # fmt: skip


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory, demo_folder: Path) -> Iterator[Any]:
    webdriver = pytest.importorskip("selenium.webdriver")
    folder = tmp_path_factory.mktemp("browser")
    with open_lab(str(folder / "lab.db"), by="Ada") as lab:
        lab.setup()
        lab.load([demo_folder / "bench"])
        lab.match("QB-1", demo_folder / "logs" / "QB-1.las")
        out = lab.write_page("QB-1", folder / "QB-1.html")
    options = webdriver.ChromeOptions()
    for option in (*OPTIONS, f"--user-data-dir={folder / 'profile'}"):
        options.add_argument(option)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    driver = webdriver.Chrome(options=options, service=webdriver.ChromeService(DRIVER))
    driver.get(out.as_uri())
    yield driver
    driver.quit()


def all_of(browser: Any, selector: str) -> list[Any]:
    return list(browser.find_elements("css selector", selector))


def brush(browser: Any, plot: Any, down: int, across: int) -> None:
    from selenium.webdriver.common.action_chains import ActionChains

    browser.execute_script("arguments[0].scrollIntoView({block: 'center'})", plot)
    chain = ActionChains(browser).move_to_element(plot).click_and_hold()
    chain.move_by_offset(across, down).release().perform()


def lit(browser: Any) -> set[str]:
    return {row.get_attribute("data-i") for row in all_of(browser, "#table tr.lit")}


def test_no_complaint_and_no_request(browser: Any) -> None:
    assert browser.get_log("browser") == []
    events = [json.loads(entry["message"])["message"] for entry in browser.get_log("performance")]
    asked = [e["params"] for e in events if e["method"] == "Network.requestWillBeSent"]
    of_page = [a["request"]["url"] for a in asked if a["documentURL"].startswith("file:")]
    assert of_page == [browser.current_url]


def test_it_fits_a_screen_of_1280(browser: Any) -> None:
    width = "return [document.documentElement.scrollWidth, document.documentElement.clientWidth]"
    needed, there = browser.execute_script(width)
    assert needed <= there


def test_a_brush_in_one_plot_lights_the_same_plugs_everywhere(browser: Any) -> None:
    depth, cross = all_of(browser, "svg.plot")
    brush(browser, depth, 120, 60)
    picked = lit(browser)
    assert 0 < len(picked) < len(all_of(browser, "#table tbody tr"))
    on = {p.get_attribute("data-i") for p in cross.find_elements("css selector", ".p.on")}
    assert on
    assert on <= picked
    there = {p.get_attribute("data-i") for p in cross.find_elements("css selector", ".p")}
    assert on == picked & there
    brush(browser, cross, -200, 150)
    second = lit(browser)
    assert second
    assert second != picked
    assert {p.get_attribute("data-i") for p in depth.find_elements("css selector", ".p.on")} == second
    browser.find_element("id", "lit").click()
    shown = [row for row in all_of(browser, "#table tbody tr") if row.is_displayed()]
    assert {row.get_attribute("data-i") for row in shown} == second
    browser.find_element("id", "lit").click()
    from selenium.webdriver.common.action_chains import ActionChains

    ActionChains(browser).move_to_element(depth).click().perform()
    assert lit(browser) == set()
    assert all_of(browser, ".p.off") == []


def test_the_table_sorts_and_filters(browser: Any) -> None:
    heads = all_of(browser, "#table th")
    place = [h.text.split("\n")[0] for h in heads].index("plug")
    browser.execute_script("arguments[0].click()", heads[place])

    def names() -> list[str]:
        return [
            str(row.find_elements("css selector", "td")[place].text)
            for row in all_of(browser, "#table tbody tr")
        ]

    up = names()
    assert up.index("2H") < up.index("10H")
    browser.execute_script("arguments[0].click()", heads[place])
    assert names() == up[::-1]
    browser.find_element("id", "filter").send_keys("cemented")
    shown = [row for row in all_of(browser, "#table tbody tr") if row.is_displayed()]
    assert 0 < len(shown) < len(up)
    assert all("cemented" in row.text for row in shown)


def test_it_prints_on_a_few_pages(browser: Any) -> None:
    made = browser.execute_cdp_cmd("Page.printToPDF", {"preferCSSPageSize": True})
    pages = re.findall(rb"/Type\s*/Page\b", base64.b64decode(made["data"]))
    assert 3 <= len(pages) <= 14
