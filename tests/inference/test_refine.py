"""Further measurements on top of a sampled density: against quadrature, against brute force, and contradictions."""

import runpy
from dataclasses import replace
from functools import cache
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from scipy import stats

from decayinfer.channels.registry import load_channel
from decayinfer.cooling.constants import STEFAN_BOLTZMANN
from decayinfer.cooling.registry import load_scenario
from decayinfer.errors import SamplingError
from decayinfer.inference.annealing import sound
from decayinfer.inference.density import evaluate
from decayinfer.inference.explore import Exploration, Quality, explore
from decayinfer.inference.importance import Weighted, importance_sample
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import make_problem
from decayinfer.inference.refine import (
    DISAGREE,
    contradiction,
    contradictions,
    decay_target,
    refine,
    refine_run,
)
from decayinfer.inference.report import parameters
from decayinfer.inference.settings import FitSettings
from decayinfer.inference.state import envelope_of, ln_measured, state_of
from decayinfer.measurements import Age, Obliquity, State, SurfaceTemperature

ALPHA = 1e-3
LN_EVIDENCE = -4.2  # of the toy density
ACTIVE = np.array([1.0, 0.0, 1.0])  # the coordinate between is idle


def toy(points):
    """A correlated normal in two coordinates, ln age and ln temperature bent against it; one coordinate idle."""
    x, idle, y = points.T
    ln_density = stats.multivariate_normal([0.0, 0.0], [[1.0, 0.6], [0.6, 1.0]]).logpdf(points[:, [0, 2]])
    nothing = np.full(x.size, np.nan)
    age, temperature = 1e4 * np.exp(x), 1e6 * np.exp(0.3 * y - 0.2 * x**2)
    star = State(age, nothing, nothing, temperature, nothing, None, nothing)
    return ln_density + stats.norm.logpdf(idle) + LN_EVIDENCE, star


@cache
def toy_sample():
    """An importance sample of the toy, from a wider normal."""
    points = np.random.default_rng(1).standard_normal((4000, 3)) * [1.5, 1.0, 1.5]
    ln_proposal = stats.norm.logpdf(points, scale=[1.5, 1.0, 1.5]).sum(axis=1)
    return Weighted(points, toy(points)[0] - ln_proposal)


def by_quadrature(measurements):
    """Evidence, and mean and standard deviation of ln age, of the toy, by trapezoids on a fine grid."""
    axis = np.linspace(-7.0, 7.0, 1401)
    x, y = np.meshgrid(axis, axis, indexing="ij")
    points = np.column_stack([x.ravel(), np.zeros(x.size), y.ravel()])
    ln_density, star = toy(points)
    ln_product = (ln_density - stats.norm.logpdf(0.0) + ln_measured(star, measurements)).reshape(x.shape)
    density = np.exp(ln_product - ln_product.max())

    def integral(values):
        return np.trapezoid(np.trapezoid(values, axis), axis)

    mass = integral(density)
    mean = integral(density * x) / mass
    return np.log(mass) + ln_product.max(), mean, np.sqrt(integral(density * (x - mean) ** 2) / mass)


CASES = {
    "age": [Age(value=2e4, err_minus=2e3, err_plus=5e3)],
    "interval": [Age(lower=3e3, upper=5e3)],
    "limit": [SurfaceTemperature(upper=6e5)],
    "both": [
        Age(value=3e4, err_minus=6e2, err_plus=6e2),
        SurfaceTemperature(value=8e5, err_minus=1.6e4, err_plus=1.6e4),
    ],
    "far": [Age(value=9e5, err_minus=2e4, err_plus=2e4)],
}


@pytest.mark.parametrize("measurements", CASES.values(), ids=CASES)
def test_two_parameters_against_quadrature(measurements):
    ln_evidence, mean, sd = by_quadrature(measurements)
    refined = refine(toy, ACTIVE, toy_sample(), measurements, np.random.default_rng(2))
    assert sound(refined)
    assert refined.effective_size >= 400.0
    error = max(refined.ln_evidence_err, 1e-3)
    assert abs(refined.ln_evidence - ln_evidence) < 3.9 * error  # a tail of 1e-4
    x = refined.points[:, 0]
    found = np.sum(refined.weights * x)
    assert abs(found - mean) < 3.9 * sd / np.sqrt(refined.effective_size)
    spread = np.sqrt(np.sum(refined.weights * (x - found) ** 2))
    assert spread == pytest.approx(sd, rel=5.0 / np.sqrt(refined.effective_size))


