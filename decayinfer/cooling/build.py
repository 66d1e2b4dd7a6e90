"""Solve and fit the cooling scenarios, and write their data files.

    python -m decayinfer.cooling.build [NAME ...] [--jobs N] [--out FOLDER]

With no name, every scenario of `decayinfer.cooling.recipes` is made. The result depends on nothing but the
code: seeds are fixed, and one process or two make no difference.
"""

import argparse
import logging
import multiprocessing
import os
import sys
from collections.abc import Sequence
from concurrent.futures import ProcessPoolExecutor
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from decayinfer.cooling import form
from decayinfer.cooling.eos import EquationOfState, get_eos
from decayinfer.cooling.evolution import Microphysics, cool, interior
from decayinfer.cooling.fitting import Fit, Target, fit_direct_urca, fit_error, fit_form
from decayinfer.cooling.gradients import Grid
from decayinfer.cooling.matter import SYMMETRY_ENERGIES, direct_urca_mass
from decayinfer.cooling.recipes import RECIPES, STANDARD, Recipe
from decayinfer.cooling.scenario import Scenario, write_scenario
from decayinfer.cooling.stars import stars_of_mass
from decayinfer.cooling.structure_fit import fit_structure
from decayinfer.errors import UnknownNameError

__all__ = ["build_scenario", "left_out_error", "main", "solve_histories"]

type Array = NDArray[np.float64]

FOLDER = Path(__file__).parent / "data"  #: where the data files of the package are
_LOG = logging.getLogger(__name__)
_AGES = np.geomspace(300.0, 1e7, 121)
_MASSES = np.linspace(*form.MASS_RANGE, 31)
_NEAR = 0.1  #: half-width of the mass range that counts as near the direct-Urca threshold [M_sun]


def solve_histories(eos: EquationOfState, physics: Microphysics, grid: Grid, *, envelope: str) -> Target:
    """Solve structure and cooling on a grid of masses and ages.

    Parameters
    ----------
    eos : EquationOfState
        Equation of state.
    physics : Microphysics
        Superfluidity and direct Urca.
    grid : Grid
        Masses [M_sun], and ages [yr] of 300 yr or more.
    envelope : str
        Name of the envelope.
    """
    stars = stars_of_mass(eos, grid.mass)
    curves = [cool(interior(star, physics), grid.age, envelope=envelope) for star in stars]
    return Target(grid, np.array([c.ln_t_b for c in curves]), np.array([c.slope for c in curves]))


def build_scenario(recipe: Recipe, *, starts: int = 20) -> Scenario:
    """Solve and fit one scenario; its errors are measured at masses and ages left out of the fit."""
    fit = _fit(recipe, starts)
    ln_radius, ln_inertia, structure = fit_structure(get_eos(recipe.eos))
    return Scenario(
        name=recipe.name,
        title=recipe.title,
        description=recipe.description,
        sources=recipe.sources,
        provisional=False,
        standard=recipe.name in STANDARD,
        properties={
            "eos": recipe.eos,
            "superfluidity": recipe.superfluidity,
            "envelope": recipe.envelope,
            "direct_urca": "yes" if recipe.direct_urca else "no",
        },
        fit_error=left_out_error(recipe, fit) | structure,
        table=fit.table,
        scalars=fit.scalars,
        ln_radius=ln_radius,
        ln_inertia=ln_inertia,
    )


def _fit(recipe: Recipe, starts: int) -> Fit:
    """Fit the histories; with direct Urca the slow branch starts from the same stars without it."""
    eos, physics = get_eos(recipe.eos), recipe.physics
    slow = Microphysics(protons=physics.protons, neutrons=physics.neutrons)
    target = solve_histories(eos, slow, Grid(_MASSES, _AGES), envelope=recipe.envelope)
    rich = recipe.superfluidity in ("fading", "triplet")
    fit = fit_form(
        target,
        sigmoid_terms=2 if rich else 1,
        exponential_term=rich,
        tolerance=(0.03, 0.25) if recipe.superfluidity == "triplet" else (0.01, 0.05),
        starts=2 * starts if rich else starts,
    )
    if not recipe.direct_urca:
        return fit
    grid = Grid(_training_masses(recipe), _AGES)
    threshold = _threshold(recipe)
    near = np.abs(grid.mass - threshold) < _NEAR
    tolerance = np.where(near, 0.06, np.where(grid.mass < threshold, 0.01, 0.02))
    target = solve_histories(eos, physics, grid, envelope=recipe.envelope)
    return fit_direct_urca(target, fit, threshold, tolerance=(tolerance, 3 * tolerance), starts=starts)


