import numpy as np
import pytest
from scipy.integrate import solve_ivp

from decayinfer.cooling.eos import EquationOfState, get_eos
from decayinfer.cooling.stars import M_SUN_KM, maximum_mass_star, sequence, stars_of_mass
from decayinfer.errors import InputError
from decayinfer.physics.constants import C_CGS, G_CGS

UNIT = G_CGS / C_CGS**2 * 1e10  # g cm^-3 -> km^-2

# Maximum masses: SLy 2.05 (Douchin & Haensel 2001, A&A 380, 151), BSk20, 21 2.16, 2.27 (Potekhin et al.
# 2013), BSk24 2.28 (Pearson et al. 2018), APR4 2.19-2.21 (Read et al. 2009). All from memory.
MAXIMUM = {"SLy4": 2.05, "BSk20": 2.16, "BSk21": 2.27, "BSk24": 2.28, "APR4": 2.20}

# mass, R [km], rho_c [1e15 g cm^-3], I [1e45 g cm^2]: an earlier independent integration of the same forms
# (no published table); guards against drift.
TABLE = {
    "SLy4": [(1.0, 11.85, 0.734, 0.868), (1.4, 11.70, 0.986, 1.366), (2.0, 10.62, 2.05, 1.998)],
    "BSk24": [(1.0, 12.47, 0.578, 0.974), (1.4, 12.59, 0.730, 1.581), (2.0, 12.30, 1.14, 2.534)],
    "APR4": [(1.0, 11.35, 0.798, 0.807), (1.4, 11.32, 1.01, 1.306), (1.8, 11.13, 1.32, 1.853)],
    "BSk21": [(1.4, 12.59, 0.730, 1.582)],
}


@pytest.mark.parametrize(("name", "mass"), MAXIMUM.items())
def test_maximum_mass_is_the_published_one(name, mass):
    assert maximum_mass_star(get_eos(name)).mass == pytest.approx(mass, abs=0.015)


@pytest.mark.parametrize(("name", "radius"), [("SLy4", 9.99), ("BSk24", 11.05), ("BSk21", 11.05)])
def test_radius_at_maximum_mass_is_the_published_one(name, radius):
    """SLy 9.99 km (Douchin & Haensel 2001); BSk21 11.0, BSk24 11.1 km (Pearson et al. 2018); from memory."""
    assert maximum_mass_star(get_eos(name)).radius == pytest.approx(radius, rel=0.01)


@pytest.mark.parametrize("name", TABLE)
def test_structure_agrees_with_an_independent_integration(name):
    rows = np.array(TABLE[name])
    for star, (_, radius, rho_c, inertia) in zip(stars_of_mass(get_eos(name), rows[:, 0]), rows, strict=True):
        assert star.radius == pytest.approx(radius, abs=0.02)
        assert star.central_density / 1e15 == pytest.approx(rho_c, rel=0.006)
        assert star.moment_of_inertia == pytest.approx(inertia, rel=0.003)


@pytest.mark.parametrize("name", ["SLy4", "BSk24", "APR4"])
def test_moment_of_inertia_follows_the_universal_fits(name):
    """Bejger & Haensel 2002, A&A 396, 917; Lattimer & Schutz 2005, ApJ 629, 979 (the second from memory)."""
    for star in stars_of_mass(get_eos(name), [1.0, 1.2, 1.4, 1.6, 1.8, 2.0]):
        y, mr2 = star.mass / star.radius, star.mass * star.radius**2 * 1.98841e33 * 1e10 / 1e45
        bejger_haensel = (2 / 9 * (1 + 5 * y) if y > 0.1 else y / (0.1 + 2 * y)) * mr2
        lattimer_schutz = 0.237 * mr2 * (1 + 4.2 * y + 90 * y**4)
        assert star.moment_of_inertia == pytest.approx(bejger_haensel, rel=0.055)
        assert star.moment_of_inertia == pytest.approx(lattimer_schutz, rel=0.05)