def test_the_evidence_is_unbiased():
    """Forty seeds: pulls of ln Z have mean zero and their errors are no smaller than they scatter."""
    ln_evidence = by_quadrature(CASES["both"])[0]
    pulls = []
    for seed in range(40):
        refined = refine(toy, ACTIVE, toy_sample(), CASES["both"], np.random.default_rng(seed))
        pulls.append((refined.ln_evidence - ln_evidence) / refined.ln_evidence_err)
    assert abs(np.mean(pulls)) < stats.norm.isf(ALPHA / 2) / np.sqrt(40)
    assert np.sum(np.square(pulls)) < stats.chi2.ppf(1 - ALPHA / 2, 40)


def test_idle_coordinates_stay_standard_normal():
    refined = refine(toy, ACTIVE, toy_sample(), CASES["both"], np.random.default_rng(3))
    idle = Weighted(refined.points[:, 1:2], refined.ln_weights).resample(1000, np.random.default_rng(4))[:, 0]
    assert stats.kstest(np.unique(idle), "norm").pvalue > ALPHA
    moved = Weighted(refined.points[:, :1], refined.ln_weights).resample(1000, np.random.default_rng(4))[:, 0]
    assert stats.kstest(np.unique(moved), "norm").pvalue < ALPHA  # the control: a coordinate in use


def test_a_mild_measurement_only_reweights():
    mild = [Age(value=1e4, err_minus=2e4, err_plus=2e4)]
    refined = refine(toy, ACTIVE, toy_sample(), mild, np.random.default_rng(5))
    np.testing.assert_array_equal(refined.points, toy_sample().points)
    assert refine(toy, ACTIVE, toy_sample(), [], np.random.default_rng(5)) is toy_sample()


def test_one_that_excludes_everything_is_named():
    def nowhere(points):
        ln_density, star = toy(points)
        return ln_density, star._replace(age=np.full(points.shape[0], np.nan))

    with pytest.raises(SamplingError, match="age 20000"):
        refine(nowhere, ACTIVE, toy_sample(), CASES["age"], np.random.default_rng(6))


# --- a real problem -------------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def wren(tools):
    """Problem, target and importance sample of the tests' object under phonon scattering, 4000 points as in a fit."""
    return prepared(tools, "phonon", 4000)


def prepared(tools, channel, count):
    problem = tools.problem(channel)
    rng = np.random.default_rng(11)
    draws = tools.typical_points(problem, 400, rng)
    draws = importance_sample(problem, draws, 4000, rng).resample(2000, rng)
    target = decay_target(problem, load_channel(channel), tools.scenario("candle"))
    return SimpleNamespace(
        problem=problem, target=target, weighted=importance_sample(problem, draws, count, rng)
    )


AGE = Age(value=2.2e4, err_minus=3e3, err_plus=3e3)
HOT = SurfaceTemperature(value=1.0e6, err_minus=4e4, err_plus=4e4)
TIGHT = [
    Age(value=1.5e4, err_minus=300.0, err_plus=300.0),
    SurfaceTemperature(value=1e6, err_minus=2e4, err_plus=2e4),
]


def quantiles(weighted, values):
    order = np.argsort(values)
    return np.interp([0.05, 0.5, 0.95], np.cumsum(weighted.weights[order]), values[order])


