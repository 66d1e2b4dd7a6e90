"""The same posterior done plainly: physical parameters, an adaptive ODE solver and an ensemble sampler.

P and Pdot enter as measurements with errors of 1 %, for without the conditioned coordinates exact values leave
nothing to
sample. Everything that is a matter of taste is decided in favour of this side: logarithms of the scale parameters,
loose tolerances, and walkers that start from the posterior, so that no burn-in is lost.
"""

import time

import emcee
import numpy as np
from scipy.integrate import solve_ivp

from decayinfer.channels.registry import load_channel
from decayinfer.cooling.form import MASS_RANGE
from decayinfer.cooling.registry import load_scenario
from decayinfer.inference.measurement import ln_index_likelihood
from decayinfer.inference.priors import Priors
from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.lattice import FREEZE_OUT
from decayinfer.physics.torque import characteristic_age

NAMES = (
    "mass", "ln_phonon_time", "ln_impurity_parameter", "ln_hall_factor", "ln_attractor_times", "ln_birth_field",
    "ln_birth_period", "ln_umklapp", "ln_age",
)  # fmt: skip
SPIN_ERROR = 0.01


class PlainPosterior:
    """Log density of physical parameters; those that the channel does not use are held at their prior medians."""

    def __init__(self, forward, star, channel, scenario, priors=None):
        self.forward, self.star, self.channel = forward, star, channel
        self.scenario, self.priors = load_scenario(scenario), priors or Priors()
        acting = load_channel(channel)
        used = {"mass", "ln_phonon_time", "ln_birth_field", "ln_birth_period", "ln_age"}
        used |= {"ln_umklapp"} if acting.phonon else set()
        used |= {"ln_impurity_parameter"} if acting.impurity else set()
        used |= {"ln_hall_factor", "ln_attractor_times"} if acting.hall else set()
        self.free = np.array([i for i, name in enumerate(NAMES) if name in used])
        means, sds = self.priors.normals()
        self.means, self.sds = means, sds
        self.default = np.concatenate([[self.priors.mass_mean], means, [0.0]])

    def __call__(self, free):
        with np.errstate(all="ignore"):  # walkers may propose fields that have died
            value = self.ln_density(free)
        return value if np.isfinite(value) else -np.inf

    def ln_density(self, free):
        x = self.default.copy()
        x[self.free] = free
        ln_prior = self.ln_prior(x)
        if not np.isfinite(ln_prior):
            return -np.inf
        ln_period, ln_derivative, index = self.today(x)
        gaps = np.array(
            [ln_period - np.log(self.star.period), ln_derivative - np.log(self.star.period_derivative)]
        )
        star = self.star
        likelihood = ln_index_likelihood(
            star.braking_index, index, star.braking_index_err_minus, star.braking_index_err_plus, 0.0,
            self.priors.scatter_sd,
        )  # fmt: skip
        return ln_prior - 0.5 * np.sum((gaps / SPIN_ERROR) ** 2) + float(likelihood)

    def ln_prior(self, x):
        mass, age = x[0], np.exp(x[8])
        if not MASS_RANGE[0] < mass < MASS_RANGE[1] or age > 5.0 * self.priors.max_age:
            return -np.inf
        ln = -0.5 * ((mass - self.priors.mass_mean) / self.priors.mass_sd) ** 2 + x[8]
        ln -= np.log1p((age / self.priors.max_age) ** 8)
        return ln - 0.5 * np.sum(((x[1:8] - self.means) / self.sds) ** 2)

    def today(self, x):
        """ln P, ln Pdot and n by LSODA on ln B and the integral of B^2, even in the logarithm of age."""
        values = dict(zip(NAMES, x, strict=True))
        draws = self.forward.Draws(
            mass=values["mass"], phonon_time=np.exp(values["ln_phonon_time"]),
            impurity_parameter=np.exp(values["ln_impurity_parameter"]), hall_factor=np.exp(values["ln_hall_factor"]),
            hall_times=np.exp(values["ln_attractor_times"]), birth_field=np.exp(values["ln_birth_field"]),
            birth_period=np.exp(values["ln_birth_period"]), age=np.exp(values["ln_age"]),
            umklapp_temperature=np.exp(values["ln_umklapp"]),
        )  # fmt: skip
        system = self.forward.equations(
            draws, self.scenario, self.channel, FREEZE_OUT[self.priors.freeze_out]
        )

        def slopes(u, state):
            age = np.expm1(u)
            return [
                -(age + 1.0) * float(system.rate(age, np.exp(state[0]))),
                (age + 1.0) * np.exp(2.0 * state[0]),
            ]

        end = np.log1p(draws.age)
        run = solve_ivp(slopes, (0.0, end), [np.log(draws.birth_field), 0.0], "LSODA", rtol=1e-6, atol=1e-8)
        ln_field, squares = run.y[:, -1]
        if not run.success or not np.isfinite(squares):
            return np.nan, np.nan, np.nan
        constant = float(system.constant)
        period = np.sqrt(draws.birth_period**2 + 2.0 * constant * squares)
        derivative = constant * np.exp(2.0 * ln_field) / period / YEAR_S
        rate = float(system.rate(draws.age, np.exp(ln_field)))
        return np.log(period), np.log(derivative), 3.0 + 4.0 * characteristic_age(period, derivative) * rate


def free_of(physical, names):
    """Parameters in the order of NAMES from what the inference calls physical, (n, len(names))."""
    columns = [getattr(physical, name) for name in names]
    return np.column_stack(np.broadcast_arrays(*columns))


def sample(posterior, starts, *, seconds, seed):
    """Run the ensemble for a processor time; return its chain (walkers, steps, d) and the time it took.

    Walkers start on draws of the posterior.
    """
    walkers = starts[:32]
    random = np.random.RandomState(seed)
    sampler = emcee.EnsembleSampler(len(walkers), walkers.shape[1], posterior)
    sampler.random_state = random.get_state()
    begun = time.process_time()
    state = walkers
    while time.process_time() - begun < seconds:
        state = sampler.run_mcmc(state, 10)
    return sampler.get_chain().swapaxes(0, 1), time.process_time() - begun


def autocorrelation_time(chain):
    """Longest over the parameters, in steps; too short when the chain is shorter than fifty of it."""
    return float(np.nanmax(emcee.autocorr.integrated_time(chain.swapaxes(0, 1), quiet=True)))
