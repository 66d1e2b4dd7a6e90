"""A cooling scenario from the user's own table of temperature against age and mass."""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from astropy import units as u
from astropy.table import Table
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import PchipInterpolator

from decayinfer.cooling import form
from decayinfer.cooling.eos import EquationOfState, get_eos
from decayinfer.cooling.fitting import LN_MEASURED, YOUNGEST, Fit, Target, fit_form
from decayinfer.cooling.gradients import Grid
from decayinfer.cooling.registry import ALL, register_scenario, scenario_names
from decayinfer.cooling.scenario import Scenario
from decayinfer.cooling.structure_fit import fit_structure
from decayinfer.errors import InputError
from decayinfer.physics.structure import redshift_factor

__all__ = ["register_table", "scenario_from_table"]

type Array = NDArray[np.float64]
type Curves = Mapping[float, tuple[ArrayLike, ArrayLike]]

_UNITS = {"age": u.yr, "mass": u.M_sun, "temperature": u.K}
_UNSTATED = ("superfluidity", "envelope", "direct_urca")
_LEAST_AGES, _LEAST_MASSES = 10, 3
_WIDEST_AGE_GAP, _WIDEST_MASS_GAP = 0.5, 0.35  # dex, M_sun
_GOOD = 0.01  # error of temperature at which the form with few terms will do
_GRID = Grid(np.linspace(*form.MASS_RANGE, 21), np.geomspace(300.0, 1e7, 121))


@dataclass(frozen=True, eq=False)
class _Rows:
    """A table that has been read: ages [yr], masses [M_sun], T_b [K], and what to call it in messages."""

    label: str
    age: Array
    mass: Array
    temperature: Array

    def curve(self, mass: float) -> tuple[NDArray[np.int_], Array, Array]:
        """Row numbers (from 1), ages and temperatures of one mass, by age."""
        rows = np.flatnonzero(self.mass == mass)
        rows = rows[np.argsort(self.age[rows], kind="stable")]
        return rows + 1, self.age[rows], self.temperature[rows]


def scenario_from_table(
    source: str | Path | Table | Mapping[str, ArrayLike] | Curves,
    *,
    name: str,
    eos: str | EquationOfState = "BSk24",
    columns: Mapping[str, str] | None = None,
    redshifted: bool = False,
    sources: tuple[str, ...] = ("user's table",),
    largest_error: float = 0.05,
    starts: int = 20,
) -> Scenario:
    """Fit the closed form to a table of (age, mass, T_b).

    Parameters
    ----------
    source : path, astropy Table, mapping of columns, or mapping of mass to (age, temperature)
        Columns ``age`` [yr], ``mass`` [M_sun] and ``temperature`` [K], the local temperature at the base of
        the envelope; units that a table carries are converted. A DataFrame passes as a mapping of columns.
    name : str
        Name of the scenario.
    eos : str or EquationOfState
        Equation of state that gives radius and moment of inertia.
    columns : mapping of str to str, optional
        The table's own names, such as ``{"age": "t"}``.
    redshifted : bool
        Whether the temperatures are those seen from far away, T e^Phi.
    sources : tuple of str
        Where the curves come from.
    largest_error : float
        Largest error of T_b, as a fraction, above which the fit is refused.
    starts : int
        Random starts of the fit.

    Returns
    -------
    Scenario
        Not registered yet: hand it to `registry.register_scenario`. ``fit_error["temperature"]`` is the
        largest error at the rows of the table from 1e3 to 1e7 yr, 1 to 2 M_sun and T_b >= 3e6 K.

    Raises
    ------
    InputError
        If a column is missing, a value is unusable, a curve does not fall with age, the table is too sparse,
        or the fit is worse than ``largest_error``; the message says which row, which rule and the remedy.
    """
    rows = _read(source, columns or {})
    star_law = get_eos(eos) if isinstance(eos, str) else eos
    ln_radius, ln_inertia, structure_error = fit_structure(star_law)
    _check_values(rows)
    if redshifted:
        radius = np.exp(form.chebyshev(ln_radius, rows.mass))
        local = rows.temperature / redshift_factor(rows.mass, radius)
        rows = _Rows(rows.label, rows.age, rows.mass, local)
    _check_shape(rows)
    target = _target(rows)
    error, fit, where = _attempt(rows, target, False, starts)
    if error > _GOOD:  # few terms do not do: take more, if they help
        error, fit, where = min((error, fit, where), _attempt(rows, target, True, starts), key=lambda a: a[0])
    if error > largest_error:
        raise InputError(
            f"{rows.label}: the closed form misses this table by {error:.1%} in temperature, more than "
            f"{largest_error:.1%}; worst {where}. Check that row for a slip or a sudden drop (a sharp onset "
            "in mass cannot be followed), or raise largest_error if that is good enough"
        )
    return Scenario(
        name=name,
        title=f"{name}: user's cooling table",
        description=f"Fitted to {rows.age.size} rows of {rows.label}; radius and inertia of {star_law.name}.",
        sources=(*sources, star_law.source),
        provisional=False,
        properties={"eos": star_law.name} | dict.fromkeys(_UNSTATED, "user's table"),
        fit_error={"temperature": error} | structure_error,
        table=fit.table,
        scalars=fit.scalars,
        ln_radius=ln_radius,
        ln_inertia=ln_inertia,
    )