@pytest.mark.slow
def test_against_brute_force(tools, wren):
    """Plain reweighting of 200000 points: evidence and the 90 % intervals of age, mass and temperature."""
    brute = prepared(tools, "phonon", 200_000)
    measurements = [AGE, HOT]
    star = brute.target(brute.weighted.points)[1]
    plain = replace(brute.weighted, ln_weights=brute.weighted.ln_weights + ln_measured(star, measurements))
    refined = refine(wren.target, wren.problem.active, wren.weighted, measurements, np.random.default_rng(12))
    assert plain.effective_size > 1000.0
    assert refined.effective_size >= 400.0
    error = np.hypot(plain.ln_evidence_err, refined.ln_evidence_err)
    assert abs(refined.ln_evidence - plain.ln_evidence) < 3.9 * error
    after = wren.target(refined.points)[1]
    for name in ("age", "mass", "surface_temperature"):
        a, b = quantiles(plain, getattr(star, name)), quantiles(refined, getattr(after, name))
        width = a[2] - a[0]
        # a quantile at 5 % of an effective size of 1000 is known to a few per cent of the interval
        np.testing.assert_allclose(b, a, atol=0.08 * width, rtol=0.0)
        assert b[2] - b[0] == pytest.approx(width, rel=0.12)


@pytest.mark.parametrize("channel", ["phonon", "impurity+phonon+hall"])
def test_a_tight_age_and_temperature_at_once(tools, channel):
    """Two per cent each."""
    case = prepared(tools, channel, 4000)
    refined = refine(case.target, case.problem.active, case.weighted, TIGHT, np.random.default_rng(13))
    assert refined.effective_size >= 400.0
    assert sound(refined)
    star = case.target(refined.points)[1]
    assert np.sqrt(np.sum(refined.weights * (star.age / 1.5e4 - 1.0) ** 2)) < 0.04
    plain = case.weighted.ln_weights + ln_measured(case.target(case.weighted.points)[1], TIGHT)
    assert Weighted(case.weighted.points, plain).effective_size < 400.0  # which weights alone do not give


def test_a_measurement_narrows(wren):
    refined = refine(wren.target, wren.problem.active, wren.weighted, [AGE], np.random.default_rng(14))
    before, after = (wren.target(w.points)[1].age for w in (wren.weighted, refined))
    low, _, high = quantiles(wren.weighted, before)
    narrow_low, _, narrow_high = quantiles(refined, after)
    assert narrow_high - narrow_low < 0.5 * (high - low)
    assert 1.6e4 < narrow_low < narrow_high < 2.8e4


def test_an_obliquity_moves_the_evidence_alone(wren):
    """Decay says nothing about the angle: every point has the likelihood of isotropic directions."""
    measured = [Obliquity(value=60.0, err_minus=5.0, err_plus=5.0)]
    refined = refine(wren.target, wren.problem.active, wren.weighted, measured, np.random.default_rng(15))
    np.testing.assert_allclose(refined.weights, wren.weighted.weights, rtol=1e-9)
    # sin(60 deg) per radian, averaged over the Gaussian
    expected = np.log(np.sin(np.radians(60.0)) * np.pi / 180.0 * np.exp(-0.5 * np.radians(5.0) ** 2))
    assert refined.ln_evidence - wren.weighted.ln_evidence == pytest.approx(expected, abs=1e-4)
    assert contradictions(wren.target, wren.weighted, measured) == {"obliquity": 1.0}


def test_an_age_ten_times_the_characteristic_age_contradicts(tools, wren):
    tau = tools.WREN.characteristic_age
    old = Age(value=10.0 * tau, err_minus=tau, err_plus=tau)
    assert contradictions(wren.target, wren.weighted, [old, AGE])["age"] < DISAGREE
    assert min(contradictions(wren.target, wren.weighted, [AGE, HOT]).values()) > 0.1
    cold = SurfaceTemperature(upper=3e5)
    assert contradiction(wren.weighted, wren.target(wren.weighted.points)[1], cold) < DISAGREE
    # and the product can still be integrated
    assert sound(refine(wren.target, wren.problem.active, wren.weighted, [old], np.random.default_rng(16)))


