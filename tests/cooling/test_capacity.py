"""Heat capacity: Yakovlev, Levenfish & Shibanov 1999, Phys. Usp. 42, 737."""

import numpy as np
import pytest

from decayinfer.cooling.capacity import heat_capacity
from decayinfer.cooling.emission import K_0, State
from decayinfer.cooling.matter import Composition
from decayinfer.cooling.superfluidity import heat_capacity_factor

ONE = np.ones(1)


def only(**k):
    """Matter in which one species alone has the density 0.16 fm^-3."""
    return Composition(0.16 * ONE, *(k.get(name, 0.0) * ONE for name in ("n", "p", "e", "mu")))


@pytest.mark.parametrize(
    ("species", "expected", "tolerance"),
    [("n", 1.61e20, 0.003), ("p", 1.60e20, 0.006), ("e", 5.67e19, 0.005)],
)
def test_heat_capacity_of_each_species_at_saturation_density(species, expected, tolerance):
    """1.61e20, 1.60e20 and 5.67e19 T_9 erg cm^-3 K^-1 at n_0 and bare masses (re-derived in that review)."""
    state = State(only(**{species: K_0}), ONE, 0 * ONE, 0 * ONE, mass_n=1.0, mass_p=1.0)
    assert heat_capacity(state)[0] == pytest.approx(expected, rel=tolerance)


def test_heat_capacity_is_linear_in_temperature_and_reduced_by_pairing():
    matter = only(n=K_0, p=0.5, e=0.5)
    normal = [heat_capacity(State(matter, t * ONE, 0 * ONE, 0 * ONE))[0] for t in (0.1, 0.2)]
    assert normal[1] == pytest.approx(2 * normal[0])
    neutrons = heat_capacity(State(only(n=K_0), ONE, 0 * ONE, 0 * ONE))
    paired = heat_capacity(State(only(n=K_0), ONE, 4 * ONE, 0 * ONE))
    assert paired / neutrons == pytest.approx(heat_capacity_factor(4 * ONE, "B"))


def test_muons_share_the_chemical_potential_of_electrons():
    both = heat_capacity(State(only(e=1.0, mu=0.5), ONE, 0 * ONE, 0 * ONE))
    alone = heat_capacity(State(only(e=1.0), ONE, 0 * ONE, 0 * ONE))
    assert both / alone == pytest.approx(1.5)