def register_table(path: str | Path) -> Scenario:
    """Fit a table on disk and register it as a scenario of this process, named after the file.

    Parameters
    ----------
    path : path
        A table as `scenario_from_table` reads it; the star is that of its default equation of state.

    Raises
    ------
    InputError
        If the table cannot be used, or a scenario has its name already.
    """
    name = re.sub(r"[^A-Za-z0-9]+", "-", Path(path).stem).strip("-")
    if name in (*scenario_names(), ALL, ""):
        raise InputError(
            f"{Path(path).name}: its scenario would be called {name!r}, which is taken; rename the file"
        )
    scenario = scenario_from_table(path, name=name)
    register_scenario(scenario)
    return scenario


def _read(source: Any, columns: Mapping[str, str]) -> _Rows:
    label = Path(source).name if isinstance(source, str | Path) else "cooling table"
    if isinstance(source, Mapping) and source and all(isinstance(key, float | int) for key in source):
        source = _stacked(source)
    try:
        table = Table.read(source) if isinstance(source, str | Path) else source
        found = list(table.colnames if isinstance(table, Table) else table.keys())
    except (OSError, ValueError, TypeError, AttributeError) as error:
        raise InputError(f"{label}: cannot be read as a table: {error}") from error
    values = {}
    for key, unit in _UNITS.items():
        column = columns.get(key, key)
        if column not in found:
            hint = f"name yours with columns={{{key!r}: ...}}"
            missing = f"no column {column!r} for {key} [{unit}]; it has {', '.join(found)}"
            raise InputError(f"{label}: {missing}; {hint}")
        values[key] = _numbers(table[column], unit, label, column)
    if len({array.shape for array in values.values()}) != 1:
        raise InputError(
            f"{label}: age, mass and temperature differ in length; give one value of each per row"
        )
    return _Rows(label, **values)


def _stacked(curves: Curves) -> dict[str, Array]:
    """Columns from several curves."""
    parts = [
        (float(m), np.atleast_1d(np.asarray(age, float)), np.atleast_1d(np.asarray(temperature, float)))
        for m, (age, temperature) in curves.items()
    ]
    for m, age, temperature in parts:
        if age.shape != temperature.shape:
            raise InputError(
                f"curve of {m} M_sun: {age.size} ages but {temperature.size} temperatures; pair them"
            )
    return {
        "age": np.concatenate([age for _, age, _ in parts]),
        "mass": np.concatenate([np.full(age.size, m) for m, age, _ in parts]),
        "temperature": np.concatenate([temperature for *_, temperature in parts]),
    }


def _numbers(column: Any, unit: u.UnitBase, label: str, name: str) -> Array:
    try:
        if getattr(column, "unit", None) is not None:
            column = u.Quantity(column).to(unit).value
        return np.atleast_1d(np.ma.filled(np.ma.asarray(column, dtype=float), np.nan))
    except (ValueError, TypeError, u.UnitConversionError) as error:
        raise InputError(f"{label}, column {name}: cannot be read as numbers in {unit}: {error}") from error


def _check_values(rows: _Rows) -> None:
    for key in ("age", "mass", "temperature"):
        values = getattr(rows, key)
        bad = np.flatnonzero(~(np.isfinite(values) & (values > 0)))
        if bad.size:
            raise InputError(
                f"{rows.label}, row {bad[0] + 1}, column {key}: {values[bad[0]]} is not a positive number; "
                "correct or remove the row"
            )


