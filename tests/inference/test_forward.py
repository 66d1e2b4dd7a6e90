"""The forward simulator against closed histories, against scipy, and against itself at finer steps."""

from types import SimpleNamespace

import numpy as np
import pytest

from decayinfer.physics import torque
from decayinfer.physics.conduction import density_from_phonon_time, impurity_time
from decayinfer.physics.constants import YEAR_S
from decayinfer.physics.hall import hall_time
from decayinfer.physics.history import exponential_field, hall_field, lumped_field
from decayinfer.physics.lattice import FREEZE_OUT

CHANNELS = [
    "impurity",
    "phonon",
    "hall",
    "impurity+phonon",
    "impurity+hall",
    "phonon+hall",
    "impurity+phonon+hall",
]


def invented_star(ln_temperature, *, redshift=0.8):
    return SimpleNamespace(
        ln_temperature=ln_temperature,
        radius_km=lambda mass: 12.0 + 0.0 * mass,
        inertia_45=lambda mass: 1.1 * mass,
        redshift_factor=lambda mass: redshift + 0.0 * mass,
        gravity_14=lambda mass: 1.2 * mass,
    )


def cooling_star():
    """Slow cooling, then a steep fall after 1e5 yr; light stars hotter."""

    def ln_temperature(ln_age, mass):
        x = np.log((np.exp(ln_age) + 100.0) / 1e5)
        return 0.3 * (1.5 - mass) - x / 6.0 - 1.2 * np.logaddexp(0.0, (x - 1.0) / 0.3) * 0.3

    return invented_star(ln_temperature)


WARM = invented_star(lambda ln_age, mass: np.log(1.3) + 0.0 * ln_age * mass)
NO_FREEZING = FREEZE_OUT["none"]


def draws(forward, **changes):
    values = {
        "mass": 1.4,
        "phonon_time": 3e5,
        "impurity_parameter": 2.0,
        "hall_factor": 1.5,
        "hall_times": np.inf,
        "birth_field": 5.0,
        "birth_period": 0.1,
        "age": np.geomspace(1e2, 1e6, 5),
        "umklapp_temperature": 0.4,
    }
    arrays = np.broadcast_arrays(*(values | changes).values())
    return forward.Draws(**dict(zip(values, arrays, strict=True)))


def random_draws(forward, count, seed):
    rng = np.random.default_rng(seed)
    return forward.Draws(
        mass=rng.uniform(1.0, 2.0, count),
        phonon_time=np.exp(rng.normal(np.log(3e5), 1.0, count)),
        impurity_parameter=np.exp(rng.normal(0.0, 1.5, count)),
        hall_factor=np.exp(rng.normal(0.0, 0.5, count)),
        hall_times=np.exp(rng.normal(np.log(3.0), 0.5, count)),
        birth_field=10.0 ** rng.normal(0.7, 0.5, count),
        birth_period=10.0 ** rng.normal(-1.0, 0.4, count),
        age=10.0 ** rng.uniform(3.0, 6.3, count),
        umklapp_temperature=np.exp(rng.normal(np.log(0.5), 0.3, count)),
    )


def star_times(sample):
    """Ohmic (phonon, impurity) and Hall times at birth on the distant clock, from the formulas themselves."""
    gravity, redshift = WARM.gravity_14(sample.mass), WARM.redshift_factor(sample.mass)
    density = density_from_phonon_time(sample.phonon_time, gravity)
    phonon = sample.phonon_time / 1.3**2 / redshift
    impurity = impurity_time(density, sample.impurity_parameter, gravity_14=gravity) / redshift
    drift = sample.hall_factor * hall_time(density, sample.birth_field, gravity_14=gravity) / redshift
    return phonon, impurity, drift


def test_field_follows_the_closed_histories(forward):
    """Constant temperature, no attractor: exponential, pure drift and the law of Aguilera et al. 2008."""
    sample = draws(forward)
    phonon, impurity, drift = star_times(sample)
    ohm = 1.0 / (1.0 / phonon + 1.0 / impurity)
    expected = {
        "phonon": exponential_field(sample.age, 5.0, decay_time=phonon),
        "impurity": exponential_field(sample.age, 5.0, decay_time=impurity),
        "hall": hall_field(sample.age, 5.0, hall_time=drift),
        "impurity+phonon+hall": lumped_field(sample.age, 5.0, ohmic_time=ohm, hall_time=drift),
        "constant": 5.0 * np.ones(5),
    }
    for channel, field in expected.items():
        run = forward.evolve(sample, WARM, channel=channel, law=NO_FREEZING, steps=200)
        np.testing.assert_allclose(run.field, field, rtol=2e-7, err_msg=channel)


