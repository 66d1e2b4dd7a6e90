"""Radius and moment of inertia of an equation of state as smooth functions of mass."""

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from decayinfer.cooling import form
from decayinfer.cooling.eos import EquationOfState
from decayinfer.cooling.stars import maximum_mass_star, stars_of_mass

__all__ = ["fit_structure"]

type Array = NDArray[np.float64]


def fit_structure(eos: EquationOfState) -> tuple[Array, Array, dict[str, float]]:
    """Chebyshev fits in mass over 1 to 2 M_sun, or to the maximum mass.

    Parameters
    ----------
    eos : EquationOfState
        Equation of state.

    Returns
    -------
    ln_radius, ln_inertia : (DEGREE + 1,) array
        Coefficients of ln R [km] and of ln I [1e45 g cm^2].
    error : dict of str to float
        Largest errors of ``radius`` and ``inertia``, as fractions.
    """
    top = min(form.MASS_RANGE[1], maximum_mass_star(eos).mass - 0.005)
    masses = np.linspace(form.MASS_RANGE[0], top, 41)
    stars = stars_of_mass(eos, masses)
    m = (masses - 1.5) / 0.5
    exact = {"radius": [s.radius for s in stars], "inertia": [s.moment_of_inertia for s in stars]}
    rows = [np.asarray(chebyshev.chebfit(m, np.log(y), form.DEGREE), dtype=float) for y in exact.values()]
    error = {
        key: float(np.max(np.abs(np.exp(chebyshev.chebval(m, row)) / y - 1)))
        for (key, y), row in zip(exact.items(), rows, strict=True)
    }
    return rows[0], rows[1], error
