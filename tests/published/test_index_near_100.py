"""Where n near 100 comes from: the phonon time that gives it, star by star and scenario by scenario."""

import numpy as np
import pytest

from decayinfer.catalog.pulsar import Pulsar
from decayinfer.channels.registry import load_channel
from decayinfer.cooling.recipes import RECIPES
from decayinfer.cooling.registry import load_scenario
from decayinfer.inference.density import evaluate
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.physics.conduction import density_from_phonon_time
from decayinfer.physics.constants import YEAR_S

MASSES = np.array([1.1, 1.25, 1.4, 1.6, 1.8])
AGES = (1e4, 3e4, 1e5)  # characteristic, yr
PRIORS = Priors()


def needed(name, tau_c):
    """Phonon time [yr] at which stars of `MASSES`, born fast, have n = 100 at this characteristic age."""
    star = Pulsar(
        name="Ruff", period=0.2, period_derivative=0.1 / (tau_c * YEAR_S), braking_index=100.0,
        braking_index_err_minus=5.0, braking_index_err_plus=5.0,
    )  # fmt: skip
    numbers = make_problem(star, load_channel("phonon"), load_scenario(name), PRIORS)
    z = np.zeros((MASSES.size, 8))
    z[:, 0], z[:, 4], z[:, 6] = np.log((MASSES - 1.0) / (2.0 - MASSES)), -5.0, numbers.normals[0, 6]
    found = evaluate(z, numbers).physical
    np.testing.assert_allclose(found.mass, MASSES)
    np.testing.assert_allclose(found.index, 100.0)
    return np.exp(found.ln_phonon_time)


def of(superfluidity):
    return [n for n, r in RECIPES.items() if r.superfluidity == superfluidity and not r.direct_urca]


@pytest.mark.parametrize("name", RECIPES)
@pytest.mark.parametrize("tau_c", AGES)
def test_light_stars_reach_it_with_longer_phonon_times(name, tau_c):
    """Common practice: light stars are warmer; the lighter the star, the more ordinary the phonon time it needs."""
    assert np.all(np.diff(needed(name, tau_c)) < 0.0)


@pytest.mark.parametrize("name", of("protons"))
@pytest.mark.parametrize("tau_c", AGES)
def test_slowly_cooling_stars_reach_it_with_longer_phonon_times(name, tau_c):
    """Common practice: strong proton pairing slows the cooling; it allows phonon times 3.5 to 5 times longer."""
    ratio = needed(name, tau_c) / needed(name.replace("protons", "normal"), tau_c)
    assert np.all((ratio > 3.5) & (ratio < 5.0))


@pytest.mark.parametrize("name", [*of("protons"), *of("fading")])
def test_the_phonon_times_of_light_slowly_cooling_stars_are_realistic(name):
    """Common practice: n near 100 is reached at tau_c of 1e4 to 1e5 yr.

    At 1e5 yr by 4e4 to 5e4 yr, one standard deviation below the prior's median; at 1e4 yr by 1e4 yr. The layers are
    those of the inner crust, between neutron drip and 1e14 g/cm^3, for which the times hold (Cumming, Arras & Zweibel
    2004, ApJ 609, 999).
    """
    gravity = load_scenario(name).gravity_14(MASSES)
    for tau_c in AGES:
        times = needed(name, tau_c)[:2]
        depth = (np.log(times) - np.log(PRIORS.phonon_time_median)) / PRIORS.phonon_time_sd
        assert np.all(depth > (-1.2 if tau_c == 1e5 else -2.5))
        density = density_from_phonon_time(times, gravity[:2])
        assert np.all((density > 0.0043) & (density < 1.0))


@pytest.mark.parametrize("name", of("normal"))
def test_without_pairing_it_takes_an_unusual_phonon_time(name):
    """About 1e4 yr at 1e5 yr: more than two standard deviations below the median, for the lightest too."""
    times = needed(name, 1e5)
    assert np.all(np.log(times) < np.log(PRIORS.phonon_time_median) - 2.0 * PRIORS.phonon_time_sd)
    assert times[0] > 1e4


@pytest.mark.parametrize("name", [n for n in RECIPES if n.endswith("urca") and "normal" in n])
def test_direct_urca_puts_it_out_of_reach_of_heavy_stars(name):
    assert needed(name, 1e5)[-1] < 100.0
