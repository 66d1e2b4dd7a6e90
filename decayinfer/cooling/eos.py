"""Equations of state of cold, catalysed neutron-star matter, P(rho), with baryon density and enthalpy.

Coefficients of the analytic forms are from memory of the papers named beside them; that they reproduce
the published maximum masses and radii is tested in ``tests/cooling/test_stars.py``.
"""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import PchipInterpolator

from decayinfer.cooling.constants import MASS_PER_BARYON
from decayinfer.errors import InputError, UnknownNameError
from decayinfer.physics.constants import C_CGS

__all__ = ["EOS_NAMES", "EquationOfState", "eos_from_table", "get_eos"]

type Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class EquationOfState:
    """A barotropic equation of state on a fine grid of density.

    Parameters
    ----------
    name : str
        Short name.
    source : str
        Paper, or where a table came from.
    density : (n,) array [g cm^-3]
        Mass-energy density over c^2, increasing.
    pressure : (n,) array [dyn cm^-2]
        Increasing.
    baryon_density : (n,) array [fm^-3]
        From d ln n = d rho / (rho + P/c^2).
    enthalpy : (n,) array
        h = int dP / (rho c^2 + P), dimensionless, zero at the first row.
    """

    name: str
    source: str
    density: Array
    pressure: Array
    baryon_density: Array
    enthalpy: Array

    def __post_init__(self) -> None:
        log = [np.log(a) for a in (self.density, self.pressure, self.baryon_density)]
        # ln rho, ln P and ln n against enthalpy: the stellar equations are integrated in h
        object.__setattr__(self, "_of_enthalpy", PchipInterpolator(self.enthalpy, np.transpose(log)))
        object.__setattr__(self, "_enthalpy_of", PchipInterpolator(log[0], self.enthalpy))

    def at_enthalpy(self, h: ArrayLike) -> tuple[Array, Array, Array]:
        """Density [g cm^-3], pressure [dyn cm^-2] and baryon density [fm^-3] at enthalpy h."""
        rho, p, n = np.moveaxis(np.exp(self._of_enthalpy(h)), -1, 0)  # type: ignore[attr-defined]
        return rho, p, n

    def enthalpy_at(self, density: ArrayLike) -> Array:
        """Enthalpy at a density [g cm^-3] inside the grid."""
        return np.asarray(self._enthalpy_of(np.log(density)))  # type: ignore[attr-defined]


def _step(z: Array) -> Array:
    return 1 / (np.exp(np.clip(z, -700, 700)) + 1)


def _sly4(xi: Array) -> Array:
    """log10 P of SLy4; Haensel & Potekhin 2004, A&A 428, 191 (coefficients from memory)."""
    return (
        (6.22 + 6.121 * xi + 0.005925 * xi**3) / (1 + 0.16326 * xi) * _step(6.48 * (xi - 11.4971))
        + (19.105 + 0.8938 * xi) * _step(6.54 * (11.4950 - xi))
        + (-22.775 + 1.5707 * xi) * _step(4.3 * (14.08 - xi))
        + (27.80 - 1.653 * xi) * _step(1.50 * (14.67 - xi))
    )


def _bsk(xi: Array, a: tuple[float, ...]) -> Array:
    """log10 P of the Brussels-Skyrme fits; a[k] is a_(k+1), the width a_19 before the centre a_20."""
    return (
        (a[0] + a[1] * xi + a[2] * xi**3) / (1 + a[3] * xi) * _step(a[4] * (xi - a[5]))
        + (a[6] + a[7] * xi) * _step(a[8] * (a[5] - xi))
        + (a[9] + a[10] * xi) * _step(a[11] * (a[12] - xi))
        + (a[13] + a[14] * xi) * _step(a[15] * (a[16] - xi))
        + a[17] / (1 + (a[18] * (xi - a[19])) ** 2)
        + a[20] / (1 + (a[21] * (xi - a[22])) ** 2)
    )


# fmt: off
_BSK20 = (4.078, 7.587, 0.00839, 0.21695, 3.614, 11.942, 13.751, 1.3373, 3.606, -22.996, 1.6229, 4.88,
          14.274, 23.560, -1.5564, 2.095, 15.294, 0.084, 6.36, 11.67, -0.042, 14.8, 14.18)
_BSK21 = (4.857, 6.981, 0.00706, 0.19351, 4.085, 12.065, 10.521, 1.5905, 4.104, -28.726, 2.0845, 4.89,
          14.302, 22.881, -1.7690, 0.989, 15.313, 0.091, 4.68, 11.65, -0.086, 10.0, 14.15)
_BSK24 = (6.795, 5.552, 0.00435, 0.13963, 3.636, 11.943, 13.848, 1.3031, 3.644, -30.840, 2.2322, 4.65,
          14.290, 30.08, -2.080, 1.10, 14.71, 0.099, 5.00, 11.66, -0.095, 9.1, 14.15)
# fmt: on


def _apr4(xi: Array) -> Array:
    """log10 P of APR4 as a piecewise polytrope on a fixed crust; Read et al. 2009, PRD 79, 124032.

    The polytropes hold in rest-mass density; the mass-energy density follows from the first law,
    epsilon = (1 + a) rho + P / ((Gamma - 1) c^2) piece by piece.
    """
    rest = np.logspace(3, 16.3, 20000)
    k, gamma, edges = _apr4_pieces()
    piece = np.searchsorted(edges[1:], rest, side="right")
    offset = np.zeros(len(k))
    for i in range(1, len(k)):  # continuity of the energy density across each join
        jump = [k[j] * edges[i] ** (gamma[j] - 1) / (gamma[j] - 1) for j in (i - 1, i)]
        offset[i] = offset[i - 1] + jump[0] - jump[1]
    pressure = k[piece] * rest ** gamma[piece]  # in units of c^2, as K is
    density = (1 + offset[piece]) * rest + pressure / (gamma[piece] - 1)
    return np.asarray(np.interp(xi, np.log10(density), np.log10(pressure * C_CGS**2)))