def _check_shape(rows: _Rows) -> None:
    """Refuse curves that do not fall, and tables with too little in them."""
    masses = np.unique(rows.mass)
    for mass in masses:
        number, age, temperature = rows.curve(mass)
        rising = np.flatnonzero((np.diff(temperature) >= 0) | (np.diff(age) <= 0))
        if rising.size:
            i = rising[0]
            raise InputError(
                f"{rows.label}, rows {number[i]} and {number[i + 1]}: temperature must fall as age grows; "
                f"at {mass:g} M_sun it goes from {temperature[i]:.4g} K at {age[i]:.4g} yr to "
                f"{temperature[i + 1]:.4g} K at {age[i + 1]:.4g} yr; only a monotone history can be fitted"
            )
        _check_ages(rows.label, mass, age, temperature)
    sparse = f"{rows.label}: too few masses ({', '.join(f'{m:g}' for m in masses)} M_sun)"
    if masses.size < _LEAST_MASSES:
        raise InputError(f"{sparse}; give at least {_LEAST_MASSES} between 1 and 2 M_sun")
    if masses[0] > 1.2 or masses[-1] < 1.8:
        raise InputError(f"{sparse}; the lightest must be at most 1.2 and the heaviest at least 1.8 M_sun")
    if np.diff(masses).max() > _WIDEST_MASS_GAP:
        raise InputError(f"{sparse}; neighbours may differ by {_WIDEST_MASS_GAP} M_sun at most")


def _check_ages(label: str, mass: float, age: Array, temperature: Array) -> None:
    sparse = f"{label}: too sparse at {mass:g} M_sun"
    if age.size < _LEAST_AGES:
        raise InputError(f"{sparse}: {age.size} ages; give at least {_LEAST_AGES}")
    if age[0] > YOUNGEST:
        raise InputError(f"{sparse}: starts at {age[0]:.4g} yr; start at 1e3 yr or earlier")
    if age[-1] < 1e6 and temperature[-1] > 3e6:
        raise InputError(f"{sparse}: ends at {age[-1]:.4g} yr; go on to 1e6 yr or to 3e6 K")
    gaps = np.diff(np.log10(age))
    if gaps.max() > _WIDEST_AGE_GAP:
        i = int(np.argmax(gaps))
        raise InputError(
            f"{sparse}: nothing between {age[i]:.4g} and {age[i + 1]:.4g} yr; "
            f"neighbouring ages may differ by {_WIDEST_AGE_GAP} dex at most"
        )


def _target(rows: _Rows) -> Target:
    """Shape-preserving interpolation on the grid of the fit; straight in logarithms beyond the table."""
    masses = np.unique(rows.mass)
    ln_age = np.log(_GRID.age)
    values, slopes = np.transpose([_curve_on(ln_age, *rows.curve(m)[1:]) for m in masses], (1, 0, 2))
    return Target(_GRID, _across(masses, values), np.minimum(_across(masses, slopes), 0.0))


def _curve_on(ln_age: Array, age: Array, temperature: Array) -> tuple[Array, Array]:
    x, y = np.log(age), np.log(temperature / 1e8)
    law = PchipInterpolator(x, y)
    inside = np.clip(ln_age, x[0], x[-1])
    # the end slopes of the interpolant can vanish; secants cannot
    ends = np.where(ln_age < x[0], (y[1] - y[0]) / (x[1] - x[0]), (y[-1] - y[-2]) / (x[-1] - x[-2]))
    slope = np.where(ln_age == inside, law(inside, 1), ends)
    return law(inside) + ends * (ln_age - inside), slope


def _across(masses: Array, values: Array) -> Array:
    """Interpolate rows of fixed mass to the masses of the grid."""
    ends = [(0, 1, form.MASS_RANGE[0]), (-1, -2, form.MASS_RANGE[1])]
    for edge, inner, limit in ends:
        outside = limit < masses[0] if edge == 0 else limit > masses[-1]
        if outside:
            slope = (values[edge] - values[inner]) / (masses[edge] - masses[inner])
            row = values[edge] + slope * (limit - masses[edge])
            at = 0 if edge == 0 else masses.size
            masses, values = np.insert(masses, at, limit), np.insert(values, at, row, axis=0)
    return np.asarray(PchipInterpolator(masses, values)(_GRID.mass))


def _attempt(rows: _Rows, target: Target, rich: bool, starts: int) -> tuple[float, Fit, str]:
    """Fit with few or many terms; the largest error at the rows of the table, and where it is."""
    fit = fit_form(
        target, sigmoid_terms=1 + rich, exponential_term=rich, tolerance=(0.01, 0.2), starts=starts
    )
    low, high = form.MASS_RANGE
    ln_t = np.log(rows.temperature / 1e8)
    counted = (rows.mass >= low) & (rows.mass <= high) & (rows.age >= YOUNGEST) & (rows.age <= 1e7)
    counted &= ln_t >= LN_MEASURED
    with np.errstate(over="ignore"):  # exp of a large number is how a steep sigmoid comes to zero
        fitted = form.ln_temperature(np.log(rows.age), rows.mass, fit.table, fit.scalars)
    error = np.where(counted, np.abs(np.expm1(fitted - ln_t)), 0.0)
    i = int(np.argmax(error))
    return float(error[i]), fit, f"in row {i + 1} ({rows.age[i]:.4g} yr, {rows.mass[i]:g} M_sun)"
