"""All formulas by key."""

from __future__ import annotations

from functools import cache
from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from corelab.science.formula import Formula

MODULES = (
    "fluids",
    "volumes",
    "gas_flow",
    "saturation",
    "stress",
    "texture",
    "control_charts",
    "averages",
    "heterogeneity",
    "trends",
    "rock_types",
    "back_transform",
    "impact",
)
"""Modules of `corelab.science` that declare `FORMULAS`; a new one is named here."""


@cache
def formulas() -> dict[str, Formula]:
    """Every formula by its key, in the order of the modules; the modules are imported on the first call.

    Raises
    ------
    ValueError
        If two formulas have the same key.

    Examples
    --------
    >>> formulas()["gas-permeability"].equation
    'k = 2 mu q_b p_b L/(A (p1^2 - p2^2))'
    """
    found: dict[str, Formula] = {}
    for module in MODULES:
        declared: tuple[Formula, ...] = import_module(f"corelab.science.{module}").FORMULAS
        for formula in declared:
            if formula.key in found:
                raise ValueError(f"two formulas have the key '{formula.key}'")
            found[formula.key] = formula
    return found
