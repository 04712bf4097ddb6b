"""Printing how a result came about."""

from __future__ import annotations

from typing import Any

import typer

from corelab.cli.show import significant

#: Longer lists of numbers show their first and last ones.
_MOST = 6
#: Symbols of an estimator that tell a reader nothing about one plug.
_UNSHOWN = {"cov", "group", "refused", "demanded"}


def print_explanation(found: dict[str, Any]) -> None:
    """The value, the formulas with their numbers, the readings, the instruments, the budget."""
    echo = typer.echo
    where = [f"{found['stress [MPa]']:g} MPa"] if found["stress [MPa]"] else []
    where += [found["direction"]] if found["direction"] not in {"", "axial"} else []
    at = f" ({', '.join(where)})" if where else ""
    echo(f"{found['result']} of {found['plug']}, well {found['well']}{at}")
    echo(f"  {_headline(found)}")
    if found["basis"]:
        echo(f"  by {found['basis']}; method {found['method']}, version {found['version']}")
    for flag in found["flags"]:
        echo(f"  flag: {flag}")
    if found["reason"]:
        echo(f"  missing: {found['reason']}")
    if found["calculations"]:
        echo("\nformulas, with their numbers")
    for step in found["calculations"]:
        echo(f"  {step['title']}: {step['equation']}")
        given = [v for v in step["inputs"] if v["symbol"] not in _UNSHOWN and v["value"] is not None]
        echo("    with " + ", ".join(_named(v) for v in given))
        gave = [o for o in step["outputs"] if o["symbol"] not in _UNSHOWN and o["value"] is not None]
        echo("    gives " + ", ".join(_named(o) for o in gave))
        echo(f"    source: {step['source']}")
    if found["readings"]:
        echo("\nreadings, as typed")
    for reading in found["readings"]:
        typed = ", ".join(f"{h} {v}" for h, v in reading["as typed"].items() if h not in {"well", "plug"})
        by = f", {reading['measured by']}" if reading["measured by"] else ""
        echo(f"  #{reading['number']} {reading['kind']}{by}: {typed}")
    if found["instruments"]:
        echo("\ninstruments")
    for stated in found["instruments"]:
        unit = stated["uncertainty unit"]
        echo(
            f"  {stated['instrument']}, {stated['measures']}: repeatability {stated['repeatability']:g} "
            f"{unit}, scale {stated['scale uncertainty']:g} {unit} ({stated['from']})"
        )
    for calibration in found["calibrations"]:
        volumes = ", ".join(f"{k} {v:.4f}" for k, v in calibration.items() if k.endswith("[cm3]"))
        dated = f" of {calibration['date']}" if calibration["date"] else ""
        numbers = calibration["readings"]
        echo(
            f"  calibration in force: {calibration['calibration']}{dated} of {calibration['instrument']} "
            f"({calibration['setup']}), readings #{min(numbers)} to #{max(numbers)}: {volumes}"
        )
    if found["budget"]:
        echo(f"\nbudget of the standard uncertainty, {_with_unit(found['uncertainty'], found['unit'])}")
    for part in found["budget"]:
        many = f" x{part['readings']}" if part["readings"] > 1 else ""
        echo(
            f"  {100 * part['share']:5.1f} %  {significant(part['contribution'], 3):>10}  "
            f"{part['cause']}{many}: {part['kind']}"
        )
    if found["source"]:
        echo(f"\nsource: {found['source']}")
    if found["valid"]:
        echo(f"holds for: {found['valid']}")


def _headline(found: dict[str, Any]) -> str:
    if found["value"] is None:
        return "no value"
    sign = {"below": "< ", "above": "> "}.get(found["limit"], "")
    text = f"{found['symbol']} = {sign}{_with_unit(found['value'], found['unit'])}"
    if found["uncertainty"] is not None:
        text += f", standard uncertainty {_with_unit(found['uncertainty'], found['unit'], 2)}"
        if found["value"]:
            text += f" ({100 * found['uncertainty'] / abs(found['value']):.2g} %)"
    return text


def _with_unit(value: float, unit: str, digits: int = 5) -> str:
    return f"{significant(value, digits)} {unit}".rstrip()


def _named(item: dict[str, Any]) -> str:
    unit = f" {item['unit']}" if item["unit"] not in {"", "1"} else ""
    return f"{item['symbol']} = {_numbers(item['value'])}{unit}"


def _numbers(value: Any) -> str:
    if isinstance(value, list):
        shown = [_numbers(v) for v in value]
        if len(shown) > _MOST:
            shown = [*shown[: _MOST - 2], "…", shown[-1]]
        return "(" + ", ".join(shown) + ")"
    if isinstance(value, float):
        return significant(value, 6)
    return "nothing" if value is None else str(value)