def test_period_follows_exponential_decay(forward):
    """P^2 = P_0^2 + C B_0^2 tau (1 - exp(-2 t/tau)) for P P' = C B^2."""
    sample = draws(forward)
    tau = star_times(sample)[0]
    constant = torque.spin_down_constant(radius_km=12.0, inertia_45=1.1 * 1.4) * YEAR_S
    run = forward.evolve(sample, WARM, channel="phonon", law=NO_FREEZING, steps=200)
    expected = np.sqrt(0.1**2 + constant * 25.0 * tau * -np.expm1(-2 * sample.age / tau))
    np.testing.assert_allclose(run.period, expected, rtol=1e-7)
    ages = torque.characteristic_age(run.period, run.period_derivative)
    np.testing.assert_allclose(run.braking_index, torque.braking_index(1.0 / tau, ages), rtol=1e-9)
    field = torque.dipole_field(run.period, run.period_derivative, radius_km=12.0, inertia_45=1.54)
    np.testing.assert_allclose(field, run.field, rtol=1e-12)


def test_constant_dipole_has_index_three(forward):
    run = forward.evolve(draws(forward), WARM, channel="constant")
    np.testing.assert_allclose(run.braking_index, 3.0, rtol=1e-12)


def test_attractor_ends_the_drift(forward):
    """Well past one Hall time (1.6e4 yr here) the field stops falling; without the attractor it falls on."""
    free, caught = (
        forward.evolve(draws(forward, birth_field=100.0, hall_times=k), WARM, channel="hall")
        for k in (np.inf, 1.0)
    )
    assert np.all(caught.field[3:] > 3.0 * free.field[3:])
    assert caught.braking_index[-1] < 3.01 < free.braking_index[-1]


@pytest.mark.parametrize("channel", CHANNELS)
@pytest.mark.parametrize("law", ["none", "exponential", "cut"])
def test_steps_agree_with_the_adaptive_solver(forward, channel, law):
    sample = random_draws(forward, 6, seed=len(channel))
    options = {"channel": channel, "law": FREEZE_OUT[law]}
    fast = forward.evolve(sample, cooling_star(), steps=600, **options)
    for i in range(6):
        exact = forward.evolve_one(sample[i], cooling_star(), **options)
        for name in ("field", "period", "period_derivative", "braking_index"):
            assert getattr(fast, name)[i] == pytest.approx(getattr(exact, name), rel=1e-8), name


def test_default_steps_are_good_enough_for_monte_carlo(forward):
    """Bins of Monte Carlo evidence are 10 % wide; the default errs a thousandth of that at most."""
    sample = random_draws(forward, 4000, seed=1)
    options = {"channel": "impurity+phonon+hall", "law": FREEZE_OUT["exponential"]}
    coarse, fine = (forward.evolve(sample, cooling_star(), steps=n, **options) for n in (64, 400))
    alive = fine.field > 1e-6
    for name in ("field", "period", "braking_index"):
        np.testing.assert_allclose(getattr(coarse, name)[alive], getattr(fine, name)[alive], rtol=5e-5)


def test_error_falls_with_the_fourth_power_of_the_step(forward):
    sample = random_draws(forward, 50, seed=2)
    options = {"channel": "impurity+phonon+hall", "law": FREEZE_OUT["exponential"]}
    runs = [forward.evolve(sample, cooling_star(), steps=n, **options).field for n in (40, 80, 640)]
    errors = [np.median(np.abs(run / runs[-1] - 1.0)) for run in runs[:2]]
    assert 8.0 < errors[0] / errors[1] < 32.0


def test_chunks_do_not_matter(forward, monkeypatch):
    sample = random_draws(forward, 30, seed=3)
    whole = forward.evolve(sample, cooling_star(), channel="phonon+hall")
    monkeypatch.setattr(forward, "CHUNK", 7)
    np.testing.assert_array_equal(
        forward.evolve(sample, cooling_star(), channel="phonon+hall").field, whole.field
    )
