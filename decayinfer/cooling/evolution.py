"""Thermal evolution of a star with an isothermal interior.

C(T) dT/dt = -L_nu(T) - L_gamma(T), with T = T(r) e^Phi(r) uniform and every quantity as seen from far away
(Thorne 1977, ApJ 212, 825); valid once the crust has relaxed, from about 300 yr. The solver is what the
analytic fits are judged by.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.integrate import OdeSolution, simpson, solve_ivp
from scipy.interpolate import CubicSpline

from decayinfer.cooling.capacity import heat_capacity
from decayinfer.cooling.emission import State, neutrino_emission
from decayinfer.cooling.envelope import photon_luminosity, surface_temperature
from decayinfer.cooling.matter import SYMMETRY_ENERGIES, SymmetryEnergy, beta_equilibrium
from decayinfer.cooling.stars import Star
from decayinfer.cooling.superfluidity import CRITICAL_TEMPERATURES, gap
from decayinfer.physics.constants import YEAR_S

__all__ = ["CoolingCurve", "Interior", "Microphysics", "cool", "interior"]

type Array = NDArray[np.float64]

LN_T_GRID = np.linspace(np.log(3e5), np.log(2e10), 560)  #: redshifted temperature of the tables [ln K]
COLDEST = 5e5  #: local temperature at which a history ends [K]
_START_YR, _START_K = 1e-3, 1e10  # forgotten long before 300 yr


@dataclass(frozen=True)
class Microphysics:
    """What the matter of a star does.

    Parameters
    ----------
    protons, neutrons : str or None
        Profiles of the critical temperature, by name in ``superfluidity.CRITICAL_TEMPERATURES``; None for
        normal matter.
    direct_urca : bool
        Whether direct Urca acts where its threshold is open.
    mass_n, mass_p : float
        Effective nucleon masses over bare masses.
    symmetry : SymmetryEnergy or None
        Symmetry energy; None takes the one that goes with the equation of state, or the soft default.
    """

    protons: str | None = None
    neutrons: str | None = None
    direct_urca: bool = False
    mass_n: float = 0.7
    mass_p: float = 0.7
    symmetry: SymmetryEnergy | None = None


@dataclass(frozen=True, eq=False)
class Interior:
    """Neutrino luminosity and heat capacity of a star, redshifted, on `LN_T_GRID`.

    Parameters
    ----------
    star : Star
        The star.
    neutrino_luminosity, heat_capacity : (n,) array [erg/s], [erg/K]
        Integrals over the core.
    """

    star: Star
    neutrino_luminosity: Array
    heat_capacity: Array


@dataclass(frozen=True, eq=False)
class CoolingCurve:
    """A solved history.

    Parameters
    ----------
    ln_age : (n,) array [ln yr]
        Ages asked for.
    ln_t_b : (n,) array [ln 1e8 K]
        Local temperature below the envelope; NaN once colder than `COLDEST`.
    slope : (n,) array
        d ln T_b / d ln t.
    surface_temperature : (n,) array [K]
        Local effective temperature.
    photon_share : (n,) array
        Photon luminosity over total.
    energy_error : float
        Energy radiated over heat lost, less one, from the first age (or an e-fold of age) to the last.
    """

    ln_age: Array
    ln_t_b: Array
    slope: Array
    surface_temperature: Array
    photon_share: Array
    energy_error: float


def interior(star: Star, physics: Microphysics) -> Interior:
    """Integrate emission and heat capacity over the core of a star.

    Parameters
    ----------
    star : Star
        From `decayinfer.cooling.stars`.
    physics : Microphysics
        Superfluidity, direct Urca, effective masses.
    """
    n, _, e_phi, volume = star.core()
    symmetry = physics.symmetry or SYMMETRY_ENERGIES.get(star.eos.name, SYMMETRY_ENERGIES["SLy4"])
    matter = beta_equilibrium(n, symmetry)
    local = np.exp(LN_T_GRID)[:, None] / e_phi
    v_n = _gap_over_temperature(local, matter.k_n, physics.neutrons)
    v_p = _gap_over_temperature(local, matter.k_p, physics.protons)
    state = State(matter, local / 1e9, v_n, v_p, mass_n=physics.mass_n, mass_p=physics.mass_p)
    emission = neutrino_emission(state, urca=physics.direct_urca)
    return Interior(star, emission @ (e_phi**2 * volume), heat_capacity(state) @ volume)


def _gap_over_temperature(local: Array, k: Array, profile: str | None) -> Array:
    if profile is None:
        return np.zeros_like(local)
    critical = CRITICAL_TEMPERATURES[profile]
    t = np.divide(local, critical(k), out=np.full_like(local, np.inf), where=critical(k) > 0)
    return gap(t, critical.pairing)


def cool(inner: Interior, age: ArrayLike, *, envelope: str) -> CoolingCurve:
    """Solve the cooling of a star.

    A stiff solver (implicit Runge-Kutta of order five, adaptive) in ln T against ln t, from 1e10 K at
    1e-3 yr.

    Parameters
    ----------
    inner : Interior
        Tables of one star.
    age : (n,) array_like [yr]
        Increasing, 300 yr or more.
    envelope : str
        Name of the envelope.
    """
    ln_age = np.log(np.atleast_1d(np.asarray(age, dtype=float)))
    star, photons = inner.star, _photons(inner.star, envelope)
    loss, heat = inner.neutrino_luminosity + photons, inner.heat_capacity * np.exp(LN_T_GRID)
    ln_rate = CubicSpline(LN_T_GRID, np.log(loss / heat * YEAR_S))

    def slope(ln_t: ArrayLike, y: Array) -> Array:
        return np.asarray(-np.exp(ln_t + ln_rate(y)))

    def cold(ln_t: float, y: Array) -> float:  # noqa: ARG001 - the solver passes the time
        return float(y[0] - np.log(COLDEST * star.redshift_factor))

    cold.terminal = True  # type: ignore[attr-defined]
    span = (np.log(_START_YR), ln_age[-1])
    start = np.array([np.log(_START_K)])
    found = solve_ivp(slope, span, start, "Radau", dense_output=True, events=cold, rtol=1e-8, atol=1e-10)
    y = np.where(ln_age <= found.t[-1], found.sol(ln_age)[0], np.nan)
    t_b = np.exp(y) / star.redshift_factor
    return CoolingCurve(
        ln_age=ln_age,
        ln_t_b=np.log(t_b / 1e8),
        slope=slope(ln_age, y),
        surface_temperature=surface_temperature(t_b, star.gravity_14, envelope=envelope),
        photon_share=CubicSpline(LN_T_GRID, photons / loss)(y),
        energy_error=_energy_error(found.sol, min(ln_age[0], found.t[-1] - 1), found.t[-1], loss, heat),
    )


def _photons(star: Star, envelope: str) -> Array:
    """Photon luminosity on `LN_T_GRID`, redshifted twice: photon energy and rate of arrival."""
    t_b = np.exp(LN_T_GRID) / star.redshift_factor
    t_s = surface_temperature(t_b, star.gravity_14, envelope=envelope)
    return star.redshift_factor**2 * photon_luminosity(t_s, star.radius)


def _energy_error(solution: OdeSolution, first: float, last: float, loss: Array, heat: Array) -> float:
    """Energy radiated between two ages against the heat lost, each by its own quadrature."""
    ln_t = np.linspace(first, last, 8001)
    y = solution(ln_t)[0]
    luminosity = np.exp(CubicSpline(LN_T_GRID, np.log(loss))(y))
    radiated = simpson(luminosity * np.exp(ln_t) * YEAR_S, x=ln_t)
    content = CubicSpline(LN_T_GRID, heat).antiderivative()
    return float(radiated / (content(y[0]) - content(y[-1])) - 1)
