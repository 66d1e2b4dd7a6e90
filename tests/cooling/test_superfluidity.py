"""Reduction factors against direct integrals over quasi-particle energies, and the profiles of T_c.

Definitions: Levenfish & Yakovlev 1994, Astron. Rep. 38, 247; Yakovlev & Levenfish 1995, A&A 297, 717;
Yakovlev, Kaminker & Levenfish 1999, A&A 343, 650. Tolerances are what the fits of those papers are seen to
reach here.
"""

import numpy as np
import pytest
from scipy.integrate import quad

from decayinfer.cooling import superfluidity as sf

V = np.array([0.5, 1.0, 2.0, 4.0, 8.0])
STEP, EDGE = 0.02, 45.0
ENERGY = np.arange(-EDGE, EDGE + STEP / 2, STEP)
COSINE, WEIGHT = np.polynomial.legendre.leggauss(12)


def anisotropy(pairing):
    """Squared gap over v^2 on the Fermi surface."""
    return {"A": 1 + 0 * COSINE, "B": 1 + 3 * COSINE**2, "C": 1 - COSINE**2}[pairing]


def occupied(gap):
    """States in each energy bin times the Fermi function, for a particle with a gap."""
    edges = np.concatenate([ENERGY - STEP / 2, [ENERGY[-1] + STEP / 2]])
    momentum = np.sign(edges) * np.sqrt(np.maximum(edges**2 - gap**2, 0))
    return np.diff(momentum) / (np.exp(ENERGY) + 1)


def phase_space(gaps, power):
    """Integral of nu^power over all particles with sum of energies nu."""
    spectrum = occupied(gaps[0])
    for gap in gaps[1:]:
        spectrum = np.convolve(spectrum, occupied(gap))
    nu = -EDGE * len(gaps) + STEP * np.arange(spectrum.size)
    return np.sum(np.where(nu > 0, np.abs(nu) ** power * spectrum, 0))


def suppression(v, pairing, paired, normal, power):
    """Emission with ``paired`` superfluid and ``normal`` other fermions over that without pairing."""
    reference = phase_space([0.0] * (paired + normal), power)
    if pairing == "A":
        return phase_space([v] * paired + [0.0] * normal, power) / reference
    gaps = v * np.sqrt(anisotropy(pairing))
    values = [phase_space([gap] * paired + [0.0] * normal, power) for gap in gaps]
    return np.sum(0.5 * WEIGHT * np.array(values)) / reference


def ln_t_of_gap(v, pairing):
    """ln(T/T_c) from the gap equation, whose logarithmic divergence cancels between T and T_c."""
    scale = anisotropy(pairing)

    def integral(y2):
        def inner(x):
            z = np.sqrt(x * x + y2)
            return np.tanh(x / 2) / x - np.tanh(z / 2) / z

        return quad(inner, 0, 1)[0] + quad(inner, 1, 30)[0] + quad(inner, 30, np.inf)[0]

    values = np.array([integral(v * v * s) for s in scale])
    return -np.sum(WEIGHT * scale * values) / np.sum(WEIGHT * scale)


def heat_capacity(v, pairing):
    """(6/pi^2) <int e^z/(e^z+1)^2 [z^2 - s v (v + t dv/dt)] dx>, from the entropy of quasi-particles."""
    h = 1e-3 * v
    t_dv_dt = 2 * h / (ln_t_of_gap(v + h, pairing) - ln_t_of_gap(v - h, pairing))
    x = (np.arange(6000) + 0.5) * 0.01
    total = 0.0
    for s, w in zip(anisotropy(pairing), WEIGHT, strict=True):
        z = np.sqrt(x**2 + s * v**2)
        numerator = z**2 - s * v * (v + t_dv_dt)
        total += 0.5 * w * np.sum(numerator / (4 * np.cosh(z / 2) ** 2)) * 0.01
    return 6 / np.pi**2 * total


def pair_integral(v, pairing):
    """F(v) = <y^2 int z^4/(e^z + 1)^2 dx> (Yakovlev, Kaminker & Levenfish 1999)."""
    x = (np.arange(6000) + 0.5) * 0.01
    total = 0.0
    for s, w in zip(anisotropy(pairing), WEIGHT, strict=True):
        z = np.sqrt(x**2 + s * v**2)
        total += 0.5 * w * s * v**2 * np.sum(z**4 / (np.exp(z) + 1) ** 2) * 0.01
    return total


def test_phase_space_without_pairing_is_the_published_number():
    """11513 pi^8/120960 for modified Urca, 457 pi^6/5040 for direct Urca (Yakovlev et al. 2001)."""
    assert phase_space([0.0] * 5, 3) == pytest.approx(11513 * np.pi**8 / 120960, rel=1e-3)
    assert phase_space([0.0] * 3, 3) == pytest.approx(457 * np.pi**6 / 5040, rel=1e-3)


