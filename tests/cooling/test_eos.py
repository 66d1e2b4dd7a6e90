import numpy as np
import pytest

from decayinfer.cooling.constants import MASS_PER_BARYON
from decayinfer.cooling.eos import EOS_NAMES, EquationOfState, eos_from_table, get_eos
from decayinfer.cooling.stars import stars_of_mass
from decayinfer.errors import InputError, UnknownNameError
from decayinfer.physics.constants import C_CGS


@pytest.mark.parametrize("name", EOS_NAMES)
def test_pressure_rises_and_sound_stays_below_light_where_stars_live(name):
    eos = get_eos(name)
    assert np.all(np.diff(eos.pressure) > 0)
    speed = np.gradient(eos.pressure, eos.density) / C_CGS**2
    # the centre of a 2 M_sun star; the fits turn superluminal further in, the published APR forms most
    centre = stars_of_mass(eos, [2.0])[0].central_density
    assert speed[eos.density < centre].max() < 1.0


@pytest.mark.parametrize("name", EOS_NAMES)
def test_baryon_density_obeys_the_first_law(name):
    """P = n^2 d(epsilon/n)/dn at zero temperature (first law)."""
    eos = get_eos(name)
    energy_per_baryon = eos.density * C_CGS**2 / (eos.baryon_density * 1e39)
    pressure = (eos.baryon_density * 1e39) ** 2 * np.gradient(energy_per_baryon, eos.baryon_density * 1e39)
    inner = (eos.density > 2e14) & (eos.density < 3e15)
    ratio = pressure[inner] / eos.pressure[inner]
    assert np.median(np.abs(ratio - 1)) < 1e-3


@pytest.mark.parametrize("name", EOS_NAMES)
def test_saturation_density_has_its_usual_mass_density(name):
    """rho_0 = 2.7e14 g cm^-3 at n_0 = 0.16 fm^-3 (common practice)."""
    eos = get_eos(name)
    rho = np.interp(0.16, eos.baryon_density, eos.density)
    assert rho == pytest.approx(2.7e14, rel=0.02)
    assert rho > 0.16e39 * MASS_PER_BARYON


def test_enthalpy_inverts():
    eos = get_eos("SLy4")
    rho = np.logspace(6, 15.5, 50)
    assert eos.at_enthalpy(eos.enthalpy_at(rho))[0] == pytest.approx(rho, rel=1e-5)


def test_unknown_name_lists_the_known():
    with pytest.raises(UnknownNameError, match="SLy4"):
        get_eos("unheard-of")


def test_table_of_an_analytic_form_gives_it_back():
    eos = get_eos("BSk24")
    table = eos_from_table(eos.density[::20], eos.pressure[::20], name="sampled")
    assert isinstance(table, EquationOfState)
    n = np.interp(np.log(1e15), np.log(table.density), table.baryon_density)
    assert n == pytest.approx(np.interp(np.log(1e15), np.log(eos.density), eos.baryon_density), rel=1e-3)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda rho, p: (rho[:5], p[:5]), "at least 20 rows"),
        (lambda rho, p: (rho, p[::-1]), "pressure must increase"),
        (lambda rho, p: (np.r_[rho[0], rho[0], rho[2:]], p), "row 2"),
        (lambda rho, p: (rho[100:], p[100:]), "add a crust"),
        (lambda rho, p: (np.r_[np.nan, rho[1:]], p), "finite and positive"),
        (lambda rho, p: (rho, p * np.where(rho > 1e15, 50, 1)), "faster than light"),
    ],
)
def test_bad_tables_are_refused_with_the_reason(change, words):
    eos = get_eos("SLy4")
    with pytest.raises(InputError, match=words):
        eos_from_table(*change(eos.density[::20], eos.pressure[::20]), name="mine")
