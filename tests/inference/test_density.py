"""The log density: prior times Jacobian by brute force, NumPy against PyMC, gradient against differences."""

import ctypes

import numpy as np
import pymc as pm
import pytest
from pytensor.compile.mode import Mode
from scipy import integrate, stats

from decayinfer.channels.registry import load_channel
from decayinfer.inference.density import evaluate
from decayinfer.inference.engine import engine
from decayinfer.inference.forward import draw_prior
from decayinfer.inference.forward import evolve as package_evolve
from decayinfer.inference.model import build_model
from decayinfer.inference.priors import Priors
from decayinfer.inference.problem import COORDINATES
from decayinfer.physics.lattice import FREEZE_OUT

CHANNELS = [
    "constant",
    "impurity",
    "phonon",
    "hall",
    "impurity+phonon",
    "impurity+hall",
    "phonon+hall",
    "impurity+phonon+hall",
]
STEP = 1e-4


# --- prior and Jacobian -----------------------------------------------------------------------------------


def prior_of(channel, law, priors):
    """Physical parameters that a channel has, by field of the forward simulator: ln pdf, and whether it is in ln."""

    def lognormal(name):
        median, sd = getattr(priors, f"{name}_median"), getattr(priors, f"{name}_sd")
        return stats.norm(np.log(median), sd), True

    def decimal(name, unit):
        mean, sd = getattr(priors, f"{name}_log10_mean"), getattr(priors, f"{name}_log10_sd")
        return stats.norm(np.log(10.0) * (mean - unit), np.log(10.0) * sd), True

    edges = [(edge - priors.mass_mean) / priors.mass_sd for edge in (1.0, 2.0)]
    parts = channel.split("+")
    chosen = {
        "mass": (stats.truncnorm(*edges, loc=priors.mass_mean, scale=priors.mass_sd), False),
        "birth_field": decimal("birth_field", 12.0),
        "birth_period": decimal("birth_period", 0.0),
        "age": (FlatAge(priors.max_age), False),
    }
    if channel != "constant":
        chosen["phonon_time"] = lognormal("phonon_time")
    if "impurity" in parts:
        chosen["impurity_parameter"] = lognormal("impurity_parameter")
    if "hall" in parts:
        chosen["hall_factor"], chosen["hall_times"] = lognormal("hall_factor"), lognormal("attractor_times")
    if "phonon" in parts and law != "none":
        ln_umklapp = stats.norm(np.log(priors.umklapp_median / 1e8), priors.umklapp_sd)
        chosen["umklapp_temperature"] = ln_umklapp, True
    return chosen


class FlatAge:
    """Constant birth rate up to the largest age, with the taper 1/(1 + (t/T)^8); normalised by quadrature."""

    def __init__(self, largest):
        self.largest = largest
        self.ln_norm = np.log(largest * integrate.quad(lambda x: 1.0 / (1.0 + x**8), 0.0, np.inf)[0])

    def logpdf(self, age):
        return -np.log1p((age / self.largest) ** 8) - self.ln_norm


def forward_map(tools, forward, numbers, channel, scenario, law, names, base):
    """Coordinates in use, ln P and ln Pdot as a function of the physical parameters `names`, (k, n) to (k, n)."""
    logged = [name not in ("mass", "age") for name in names]

    def mapped(values):
        changed = {name: np.exp(v) if log else v for name, v, log in zip(names, values, logged, strict=True)}
        kept = {name: np.broadcast_to(v, values.shape[1]) for name, v in vars(base).items()}
        seen = tools.observe(forward, forward.Draws(**(kept | changed)), scenario, channel=channel, law=law)
        centre, width, tail = numbers.warp
        seen["logit_mass"] = -np.log(1.0 / (seen["logit_mass"] - 1.0) - 1.0)
        if "warped_index" in seen:
            excess = seen["warped_index"]
            if numbers.shear:  # the coordinate follows the drift before the switch, n - 3 over S(t)
                excess = excess + np.log1p(np.exp(-4.0 * seen["ln_attractor_ratio"]))
            seen["warped_index"] = np.arcsinh(tail * (excess - centre) / width) / tail
        used = [name for name, active in zip(COORDINATES, numbers.active, strict=True) if active]
        return np.array([seen[name] for name in (*used, "ln_period", "ln_period_derivative")])

    return mapped


@pytest.mark.parametrize(
    ("name", "law"), [("candle", "exponential"), ("urca", "none"), ("slow-candle", "cut")]
)
@pytest.mark.parametrize("channel", CHANNELS)
def test_density_is_the_prior_times_the_determinant_of_the_forward_map(
    tools, forward, channel, name, law, rng
):
    r"""p(z, ln P, ln Pdot) = p(physical) |d physical/d(z, ln P, ln Pdot)|: the change of variables itself.

    The determinant of (physical) -> (coordinates, ln P, ln Pdot) is taken by central differences of the forward
    simulator, which knows nothing of the closed Jacobian. Prior densities are scipy's. Coordinates that the
    channel does not use are standard normal.
    """
    numbers = tools.problem(channel, name, priors=Priors(freeze_out=law))
    for point in tools.typical_points(numbers, 2, rng):
        check_change_of_variables(tools, forward, numbers, point, channel, name, law)


def test_sheared_coordinates_have_the_same_determinant(tools, forward, rng):
    """Hall drift with n free samples n - 3 over the switch: a shear, whose determinant is one."""
    numbers = tools.problem("hall").without_index()
    assert numbers.shear == 1.0
    for point in tools.typical_points(numbers, 3, rng):
        check_change_of_variables(tools, forward, numbers, point, "hall", "candle", "none")


