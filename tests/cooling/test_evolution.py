from functools import cache

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.interpolate import CubicSpline

from decayinfer.cooling.eos import get_eos
from decayinfer.cooling.evolution import LN_T_GRID, Interior, Microphysics, cool, interior
from decayinfer.cooling.stars import stars_of_mass
from decayinfer.physics.constants import YEAR_S

AGES = np.geomspace(300, 1e7, 60)
NORMAL = Microphysics()
PROTONS = Microphysics(protons="protons-strong")
TRIPLET = Microphysics(protons="protons-strong", neutrons="neutrons-moderate")
URCA = Microphysics(direct_urca=True)


@cache
def star(eos, mass):
    return stars_of_mass(get_eos(eos), [mass])[0]


@cache
def inside(eos, mass, physics):
    return interior(star(eos, mass), physics)


@pytest.fixture(scope="module")
def normal():
    return inside("BSk24", 1.4, NORMAL)


@pytest.mark.parametrize(
    ("eos", "mass"), [("SLy4", 1.0), ("SLy4", 1.4), ("SLy4", 1.8), ("BSk24", 1.4), ("APR4", 1.6)]
)
def test_standard_neutrino_candle(eos, mass):
    """T = 3.45e8 K (1 - x) [1 + 0.12 (R/10 km)^2] (330 yr/t)^(1/6), redshifted, without superfluidity.

    Yakovlev, Ho, Shternin, Heinke & Potekhin 2011, MNRAS 411, 1977 (from memory).
    """
    s = star(eos, mass)
    ages = np.array([330.0, 1e3, 3e3, 1e4])
    curve = cool(interior(s, NORMAL), ages, envelope="iron")
    redshifted = np.exp(curve.ln_t_b) * 1e8 * s.redshift_factor
    candle = 3.45e8 * (1 - s.compactness) * (1 + 0.12 * (s.radius / 10) ** 2) * (330 / ages) ** (1 / 6)
    assert redshifted == pytest.approx(candle, rel=0.2)


@pytest.mark.parametrize(("physics", "mass", "slope"), [(NORMAL, 1.4, -1 / 6), (URCA, 1.9, -1 / 4)])
def test_slopes_of_the_neutrino_era(physics, mass, slope):
    """-1/6 by modified, -1/4 by direct Urca while photons do not count: L ~ T^8, T^6 and C ~ T."""
    curve = cool(inside("BSk24", mass, physics), np.geomspace(300, 900, 9), envelope="iron")
    assert curve.photon_share.max() < 0.02
    assert curve.slope == pytest.approx(slope, rel=0.01)
    fitted = np.polyfit(curve.ln_age, curve.ln_t_b, 1)[0]
    assert fitted == pytest.approx(slope, rel=0.01)


@pytest.mark.parametrize("envelope", ["iron", "light"])
def test_photon_era_is_steeper(normal, envelope):
    curve = cool(normal, AGES, envelope=envelope)
    neutrinos, photons = curve.photon_share < 0.05, curve.photon_share > 0.95
    assert neutrinos.any()
    assert photons.any()
    assert np.abs(curve.slope[photons]).min() > 2 * np.abs(curve.slope[neutrinos]).max()


@pytest.mark.parametrize("physics", [NORMAL, PROTONS, TRIPLET, URCA])
@pytest.mark.parametrize("envelope", ["iron", "light"])
def test_energy_balance(physics, envelope):
    curve = cool(inside("BSk24", 1.8, physics), AGES, envelope=envelope)
    assert abs(curve.energy_error) < 1e-4