def test_adaptive_integration_in_radius_gives_the_same_star():
    """The textbook equations in r and P with an adaptive stepper, no Hartle trick, no enthalpy."""
    eos = get_eos("SLy4")
    (star,) = sequence(eos, [9.86e14])

    def slope(r, y):
        p, m = np.exp(y[0]), y[1]
        rho = np.exp(np.interp(np.log(p), np.log(eos.pressure), np.log(eos.density)))
        pg = p / C_CGS**2 * UNIT
        return [
            -(rho * UNIT + pg) * (m + 4 * np.pi * r**3 * pg) / (r * (r - 2 * m)) / pg,
            4 * np.pi * r**2 * rho * UNIT,
        ]

    p_c = np.exp(np.interp(np.log(9.86e14), np.log(eos.density), np.log(eos.pressure)))
    surface = lambda r, y: y[0] - np.log(eos.pressure[0])  # noqa: E731
    surface.terminal = True
    found = solve_ivp(slope, (1e-3, 20), [np.log(p_c), 0], events=surface, rtol=1e-8, atol=1e-10)
    assert star.radius == pytest.approx(found.t[-1], rel=3e-4)
    assert star.mass == pytest.approx(found.y[1, -1] / M_SUN_KM, rel=1e-4)


def test_incompressible_star_has_the_closed_form():
    """Schwarzschild 1916: uniform density, P_c/(rho c^2) = (1 - s)/(3 s - 1), s = sqrt(1 - 2GM/Rc^2)."""
    p = np.logspace(28, 36.2, 400)
    rho = 1e15 * (1 + 1e-9 * np.arange(p.size))  # the interpolators need a slope, however small
    eos = EquationOfState("uniform", "invented", rho, p, rho / 1.66e15, np.log1p(p / (1e15 * C_CGS**2)))
    for star in sequence(eos, rho[[200, 300, 390]]):
        s = star.redshift_factor
        p_c = eos.at_enthalpy(star.h[0])[1] / (1e15 * C_CGS**2)
        assert p_c == pytest.approx((1 - s) / (3 * s - 1), rel=1e-4)
        assert star.mass * M_SUN_KM == pytest.approx(4 * np.pi / 3 * 1e15 * UNIT * star.radius**3, rel=1e-5)


def test_core_volume_holds_the_baryons():
    """Rest mass exceeds gravitational mass by the binding energy, 0.084 (M/M_sun)^2 M_sun within a fifth
    (Lattimer & Yahil 1989, ApJ 340, 426)."""
    (star,) = stars_of_mass(get_eos("BSk24"), [1.4])
    n, rho, e_phi, volume = star.core(n_min=1e-4, shells=2000)
    baryons = np.sum(n * 1e39 * volume) * 1.66054e-24 / 1.98841e33
    assert baryons - 1.4 == pytest.approx(0.084 * 1.4**2, rel=0.2)
    assert np.all(np.diff(e_phi) > 0)
    assert np.all(np.diff(rho) < 0)


def test_gravity_and_redshift_of_a_worked_case():
    """M = 1.4, R = 12 km gives x = 0.34455, g_14 = 1.5937, 1 + z = 1.2352 (definitions)."""
    (star,) = stars_of_mass(get_eos("SLy4"), [1.4])
    like = star.__class__(star.eos, 1.4, 12.0, 0.0, 0.0, star.r, star.m, star.h)
    assert like.compactness == pytest.approx(0.34455, abs=2e-5)
    assert like.gravity_14 == pytest.approx(1.5937, abs=2e-4)
    assert 1 / like.redshift_factor == pytest.approx(1.2352, abs=1e-4)


def test_masses_asked_for_are_met_and_impossible_ones_refused():
    eos = get_eos("SLy4")
    assert [s.mass for s in stars_of_mass(eos, [1.0, 1.7, 2.0])] == pytest.approx([1.0, 1.7, 2.0], abs=1e-6)
    with pytest.raises(InputError, match=r"2\.04"):
        stars_of_mass(eos, [2.2])
    with pytest.raises(InputError, match="central densities"):
        sequence(eos, [1e20])