def check_change_of_variables(tools, forward, numbers, point, channel, name, law):
    scenario, chosen = tools.scenario(name), prior_of(channel, law, Priors(freeze_out=law))
    evaluation = evaluate(point[None], numbers)
    draws = tools.draws_of(forward, evaluation.physical)[0]
    start = np.array([np.log(getattr(draws, n)) if chosen[n][1] else getattr(draws, n) for n in chosen])
    ln_pdf = sum(chosen[n][0].logpdf(value) for n, value in zip(chosen, start, strict=True))
    mapped = forward_map(tools, forward, numbers, channel, scenario, FREEZE_OUT[law], list(chosen), draws)
    steps = np.where(np.array(list(chosen)) == "age", STEP * draws.age, STEP)
    shifts = np.diag(steps)
    both = mapped(start[:, None] + np.hstack([shifts, -shifts]))
    half = len(steps)
    slopes = (both[:, :half] - both[:, half:]) / (2.0 * steps)
    idle = point[numbers.active == 0.0]
    expected = ln_pdf - np.linalg.slogdet(slopes)[1] + stats.norm.logpdf(idle).sum()
    assert evaluation.ln_prior[0] == pytest.approx(expected, abs=1e-5)


# --- NumPy and PyMC ---------------------------------------------------------------------------------------


@pytest.fixture(scope="module")
def model(tools):
    """The PyMC model with its log density, run operation by operation: nothing to compile."""
    model = build_model(tools.problem("impurity+phonon+hall"))
    return model, model.compile_logp(mode=Mode("py", "merge"))


@pytest.mark.parametrize(
    "changes", [{}, {"braking_index": np.nan, "braking_index_limit": 15.0}], ids=["n", "limit"]
)
@pytest.mark.parametrize("scenario", ["candle", "slow-candle"])
@pytest.mark.parametrize("channel", CHANNELS)
def test_numpy_density_is_that_of_the_model(tools, model, channel, scenario, changes, rng):
    """To 1e-9, with and without the likelihood of n."""
    numbers = tools.problem(channel, scenario, **changes)
    built, logp = model
    for used in (numbers, numbers.without_index()):
        points = tools.typical_points(used, 2, rng)
        with built:
            pm.set_data(used._asdict())
        expected = [float(logp({"coordinates": point})) for point in points]
        np.testing.assert_allclose(evaluate(points, used).ln_density(used), expected, rtol=1e-9, atol=1e-9)


class Compiled:
    """The log density and gradient that the sampler calls, through its C function."""

    def __init__(self, numbers):
        self.compiled = engine().with_numbers(numbers)

    def __call__(self, point):
        gradient, value = np.empty(8), ctypes.c_double()
        pointer = ctypes.POINTER(ctypes.c_double)
        point = np.ascontiguousarray(point)
        function = self.compiled.compiled_logp_func.ctypes
        arrays = point.ctypes.data_as(pointer), gradient.ctypes.data_as(pointer), ctypes.pointer(value)
        assert function(8, *arrays, self.compiled.user_data.ctypes.data) == 0
        return value.value, gradient


@pytest.mark.slow  # compiles the model
@pytest.mark.parametrize("scenario", ["candle", "urca"])
@pytest.mark.parametrize("channel", CHANNELS)
def test_the_sampler_s_density_and_gradient(tools, channel, scenario, rng):
    """The compiled density is the NumPy one to 1e-9; its gradient that of five-point differences to 1e-6."""
    numbers = tools.problem(channel, scenario)
    compiled = Compiled(numbers)
    for point in tools.typical_points(numbers, 3, rng):
        value, gradient = compiled(point)
        assert value == pytest.approx(
            evaluate(point[None], numbers).ln_density(numbers)[0], rel=1e-9, abs=1e-9
        )
        h = 1e-3
        steps = h * np.array([-2.0, -1.0, 1.0, 2.0])[:, None, None] * np.eye(8)
        around = evaluate((point + steps).reshape(-1, 8), numbers).ln_density(numbers).reshape(4, 8)
        expected = np.array([1.0, -8.0, 8.0, -1.0]) @ around / (12.0 * h)
        np.testing.assert_allclose(gradient, expected, rtol=1e-6, atol=1e-6)


# --- forward simulation -----------------------------------------------------------------------------------


@pytest.mark.parametrize("law", ["none", "exponential", "cut"])
@pytest.mark.parametrize("channel", CHANNELS)
def test_the_package_evolves_prior_draws_as_the_equations_do(tools, forward, channel, law):
    """Quadrature of the closed history against Runge-Kutta steps of the equations, on prior draws.

    1e-4 for every star whose index could be measured (the sharpest freeze-out errs most), 1e-6 in the median.
    """
    scenario, priors = tools.scenario("candle"), Priors(freeze_out=law)
    prior = draw_prior(400, priors, np.random.default_rng(11))
    ours = package_evolve(prior, load_channel(channel), scenario, priors)
    draws = forward.Draws(
        mass=prior.mass, phonon_time=prior.phonon_time, impurity_parameter=prior.impurity_parameter,
        hall_factor=prior.hall_factor, hall_times=prior.attractor_times, birth_field=prior.birth_field,
        birth_period=prior.birth_period, age=prior.age, umklapp_temperature=prior.umklapp,
    )  # fmt: skip
    theirs = forward.evolve(draws, scenario, channel=channel, law=FREEZE_OUT[law], steps=600)
    alive = theirs.braking_index < 200.0
    assert alive.sum() > 50
    pairs = {
        "period": (ours.period, theirs.period),
        "derivative": (ours.period_derivative, theirs.period_derivative),
        "index": (ours.braking_index, theirs.braking_index),
    }
    for name, (a, b) in pairs.items():
        error = np.abs(a[alive] / b[alive] - 1.0)
        assert np.median(error) < 1e-6, name
        assert np.max(error) < 1e-4, name