def _threshold(recipe: Recipe) -> float:
    return direct_urca_mass(get_eos(recipe.eos), SYMMETRY_ENERGIES[recipe.eos])


def _training_masses(recipe: Recipe) -> Array:
    """Masses of the fit, closer together where direct Urca opens."""
    if not recipe.direct_urca:
        return _MASSES
    onset = _threshold(recipe)
    return np.union1d(_MASSES, np.linspace(onset - 0.05, min(onset + 0.17, form.MASS_RANGE[1]), 23))


def left_out_error(recipe: Recipe, fit: Fit | Scenario) -> dict[str, float]:
    """Largest errors of a fit midway between the masses and ages it was made from.

    Returns
    -------
    dict
        ``temperature`` over 1e3 to 1e7 yr where T_b >= 3e6 K, as a fraction; ``slope`` of d ln T / d ln t
        where T_b >= 1e7 K (with triplet pairing from 1e4 yr, and ``slope_young`` from 1e3 yr); with direct
        Urca also ``temperature_near_threshold``, within 0.1 M_sun of where it opens, and
        ``temperature_away``.
    """
    masses = _training_masses(recipe)
    grid = Grid(0.5 * (masses[1:] + masses[:-1]), np.sqrt(_AGES[1:] * _AGES[:-1]))
    target = solve_histories(get_eos(recipe.eos), recipe.physics, grid, envelope=recipe.envelope)
    coefficients = Fit(fit.table, fit.scalars)
    triplet = recipe.superfluidity == "triplet"
    whole = fit_error(coefficients, target, slope_from=1e4 if triplet else 1e3)
    out = {"temperature": whole.temperature, "slope": whole.slope}
    if triplet:
        out["slope_young"] = fit_error(coefficients, target).slope
    if recipe.direct_urca:
        near = np.abs(grid.mass - _threshold(recipe)) < _NEAR
        for key, pick in (("temperature_near_threshold", near), ("temperature_away", ~near)):
            part = Target(Grid(grid.mass[pick], grid.age), target.ln_t_b[pick], target.slope[pick])
            out[key] = fit_error(coefficients, part).temperature
    return out


def _make(name: str, folder: Path) -> str:
    scenario = build_scenario(RECIPES[name])
    write_scenario(scenario, folder / f"{name}.toml")
    return f"{name}: " + ", ".join(f"{key} {value:.2%}" for key, value in scenario.fit_error.items())


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command."""
    parser = argparse.ArgumentParser(prog="python -m decayinfer.cooling.build", description=__doc__)
    parser.add_argument("names", nargs="*", metavar="NAME", help="scenarios to make; all when none is given")
    parser.add_argument("--jobs", type=int, default=2, choices=(1, 2), help="processes")
    parser.add_argument("--out", type=Path, default=FOLDER, help="folder of the data files")
    chosen = parser.parse_args(arguments)
    unknown = [name for name in chosen.names if name not in RECIPES]
    if unknown:
        parser.error(str(UnknownNameError("cooling scenario", unknown[0], RECIPES)))
    logging.basicConfig(level=logging.INFO, format="%(message)s", stream=sys.stdout)
    names = chosen.names or list(RECIPES)
    chosen.out.mkdir(parents=True, exist_ok=True)
    # the matrices are small: one linear-algebra thread per process, set before the children load NumPy
    os.environ |= {"OPENBLAS_NUM_THREADS": "1", "OMP_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"}
    with ProcessPoolExecutor(chosen.jobs, mp_context=multiprocessing.get_context("spawn")) as pool:
        for line in pool.map(_make, names, [chosen.out] * len(names)):
            _LOG.info(line)
    return 0


if __name__ == "__main__":
    raise SystemExit(main())