def test_a_run_is_refined(wren):
    rng = np.random.default_rng(17)
    points = wren.weighted.resample(2000, rng).reshape(2, 1000, -1)
    quality = Quality(900.0, 900.0, 1.0, 3, 2000)
    run = Exploration(points, np.ones((2, 1000), dtype=bool), quality, wren.weighted, 7, True)
    refined, tails = refine_run(run, wren.target, wren.problem.active, [AGE], rng)
    assert refined.points.shape == points.shape
    assert not refined.diverging.any()
    assert refined.converged
    assert refined.gradients == 7
    assert set(tails) == {"age"}
    assert 400.0 < refined.quality.ess_bulk <= refined.weighted.effective_size
    assert refined.quality.r_hat < 1.01
    age = wren.target(refined.points.reshape(2000, -1))[1].age
    expected = quantiles(refined.weighted, wren.target(refined.weighted.points)[1].age)
    np.testing.assert_allclose(np.quantile(age, [0.05, 0.5, 0.95]), expected, rtol=0.05)
    same, none = refine_run(run, wren.target, wren.problem.active, (), rng)
    assert same is run
    assert none == {}


# --- the state of a star --------------------------------------------------------------------------------------


def test_luminosity_and_temperature_at_infinity_agree(tools):
    """L_inf = 4 pi R_inf^2 sigma T_inf^4 with R_inf = R/sqrt(1 - 2GM/Rc^2) (Thorne 1977, ApJ 212, 825, from memory)."""
    star = tools.scenario("candle")
    mass = np.array([1.1, 1.4, 1.9])
    known = {
        "mass": mass,
        "age": 0.0 * mass,
        "braking_index": 0.0 * mass,
        "crust_temperature": 2e8 + 0.0 * mass,
    }
    state = state_of(known, star)
    apparent = star.radius_km(mass) * 1e5 / star.redshift_factor(mass)
    expected = 4.0 * np.pi * apparent**2 * STEFAN_BOLTZMANN * state.surface_temperature**4
    np.testing.assert_allclose(state.luminosity, expected, rtol=1e-12)
    assert np.all((state.surface_temperature > 5e5) & (state.surface_temperature < 2e6))
    assert state.obliquity is None


def test_the_envelope_is_the_scenario_s(tools):
    star = tools.scenario("candle")
    light = replace(star, properties={"envelope": "light"})
    table = replace(star, properties={"envelope": "user's table"})
    assert [envelope_of(s) for s in (star, light, table)] == ["iron", "light", "iron"]
    one = np.ones(1)
    known = {"mass": 1.4 * one, "age": one, "braking_index": one, "crust_temperature": 1e8 * one}
    hot, iron = (state_of(known, s).surface_temperature[0] for s in (light, table))
    assert (
        hot > 1.2 * iron
    )  # light elements conduct better (Potekhin, Chabrier & Yakovlev 1997, A&A 323, 415)


def test_states_are_those_of_the_reported_parameters(tools, wren):
    points = wren.weighted.points[:50]
    reported = parameters(evaluate(points, wren.problem), wren.problem, load_channel("phonon"))
    ln_density, state = wren.target(points)
    for name in ("age", "mass", "crust_temperature", "braking_index"):
        np.testing.assert_array_equal(getattr(state, name), reported[name])
    np.testing.assert_array_equal(ln_density, evaluate(points, wren.problem).ln_density(wren.problem))


@pytest.mark.slow
def test_the_documented_example():
    """examples/age_and_temperature.py: age, mass and phonon time tighten to less than half; a wrong age contradicts."""
    path = Path(__file__).parents[2] / "examples" / "age_and_temperature.py"
    example = runpy.run_path(str(path), run_name="example")
    channel, scenario = load_channel(example["CHANNEL"]), load_scenario(example["SCENARIO"])
    problem = make_problem(example["BARE"], channel, scenario, Priors())
    target = decay_target(problem, channel, scenario)
    run = explore(problem, FitSettings(), np.random.SeedSequence(1))

    def intervals(exploration):
        points = exploration.points.reshape(-1, exploration.points.shape[-1])
        known = parameters(evaluate(points, problem), problem, channel)
        return {name: np.quantile(known[name], [0.05, 0.95]) for name in ("age", "mass", "phonon_time")}

    known, tails = refine_run(
        run, target, problem.active, example["KNOWN"].measurements, np.random.default_rng(2)
    )
    assert run.converged
    assert known.converged
    assert min(tails.values()) > 0.05
    before, after = intervals(run), intervals(known)
    for name in before:
        assert np.ptp(after[name]) < 0.5 * np.ptp(before[name]), name
    assert contradictions(target, run.weighted, example["TOO_OLD"].measurements)["age"] < DISAGREE
