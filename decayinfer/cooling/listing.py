"""Cooling scenarios as rows of text."""

import csv
import io
from collections.abc import Iterable

from decayinfer.cooling.scenario import Scenario

__all__ = ["CSV_HEADER", "HEADER", "card", "listing", "to_csv"]

_PHYSICS = ("eos", "superfluidity", "envelope", "direct_urca")
_ERRORS = ("temperature", "slope")

#: Heads of the table that `listing` fills.
HEADER = ("name", "eos", "superfluidity", "envelope", "direct Urca", "set", "max error T", "max error slope")
#: Columns of `to_csv`; errors are fractions, of T_b and absolute of d ln T_b/d ln t, nan where nothing was fitted.
CSV_HEADER = ("name", *_PHYSICS, "max_error_T", "max_error_slope")


def listing(scenarios: Iterable[Scenario]) -> list[tuple[str, ...]]:
    """Return a row of text for each scenario, under `HEADER`."""
    return [(s.name, *_physics(s), _set(s), _percent(s), _slope(s)) for s in scenarios]


def to_csv(scenarios: Iterable[Scenario]) -> str:
    """Return a CSV table of scenarios, with its head line and without the last line end."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(CSV_HEADER)
    for s in scenarios:
        errors = (f"{s.fit_error.get(key, float('nan')):.6g}" for key in _ERRORS)
        writer.writerow((s.name, *_physics(s), *errors))
    return out.getvalue().rstrip("\n")


def card(scenario: Scenario) -> list[str]:
    """Return everything a scenario says of itself, line by line."""
    basis = "provisional: built on scalings" if scenario.provisional else "computed cooling curves"
    lines = [f"{scenario.name}: {scenario.title}", scenario.description.strip()]
    lines += [f"basis: {basis}", f"set: {_set(scenario)}", f"weight: {scenario.weight:g}"]
    lines += [f"{key.replace('_', ' ')}: {value}" for key, value in scenario.properties.items()]
    for key, value in scenario.fit_error.items():
        size = f"{value:.2g}" if key.startswith("slope") else f"{100 * value:.2g} %"
        lines.append(f"largest fit error in {key.replace('_', ' ')}: {size}")
    return lines + [f"source: {source}" for source in scenario.sources]


def _physics(scenario: Scenario) -> tuple[str, ...]:
    return tuple(scenario.properties.get(key, "") for key in _PHYSICS)


def _set(scenario: Scenario) -> str:
    if scenario.provisional:
        return "provisional"
    return "standard" if scenario.standard else "by name"


def _percent(scenario: Scenario) -> str:
    return f"{100 * scenario.fit_error['temperature']:.2f} %" if "temperature" in scenario.fit_error else "-"


def _slope(scenario: Scenario) -> str:
    return f"{scenario.fit_error['slope']:.3f}" if "slope" in scenario.fit_error else "-"