@pytest.mark.parametrize("physics", [NORMAL, TRIPLET])
def test_solver_agrees_with_quadrature(physics):
    """The equation is autonomous: t = int C dT/(L_nu + L_gamma), done here without a stepper."""
    from decayinfer.cooling.evolution import _photons

    inner = inside("SLy4", 1.4, physics)
    curve = cool(inner, np.array([3e3, 3e4, 3e5]), envelope="iron")
    loss = inner.neutrino_luminosity + _photons(inner.star, "iron")
    time = CubicSpline(LN_T_GRID, np.log(inner.heat_capacity * np.exp(LN_T_GRID) / loss / YEAR_S))
    ln_t = np.log(np.exp(curve.ln_t_b) * 1e8 * inner.star.redshift_factor)
    warmer = [np.log(1e10), *ln_t[:-1]]
    ages = np.cumsum(
        [quad(lambda y: np.exp(time(y)), a, b, limit=500)[0] for a, b in zip(ln_t, warmer, strict=True)]
    )
    assert ages == pytest.approx([3e3, 3e4, 3e5], rel=1e-4)


def test_slope_is_the_derivative_of_the_curve():
    curve = cool(inside("SLy4", 1.4, TRIPLET), np.geomspace(300, 1e6, 4000), envelope="light")
    numeric = np.gradient(curve.ln_t_b, curve.ln_age)
    warm = np.isfinite(curve.ln_t_b) & (curve.ln_t_b > np.log(0.03))
    assert curve.slope[warm][1:-1] == pytest.approx(numeric[warm][1:-1], abs=5e-3)


@pytest.mark.parametrize("physics", [NORMAL, PROTONS])
@pytest.mark.parametrize("eos", ["SLy4", "BSk24", "APR4"])
@pytest.mark.parametrize("envelope", ["iron", "light"])
def test_light_stars_are_hotter_inside(physics, eos, envelope):
    """A 1.1 M_sun star is hotter than a 1.4 M_sun one at 1e3 to 1e5 yr (common practice; no paper)."""
    ages = np.geomspace(1e3, 1e5, 9)
    light, heavy = (cool(inside(eos, m, physics), ages, envelope=envelope) for m in (1.1, 1.4))
    assert np.all(light.ln_t_b > heavy.ln_t_b)


def test_pairing_order_of_temperatures():
    """Strong proton pairing slows neutrino cooling; neutron pairs later speed it (Page et al. 2011)."""
    curves = [
        cool(inside("SLy4", 1.4, p), np.array([1e3, 1e4]), envelope="iron")
        for p in (NORMAL, PROTONS, TRIPLET)
    ]
    assert np.all(curves[1].ln_t_b > curves[0].ln_t_b)
    assert curves[2].ln_t_b[1] < curves[0].ln_t_b[1]


def test_direct_urca_cools_only_stars_above_its_threshold():
    for mass, colder in ((1.4, False), (1.9, True)):
        with_it, without = (
            cool(inside("BSk24", mass, p), np.array([1e3]), envelope="iron") for p in (URCA, NORMAL)
        )
        assert (with_it.ln_t_b[0] < without.ln_t_b[0] - 1) == colder
        assert colder or with_it.ln_t_b[0] == pytest.approx(without.ln_t_b[0], abs=1e-9)


def test_history_ends_in_nan_once_cold(normal):
    curve = cool(normal, AGES, envelope="light")
    assert np.isnan(curve.ln_t_b[-1])
    assert np.isfinite(curve.ln_t_b[0])
    assert np.all(np.diff(curve.ln_t_b[np.isfinite(curve.ln_t_b)]) < 0)


def test_initial_temperature_is_forgotten(normal):
    """A star born ten times colder in energy has the same history from 300 yr (T^-6 dominates)."""
    import decayinfer.cooling.evolution as module

    first = cool(normal, AGES[:5], envelope="iron").ln_t_b
    original, module._START_K = module._START_K, 3e9
    try:
        assert cool(normal, AGES[:5], envelope="iron").ln_t_b == pytest.approx(first, abs=1e-5)
    finally:
        module._START_K = original


def test_surface_temperature_of_a_middle_aged_star_is_near_a_million_kelvin(normal):
    """T_s of order 1e6 K at 1e4 yr (textbook; Yakovlev & Pethick 2004, ARA&A 42, 169)."""
    curve = cool(normal, np.array([1e4]), envelope="iron")
    assert 0.5e6 < curve.surface_temperature[0] < 2e6
    assert isinstance(normal, Interior)