@pytest.mark.parametrize(("pairing", "tolerance"), [("A", 0.008), ("B", 0.016), ("C", 0.018)])
def test_gap_solves_the_gap_equation(pairing, tolerance):
    t = np.array([0.1, 0.3, 0.5, 0.7, 0.9, 0.97])
    v = sf.gap(t, pairing)
    for one, fitted in zip(t, v, strict=True):
        low, high = 0.8 * fitted, 1.2 * fitted
        for _ in range(30):
            mid = 0.5 * (low + high)
            low, high = (mid, high) if ln_t_of_gap(mid, pairing) > np.log(one) else (low, mid)
        assert fitted == pytest.approx(mid, rel=tolerance)


def test_gap_at_zero_temperature_is_the_weak_coupling_one():
    """Delta(0)/T_c = 1.764 for singlet pairing (Bardeen, Cooper & Schrieffer 1957); triplet as numeric."""
    for pairing, expected in (("A", 1.764), ("B", 1.188), ("C", 2.030)):
        assert 1e-6 * sf.gap(1e-6, pairing) == pytest.approx(expected, rel=1e-3)
        assert np.all(sf.gap(np.array([1.0, 1.5, np.inf]), pairing) == 0)


@pytest.mark.parametrize(("pairing", "tolerance"), [("A", 0.015), ("B", 0.012), ("C", 0.025)])
def test_heat_capacity(pairing, tolerance):
    expected = [heat_capacity(v, pairing) for v in V]
    assert sf.heat_capacity_factor(V, pairing) == pytest.approx(expected, rel=tolerance)
    assert sf.heat_capacity_factor(np.array([0.0]), pairing) == 1


@pytest.mark.parametrize(("pairing", "tolerance"), [("A", 0.007), ("B", 0.019), ("C", 0.01)])
def test_direct_urca(pairing, tolerance):
    expected = [suppression(v, pairing, 1, 2, 3) for v in V]
    assert sf.direct_urca_factor(V, pairing) == pytest.approx(expected, rel=tolerance)


@pytest.mark.parametrize(("pairing", "tolerance"), [("A", 0.011), ("B", 0.025)])
def test_modified_urca(pairing, tolerance):
    expected = [suppression(v, pairing, 1, 4, 3) for v in V]
    assert sf.modified_urca_factor(V, pairing) == pytest.approx(expected, rel=tolerance)


def test_bremsstrahlung_of_one_species():
    expected = [suppression(v, "A", 4, 0, 4) for v in V]
    assert sf.bremsstrahlung_factor(V[:3]) == pytest.approx(expected[:3], rel=0.01)
    assert sf.bremsstrahlung_factor(V) == pytest.approx(expected, rel=0.067)  # at v = 8, 1e-5 of the whole


def test_bremsstrahlung_of_two_species():
    expected = [suppression(v, "A", 2, 2, 4) for v in V]
    assert sf.mixed_bremsstrahlung_factor(V) == pytest.approx(expected, rel=0.043)  # worst near v = 0.7


@pytest.mark.parametrize(("pairing", "tolerance"), [("A", 0.011), ("B", 0.035), ("C", 0.03)])
def test_pair_emission(pairing, tolerance):
    expected = [pair_integral(v, pairing) for v in V]
    assert sf.pair_emission(V, pairing) == pytest.approx(expected, rel=tolerance)


@pytest.mark.parametrize(
    "factor",
    [
        lambda v: sf.direct_urca_factor(v, "A"),
        lambda v: sf.direct_urca_factor(v, "B"),
        lambda v: sf.modified_urca_factor(v, "A"),
        lambda v: sf.modified_urca_factor(v, "B"),
        sf.bremsstrahlung_factor,
    ],
)
def test_factors_fall_from_one_without_a_step(factor):
    v = np.linspace(0, 40, 4001)
    values = factor(v)
    assert values[0] == pytest.approx(1, abs=2e-3)
    assert np.all(np.diff(values) < 1e-12)
    assert values[-1] < 1e-9


def test_the_mixed_bremsstrahlung_fit_overshoots_one_by_less_than_its_error():
    v = np.linspace(0, 40, 4001)
    values = sf.mixed_bremsstrahlung_factor(v)
    assert values[0] == pytest.approx(1, abs=1e-12)
    assert values.max() < 1.02
    assert np.all(np.diff(values[v > 0.4]) < 0)


@pytest.mark.parametrize("name", sf.CRITICAL_TEMPERATURES)
def test_critical_temperatures_peak_where_they_say(name):
    profile = sf.CRITICAL_TEMPERATURES[name]
    k = np.linspace(0, 3, 3001)
    assert profile(k).max() == pytest.approx(profile.peak, rel=1e-5)
    assert np.all(profile(k)[(k <= profile.k_0) | (k >= profile.k_2)] == 0)
