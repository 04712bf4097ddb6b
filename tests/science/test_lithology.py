"""Grain-density ranges of described rocks, against the minerals' handbook densities.

Sources: densities of minerals as in handbooks (from memory), partly checked by the unit cell, Z M/(N_A V)
with cell volumes from memory.
"""

from __future__ import annotations

import doctest

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from corelab.errors import Impossible
from corelab.science import lithology
from corelab.science.lithology import MARGIN_G_CM3, MINERALS, grain_density_range_g_cm3


def test_the_examples_run():
    assert doctest.testmod(lithology).attempted > 0
    assert doctest.testmod(lithology).failed == 0


@pytest.mark.parametrize(
    ("mineral", "density"),
    # from the unit cell (made)
    [
        ("quartz", 2.649),
        ("calcite", 2.711),
        ("dolomite", 2.868),
        ("siderite", 3.937),
        ("anhydrite", 2.964),
        ("halite", 2.164),
        ("pyrite", 5.011),
        ("barite", 4.479),
        ("kaolinite", 2.599),
    ],
)
def test_densities_agree_with_the_unit_cell(mineral, density):
    found = MINERALS[mineral]
    assert found.low_g_cm3 == found.high_g_cm3 == pytest.approx(density, abs=0.0051)
    assert "unit cell" in found.source


def test_every_mineral_has_a_source_and_a_range():
    for mineral in MINERALS.values():
        assert 2.0 < mineral.low_g_cm3 <= mineral.high_g_cm3 < 5.2
        assert "from memory" in mineral.source


@pytest.mark.parametrize(
    ("text", "density", "inside"),
    [
        ("sandstone", 2.65, True),
        ("Sandstones, grey", 2.65, True),
        ("sandstone", 2.87, False),
        ("sandstone, pyritic", 2.87, True),
        ("limestone", 2.71, True),
        ("limestone", 2.65, False),
        ("limestone, dolomitic", 2.78, True),
        ("limestone, dolomitic", 2.87, False),
        ("dolomite", 2.87, True),
        ("Dol, calcareous", 2.80, True),
        ("claystone", 2.65, True),
        ("claystone", 2.48, False),
        ("anhydrite", 2.96, True),
        ("salt", 2.165, True),
        ("sst", 4.4, False),  # a grain volume read too small
    ],
)
def test_what_a_description_allows(text, density, inside):
    found = grain_density_range_g_cm3(text)
    assert bool(found.low_g_cm3 <= density <= found.high_g_cm3) is inside


def test_unknown_words_give_no_range():
    texts = ["", "grey", "calcareous", "volcanic tuff"]
    found = grain_density_range_g_cm3(texts)
    assert np.isnan(found.low_g_cm3).all()
    assert np.isnan(found.high_g_cm3).all()
    assert found.low_g_cm3.shape == (4,)


def test_shapes_margin_and_what_is_refused():
    found = grain_density_range_g_cm3([["limestone", ""], ["salt", "chalk"]], margin_g_cm3=0.0)
    assert found.low_g_cm3[0, 0] == found.high_g_cm3[0, 0] == found.low_g_cm3[1, 1] == 2.71
    assert np.isnan(found.low_g_cm3[0, 1])
    assert grain_density_range_g_cm3("chalk").high_g_cm3 == pytest.approx(2.71 + MARGIN_G_CM3)
    assert grain_density_range_g_cm3([]).low_g_cm3.shape == (0,)
    with pytest.raises(Impossible, match="margin_g_cm3"):
        grain_density_range_g_cm3("sandstone", margin_g_cm3=-1.0)


WORDS = st.sampled_from(["sandstone", "limestone", "dolomitic", "pyritic", "argillaceous", "grey", "salty"])


@given(st.lists(WORDS, max_size=4), WORDS)
@settings(max_examples=60, deadline=None)
def test_law_a_further_word_never_narrows(words, further):
    before = grain_density_range_g_cm3(", ".join(["shale", *words]))
    after = grain_density_range_g_cm3(", ".join(["shale", *words, further]))
    assert after.low_g_cm3 <= before.low_g_cm3 + 1e-12
    assert after.high_g_cm3 >= before.high_g_cm3 - 1e-12