def _apr4_pieces() -> tuple[Array, Array, Array]:
    """K [P/c^2 in cgs], Gamma and lower edge in rest-mass density of each polytrope (from memory)."""
    k = [6.80110e-9, 1.06186e-6, 53.2697, 3.99874e-8]
    gamma = [1.58425, 1.28733, 0.62223, 1.35692, 2.830, 3.445, 3.348]
    inner = 10**34.269 / C_CGS**2 / 10 ** (14.7 * gamma[4])
    join = (inner / k[3]) ** (1 / (gamma[3] - gamma[4]))  # where core and crust pressures meet
    edges = [0.0, 2.44034e7, 3.78358e11, 2.62780e12, join, 10**14.7, 10**15.0]
    k.append(inner)
    for i in (5, 6):
        k.append(k[-1] * edges[i] ** (gamma[i - 1] - gamma[i]))
    return np.array(k), np.array(gamma), np.array(edges)


_HAENSEL = "Haensel & Potekhin 2004, A&A 428, 191"
_POTEKHIN = "Potekhin et al. 2013, A&A 560, A48"
_ANALYTIC: Mapping[str, tuple[Callable[[Array], Array], float, str]] = MappingProxyType(
    {
        "APR4": (_apr4, 5.0, "Read et al. 2009, PRD 79, 124032 (piecewise polytrope)"),
        "BSk20": (lambda xi: _bsk(xi, _BSK20), 6.0, _POTEKHIN),
        "BSk21": (lambda xi: _bsk(xi, _BSK21), 6.0, _POTEKHIN),
        "BSk24": (lambda xi: _bsk(xi, _BSK24), 6.0, "Pearson et al. 2018, MNRAS 481, 2994"),
        "SLy4": (_sly4, 5.0, _HAENSEL),
    }
)

#: Names of the equations of state that ship with the package.
EOS_NAMES: tuple[str, ...] = tuple(_ANALYTIC)


@cache
def get_eos(name: str) -> EquationOfState:
    """Return an equation of state of the package by name.

    Raises
    ------
    UnknownNameError
        If there is none of that name.
    """
    if name not in _ANALYTIC:
        raise UnknownNameError("equation of state", name, EOS_NAMES)
    log_pressure, lowest, source = _ANALYTIC[name]
    xi = np.linspace(lowest, 16.1, 4000)
    return _complete(name, source, 10**xi, 10 ** log_pressure(xi))


def eos_from_table(
    density: ArrayLike, pressure: ArrayLike, *, name: str, source: str = "user"
) -> EquationOfState:
    """Make an equation of state from a table.

    Parameters
    ----------
    density, pressure : (n,) array_like [g cm^-3], [dyn cm^-2]
        Both strictly increasing, from the outer crust (1e7 g cm^-3 or less) to the heaviest centre.
    name, source : str
        Name, and where the table came from.

    Raises
    ------
    InputError
        If the table is too short, starts too deep, is not increasing or lets sound outrun light.
    """
    rho, p = np.asarray(density, dtype=float), np.asarray(pressure, dtype=float)
    problem = _table_problem(rho, p)
    if problem:
        raise InputError(f"equation of state {name!r}: {problem}")
    # a fine grid by shape-preserving interpolation: the integrals below need it
    fine = np.linspace(np.log(rho[0]), np.log(rho[-1]), 4000)
    return _complete(name, source, np.exp(fine), np.exp(PchipInterpolator(np.log(rho), np.log(p))(fine)))


def _table_problem(rho: Array, p: Array) -> str:
    """Say what makes a table unusable and how to mend it, or return an empty string."""
    if rho.ndim != 1 or rho.shape != p.shape or rho.size < 20:
        return f"needs two columns of equal length with at least 20 rows, got {rho.shape} and {p.shape}"
    if not (np.all(np.isfinite(rho)) and np.all(np.isfinite(p)) and rho[0] > 0 and p[0] > 0):
        return "density and pressure must be finite and positive in every row"
    for label, column in (("density", rho), ("pressure", p)):
        bad = np.flatnonzero(np.diff(column) <= 0)
        if bad.size:
            return (
                f"{label} must increase from row to row; row {bad[0] + 2} does not (sort, drop repeated rows)"
            )
    if rho[0] > 1e7:
        return f"starts at {rho[0]:.3g} g cm^-3; add a crust down to 1e7 g cm^-3 or less"
    fast = np.flatnonzero(np.diff(p) > 1.5 * C_CGS**2 * np.diff(rho))
    if fast.size:
        row = int(fast[0]) + 1
        return f"sound is faster than light between rows {row} and {row + 1}; cut the table there"
    return ""


def _complete(name: str, source: str, rho: Array, p: Array) -> EquationOfState:
    """Add baryon density and enthalpy by the first law, trapezoids in the logarithms."""
    total = rho + p / C_CGS**2
    ln_n = _cumulative(rho / total, np.log(rho))
    h = _cumulative(p / (total * C_CGS**2), np.log(p))
    n = rho[0] / MASS_PER_BARYON * 1e-39 * np.exp(ln_n)
    return EquationOfState(name, source, rho, p, n, h)


def _cumulative(y: Array, x: Array) -> Array:
    return np.concatenate([[0.0], np.cumsum(0.5 * (y[1:] + y[:-1]) * np.diff(x))])
