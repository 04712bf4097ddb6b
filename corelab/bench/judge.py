"""Doubts that need a value's uncertainty: routes that disagree, a grain density foreign to the rock."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from corelab.bench.gather import Tray
from corelab.bench.outcome import Outcome, first_text_by
from corelab.bench.volumes import ROUTE_DIFFERENCE
from corelab.science.lithology import grain_density_range_g_cm3

#: Two values disagree beyond this many standard uncertainties of their difference (about 95 %).
COVERAGE = 2.0


def judge(tray: Tray, outcomes: Sequence[Outcome]) -> None:
    """Flag what the uncertainties let one judge."""
    found = {o.quantity: o for o in outcomes if o.stress_mpa is None}
    difference, porosity = found.get(ROUTE_DIFFERENCE), found.get("porosity")
    if difference is not None and porosity is not None and difference.uncertainty is not None:
        gap, u = np.abs(difference.value.real), difference.uncertainty
        with np.errstate(invalid="ignore"):
            porosity.flag("porosity routes disagree beyond their uncertainty", gap > COVERAGE * u)
    density = found.get("grain density")
    described = tray.readings.get("descriptions")
    if density is not None and described is not None and len(described):
        rock = first_text_by(described.texts["lithology"], described.at, len(tray))
        fits = grain_density_range_g_cm3(rock.astype(str))
        slack = COVERAGE * np.nan_to_num(density.uncertainty) if density.uncertainty is not None else 0.0
        with np.errstate(invalid="ignore"):
            outside = (density.value.real < fits.low_g_cm3 - slack) | (
                density.value.real > fits.high_g_cm3 + slack
            )
        density.flag("grain density does not fit the described lithology", outside)
