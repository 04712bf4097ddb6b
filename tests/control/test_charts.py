"""From checks of standards to doubt about plugs: simulated checks from a stated truth, judged as in a lab."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from corelab.control import charts
from corelab.control.instruments import Calibration
from corelab.errors import NotFound, Refused
from corelab.lab import Lab


def checks(values: list[float], certified: float = 50.0, u: float = 0.05, **cells: object) -> pd.DataFrame:
    """One check a day of one standard on one instrument."""
    days = pd.date_range("2026-01-01", periods=len(values)).strftime("%Y-%m-%d")
    frame = pd.DataFrame({"day": days, "value": values})
    fixed = {"standard_id": 1, "instrument_id": 7, "result": "grain volume", "unit": "cm3", "u_value": u}
    fixed |= {"certified": certified, "u_certified": 0.01, "valid_until": "", "calibrated": ""} | cells
    return frame.assign(**fixed)


def sound(count: int, seed: int = 1) -> list[float]:
    return (50.0 + 0.02 * np.random.default_rng(seed).normal(size=count)).tolist()


def test_the_first_checks_make_the_limits_and_judge_the_later():
    points = charts.judged(checks([*sound(20), 50.2]))
    assert points["good"].tolist() == [True] * 20 + [False]
    assert "beyond the limits" in points["why"].iloc[-1]
    first = charts.judged(checks(sound(20)))
    assert points["upper"].iloc[0] == first["upper"].iloc[0]  # the bad value did not widen them


def test_few_checks_are_judged_by_the_certificate():
    points = charts.judged(checks([50.01, 49.98, 50.02, 51.0]))
    assert points["limits"].iloc[0] == "the certificate and the stated uncertainty"
    assert points["good"].tolist() == [True, True, True, False]
    assert points["sigma"].iloc[0] == pytest.approx(np.hypot(0.05, 0.01))


def test_a_steady_bias_is_seen_though_the_values_agree_among_themselves():
    points = charts.judged(checks([v + 0.3 for v in sound(15)]))
    assert points["limits"].iloc[0] == "the certificate and the stated uncertainty"
    assert not points["good"].any()
    assert "is certified" in points["why"].iloc[0]


def test_a_slow_drift_is_seen_before_it_leaves_the_limits():
    values = np.array(sound(20, 5))
    drifting = values.mean() + 0.007 * np.arange(1, 15)  # a third of the scatter a day
    points = charts.judged(checks([*values, *drifting]))
    bad = points[points["bad"]]
    assert points["good"].iloc[:24].all()
    assert bad["why"].iloc[0] == charts.WORDS[charts.DRIFT]
    assert bad["value"].iloc[0] < bad["upper"].iloc[0]
    assert "3" in points["rules"].iloc[25]  # six rising: worth a look, no alarm


def test_the_moving_average_begins_anew_after_a_gross_fault():
    points = charts.judged(checks([*sound(20), 51.0, *[50.01, 49.99] * 5]))
    assert points.index[points["bad"]].tolist() == [20]
    assert charts.RANGE in points["rules"].iloc[20]


def test_a_shift_of_two_standard_deviations_is_found_in_a_few_checks():
    found = []
    for seed in range(40):
        points = charts.judged(checks([*sound(20, seed), *(v + 0.04 for v in sound(20, 1000 + seed))]))
        bad = points.index[points["bad"] & (points.index >= 20)]
        found.append(bad[0] - 19 if len(bad) else 99)
    assert np.median(found) <= 8


def test_nine_on_one_side_is_an_alarm_only_where_the_side_is_known():
    values = sound(20)
    centre, sigma = (charts.judged(checks(values))[c].iloc[0] for c in ("centre", "sigma"))
    beside = charts.judged(checks([*values, *[centre + 0.1 * sigma] * 9]))
    assert beside["good"].all()
    above = charts.judged(checks([*values, *[centre + 0.5 * sigma, centre + 0.7 * sigma] * 5]))
    assert above.index[above["bad"]].tolist() == [28, 29]
    assert "nine values" in above["why"].iloc[28]


def test_values_too_coarsely_read_make_no_limits_of_their_own():
    values = [50.0] * 12 + [50.01] + [50.0] * 12
    points = charts.judged(checks(values))
    assert points["limits"].iloc[0] == "the certificate and the stated uncertainty"
    assert points["good"].all()


def test_a_calibration_begins_a_new_chart():
    """The porosimeter gives a little more after it was calibrated anew: no alarm, other limits."""
    values = [*sound(20), *(v + 0.03 for v in sound(20, 2))]
    both = ["A-1"] * 20 + ["A-2"] * 20
    assert not charts.judged(checks(values))["good"].all()
    points = charts.judged(checks(values, calibrated=both))
    assert points["good"].all()
    assert points["centre"].iloc[-1] - points["centre"].iloc[0] == pytest.approx(0.03, abs=0.02)
    assert np.isnan(points["moving_range"].iloc[20])


def test_a_certificate_that_ran_out_makes_no_check_at_all():
    points = charts.judged(checks([*sound(3), 51.0], valid_until="2026-01-02"))
    assert points["good"].tolist() == [True, True, False, False]
    assert not points["bad"].any()
    assert "the standard's certificate had run out" in points["why"].iloc[-1]
    assert charts.doubts(points, [], {7: "POR-1"}) == []
    state = charts.states(points, [], {7: "POR-1"}, "2026-02-01").iloc[0]
    assert (state["state"], state["last good check"]) == ("in control", "2026-01-02")


def test_doubt_lasts_from_the_last_good_check_to_the_next():
    points = charts.judged(checks([*sound(20), 50.2, 50.3, 50.0]))
    (doubt,) = charts.doubts(points, [], {7: "POR-1"})
    assert (doubt.after, doubt.before, doubt.words) == ("2026-01-20", "2026-01-23", "POR-1 out of control")
    days = pd.Series(["2026-01-20", "2026-01-21", "2026-01-22", "2026-01-23", ""])
    assert doubt.covers(days).tolist() == [False, True, True, False, True]


def test_doubt_without_a_good_check_after_has_no_end():
    points = charts.judged(checks([*sound(20), 50.2]))
    (doubt,) = charts.doubts(points, [], {7: "POR-1"})
    assert (doubt.after, doubt.before) == ("2026-01-20", "")


def test_a_good_check_of_another_result_does_not_end_a_doubt():
    volume = checks([*sound(20), 50.5])
    density = checks([2.65] * 22, 2.65, 0.01, result="grain density")
    points = charts.judged(pd.concat([volume, density], ignore_index=True))
    (doubt,) = charts.doubts(points, [], {7: "POR-1"})
    assert (doubt.after, doubt.before) == ("2026-01-20", "")
    state = charts.states(points, [], {7: "POR-1"}, "2026-02-01").iloc[0]
    assert state["state"] == "out of control"
    assert (state["last check"], state["in doubt"]) == ("2026-01-22", "after 2026-01-20")
    assert "grain volume on 2026-01-21" in state["why"]
    before = charts.states(points, [], {7: "POR-1"}, "2026-01-20").iloc[0]
    assert (before["state"], before["checks"], before["why"]) == ("in control", 20, "")


def calibration(made_on: str, due_on: str, measures: str = "volume") -> Calibration:
    return Calibration(7, measures, made_on, due_on)


def test_a_calibration_that_ran_out_puts_what_follows_in_doubt():
    points = charts.judged(checks(sound(9)))
    found = charts.doubts(points, [calibration("2025-01-05", "2026-01-05")], {7: "POR-1"})
    assert [(d.after, d.before, d.words) for d in found] == [("2026-01-05", "", "POR-1 calibration overdue")]
    readings = pd.DataFrame(
        {"plug_id": [1, 2, 3], "instrument_id": 7, "day": ["2026-01-05", "2026-01-06", ""]}
    )
    assert charts.doubted(readings, found) == {2: ["POR-1 calibration overdue"]}


def test_a_new_calibration_does_not_excuse_what_was_measured_without_one():
    history = [
        calibration("2025-01-05", "2026-01-05"),
        calibration("2026-01-10", "2027-01-10"),
        calibration("2026-12-01", "2027-12-01"),  # in good time
        calibration("2025-06-01", "2026-06-01", "temperature"),
    ]
    nothing = charts.judged(checks([]))
    found = charts.doubts(nothing, history, {7: "POR-1"})
    assert [(d.after, d.before) for d in found] == [
        ("2026-01-05", "2026-01-10"), ("2027-12-01", ""), ("2026-06-01", "")
    ]  # fmt: skip
    on = {day: charts.states(nothing, history, {7: "POR-1"}, day).iloc[0]["state"] for day in
          ("2025-12-31", "2026-01-07", "2026-03-01", "2026-06-02")}  # fmt: skip
    assert on == {
        "2025-12-31": "not checked", "2026-01-07": "calibration overdue", "2026-03-01": "not checked",
        "2026-06-02": "calibration overdue",
    }  # fmt: skip


def test_sound_instruments_seldom_raise_an_alarm():
    """Simulated: 300 sound instruments, 100 checks each after a baseline of 20.

    One check in 370 (0.0027) may lie beyond the limits, whatever the baseline; all that call for action
    together, one in 170 (0.006). A sample of 30,000 tells 0.001.
    """
    rng = np.random.default_rng(8)
    beyond, bad, count = 0, 0, 0
    for _ in range(300):
        points = charts.judged(checks((50.0 + 0.02 * rng.normal(size=120)).tolist()))
        later = points.iloc[20:]
        beyond += int(((later["value"] > later["upper"]) | (later["value"] < later["lower"])).sum())
        bad += int(later["bad"].sum())
        count += len(later)
    assert 0.001 < beyond / count < 0.004
    assert 0.003 < bad / count < 0.009


def test_instruments_are_compared_on_one_standard():
    """Two instruments apart by 0.2, each with its own scatter: s_L from the means, s_r from the scatter."""
    first, second = checks(sound(30, 3)), checks([v + 0.2 for v in sound(30, 4)], instrument_id=8, u=0.2)
    found = charts.between(charts.judged(pd.concat([first, second], ignore_index=True))).iloc[0]
    assert (found["instruments"], found["checks"]) == (2, 60)
    assert found["repeatability"] == pytest.approx(0.02, rel=0.25)
    assert found["between instruments"] == pytest.approx(0.2 / np.sqrt(2), rel=0.05)
    assert found["reproducibility limit"] == pytest.approx(2.8 * found["reproducibility"])


# -- through a lab ------------------------------------------------------------------------------------------

DAYS = [f"2026-02-{day:02d}" for day in range(1, 21)]


@pytest.fixture
def controlled(any_lab: Lab, write_sheet: Callable[..., Path]) -> Lab:
    """A porosimeter that reports volumes: good until the 12th, half a cm3 off to the 15th, good again."""
    rng = np.random.default_rng(4)

    def read(true: float, day: str) -> str:
        off = 0.5 if "2026-02-12" < day < "2026-02-16" else 0.0
        return f"{true + off + 0.01 * rng.normal():.4f}"

    sheets = [
        write_sheet(
            "instruments",
            "instrument,measures,repeatability,scale uncertainty,uncertainty unit,calibrated on,due on",
            "POR-1,volume,0.01,0.01,cm3,2026-01-01,2027-01-01",
            "CAL-1,length,0.01,0.01,mm,2026-01-01,2026-02-18",
        ),
        write_sheet("standards", "standard,kind", "S-1,check plug"),
        write_sheet(
            "certified values",
            "standard,result,certified value,unit,standard uncertainty",
            "S-1,grain volume,45,mL,0.005",
        ),
        write_sheet("wells", "well,depth unit", "W-1,m"),
        write_sheet(
            "plugs", "well,plug,from,depth [m]", *(f"W-1,{i}H,core,{1000 + i}" for i in range(1, 21))
        ),
        write_sheet(
            "grain volume",
            "well,plug,instrument,grain volume [cm3],measured on,measured by",
            *(f"standards,S-1,POR-1,{read(45.0, day)},{day},Bo" for day in DAYS),
            *(f"W-1,{i}H,POR-1,{read(44.0, day)},{day},Bo" for i, day in enumerate(DAYS, 1)),
        ),
        write_sheet(
            "dimensions",
            "well,plug,length 1 [mm],diameter 1 [mm],caliper,measured on,measured by",
            *(f"W-1,{i}H,50,38,CAL-1,{day},Bo" for i, day in enumerate(DAYS, 1)),
        ),
    ]
    any_lab.load(sheets)
    return any_lab


def test_what_was_measured_since_the_last_good_check_is_flagged_everywhere(controlled: Lab):
    found = controlled.control()
    state = found["instruments"].set_index("instrument")
    assert state.loc["POR-1", "state"] == "in control"
    assert state.loc["POR-1", "last good check"] == "2026-02-20"
    assert "calibration overdue" in state.loc["CAL-1", "state"]
    checks = found["checks"]
    assert checks.loc[~checks["good"].astype(bool), "day"].tolist() == DAYS[12:15]
    frame = controlled.interval("W-1")
    flagged = frame["flags"].str.contains("POR-1 out of control")
    assert frame.loc[flagged, "plug"].tolist() == ["13H", "14H", "15H"]
    overdue = frame["flags"].str.contains("CAL-1 calibration overdue")
    assert frame.loc[overdue, "plug"].tolist() == ["19H", "20H"]


def test_control_blocks_approval_until_a_manager_releases(controlled: Lab):
    for name, role in (("Ada", "manager"), ("Rev", "reviewer")):
        controlled.person_add(name, role)
        controlled.by = "Ada"
    controlled.by = "Rev"
    waits = controlled.review("W-1")
    assert set(waits["plug"].head(4)) >= {"13H", "14H", "15H"}  # with 12H, which stands between both
    assert waits.set_index("plug").loc["14H", "blocked"] == "POR-1 out of control"
    with pytest.raises(Refused, match="POR-1 out of control"):
        controlled.approve("W-1", ["12H", "14H"], "fine")
    assert (controlled.interval("W-1")["status"] == "computed").all()  # neither of them was approved
    with pytest.raises(Refused, match="manager"):
        controlled.release("W-1", ["14H"], "repeated on another instrument")
    controlled.by = "Ada"
    with pytest.raises(Refused, match="control does not block"):
        controlled.release("W-1", ["12H"], "no need")
    controlled.release("W-1", ["14H"], "repeated on another instrument")
    controlled.by = "Rev"
    controlled.approve("W-1", ["12H", "14H"], "fine")
    row = controlled.interval("W-1").set_index("plug").loc["14H"]
    assert row["status"] == "approved"
    assert "released by Ada: repeated on another instrument" in row["flags"]


def test_a_release_does_not_cover_a_later_correction(controlled: Lab, write_sheet: Callable[..., Path]):
    for name, role in (("Ada", "manager"), ("Rev", "reviewer")):
        controlled.person_add(name, role)
        controlled.by = "Ada"
    controlled.release("W-1", ["14H"], "repeated")
    sheet = write_sheet(
        "grain volume",
        "well,plug,instrument,grain volume [cm3],measured on,measured by",
        "W-1,14H,POR-1,43.5,2026-02-14,Bo",
    )
    controlled.load([sheet], reason="misread")
    assert "released" not in controlled.interval("W-1").set_index("plug").loc["14H", "flags"]
    controlled.by = "Rev"
    with pytest.raises(Refused, match="out of control"):
        controlled.approve("W-1", ["14H"], "fine")


def test_an_unknown_instrument_gets_the_nearest(controlled: Lab):
    with pytest.raises(NotFound, match="did you mean 'POR-1'"):
        controlled.control("POR1")


def test_charts_are_drawn_without_a_network(controlled: Lab, tmp_path: Path):
    page = controlled.write_control_charts(tmp_path / "c.html", "POR-1").read_text(encoding="utf-8")
    assert "<script src=" not in page
    assert "grain volume of S-1" in page
    picture = controlled.write_control_charts(tmp_path / "c.png").read_bytes()
    assert picture.startswith(b"\x89PNG")


def test_the_demo_labs_instruments_are_in_control_and_unbiased(lab: Lab, demo_folder: Path):
    """Its check plugs were made from a stated truth without drift: no bias beyond what both allow."""
    lab.load([demo_folder / "bench"])
    found = lab.control()
    assert found["checks"]["good"].all()
    assert (found["charts"]["e_n"].abs() < 1).all()
    truth = pd.read_csv(demo_folder / "truth_standards.csv").set_index("standard")
    porosity = found["charts"][found["charts"]["result"] == "porosity"].set_index("standard")
    assert porosity["mean"].to_dict() == pytest.approx(truth["porosity [v/v]"].to_dict(), abs=0.002)
    assert not lab.interval("QB-1")["flags"].str.contains("out of control|overdue").any()
