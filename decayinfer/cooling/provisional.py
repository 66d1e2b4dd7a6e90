"""Two provisional scenarios from published scalings, until computed cooling curves replace them.

Neutrino era: the standard candle of Yakovlev, Ho, Shternin, Heinke & Potekhin 2011, MNRAS 411, 1977 (formula from
memory), redshifted T = 3.45e8 K (1 - x)[1 + 0.12 (R/10 km)^2](330 yr/t)^(1/6), scaled by f_l^(-1/6) for a star whose
neutrino cooling is f_l times the candle's. Photon era: heat capacity 1.3e39 T_9 (M/M_sun) erg/K (order of magnitude of
Yakovlev & Pethick 2004, ARA&A 42, 169) against the photon luminosity behind the iron envelope of Gudmundsson,
Pethick & Epstein 1983, ApJ 272, 286, T_s = 0.87e6 K g_14^(1/4) T_b8^0.55, which gives T = T_nu (1 + t/t_gamma)^-5.
Mass enters through compactness, gravity and heat capacity at a fixed radius of 12 km.
"""

from pathlib import Path

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from decayinfer.cooling import form
from decayinfer.cooling.scenario import Scenario, write_scenario
from decayinfer.physics import constants, structure

__all__ = ["candle_temperature", "photon_time", "provisional_scenario", "write_provisional"]

RADIUS_KM = 12.0  #: radius of every provisional star [km]
CANDLE_TEMPERATURE_8 = 3.45  #: of Yakovlev et al. 2011 (from memory)
CANDLE_AGE = 330.0  #: age at which it holds [yr]
HEAT_CAPACITY_39 = 1.3  #: per solar mass and T_9 [1e39 erg/K]
STEFAN_BOLTZMANN_CGS = 5.670374419e-5  #: [erg cm^-2 s^-1 K^-4] (exact by definition of SI)
PHOTON_SLOPE = 5.0  #: ln T falls as 5 ln t once L_gamma ~ T^2.2 and C ~ T alone decide
SOURCES = (
    "Yakovlev, Ho, Shternin, Heinke & Potekhin 2011, MNRAS 411, 1977",
    "Gudmundsson, Pethick & Epstein 1983, ApJ 272, 286",
    "Yakovlev & Pethick 2004, ARA&A 42, 169",
    "Bejger & Haensel 2002, A&A 396, 917",
)


def candle_temperature(
    mass: NDArray[np.float64], age: float | NDArray[np.float64], relative_rate: float
) -> NDArray[np.float64]:
    """Return the local temperature [1e8 K] of a star in its neutrino era at an age [yr]."""
    redshift = structure.redshift_factor(mass, RADIUS_KM)
    size = 1.0 + 0.12 * (RADIUS_KM / 10.0) ** 2
    cooled = redshift * size * (CANDLE_AGE / age / relative_rate) ** (1.0 / 6.0)
    return np.asarray(CANDLE_TEMPERATURE_8 * cooled)


def photon_time(mass: NDArray[np.float64], temperature_8: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return t_gamma [yr]: five e-folding times of T_b by photon emission at that temperature [1e8 K]."""
    redshift = structure.redshift_factor(mass, RADIUS_KM)
    surface = 0.87e6 * structure.surface_gravity_14(mass, RADIUS_KM) ** 0.25 * temperature_8**0.55
    area = 4.0 * np.pi * (RADIUS_KM * constants.KM_CM) ** 2
    luminosity = area * STEFAN_BOLTZMANN_CGS * surface**4 * redshift**2
    internal = redshift * temperature_8 * constants.T_UNIT_K
    heat_capacity = HEAT_CAPACITY_39 * 1e39 * mass * internal / 1e9
    return np.asarray(PHOTON_SLOPE * heat_capacity * internal / luminosity / constants.YEAR_S)


def provisional_scenario(name: str, relative_rate: float, title: str) -> Scenario:
    """Build a provisional scenario whose neutrino cooling is ``relative_rate`` times the candle's."""
    mass = np.linspace(*form.MASS_RANGE, 41)
    onset = np.full_like(mass, 1e6)
    for _ in range(50):  # the photon era begins at the temperature that the neutrino era has left
        onset = photon_time(mass, candle_temperature(mass, onset, relative_rate))
    table = np.zeros((2, len(form.PARAMETERS), form.DEGREE + 1))
    rows = {
        "a0": np.log(candle_temperature(mass, form.REFERENCE_AGE, relative_rate)),
        "s0": np.full_like(mass, np.log(1.0 / 6.0)),
        "s1": np.full_like(mass, np.log(PHOTON_SLOPE - 1.0 / 6.0)),
        "l1": np.log(onset / form.REFERENCE_AGE),
        "w1": np.zeros_like(mass),
    }
    for parameter, values in rows.items():
        table[0, form.PARAMETERS.index(parameter)] = _polynomial(mass, values)
    named = dict.fromkeys(form.SCALARS, 0.0) | {
        "softplus_terms": 1.0, "sharpness": 1.0, "urca_width": 1.0,
        "ln_floor": float(np.log(0.015)), "relaxation_time": 100.0,
    }  # fmt: skip
    return Scenario(
        name=name,
        title=title,
        description=f"{title}. Published scalings joined in closed form; no computed cooling curve stands behind it.",
        sources=SOURCES,
        provisional=True,
        properties={"eos": "none", "superfluidity": "none", "envelope": "iron", "direct_urca": "no"},
        table=table,
        scalars=np.array([named[scalar] for scalar in form.SCALARS]),
        ln_radius=np.array([np.log(RADIUS_KM), 0.0, 0.0, 0.0]),
        ln_inertia=_polynomial(mass, np.log(structure.moment_of_inertia_45(mass, RADIUS_KM))),
    )


def write_provisional(folder: Path) -> None:
    """Write the data files of the provisional scenarios into a folder."""
    for name, rate, title in (
        ("candle", 1.0, "Provisional: standard neutrino candle, iron envelope"),
        (
            "slow-candle",
            0.02,
            "Provisional: neutrino cooling fifty times slower than the candle, iron envelope",
        ),
    ):
        write_scenario(provisional_scenario(name, rate, title), folder / f"{name}.toml")


def _polynomial(mass: NDArray[np.float64], values: NDArray[np.float64]) -> NDArray[np.float64]:
    fitted = np.asarray(chebyshev.chebfit((mass - 1.5) / 0.5, values, form.DEGREE), dtype=np.float64)
    return np.where(np.abs(fitted) < 1e-14, 0.0, fitted)
