"""Neutron-star structure: hydrostatic balance in general relativity with slow rotation.

Tolman 1939, Phys. Rev. 55, 364; Oppenheimer & Volkoff 1939, Phys. Rev. 55, 374; slow rotation: Hartle 1967,
ApJ 150, 1005. Integrated in enthalpy h, so that the metric is known without an equation of its own,
Phi(r) = Phi(R) - h(r); many stars at once.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import CubicSpline

from decayinfer.cooling.eos import EquationOfState
from decayinfer.errors import InputError
from decayinfer.physics.constants import C_CGS, G_CGS, M_SUN_G

__all__ = ["Star", "maximum_mass_star", "sequence", "stars_of_mass"]

type Array = NDArray[np.float64]

M_SUN_KM = G_CGS * M_SUN_G / C_CGS**2 / 1e5  #: G M_sun / c^2 [km]
_TO_KM = G_CGS / C_CGS**2 * 1e10  # g cm^-3 -> km^-2
_STEPS = 600


@dataclass(frozen=True, eq=False)
class Star:
    """One star.

    Parameters
    ----------
    eos : EquationOfState
        Its equation of state.
    mass, radius, central_density, moment_of_inertia : float [M_sun], [km], [g cm^-3], [1e45 g cm^2]
        Gravitational mass, circumferential radius, density at the centre, slow-rotation moment of inertia.
    r, m, h : (n,) array [km], [km], dimensionless
        Profile from the centre to the surface: radius, G m(r)/c^2, enthalpy.
    """

    eos: EquationOfState
    mass: float
    radius: float
    central_density: float
    moment_of_inertia: float
    r: Array
    m: Array
    h: Array

    @property
    def compactness(self) -> float:
        """2 G M / (R c^2)."""
        return 2 * M_SUN_KM * self.mass / self.radius

    @property
    def redshift_factor(self) -> float:
        """e^Phi at the surface, sqrt(1 - 2 G M / (R c^2)) = 1/(1 + z)."""
        return float(np.sqrt(1 - self.compactness))

    @property
    def gravity_14(self) -> float:
        """Surface gravity [1e14 cm s^-2]."""
        newton = G_CGS * M_SUN_G * self.mass / (self.radius * 1e5) ** 2
        return newton / self.redshift_factor / 1e14

    def core(self, *, n_min: float = 0.08, shells: int = 400) -> tuple[Array, Array, Array, Array]:
        """Shells of the core, for volume integrals by the midpoint rule.

        Parameters
        ----------
        n_min : float [fm^-3]
            Baryon density at the crust-core boundary.
        shells : int
            Number of shells.

        Returns
        -------
        n, rho, e_phi, volume : (shells,) array [fm^-3], [g cm^-3], dimensionless, [cm^3]
            Baryon density, density, redshift factor and proper volume of each shell.
        """
        h_of_r, m_of_r = CubicSpline(self.r, self.h), CubicSpline(self.r, self.m)
        rho_min = np.exp(np.interp(np.log(n_min), np.log(self.eos.baryon_density), np.log(self.eos.density)))
        edge = np.interp(-self.eos.enthalpy_at(rho_min), -self.h, self.r)
        r = (np.arange(shells) + 0.5) * edge / shells
        rho, _, n = self.eos.at_enthalpy(h_of_r(r))
        volume = 4e15 * np.pi * r**2 * (edge / shells) / np.sqrt(1 - 2 * m_of_r(r) / r)
        return n, rho, self.redshift_factor * np.exp(-h_of_r(r)), volume


def sequence(eos: EquationOfState, central_density: ArrayLike) -> list[Star]:
    """Solve stars of given central densities.

    Parameters
    ----------
    eos : EquationOfState
        Equation of state.
    central_density : (n_star,) array_like [g cm^-3]
        Inside the range of the equation of state.

    Returns
    -------
    list of Star
        One star each, in the order given.

    Raises
    ------
    InputError
        If a central density lies outside the equation of state.
    """
    rho_c = np.atleast_1d(np.asarray(central_density, dtype=float))
    if not np.all((rho_c > eos.density[0]) & (rho_c <= eos.density[-1])):
        span = f"{eos.density[0]:.3g} to {eos.density[-1]:.3g}"
        raise InputError(f"central densities must lie within {eos.name}, {span} g cm^-3; got {rho_c}")
    s, r, m, u = _integrate(eos, rho_c)
    h = eos.enthalpy_at(rho_c) * (1 - s[:, None] ** 2)
    inertia = r[-1] ** 3 * u[-1] / (2 * (3 + u[-1])) / M_SUN_KM * M_SUN_G * 1e10 / 1e45
    return [
        Star(eos, m[-1, i] / M_SUN_KM, r[-1, i], rho_c[i], inertia[i], r[:, i], m[:, i], h[:, i])
        for i in range(rho_c.size)
    ]


def _integrate(eos: EquationOfState, rho_c: Array) -> tuple[Array, Array, Array, Array]:
    """Fourth-order steps in s = sqrt(1 - h/h_c), in which r starts linearly.

    Geometric units (km). u = d ln(omega_bar) / d ln r carries the frame dragging; then
    I = (c^2/G) R^3 u / (2 (3 + u)) at the surface.
    """
    h_c = eos.enthalpy_at(rho_c)
    ds = 1 / _STEPS
    s = np.linspace(0, 1, _STEPS + 1)
    y = np.zeros((_STEPS + 1, 3, rho_c.size))
    y[1] = _series(eos, rho_c, h_c, ds)

    def slope(at: float, state: Array) -> Array:
        r, m, u = state
        rho, p, _ = eos.at_enthalpy(np.maximum(h_c * (1 - at**2), 0))
        rho, p = rho * _TO_KM, p / C_CGS**2 * _TO_KM
        dr = 2 * h_c * at * r * (r - 2 * m) / (m + 4 * np.pi * r**3 * p)
        drag = (4 + u) * 4 * np.pi * r**3 * (rho + p) / (r - 2 * m) - u * (u + 3)
        return np.array([dr, 4 * np.pi * r**2 * rho * dr, drag / r * dr])

    for i in range(1, _STEPS):
        k1 = slope(s[i], y[i])
        k2 = slope(s[i] + ds / 2, y[i] + ds / 2 * k1)
        k3 = slope(s[i] + ds / 2, y[i] + ds / 2 * k2)
        k4 = slope(s[i + 1], y[i] + ds * k3)
        y[i + 1] = y[i] + ds / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
    return s, y[:, 0], y[:, 1], y[:, 2]


def _series(eos: EquationOfState, rho_c: Array, h_c: Array, s: float) -> Array:
    """Leading terms at the centre: r^2 = 3 h_c s^2 / (2 pi (rho + 3P)), u = 16 pi (rho + P) r^2 / 5."""
    _, p, _ = eos.at_enthalpy(h_c)
    rho, p = rho_c * _TO_KM, p / C_CGS**2 * _TO_KM
    r = s * np.sqrt(3 * h_c / (2 * np.pi * (rho + 3 * p)))
    return np.array([r, 4 * np.pi / 3 * rho * r**3, 16 * np.pi / 5 * (rho + p) * r**2])


@lru_cache(maxsize=16)
def _mass_curve(eos: EquationOfState) -> tuple[Array, Array]:
    """Central density and mass along the stable branch, up to the maximum."""
    top = min(15.7, np.log10(eos.density[-1]))
    stars = sequence(eos, np.logspace(14.5, top, 160))
    mass = np.array([star.mass for star in stars])
    last = int(np.argmax(mass)) + 1  # rising masses only: the stable branch
    first = int(np.flatnonzero(np.diff(mass[:last]) <= 0)[-1]) + 1 if np.any(np.diff(mass[:last]) <= 0) else 0
    return np.array([star.central_density for star in stars])[first:last], mass[first:last]


@lru_cache(maxsize=16)
def maximum_mass_star(eos: EquationOfState) -> Star:
    """Return the heaviest stable star.

    Its central density is the vertex of the parabola through the three highest points of the mass curve.
    """
    rho_c, _ = _mass_curve(eos)
    trial = np.exp(
        np.linspace(np.log(rho_c[-2]), np.log(min(rho_c[-1] ** 2 / rho_c[-2], eos.density[-1])), 21)
    )
    stars = sequence(eos, trial)
    return max(stars, key=lambda star: star.mass)


def stars_of_mass(eos: EquationOfState, mass: ArrayLike) -> list[Star]:
    """Solve stars of given gravitational masses.

    Parameters
    ----------
    eos : EquationOfState
        Equation of state.
    mass : (n_star,) array_like [M_sun]
        Between the lightest mass of the curve (about 0.2) and the maximum mass.

    Returns
    -------
    list of Star
        Masses agree with those asked for to 1e-6.

    Raises
    ------
    InputError
        If a mass is out of reach.
    """
    wanted = np.atleast_1d(np.asarray(mass, dtype=float))
    rho_curve, m_curve = _mass_curve(eos)
    if not np.all((wanted >= m_curve[0]) & (wanted <= m_curve[-1])):
        span = f"{m_curve[0]:.2f} to {m_curve[-1]:.3f}"
        raise InputError(f"{eos.name} carries stable stars of {span} M_sun; got {wanted}")
    inverse = CubicSpline(m_curve, np.log(rho_curve))
    log_rho = inverse(wanted)
    for _ in range(3):  # Newton with the slope of the curve
        found = np.array([star.mass for star in sequence(eos, np.exp(log_rho))])
        log_rho = log_rho + (wanted - found) * inverse(wanted, 1)
    return sequence(eos, np.exp(log_rho))
